package ground

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

// What can be done to a feature by hand, in words.
var handVerbs = []struct{ verb, words string }{
	{study.HandSet, "give it other values"}, {study.HandMove, "put it elsewhere"}, {study.HandAdd, "add a new one"}, {study.HandRemove, "take it out"},
}

// handForm changes a feature of a layer by hand.
type handForm struct {
	s        *Stage
	rec      study.LayerRecord
	newRole  string   // of a layer that the change begins; empty for one that is there
	kind     geo.Kind // of a new feature; NoGeometry where the layer's role leaves it open
	verb     *widget.Select
	feature  *widget.Entry
	place    *widget.Entry
	draw     *widget.Button
	field    *widget.Select
	value    *widget.Entry
	reason   *widget.Entry
	said     *widget.Label
	fields   []string
	dialog   *dialog.CustomDialog
	ok, back *widget.Button
}

func newHandForm(s *Stage, rec study.LayerRecord) *handForm {
	f := &handForm{s: s, rec: rec, feature: widget.NewEntry(), place: widget.NewEntry(), value: widget.NewEntry(), reason: widget.NewEntry(), said: widgets.NewText("")}
	words := make([]string, len(handVerbs))
	for i, v := range handVerbs {
		words[i] = v.words
	}
	f.verb = widget.NewSelect(words, func(string) { f.fits() })
	f.place.SetPlaceHolder("longitude, latitude; several for a line or an outline")
	f.reason.SetPlaceHolder("needed; it goes into the appendix")
	role, _ := s.c.Parts.Catalog.Role(rec.Role)
	titles := []string{"no value"}
	f.fields = []string{""}
	for _, field := range role.Fields {
		if !field.Personal {
			titles, f.fields = append(titles, fieldWords(field)), append(f.fields, field.Name)
		}
	}
	f.field = widget.NewSelect(titles, nil)
	f.field.SetSelectedIndex(0)
	f.value.SetPlaceHolder("its value")
	f.draw = widget.NewButton("Draw…", f.sketch)
	f.ok = widget.NewButton("Change it", f.commit)
	f.ok.Importance = widget.HighImportance
	f.back = widget.NewButton("Leave it", func() { f.dialog.Hide() })
	f.verb.SetSelectedIndex(0)
	return f
}

// fits greys what plays no part in what is chosen.
func (f *handForm) fits() {
	able := func(w interface {
		Enable()
		Disable()
	}, yes bool) {
		if yes {
			w.Enable()
		} else {
			w.Disable()
		}
	}
	verb := handVerbs[max(f.verb.SelectedIndex(), 0)].verb
	f.feature.SetPlaceHolder(map[bool]string{true: "may stay empty: a name is found for it", false: "its identifier, as the map and the notices name it"}[verb == study.HandAdd])
	able(f.place, verb == study.HandMove || verb == study.HandAdd)
	able(f.draw, verb == study.HandMove || verb == study.HandAdd)
	able(f.field, verb == study.HandSet || verb == study.HandAdd)
	able(f.value, verb == study.HandSet || verb == study.HandAdd)
}

func (f *handForm) open() {
	form := container.New(columns{label: 130})
	row := func(label string, o ...*widget.Entry) {
		for _, e := range o {
			form.Add(widgets.NewLine(label))
			form.Add(e)
		}
	}
	form.Add(widgets.NewLine("What to do"))
	form.Add(f.verb)
	row("Feature", f.feature)
	form.Add(widgets.NewLine("Place"))
	form.Add(container.NewBorder(nil, nil, nil, f.draw, f.place))
	form.Add(widgets.NewLine("Field"))
	form.Add(widgets.Fields(6, []float32{170, 0}, f.field, f.value))
	row("Why", f.reason)
	foot := container.NewBorder(nil, nil, nil, container.NewHBox(f.back, f.ok))
	words := widgets.NewText("The change is kept with its reason, undone like any other, and made again when the layer is replaced by a new edition. A place can be typed, or drawn on the map by mouse or by keys: arrows move a cross, with Shift in small steps, and Space sets a point.")
	title := "Change " + f.rec.Name + " by hand"
	if f.newRole != "" {
		title = "Begin the layer " + f.rec.Name + " by hand"
	}
	f.dialog = dialog.NewCustomWithoutButtons(title, container.NewBorder(nil, foot, nil, nil, container.NewVBox(words, form, f.said)), f.s.c.Window)
	f.dialog.Resize(dialogSize(f.s.c, 620, 420))
	f.dialog.Show()
	first := f.feature
	if f.place.Text != "" { // it was drawn
		first = f.reason
	}
	f.s.c.Window.Canvas().Focus(first)
}

