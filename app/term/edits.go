package term

import (
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

var verbJoin = verb{
	name: "join", usage: "join STUDY.gpkg LAYER FILE --key COLUMN [--layer-key COLUMN] [--table NAME] [--replace | --beside] [--reason TEXT]", summary: "joins a table's columns to a layer by a key", places: [2]int{3, 3},
	more: "Features are met by their identifiers, or by a column of the layer. What finds no partner on either side is listed.",
	options: []option{{name: "key", value: "COLUMN", help: "the column of the table that holds the keys"}, {name: "layer-key", value: "COLUMN", help: "the column of the layer that holds them; without it the identifiers"}, {name: "table", value: "NAME", help: "which sheet or table of the file"},
		{name: "replace", help: "columns that the layer has already are replaced by the table's"}, {name: "beside", help: "they stay, and the table's get a number behind their names"}, reasonOption},
	run: func(c *call) (int, error) {
		if !c.args.has("key") {
			return 0, &study.QuestionError{File: c.args.places[2], Questions: []study.Question{{Text: "which column of the table holds the keys?", Option: "--key COLUMN"}}}
		}
		twice := study.AskTwice
		switch {
		case c.args.has("replace") && c.args.has("beside"):
			return 0, usagef("--replace and --beside exclude each other")
		case c.args.has("replace"):
			twice = study.ReplaceTwice
		case c.args.has("beside"):
			twice = study.BesideTwice
		}
		return c.with(func(s *study.Study) (int, error) {
			in, err := c.ReadFile(c.ctx, c.args.places[2], study.ReadOptions{Table: c.args.get("table")})
			if err != nil {
				return 0, err
			}
			if in.Layer == nil {
				return 0, usagef("%s is a raster (a grid of values) and no table", c.args.places[2])
			}
			rep, err := s.Join(c.ctx, c.args.places[1], in.Layer, c.args.get("layer-key"), c.args.get("key"), twice, c.args.get("reason"))
			if err != nil {
				return 0, c.noLayer(s, err)
			}
			c.answer(map[string]any{"study": c.args.places[0], "join": rep}, "Joined %s to %s: %s met their row.", listed(rep.Columns), c.args.places[1], counted(rep.Matched, "feature"))
			if len(rep.Replaced) > 0 {
				c.say("  replaced: the columns %s that the layer had", listed(rep.Replaced))
			}
			c.some("feature", "without a row", rep.Without)
			c.some("row", "without a feature", rep.LeftOver)
			c.some("key", "in several rows, of which the first counts", rep.Doubled)
			if len(rep.Without)+len(rep.LeftOver)+len(rep.Doubled) > 0 {
				return ExitLeftOut, nil
			}
			return ExitDone, nil
		})
	},
}

// some lists the first of many names.
func (c *call) some(one, what string, names []string) {
	if len(names) == 0 {
		return
	}
	words := strings.Join(names[:min(len(names), 8)], ", ")
	if len(names) > 8 {
		words += fmt.Sprintf(" and %d more", len(names)-8)
	}
	c.say("  %s %s: %s", counted(len(names), one), what, words)
}

// noLayer turns a layer that is not there into words with the layers that are.
func (c *call) noLayer(s *study.Study, err error) error {
	var feature *study.FeatureError
	if !errors.Is(err, study.ErrNotThere) || errors.As(err, &feature) {
		return err
	}
	snap, e := s.Snapshot()
	if e != nil {
		return e
	}
	if hasLayer(snap, c.args.places[1]) {
		return err
	}
	return usagef("there is no layer %q; the layers are: %s", c.args.places[1], layerNames(snap))
}

var verbDraw = verb{
	name: "draw", usage: "draw STUDY.gpkg LAYER --shape 'LON,LAT LON,LAT ...' --reason TEXT [--as ROLE] [--set FIELD=VALUE ...] [--id NAME]", summary: "adds a point, line or polygon to a layer by hand", places: [2]int{2, 2},
	more: "One position makes a point, several a line; a polygon ends where it began. A layer that is not there is begun\nwith --as. Changes by hand are kept when the layer is replaced by a new edition.",
	options: []option{{name: "shape", value: "LON,LAT ...", help: "its positions in degrees"}, {name: "as", value: "ROLE", help: "what a new layer means"},
		{name: "set", value: "FIELD=VALUE", many: true, help: "a field of the role"}, {name: "id", value: "NAME", help: "its identifier"}, reasonOption},
	run: func(c *call) (int, error) {
		g, err := shapeOf(c.args.get("shape"))
		if err != nil {
			return 0, err
		}
		values, err := c.args.pairs("set")
		if err != nil {
			return 0, err
		}
		return c.byHand(study.HandEdit{Verb: study.HandAdd, Feature: c.args.get("id"), Geometry: &g, Values: values})
	},
}

var verbPlace = verb{
	name: "place", usage: "place STUDY.gpkg (LAYER FEATURE (--shape 'LON,LAT ...' | --set FIELD=VALUE ... | --remove) | SITE PLANT (--turbines 'LON,LAT ...' | --add LON,LAT | --move N=LON,LAT | --take N | --own)) --reason TEXT", summary: "moves, reclasses or takes out a feature, or places turbines, by hand", places: [2]int{1, 3 + study.MostHandTurbines},
	more: `FEATURE is its identifier (a dwelling_id, a name) or its row in the file; where both fit, row=3 and
dwelling_id=3 tell them apart. A measure may have its unit behind it, as --set 'voltage=20 kV'.
Turbines of a plant option on a site: --turbines places all; --add, --move and --take change what is there, the layout
by hand or else the program's own, which is computed first. Rules that a place breaks are shown with the results.
Without an option the turbines placed by hand are listed with their numbers: gtally place STUDY.gpkg [SITE PLANT]`,
	options: slices.Concat([]option{{name: "shape", value: "LON,LAT ...", help: "of a feature: its new place in degrees"}, {name: "set", value: "FIELD=VALUE", many: true, help: "a field of the role, as class=farm"}, {name: "remove", help: "take the feature out"}}, layoutOptions, []option{reasonOption}),
	run: func(c *call) (int, error) {
		way, err := c.layoutWay()
		if err != nil {
			return 0, err
		}
		feature := c.args.has("shape") || c.args.has("set") || c.args.has("remove")
		switch n := len(c.args.places); {
		case way != "":
			return c.placeTurbines(way)
		case !feature && !c.args.has("reason") && (n == 1 || n == 3):
			return c.listLayouts()
		case n != 3:
			return 0, usagef("usage: gtally %s", c.verb.usage)
		}
		values, err := c.args.pairs("set")
		if err != nil {
			return 0, err
		}
		h := study.HandEdit{Verb: study.HandSet, Feature: c.args.places[2], Values: values}
		switch {
		case c.args.has("remove") && (c.args.has("shape") || len(values) > 0):
			return 0, usagef("--remove takes the feature out and cannot stand beside --shape or --set")
		case c.args.has("remove"):
			h.Verb = study.HandRemove
		case c.args.has("shape"):
			g, err := shapeOf(c.args.get("shape"))
			if err != nil {
				return 0, err
			}
			h.Verb, h.Geometry = study.HandMove, &g
		case len(values) == 0:
			return 0, usagef("usage: gtally %s", c.verb.usage)
		}
		return c.byHand(h)
	},
}

func (c *call) byHand(h study.HandEdit) (int, error) {
	if h.Reason = c.args.get("reason"); strings.TrimSpace(h.Reason) == "" {
		return 0, usagef("a change by hand needs --reason TEXT; it goes into the appendix")
	}
	role := ""
	if c.args.has("as") {
		r, ok := c.Catalog.Role(c.args.get("as"))
		if !ok {
			return 0, c.noRole(c.args.get("as"))
		}
		role = r.Name
	}
	return c.with(func(s *study.Study) (int, error) {
		tools, done := c.Tools()
		defer done()
		rec, err := s.EditByHand(c.ctx, c.args.places[1], role, tools, h)
		if err != nil {
			return 0, &inputError{c.noLayer(s, err)}
		}
		h = rec.Hand[len(rec.Hand)-1]
		c.answer(map[string]any{"study": c.args.places[0], "layer": rec}, "%s, %s. %s; the change is kept for the next edition.", rec.Name, handWords(h), present.Upper(counted(rec.Count, "feature")))
		c.notices(slices.DeleteFunc(slices.Clone(rec.Notices), func(n geo.Notice) bool {
			_, now := h.Values[n.Field]
			return n.Feature != h.Feature || !(strings.HasPrefix(n.Code, "drawn_repaired") && h.Geometry != nil || n.Code == "hand_value_new" && now)
		}))
		return ExitDone, nil
	})
}

// shapeOf reads positions in degrees.
func shapeOf(text string) (geo.LonLatGeometry, error) {
	var ps []geo.LonLat
	for _, word := range strings.Fields(text) {
		a, b, ok := strings.Cut(word, ",")
		lon, errA := strconv.ParseFloat(a, 64)
		lat, errB := strconv.ParseFloat(b, 64)
		if !ok || errA != nil || errB != nil {
			return geo.LonLatGeometry{}, usagef("--shape: %q is no LON,LAT in degrees", word)
		}
		ps = append(ps, geo.LonLat{Lon: lon, Lat: lat})
	}
	g, err := geo.Shape(ps)
	if err != nil {
		return g, usagef("--shape 'LON,LAT LON,LAT ...': %v", err)
	}
	return g, nil
}
