package ground

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/desktest"
	"groundtally/app/study"
	"groundtally/geo"
)

// bench opens the stage on the sample study and keeps what it tells and shows.
type bench struct {
	*desktest.Bench
	s       *Stage
	told    []string
	places  []geo.LonLat
	parcels [][]string
	opened  []string
}

func open(t *testing.T) *bench {
	t.Helper()
	b := &bench{Bench: desktest.New(t, 60)}
	b.Settle()
	c := b.Core
	c.Tell = func(w string) { b.told = append(b.told, w) }
	c.ShowPlace = func(p geo.LonLat) { b.places = append(b.places, p) }
	c.ShowParcels = func(ids []string) { b.parcels = append(b.parcels, ids) }
	c.ShowStage = func(title string) { b.opened = append(b.opened, title) }
	c.Ask = func(_, _, _ string, then func()) { then() }
	b.s = New(c)
	c.OnChange(b.s.Changed)
	b.Show(b.s.Content(), 520, 480)
	return b
}

func put(t *testing.T, name, content string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// shoot takes pictures at three widths.
func (b *bench) shoot(name string) {
	for _, s := range []fyne.Size{fyne.NewSize(520, 480), fyne.NewSize(760, 560), fyne.NewSize(430, 470)} {
		b.Window.Resize(s)
		if f := b.s.form; f != nil {
			f.dialog.Resize(dialogSize(b.Core, 760, 640))
		}
		b.Shoot(fmt.Sprintf("ground-%s-%.0f", name, s.Width))
	}
	b.Window.Resize(fyne.NewSize(520, 480))
}

// overlay gives all texts of the dialog that is on top.
func (b *bench) overlay() string {
	top := b.Window.Canvas().Overlays().Top()
	if top == nil {
		return ""
	}
	var out []string
	for _, o := range test.LaidOutObjects(top) {
		switch o := o.(type) {
		case *widget.Label:
			out = append(out, o.Text)
		case *widget.Button:
			out = append(out, "["+o.Text+"]")
		}
	}
	return strings.Join(out, "\n")
}

// press taps a button of the dialog on top.
func (b *bench) press(text string) {
	b.T.Helper()
	for _, o := range test.LaidOutObjects(b.Window.Canvas().Overlays().Top()) {
		if x, ok := o.(*widget.Button); ok && x.Text == text {
			test.Tap(x)
			return
		}
	}
	b.T.Fatalf("no button %q among:\n%s", text, b.overlay())
}

func (b *bench) waitForm(base string) *form {
	b.T.Helper()
	b.Until("the form of "+base+" is there", func() bool { return b.s.form != nil && b.s.form.in.Base == base })
	return b.s.form
}

func (b *bench) layer(name string) (study.LayerRecord, bool) {
	return hasLayer(b.Core.View().Snap, name)
}

const dwellings = `{"type":"FeatureCollection","features":[
{"type":"Feature","id":"a","properties":{"dwelling_id":"D1","kind":"house","homes":1,"address":"Mill Lane 3","eaves":5.5},"geometry":{"type":"Point","coordinates":[-27.03,47.51]}},
{"type":"Feature","id":"b","properties":{"dwelling_id":"D2","kind":"house","homes":2,"address":"Mill Lane 5","eaves":4},"geometry":{"type":"Point","coordinates":[-27.031,47.512]}},
{"type":"Feature","id":"c","properties":{"dwelling_id":"D3","kind":"barn","homes":0,"address":"Mill Lane 7","eaves":4},"geometry":{"type":"Point","coordinates":[-27.031,47.512]}}]}`

func TestPictures(t *testing.T) {
	b := open(t)
	s := b.s
	b.shoot("layers")
	s.layers.open("Parcels")
	b.shoot("unfolded")
	s.tabs.Choose(1)
	b.Until("the missing roles are there", func() bool { return len(s.missing.roles) > 0 })
	b.shoot("missing")
	s.tabs.Choose(2)
	s.sites.gather(b.Core.Chosen()[0].Parcels)
	b.Core.Edit("group", func(ctx context.Context, s *study.Study) error {
		_, err := s.GroupBy(ctx, "use_class", "test")
		return err
	}, nil)
	b.Settle()
	b.shoot("sites")
	s.tabs.Choose(3)
	b.Until("the lines are there", func() bool { return len(s.typed.spare.all) > 0 })
	b.shoot("typed")
	test.Type(s.typed.values[0].entry, "31")
	s.typed.scroll.ScrollToBottom()
	b.shoot("typed-foot")
	s.tabs.Choose(0)
	s.Import(put(t, "old.csv", "a\n1\n"), put(t, "new_dwellings.geojson", dwellings))
	b.waitForm("old.csv")
	b.shoot("form-table")
	b.press("Leave it out")
	f := b.waitForm("new_dwellings.geojson")
	b.shoot("form")
	f.fields[5].column.SetSelected("eaves")
	test.Tap(f.ok)
	f.scroll.ScrollToBottom()
	b.shoot("form-foot")
	f.fields[5].unit.SetSelected("m")
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return s.form == nil })
	b.Settle()
	s.layers.list.ScrollToBottom()
	s.layers.open("new_dwellings")
	s.layers.list.ScrollToOffset(s.layers.list.GetScrollOffset() + 330)
	b.shoot("notices")
	s.Import(put(t, "plan.pdf", "%PDF-1.7"))
	b.Until("it is refused", func() bool { return b.overlay() != "" })
	b.shoot("refused")
}

