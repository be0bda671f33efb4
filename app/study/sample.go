package study

import (
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"io/fs"
)

// sampleFile is one layer of a sample district with the answers its import needs.
type sampleFile struct {
	Path     string            `json:"path"`
	Role     string            `json:"role"`
	Name     string            `json:"name"`
	CRS      string            `json:"crs"`
	SwapAxes bool              `json:"swap_axes"`
	Match    map[string]string `json:"match"`
	Units    map[string]string `json:"units"`
	Personal []string          `json:"personal"`
	Complete bool              `json:"complete"`
	Edition  string            `json:"edition"`
	Holder   string            `json:"holder"`
}

// settingsRole marks the manifest's row of the settings file, which is no layer.
const settingsRole = "settings"

// LoadSample fills a study with a sample district: the layers of manifest.json, parcels first because
// they fix the frame, then the settings of settings.csv as one edit. Every layer goes through the same
// import as a user's file.
func (s *Study) LoadSample(ctx context.Context, fsys fs.FS, read func(ctx context.Context, fsys fs.FS, name string) (Import, error), tools Tools, report func(LayerRecord)) error {
	b, err := fs.ReadFile(fsys, "manifest.json")
	if err != nil {
		return err
	}
	var m struct {
		Files []sampleFile `json:"files"`
	}
	if err := json.Unmarshal(b, &m); err != nil {
		return fmt.Errorf("manifest.json: %w", err)
	}
	file, err := fsys.Open("settings.csv")
	if err != nil {
		return err
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		return fmt.Errorf("settings.csv: %w", err)
	}
	var edits []SettingEdit
	said := map[string]string{}
	for i, r := range rows {
		if i == 0 {
			continue
		}
		if len(r) != 5 {
			return fmt.Errorf("settings.csv, row %d: %d cells, want key,value,unit,source,reason", i+1, len(r))
		}
		said[r[0]] = r[1]
		edits = append(edits, SettingEdit{Key: r[0], Value: r[1], Source: r[3], Reason: r[4], AcceptedBy: "sample district"})
	}
	for pass := range 2 {
		for _, f := range m.Files {
			if f.Role == settingsRole || (f.Role == "parcels") != (pass == 0) {
				continue
			}
			in, err := read(ctx, fsys, f.Path)
			if err != nil {
				return err
			}
			in.Role, in.Name, in.CRSOption, in.SwapAxes, in.Match, in.Units = f.Role, f.Name, f.CRS, f.SwapAxes, f.Match, f.Units
			in.Personal, in.Complete, in.Edition, in.Holder, in.Reason = f.Personal, f.Complete, f.Edition, f.Holder, "sample district"
			if f.Role == HourlyRole {
				in.Stamp, in.OffsetH = said[StampKey], said[OffsetKey]
			}
			rec, err := s.AddLayer(ctx, in, tools)
			if err != nil {
				return err
			}
			report(rec)
		}
	}
	_, err = s.Set(ctx, "set", "ordinance, plant options and voices of the sample district", edits...)
	return err
}
