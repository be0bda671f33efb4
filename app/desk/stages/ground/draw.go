package ground

import (
	"context"
	"fmt"
	"math"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/study"
	"groundtally/geo"
)

// What is most often drawn: one entry of the menu each. What else there is goes through the form of its layer.
var drawings = []struct {
	words, role string
	kind        geo.Kind
	ask         string
}{
	{"A dwelling: a click", "dwellings", geo.Points, "Click where the dwelling stands"},
	{"A road: a line", "roads", geo.Lines, "Click along the road"},
	{"A power line: a line", "grid_lines", geo.Lines, "Click along the power line"},
	{"An exclusion area: an outline", "exclusion", geo.Polygons, "Click around the ground where nothing may be built"},
}

// chooseDrawing offers what can be drawn on the map.
func (p *layersPane) chooseDrawing() {
	c := p.s.c
	if c.View().Snap.Frame == nil {
		c.Tell("Add parcels first: they give the study its place.")
		return
	}
	at := fyne.CurrentApp().Driver().AbsolutePositionForObject(p.draw).AddXY(0, p.draw.Size().Height)
	widget.ShowPopUpMenuAtPosition(fyne.NewMenu("", p.drawItems()...), c.Window.Canvas(), at)
}

// drawItems are the entries of the menu. A layer that is unfolded is the one that is drawn in.
func (p *layersPane) drawItems() []*fyne.MenuItem {
	var items []*fyne.MenuItem
	for _, d := range drawings {
		rec, newRole := p.layerFor(d.role)
		items = append(items, fyne.NewMenuItem(d.words, func() { drawNew(p.s, rec, newRole, d.kind, d.ask) }))
	}
	rec, missing := p.layerFor("dwellings")
	if open, ok := hasLayer(p.s.c.View().Snap, p.opened); ok && open.Kind == "point" {
		rec, missing = open, ""
	}
	if missing == "" {
		items = append(items, fyne.NewMenuItemSeparator(), fyne.NewMenuItem("Move a point of "+rec.Name, func() { pickPoint(p.s, rec) }))
	}
	return items
}

// layerFor gives the layer of a role in which is drawn: the unfolded one, else the first; newRole is set when
// there is none and it will be begun.
func (p *layersPane) layerFor(role string) (rec study.LayerRecord, newRole string) {
	list := p.s.c.View().Snap.LayersOf(role)
	for _, l := range list {
		if l.Kind != "table" && l.Kind != "raster" && (rec.Name == "" || l.Name == p.opened) {
			rec = l
		}
	}
	if rec.Name != "" {
		return rec, ""
	}
	r, _ := p.s.c.Parts.Catalog.Role(role)
	name := r.Title + " by hand"
	for n := 2; ; n++ {
		if _, taken := hasLayer(p.s.c.View().Snap, name); !taken {
			return study.LayerRecord{Name: name, Role: role}, role
		}
		name = fmt.Sprintf("%s by hand %d", r.Title, n)
	}
}

// drawNew has the user draw a new feature, then asks why.
func drawNew(s *Stage, rec study.LayerRecord, newRole string, kind geo.Kind, ask string) {
	s.c.Sketch(kind, ask, nil, func(at []geo.LonLat, _ float64) {
		if len(at) == 0 {
			s.c.Tell("Nothing was drawn.")
			return
		}
		f := newHandForm(s, rec)
		f.newRole, f.kind = newRole, kind
		f.do(study.HandAdd)
		f.place.SetText(placesText(at))
		f.needed()
		f.open()
	})
}

// pickPoint has the user pick a point feature on the map and show where it goes, then asks why.
func pickPoint(s *Stage, rec study.LayerRecord) {
	c := s.c
	c.Sketch(geo.Points, "Click the feature of "+rec.Name+" that is put elsewhere", nil, func(at []geo.LonLat, nearM float64) {
		if len(at) == 0 {
			c.Tell("Nothing was moved.")
			return
		}
		store, centre := c.Session.Study().Store(), *c.View().Snap.Frame
		tools, done := c.Parts.Tools()
		go func() {
			defer done()
			id, from, err := nearest(context.Background(), store, rec, at[0], nearM, centre, tools)
			c.Do(func() {
				switch {
				case err != nil:
					c.Fail("find the feature", err)
				case id == "":
					c.Tell("There is no point of " + rec.Name + " there.")
					pickPoint(s, rec)
				default:
					movePoint(s, rec, id, from)
				}
			})
		}()
	})
}