// edit gives the change that the form asks for.
func (f *handForm) edit() (study.HandEdit, error) {
	h := study.HandEdit{Verb: handVerbs[max(f.verb.SelectedIndex(), 0)].verb, Feature: strings.TrimSpace(f.feature.Text), Reason: strings.TrimSpace(f.reason.Text)}
	if h.Feature == "" && h.Verb != study.HandAdd {
		return h, errors.New("say which feature")
	}
	if h.Reason == "" {
		return h, errors.New("a change by hand needs a reason; everyone who reads the appendix will see it")
	}
	if h.Verb == study.HandMove || h.Verb == study.HandAdd {
		g, err := placesIn(f.place.Text)
		if err != nil {
			return h, err
		}
		h.Geometry = &g
	}
	if i := f.field.SelectedIndex(); i > 0 && h.Verb == study.HandAdd && strings.TrimSpace(f.value.Text) == "" {
		role, _ := f.s.c.Parts.Catalog.Role(f.rec.Role)
		if field, _ := role.Field(f.fields[i]); field.Required {
			return h, fmt.Errorf("write the value of the field %s, which %s need", fieldWords(field), role.Title)
		}
	}
	if i := f.field.SelectedIndex(); i > 0 && (h.Verb == study.HandSet || h.Verb == study.HandAdd && strings.TrimSpace(f.value.Text) != "") {
		h.Values = map[string]string{f.fields[i]: strings.TrimSpace(f.value.Text)}
	}
	return h, nil
}

// placesIn reads positions in degrees: pairs of longitude and latitude, a blank or a semicolon between pairs.
func placesIn(text string) (geo.LonLatGeometry, error) {
	text = strings.NewReplacer(";", " ", ", ", ",").Replace(text)
	var ps []geo.LonLat
	for _, word := range strings.Fields(text) {
		a, b, ok := strings.Cut(word, ",")
		lon, errA := strconv.ParseFloat(a, 64)
		lat, errB := strconv.ParseFloat(b, 64)
		if p := (geo.LonLat{Lon: lon, Lat: lat}); !ok || errA != nil || errB != nil || !p.Finite() {
			return geo.LonLatGeometry{}, fmt.Errorf("%q is no place; write longitude, latitude in degrees, as 9.0312, 48.2071", word)
		}
		ps = append(ps, geo.LonLat{Lon: lon, Lat: lat})
	}
	return geo.Shape(ps)
}

func (f *handForm) commit() {
	h, err := f.edit()
	if err != nil {
		said := err.Error()
		f.said.SetText(strings.ToUpper(said[:1]) + said[1:] + ".")
		return
	}
	var failed error
	parts, name, newRole := f.s.c.Parts, f.rec.Name, f.newRole
	c := f.s.c
	f.ok.Disable()
	c.Session.Edit(func(ctx context.Context, s *study.Study) error {
		tools, done := parts.Tools()
		defer done()
		_, failed = s.EditByHand(ctx, name, newRole, tools, h)
		return nil // said in the form, so that nothing typed is lost
	}, func(err error) {
		c.Do(func() {
			c.Update()
			f.ok.Enable()
			if err = errors.Join(failed, err); err != nil {
				f.said.SetText(inWindow.Replace(present.Problem(err)))
				return
			}
			f.dialog.Hide()
			c.Tell(name + " was changed by hand. Undo takes it back.")
		})
	})
}

// writeLayer saves a layer in another form.
func (p *layersPane) writeLayer() {
	c := p.s.c
	rec, ok := hasLayer(c.View().Snap, p.opened)
	if !ok {
		return
	}
	store := c.Session.Study().Store()
	d := dialog.NewFileSave(saved(c.Fail, func(path string) {
		go func() {
			v, _, err := store.Version(context.Background(), rec.Digest)
			if err == nil && v.Layer == nil {
				err = errors.New("a grid of values is not written in another form")
			}
			if err == nil {
				l := *v.Layer
				l.Name = rec.Name
				err = c.Parts.Export(context.Background(), path, []*geo.Layer{&l}, true)
			}
			c.Do(func() {
				if err != nil {
					c.Fail("write the layer", err)
					return
				}
				c.Tell("Wrote " + filepath.Base(path) + ". Personal columns stayed in the study.")
			})
		}()
	}), c.Window)
	d.SetFileName(rec.Name + ".geojson")
	d.Resize(dialogSize(c, 820, 600))
	d.Show()
}

// chooseTable asks which table of a file takes the place of a layer.
func (s *Stage) chooseTable(j job, tables []string) {
	pick := widget.NewSelect(tables, nil)
	if rec, ok := hasLayer(s.c.View().Snap, j.replace); ok && slices.Contains(tables, rec.Table) {
		pick.SetSelected(rec.Table)
	} else {
		pick.SetSelectedIndex(0)
	}
	var d *dialog.CustomDialog
	take := widget.NewButton("Take it", func() {
		j.table = pick.Selected
		d.Hide()
		s.queue = append([]job{j}, s.queue...)
		s.finished()
	})
	take.Importance = widget.HighImportance
	leave := widget.NewButton("Leave it out", func() { d.Hide(); s.finished() })
	body := container.NewBorder(widgets.NewText(fmt.Sprintf("%s holds several tables. Which one takes the place of %s?", filepath.Base(j.path), j.replace)), container.NewBorder(nil, nil, nil, container.NewHBox(leave, take)), nil, nil, pick)
	d = dialog.NewCustomWithoutButtons("Which table", body, s.c.Window)
	d.Resize(dialogSize(s.c, 480, 200))
	d.Show()
}