// A file of dwellings is asked about, a unit that is missing comes back into the form, then it is a layer.
func TestImport(t *testing.T) {
	b := open(t)
	path := put(t, "new_dwellings.geojson", dwellings)
	b.s.Import(path)
	f := b.waitForm("new_dwellings.geojson")
	if f.role.Selected != "Dwellings" || !strings.Contains(f.guess.Text, "guess") {
		t.Errorf("role %q, said %q", f.role.Selected, f.guess.Text)
	}
	at := map[string]*fieldRow{}
	for _, r := range f.fields {
		at[r.field.Name] = r
	}
	if got := at["class"].column.Selected; got != "kind" {
		t.Errorf("class is proposed to be %q", got)
	}
	if at["households"].column.Selected != noColumn || !f.personal["address"].Checked || !f.personal["address"].Disabled() {
		t.Error("proposals are wrong")
	}
	texts := ""
	for _, o := range test.LaidOutObjects(f.sample) {
		if l, ok := o.(interface{ MinSize() fyne.Size }); ok {
			texts += fmt.Sprintf("%v", l)
		}
	}
	if !strings.Contains(texts, "house") || strings.Contains(texts, "Mill Lane") {
		t.Error("the sample shows an address")
	}
	at["eaves_height"].column.SetSelected("eaves")
	f.edition.SetText("May 2031")
	before := len(b.Core.View().Journal)
	test.Tap(f.ok)
	if b.s.form != f || !strings.Contains(f.asked.Text, "unit") || !f.askedBox.Visible() {
		t.Fatalf("the unit was not asked for: %q", f.asked.Text)
	}
	at["eaves_height"].unit.SetSelected("ft")
	f.name.SetText("Dwellings")
	test.Tap(f.ok)
	b.Until("the name is asked about", func() bool { return strings.Contains(f.asked.Text, "is there already") })
	if f.edition.Text != "May 2031" || at["eaves_height"].unit.Selected != "ft" || f.ok.Disabled() {
		t.Error("answers were lost")
	}
	if len(b.Core.View().Journal) != before {
		t.Error("something was added before all was answered")
	}
	f.name.SetText("Homes at the mill")
	f.complete.SetChecked(true)
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	rec, ok := b.layer("Homes at the mill")
	if !ok || rec.Count != 2 || rec.Ledger.LeftOut != 1 || rec.Edition != "May 2031" || !rec.Complete {
		t.Fatalf("%v %+v", ok, rec)
	}
	if rec.Match["class"] != "kind" || rec.Match["households"] != "" || rec.Units["eaves"] != "ft" || !slices.Equal(rec.Personal, []string{"address"}) {
		t.Errorf("match %v, units %v, personal %v", rec.Match, rec.Units, rec.Personal)
	}
	if said := b.told[len(b.told)-1]; !strings.Contains(said, "3 read · 0 repaired · 1 left out") {
		t.Errorf("told %q", said)
	}
	if b.s.layers.opened != rec.Name || b.opened[0] != "Ground" {
		t.Error("the layer is not unfolded, or the stage was not opened")
	}
	b.Core.Undo()
	b.Settle()
	if _, there := b.layer("Homes at the mill"); there {
		t.Error("undo left the layer")
	}
}

