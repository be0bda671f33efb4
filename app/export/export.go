package export

import (
	"context"
	"fmt"
	"io"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"groundtally/app/files"
	"groundtally/app/store/gpkgout"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/formats/geojson"
)

// Format is a form of file.
type Format string

// The formats.
const (
	GeoJSON    Format = "geojson"
	CSV        Format = "csv"
	GeoPackage Format = "gpkg"
)

// Formats lists all of them.
func Formats() []Format { return []Format{GeoJSON, CSV, GeoPackage} }

// FormatOf tells the format from the ending of a file's name.
func FormatOf(path string) (Format, error) {
	switch strings.ToLower(filepath.Ext(path)) {
	case ".geojson", ".json":
		return GeoJSON, nil
	case ".csv":
		return CSV, nil
	case ".gpkg":
		return GeoPackage, nil
	}
	return "", &study.FileError{File: path, What: "the ending of its name does not say in which form to write it", Cure: "Let it end in .geojson, .csv or .gpkg"}
}

// Options say how a file is written.
type Options struct {
	Format   Format
	Replace  bool      // put it in the place of a file that is there; otherwise that is an error
	Personal bool      // write columns marked personal too
	Changed  time.Time // when the layers last changed, which a GeoPackage says; see gpkgout.Options
	Triggers bool      // let a geographic information system edit a GeoPackage safely; see gpkgout
}

// Layer writes one layer.
func Layer(ctx context.Context, path string, l *geo.Layer, o Options) error {
	return Layers(ctx, path, []*geo.Layer{l}, o)
}

// Layers writes layers into one file. In a GeoPackage the layers' names become those of the tables;
// where two are the same the later one gets a number.
func Layers(ctx context.Context, path string, layers []*geo.Layer, o Options) error {
	if len(layers) == 0 {
		return &study.FileError{File: path, What: "there is no layer to write", Cure: "Choose one at least"}
	}
	if o.Format == GeoPackage {
		return gpkgout.Write(ctx, path, tables(layers), gpkgout.Options{Replace: o.Replace, Personal: o.Personal, Changed: o.Changed, Triggers: o.Triggers})
	}
	var encode func(io.Writer) error
	switch o.Format {
	case GeoJSON:
		encode = func(w io.Writer) error {
			return geojson.Encode(ctx, w, layers[0], geojson.EncodeOptions{Personal: o.Personal})
		}
	case CSV:
		encode = func(w io.Writer) error { return encodeCSV(ctx, w, layers[0], o.Personal) }
	default:
		return fmt.Errorf("%q is no format to export to", o.Format)
	}
	if len(layers) > 1 {
		return &study.FileError{File: path, What: fmt.Sprintf("a file of the form %s holds one layer, not %d", o.Format, len(layers)), Cure: "Choose a GeoPackage, or write every layer into a file of its own"}
	}
	if o.Replace {
		return files.Write(path, encode)
	}
	return files.WriteNew(path, encode)
}

// tables gives every layer a name of its own, without regard to case as SQLite has it.
func tables(layers []*geo.Layer) []gpkgout.Layer {
	used := map[string]bool{}
	out := make([]gpkgout.Layer, len(layers))
	for i, l := range layers {
		base := l.Name
		if base == "" {
			base = "layer"
		}
		name := base
		for n := 2; used[strings.ToLower(name)]; n++ {
			name = base + " (" + strconv.Itoa(n) + ")"
		}
		used[strings.ToLower(name)] = true
		out[i] = gpkgout.Layer{Name: name, Layer: l}
	}
	return out
}
