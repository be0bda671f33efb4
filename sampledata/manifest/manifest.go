package manifest

import (
	"bytes"
	"encoding/json"
	"fmt"
)

// Manifest lists the files of a district and the flaws that were put into them on purpose.
type Manifest struct {
	Name    string `json:"name"`
	Licence string `json:"licence"`
	Files   []File `json:"files"`
	Flaws   []Flaw `json:"flaws"`
}

// File is one file with the role it plays. Role is a layer role, or "settings" for the table of
// settings. CRS is empty for positions on WGS 84 and for tables without positions.
type File struct {
	Path     string            `json:"path"`
	Role     string            `json:"role"`
	Name     string            `json:"name"`
	CRS      string            `json:"crs,omitempty"`
	SwapAxes bool              `json:"swap_axes,omitempty"` // positions stand as latitude, longitude
	Match    map[string]string `json:"match,omitempty"`     // field of the role to column of the file
	Units    map[string]string `json:"units,omitempty"`     // column of the file to unit
	Personal []string          `json:"personal,omitempty"`  // columns that name people
	Complete bool              `json:"complete,omitempty"`  // the layer covers the whole district
	Edition  string            `json:"edition"`
	Holder   string            `json:"holder"`
	Note     string            `json:"note,omitempty"`
}

// Flaw is one fault of the data that is there on purpose.
type Flaw struct {
	File    string `json:"file"`
	Feature string `json:"feature"`
	What    string `json:"what"`
}

// Parse reads a manifest. Unknown members, a file without path or role, and a path that stands twice
// are refused.
func Parse(b []byte) (Manifest, error) {
	var m Manifest
	d := json.NewDecoder(bytes.NewReader(b))
	d.DisallowUnknownFields()
	if err := d.Decode(&m); err != nil {
		return Manifest{}, fmt.Errorf("parse manifest: %w", err)
	}
	seen := map[string]bool{}
	for i, f := range m.Files {
		if f.Path == "" || f.Role == "" {
			return Manifest{}, fmt.Errorf("parse manifest: file %d has no path or no role", i+1)
		}
		if seen[f.Path] {
			return Manifest{}, fmt.Errorf("parse manifest: %s stands twice", f.Path)
		}
		seen[f.Path] = true
	}
	return m, nil
}