// A required column that is missing is asked for; the user may go on without it.
func TestImportWithoutNeededColumn(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "x.geojson", `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"w":"4"},"geometry":{"type":"LineString","coordinates":[[-27.03,47.51],[-27.02,47.52]]}}]}`))
	f := b.waitForm("x.geojson")
	if f.role.Selected != "" {
		t.Errorf("a role was guessed: %q", f.role.Selected)
	}
	test.Tap(f.ok)
	if !strings.Contains(f.asked.Text, "means") {
		t.Errorf("asked %q", f.asked.Text)
	}
	if slices.Contains(f.role.Options, "Ground heights") {
		t.Error("a role of grids is offered for lines")
	}
	f.role.SetSelected("Roads")
	test.Tap(f.ok)
	b.Until("the class is asked for", func() bool { return f.without.Visible() })
	if !strings.Contains(f.asked.Text, "class") || strings.Contains(f.asked.Text, "--") {
		t.Errorf("asked %q", f.asked.Text)
	}
	f.without.SetChecked(true)
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	rec, ok := b.layer("x")
	if !ok || !slices.ContainsFunc(rec.Notices, func(n geo.Notice) bool { return n.Code == "missing_field" }) {
		t.Errorf("%v %+v", ok, rec.Notices)
	}
}

// Files come one after the other; one that cannot be read says why and which kinds are read.
func TestImportSeveral(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "plan.pdf", "%PDF-1.7"), put(t, "new_dwellings.geojson", dwellings), put(t, "drawing.kml", "<kml>"))
	b.Until("the first is refused", func() bool { return strings.Contains(b.overlay(), "[Go on]") })
	if text := b.overlay(); !strings.Contains(text, "PDF") || !strings.Contains(text, "GeoJSON") || !strings.Contains(text, ".csv") {
		t.Errorf("said %q", text)
	}
	if b.s.form != nil {
		t.Error("the second came before the first was done with")
	}
	b.press("Go on")
	f := b.waitForm("new_dwellings.geojson")
	test.Tap(f.cancelButton)
	b.Until("the last is refused", func() bool { return strings.Contains(b.overlay(), "KML") })
	if _, there := b.layer("new_dwellings"); there || b.s.busy {
		t.Error("a file that was left out is there, or the stage waits for ever")
	}
}

// Coordinates that are no degrees are asked about; swapped ones as well.
func TestImportCoordinates(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "dwellings_utm.geojson", strings.ReplaceAll(dwellings, "[-27.03,47.51]", "[497735,5261900]")))
	f := b.waitForm("dwellings_utm.geojson")
	test.Tap(f.ok)
	b.Until("the system is asked for", func() bool { return strings.Contains(f.asked.Text, "coordinate system") })
	f.crs.SetText("EPSG:nonsense")
	test.Tap(f.ok)
	b.Until("nonsense is refused", func() bool { return strings.Contains(f.asked.Text, "EPSG:25832") })
	if strings.Contains(f.asked.Text, "--crs") {
		t.Errorf("it speaks of options of the terminal: %q", f.asked.Text)
	}
	test.Tap(f.cancelButton)
	b.s.Import(put(t, "dwellings_swapped.geojson", strings.NewReplacer("[-27.03,47.51]", "[47.51,-27.03]", "[-27.031,47.512]", "[47.512,-27.031]").Replace(dwellings)))
	f = b.waitForm("dwellings_swapped.geojson")
	test.Tap(f.ok)
	b.Until("it is asked whether they are swapped", func() bool { return strings.Contains(f.asked.Text, "latitude before longitude") })
	f.swap.SetChecked(true)
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	if rec, ok := b.layer("dwellings_swapped"); !ok || !rec.Swapped {
		t.Errorf("%v %+v", ok, rec)
	}
}