// movePoint has the user show where a feature goes.
func movePoint(s *Stage, rec study.LayerRecord, id string, from geo.LonLat) {
	s.c.Sketch(geo.Points, "Click where "+id+" of "+rec.Name+" belongs", &from, func(at []geo.LonLat, _ float64) {
		if len(at) == 0 {
			s.c.Tell("Nothing was moved.")
			return
		}
		f := newHandForm(s, rec)
		f.kind = geo.Points
		f.do(study.HandMove)
		f.feature.SetText(id)
		f.place.SetText(placesText(at))
		f.open()
	})
}

// nearest finds the point feature of a layer that lies nearest to a place, within some metres; no identifier when
// there is none.
func nearest(ctx context.Context, store study.Store, rec study.LayerRecord, at geo.LonLat, withinM float64, centre geo.LonLat, tools study.Tools) (id string, from geo.LonLat, err error) {
	v, _, err := store.Version(ctx, rec.Digest)
	if err != nil || v.Layer == nil {
		return "", from, err
	}
	forward, _, err := tools.Frame(centre)
	if err != nil {
		return "", from, err
	}
	flat := func(p geo.LonLat) (geo.XY, error) {
		g, err := forward(geo.LonLatGeometry{Kind: geo.Points, Parts: [][][]geo.LonLat{{{p}}}})
		if err != nil {
			return geo.XY{}, err
		}
		return g.Parts[0][0][0], nil
	}
	here, err := flat(at)
	if err != nil {
		return "", from, err
	}
	best := withinM
	for _, f := range v.Layer.Features {
		if f.Geometry.Kind != geo.Points || len(f.Geometry.Parts) != 1 {
			continue // of several points none is the one that is put elsewhere
		}
		p := f.Geometry.Parts[0][0][0]
		// Degrees first, as most features are far away: a degree of latitude is no less than 110 km.
		if math.Abs(p.Lat-at.Lat)*110_000 > withinM {
			continue
		}
		q, err := flat(p)
		if err != nil {
			continue // it lies outside the study's reach
		}
		if d := here.Dist(q); d <= best {
			best, id, from = d, f.ID, p
		}
	}
	return id, from, nil
}

// placesText writes places as the form takes them, to a centimetre.
func placesText(at []geo.LonLat) string {
	words := make([]string, len(at))
	for i, p := range at {
		words[i] = fmt.Sprintf("%.7f, %.7f", p.Lon, p.Lat)
	}
	return strings.Join(words, "; ")
}

// do chooses what is done.
func (f *handForm) do(verb string) {
	for i, v := range handVerbs {
		if v.verb == verb {
			f.verb.SetSelectedIndex(i)
		}
	}
}

// needed chooses the first field that the role needs, so that a new feature does not lack it unasked.
func (f *handForm) needed() {
	role, _ := f.s.c.Parts.Catalog.Role(f.rec.Role)
	for _, field := range role.Fields {
		if !field.Required {
			continue
		}
		for i, n := range f.fields {
			if n == field.Name {
				f.field.SetSelectedIndex(i)
				f.value.SetPlaceHolder("its value, needed")
				return
			}
		}
	}
}

// sketch has the place drawn on the map; the form comes back with it, or as it was.
func (f *handForm) sketch() {
	kind := f.kind
	if kind == geo.NoGeometry {
		kind = map[string]geo.Kind{"point": geo.Points, "line": geo.Lines, "polygon": geo.Polygons}[f.rec.Kind]
	}
	ask := map[geo.Kind]string{geo.Points: "Click the place", geo.Lines: "Click along the line", geo.Polygons: "Click around the area"}[kind]
	f.dialog.Hide()
	f.s.c.Sketch(kind, ask, nil, func(at []geo.LonLat, _ float64) {
		if len(at) > 0 {
			f.place.SetText(placesText(at))
		}
		f.dialog.Show()
		f.s.c.Window.Canvas().Focus(f.reason)
	})
}
