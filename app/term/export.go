package term

import (
	"cmp"
	"errors"
	"fmt"
	"os"
	"slices"

	"groundtally/app/export"
	"groundtally/app/study"
	"groundtally/geo"
)

var verbExport = verb{
	name: "export", usage: "export STUDY.gpkg LAYER [LAYER ...] --to FILE [--personal] [--replace]", summary: "writes layers as GeoJSON, GeoPackage or CSV", places: [2]int{2, 1000},
	more:    "The ending of the file's name says the form: .geojson, .gpkg (which holds several layers) or .csv.",
	options: []option{{name: "to", value: "FILE", help: "where to write"}, {name: "personal", help: "write personal columns too"}, replaceOption},
	run: func(c *call) (int, error) {
		if !c.args.has("to") {
			return 0, usagef("usage: gtally %s", c.verb.usage)
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			var layers []*geo.Layer
			for _, name := range c.args.places[1:] {
				at := slices.IndexFunc(snap.Layers, func(l study.LayerRecord) bool { return l.Name == name })
				if at < 0 {
					return 0, usagef("there is no layer %q; the layers are: %s", name, layerNames(snap))
				}
				v, _, err := s.Store().Version(c.ctx, snap.Layers[at].Digest)
				if err != nil {
					return 0, err
				}
				if v.Layer == nil {
					return 0, &inputError{fmt.Errorf("layer %q is a raster (a grid of values), which is not written in another form", name)}
				}
				l := *v.Layer
				l.Name = name
				layers = append(layers, &l)
			}
			if err := c.export(c.args.get("to"), layers, c.args.has("personal"), c.args.has("replace")); err != nil {
				return 0, err
			}
			c.done(fmt.Sprintf("Wrote %s.", c.args.get("to")))
			return ExitDone, nil
		})
	},
}

// replaceOption stands where a verb writes one file.
var replaceOption = option{name: "replace", help: "put it in the place of a file that is there"}

// freeFile refuses a name that a file has already, unless it is to be replaced; an empty name is free. It is
// asked before long work.
func (c *call) freeFile(to string) error {
	if to == "" || c.args.has("replace") {
		return nil
	}
	if _, err := os.Lstat(to); err == nil {
		return errors.Join(&study.FileError{File: to, What: "there is a file of this name already"}, study.ErrNameInUse)
	}
	return nil // what else may be wrong with the name is said when it is written
}

func (c *call) export(to string, layers []*geo.Layer, personal, replace bool) error {
	f, err := export.FormatOf(to)
	if err != nil {
		return err
	}
	return export.Layers(c.ctx, to, layers, export.Options{Format: f, Personal: personal, Replace: replace, Triggers: true})
}

var verbConvert = verb{
	name: "convert", usage: "convert FILE OUT [--table NAME] [--crs AUTH:CODE] [--at COLUMN,COLUMN] [--replace]", summary: "between the forms that the program reads and writes", places: [2]int{2, 2},
	more: "Coordinates come to longitude and latitude on WGS 84. Read: GeoJSON, GeoPackage, shapefile (also in a zip), CSV,\nworkbook. Written: GeoJSON, GeoPackage, CSV, by the ending of OUT.",
	options: []option{{name: "table", value: "NAME", help: "which table, sheet or layer of the file"}, {name: "crs", value: "AUTH:CODE", help: "coordinate system of the file"},
		{name: "at", value: "COLUMN,COLUMN", help: "the columns that hold longitude and latitude, or east and north"}, replaceOption},
	run: func(c *call) (int, error) {
		in, err := c.ReadFile(c.ctx, c.args.places[0], study.ReadOptions{CRSGiven: c.args.has("crs"), Table: c.args.get("table")})
		if err != nil {
			return 0, err
		}
		if in.Layer == nil {
			return 0, &inputError{fmt.Errorf("%s is a raster (a grid of values), which is not written in another form", c.args.places[0])}
		}
		if in.At, err = placeOf(c.args.get("at")); err != nil {
			return 0, err
		}
		in.CRSOption = c.args.get("crs")
		tools, done := c.Tools()
		defer done()
		l, err := study.ToDegrees(c.ctx, in, tools)
		if err != nil {
			return 0, err
		}
		l.Name = cmp.Or(in.Table, in.Base)
		if err := c.export(c.args.places[1], []*geo.Layer{l}, true, c.args.has("replace")); err != nil {
			return 0, err
		}
		c.notices(in.Notices)
		c.answer(map[string]any{"file": c.args.places[0], "out": c.args.places[1], "ledger": in.Ledger}, "Wrote %s: %s.", c.args.places[1], ledgerWords(in.Ledger))
		if in.Ledger.LeftOut > 0 {
			return ExitLeftOut, nil
		}
		return ExitDone, nil
	},
}