// A grid of heights is kept whole; the system of its corners is asked for.
func TestImportGrid(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "dem.asc", "ncols 2\nnrows 2\nxllcorner 497000\nyllcorner 5261000\ncellsize 100\nNODATA_value -9999\n1 2\n3 4\n"))
	f := b.waitForm("dem.asc")
	if f.role.Selected != "Ground heights" {
		t.Errorf("guessed %q", f.role.Selected)
	}
	test.Tap(f.ok)
	if !strings.Contains(f.asked.Text, "corners of the grid") {
		t.Errorf("asked %q", f.asked.Text)
	}
	f.crs.SetText("EPSG:32626")
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	if rec, ok := b.layer("dem"); !ok || rec.Kind != "raster" || rec.CRS != "EPSG:32626" {
		t.Errorf("%v %+v", ok, rec)
	}
}

// A grid of wind is asked for what it holds, in the form; the file's name proposes.
func TestImportGridOfWind(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "mean_speed_80m.asc", "ncols 2\nnrows 2\nxllcorner -23.1\nyllcorner 47.6\ncellsize 0.2\nNODATA_value -9999\n6 7\n6.5 7\n"))
	f := b.waitForm("mean_speed_80m.asc")
	f.role.SetSelected("Wind resource")
	f.crs.SetText("OGC:CRS84")
	if f.grid == nil || f.grid.field.Selected != f.grid.titles()[0] || f.grid.number.Text != "80" {
		t.Fatalf("proposed %+v", f.grid)
	}
	test.Tap(f.ok)
	if !strings.Contains(f.asked.Text, "In which unit are the values") {
		t.Errorf("asked %q", f.asked.Text)
	}
	f.grid.unit.SetSelected("m/s")
	f.grid.number.SetText("8000")
	test.Tap(f.ok)
	b.Until("it is asked again", func() bool { return strings.Contains(f.asked.Text, "8000 m is not between") })
	f.grid.number.SetText("80")
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	rec, ok := b.layer("mean_speed_80m")
	if use, err := study.GridUseOf(rec); !ok || err != nil || use != (study.GridUse{Field: "mean_speed", Unit: "m/s", HeightM: 80}) {
		t.Errorf("%v %+v %v", ok, use, err)
	}
}

// A table of hours is asked for what its times mark and for its clock; the answers become settings of the study.
func TestImportHours(t *testing.T) {
	b := open(t)
	b.s.Import(put(t, "hours.csv", "time,ghi,temperature\n2025-06-21 12:00,800,20\n2025-06-21 13:00,810,21\n"))
	f := b.waitForm("hours.csv")
	f.role.SetSelected("Hourly weather")
	if f.clockBox == nil || f.stamp.Selected != stampWords[0] {
		t.Fatalf("what the study says of its times already is not shown: %+v", f.stamp)
	}
	for _, r := range f.fields {
		if r.column.Selected != noColumn && r.field.Physical() {
			r.unit.SetSelected(r.field.Unit)
		}
	}
	f.stamp.ClearSelected()
	test.Tap(f.ok)
	if !strings.Contains(f.asked.Text, "What do the times mark?") {
		t.Errorf("asked %q", f.asked.Text)
	}
	f.stamp.SetSelected(stampWords[2])
	test.Tap(f.ok)
	b.Until("the clock is asked for", func() bool { return strings.Contains(f.asked.Text, "Enter it at Hours ahead of UTC") })
	f.offset.SetText("-2")
	test.Tap(f.ok)
	b.Until("it is added", func() bool { return b.s.form == nil })
	said := b.s.c.View().Snap.Explicit
	if said[study.StampKey].Value != "end" || said[study.OffsetKey].Value != "-2" {
		t.Errorf("kept: %v, %v", said[study.StampKey], said[study.OffsetKey])
	}
}

func TestReplaceAndTakeOut(t *testing.T) {
	b := open(t)
	p := b.s.layers
	if !p.replace.Disabled() || !p.takeOut.Disabled() {
		t.Error("there is something to replace before a layer is chosen")
	}
	p.list.Select(slices.IndexFunc(p.rows, func(r layerRow) bool { return p.shown[r.layer].rec.Name == "Dwellings" }))
	if p.opened != "Dwellings" || p.takeOut.Disabled() {
		t.Fatal("the layer was not unfolded")
	}
	old, _ := b.layer("Dwellings")
	b.s.enqueue(job{path: put(t, "later.geojson", dwellings), replace: "Dwellings"})
	f := b.waitForm("later.geojson")
	if f.name.Text != "Dwellings" || !f.role.Disabled() || f.holder.Text != old.Holder {
		t.Errorf("name %q, holder %q", f.name.Text, f.holder.Text)
	}
	test.Tap(f.ok)
	b.Until("it is replaced", func() bool { return b.s.form == nil })
	if now, _ := b.layer("Dwellings"); now.Count != 2 || now.Role != "dwellings" {
		t.Errorf("%+v", now)
	}
	b.Settle()
	test.Tap(p.takeOut)
	b.Settle()
	if _, there := b.layer("Dwellings"); there {
		t.Fatal("it is still there")
	}
	b.Core.Undo()
	b.Settle()
	if _, there := b.layer("Dwellings"); !there {
		t.Error("undo did not bring it back")
	}
}

// Notices lead to their place: a position, a parcel, or a feature found in the layer.
func TestJump(t *testing.T) {
	b := open(t)
	p := b.s.layers
	dwellings, _ := b.layer("Dwellings")
	v, _, err := b.Core.Session.Study().Store().Version(t.Context(), dwellings.Digest)
	if err != nil {
		t.Fatal(err)
	}
	at := geo.LonLat{Lon: -27, Lat: 47.5}
	p.jump(shownLayer{rec: dwellings}, geo.Notice{At: &at})
	if len(b.places) != 1 || b.places[0] != at {
		t.Fatal(b.places)
	}
	f := v.Layer.Features[3]
	p.jump(shownLayer{rec: dwellings}, geo.Notice{Feature: f.ID})
	b.Until("the feature is shown", func() bool { return len(b.places) == 2 })
	if got, want := b.places[1], f.Geometry.Parts[0][0][0]; got != want {
		t.Errorf("shown at %v, it is at %v", got, want)
	}
	p.jump(shownLayer{rec: dwellings}, geo.Notice{Feature: "nothing"})
	b.Until("it is said that it is not there", func() bool { return len(b.told) > 0 && strings.Contains(b.told[len(b.told)-1], "left out") })
	parcels, _ := b.layer("Parcels")
	id := b.Core.Chosen()[0].Parcels[0]
	p.jump(shownLayer{rec: parcels}, geo.Notice{Feature: id})
	if len(b.parcels) != 1 || b.parcels[0][0] != id {
		t.Error(b.parcels)
	}
}

func TestState(t *testing.T) {
	b := open(t)
	first, second, warn := b.s.State()
	n := 0
	for _, l := range b.s.layers.shown {
		n += l.warm
	}
	if first != "28 layers" || warn != (n > 0) || n > 0 && !strings.HasPrefix(second, fmt.Sprint(n)+" thing") {
		t.Errorf("%q, %q, %v with %d notices", first, second, warn, n)
	}
	b.Core.Edit("take out", func(ctx context.Context, s *study.Study) error { return s.RemoveLayer(ctx, "Parcels", "test") }, nil)
	b.Settle()
	if first, second, warn := b.s.State(); first != "27 layers" || !warn || second == "" {
		t.Errorf("without parcels: %q, %q, %v", first, second, warn)
	}
	last := b.s.layers.shown[len(b.s.layers.shown)-1]
	if !last.whole || !slices.ContainsFunc(last.notices, func(n geo.Notice) bool { return n.Code == "no_parcels" }) {
		t.Errorf("%+v", last)
	}
	if _, what := noticeWords(geo.Notice{Code: "no_parcels"}, true); strings.Contains(what, "gtally") {
		t.Errorf("the window speaks of the terminal program: %q", what)
	}
}

func TestMissing(t *testing.T) {
	b := open(t)
	b.Core.Edit("take out", func(ctx context.Context, s *study.Study) error { return s.RemoveLayer(ctx, "Dwellings", "test") }, nil)
	b.Settle()
	b.s.tabs.Choose(1)
	p := b.s.missing
	b.Until("the roles are there", func() bool { return len(p.roles) == 7 })
	if r := p.roles[0]; r.role.Name != "dwellings" || r.waiting == 0 || strings.Contains(r.without, "noise_dba") {
		t.Errorf("first is %s with %d waiting: %s", r.role.Name, r.waiting, r.without)
	}
	test.Tap(p.copy)
	text := b.App.Clipboard().Content()
	if !strings.Contains(text, "1. Dwellings") || !strings.Contains(text, "address register") || !strings.Contains(text, "eaves height (m)") {
		t.Errorf("copied:\n%s", text)
	}
}

func TestSites(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(2)
	p := b.s.sites
	b.Until("the columns are there", func() bool { return len(p.column.Options) > 0 })
	if slices.Contains(p.column.Options, "owner") || !slices.Contains(p.column.Options, "site_group") {
		t.Errorf("columns %v", p.column.Options)
	}
	var ids []string
	for i := range b.Core.View().Results.Candidates {
		if id := b.Core.View().Results.Candidates[i].Parcels[0]; !slices.Contains(ids, id) {
			ids = append(ids, id)
		}
	}
	b.Core.Boxed = func() []string { return ids[:2] }
	press := func(text string) {
		for _, o := range test.LaidOutObjects(p.content) {
			if x, ok := o.(*widget.Button); ok && x.Text == text {
				test.Tap(x)
				return
			}
		}
		t.Fatalf("no button %q", text)
	}
	press("Take the box of the map")
	test.Type(p.number, ids[2]+", "+ids[0]+", nonsense")
	press("Add")
	if !slices.Equal(p.parcels, ids[:3]) || !strings.Contains(b.told[len(b.told)-1], "nonsense") {
		t.Fatalf("gathered %v, told %v", p.parcels, b.told)
	}
	if !p.make.Disabled() {
		t.Error("a site without a name can be made")
	}
	test.Type(p.name, "North ings")
	test.Tap(p.make)
	b.Settle()
	g := b.Core.View().Snap.Groups
	if len(g) != 1 || g[0].Site != "North ings" || len(g[0].Parcels) != 3 || len(p.parcels) != 0 {
		t.Fatalf("%+v, left %v", g, p.parcels)
	}
	if _, ok := b.Core.View().Index.Site("North ings"); !ok {
		t.Error("the site was not computed")
	}
	press("Show on the map")
	if got := b.parcels[len(b.parcels)-1]; len(got) != 3 {
		t.Errorf("shown %v", got)
	}
	press("Part again")
	b.Settle()
	if len(b.Core.View().Snap.Groups) != 0 {
		t.Error("it was not parted")
	}
	p.column.SetSelected("site_group")
	test.Tap(p.byValue)
	b.Settle()
	if len(b.Core.View().Snap.Groups) == 0 && !strings.Contains(b.told[len(b.told)-1], "nothing to group") {
		t.Errorf("told %q", b.told[len(b.told)-1])
	}
	p.column.SetSelected("use_class")
	test.Tap(p.byValue)
	b.Settle()
	if len(b.Core.View().Snap.Groups) == 0 {
		t.Error("no groups by use")
	}
}

func TestTypedValues(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(3)
	p := b.s.typed
	if !strings.Contains(p.served[0].line.Text, "Not used: the layer") {
		t.Errorf("sunlight: %q", p.served[0].line.Text)
	}
	by := map[string]*typedValue{}
	for _, v := range p.values {
		by[v.key] = v
	}
	test.Type(p.values[0].entry, "31")
	if !p.save.Disabled() || !strings.Contains(p.said.Text, "twelve months") {
		t.Errorf("an unfinished year can be saved; said %q", p.said.Text)
	}
	for i, v := range p.values[:24] {
		v.entry.SetText(fmt.Sprint(20 + i))
	}
	by["wind.typed_mean_speed_m_per_s"].entry.SetText("99")
	if !p.save.Disabled() || !strings.Contains(p.said.Text, "Mean wind speed") {
		t.Errorf("99 m/s can be saved; said %q", p.said.Text)
	}
	by["wind.typed_mean_speed_m_per_s"].entry.SetText("6,5")
	p.reason.SetText("from the atlas")
	p.source.SetText("Atlas 2031")
	before := len(b.Core.View().Journal)
	test.Tap(p.save)
	b.Settle()
	v := b.Core.View()
	if len(v.Journal) != before+1 || v.Problem != nil {
		t.Fatalf("%d entries, problem %v", len(v.Journal)-before, v.Problem)
	}
	if s := v.Snap.Explicit["wind.typed_mean_speed_m_per_s"]; s.Value != "6.5" || s.Source != "Atlas 2031" || s.Reason != "from the atlas" {
		t.Errorf("%+v", s)
	}
	if x, _ := v.Snap.Number("solar.typed_temperature_12_degc"); x != 43 {
		t.Errorf("December has %v degC", x)
	}
	if !p.save.Disabled() {
		t.Error("there is still something to save")
	}
	b.Core.Undo()
	b.Settle()
	if p.values[0].entry.Text != "" {
		t.Errorf("after undo January shows %q", p.values[0].entry.Text)
	}
}

func TestSpareCapacity(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(3)
	p := b.s.typed.spare
	b.Until("the lines are there", func() bool { return len(p.all) > 0 })
	test.Type(p.find, "substation")
	if len(p.shown) != 2 {
		t.Fatalf("%d substations found", len(p.shown))
	}
	p.list.Select(0)
	p.kw.SetText("1500")
	if !p.save.Disabled() {
		t.Error("it can be saved without who told it and when")
	}
	test.Type(p.who, "Marram Power")
	test.Type(p.when, "2031-05-03")
	test.Tap(p.save)
	b.Settle()
	s := b.Core.View().Snap.Explicit[p.asset]
	if s.Value != "1500" || s.Reason != "told by Marram Power on 2031-05-03" {
		t.Fatalf("%s: %+v", p.asset, s)
	}
	heard := false
	for i := range b.Core.View().Results.Candidates {
		if c := b.Core.View().Results.Candidates[i].Connection; c != nil && c.SpareKW != nil && *c.SpareKW == 1500 && c.ToldBy == s.Reason {
			heard = true
		}
	}
	if !heard {
		t.Error("no connection knows of it")
	}
	test.Tap(p.remove)
	b.Settle()
	if _, there := b.Core.View().Snap.Explicit[p.asset]; there {
		t.Error("it was not taken out")
	}
}

// A list of very many notices is as quick as a short one.
func TestManyNotices(t *testing.T) {
	b := open(t)
	rec, _ := b.layer("Dwellings")
	for range 100_000 {
		rec.Notices = append(rec.Notices, geo.Notice{Code: "duplicate", Severity: geo.Warning, Feature: "1", Args: map[string]string{"of": "2"}})
	}
	p := b.s.layers
	p.shown = append(p.shown, shownLayer{rec: rec, notices: rec.Notices, warm: len(rec.Notices)})
	p.opened = rec.Name
	p.build()
	p.list.ScrollToBottom()
	if n := len(test.LaidOutObjects(p.list)); n > 2000 {
		t.Errorf("%d objects are laid out", n)
	}
}
