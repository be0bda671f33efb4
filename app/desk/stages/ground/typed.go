package ground

import (
	"context"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// typedPane takes the few values that serve where no file exists.
type typedPane struct {
	c       *core.Core
	content fyne.CanvasObject

	values []*typedValue
	served []*servedLine
	reason *widget.Entry
	source *widget.Entry
	save   *widget.Button
	said   *widget.Label
	spare  *sparePane
	scroll *container.Scroll

	of *study.Snapshot
}

// typedValue is one setting with its entry. An entry that the user changed keeps what was typed when the
// study changes meanwhile.
type typedValue struct {
	key   string
	label string
	entry *widget.Entry
	saved string
}

// servedLine says whether a layer serves in place of typed values.
type servedLine struct {
	line  *widgets.Line
	roles []string
	used  string // said when no layer serves
}

var months = []string{"January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November", "December"}

func newTypedPane(c *core.Core) *typedPane {
	p := &typedPane{c: c, reason: widget.NewEntry(), source: widget.NewEntry(), said: widgets.NewText("")}
	p.reason.SetPlaceHolder("Reason, for the journal")
	p.source.SetPlaceHolder("Source of the values")
	p.said.Importance = widget.WarningImportance
	p.said.Hide()
	p.save = widget.NewButton("Save the typed values", p.keep)
	p.save.Importance = widget.HighImportance
	p.save.Disable()

	sun := []fyne.CanvasObject{widgets.Faint(""), widgets.Faint("Sunlight on level ground"), widgets.Faint("Mean temperature"), widgets.Faint(""), widgets.Faint("kWh/(m2 month)"), widgets.Faint("degC")}
	for i, m := range months {
		ghi := p.value(fmt.Sprintf("solar.typed_ghi_%d_kwh_per_m2", i+1), "sunlight of "+m)
		temperature := p.value(fmt.Sprintf("solar.typed_temperature_%d_degc", i+1), "temperature of "+m)
		sun = append(sun, widgets.NewLine(m), ghi.entry, temperature.entry)
	}
	one := func(key, label string) fyne.CanvasObject {
		v := p.value(key, label)
		d, _ := c.Parts.Catalog.Definition(key)
		return container.New(oneValue{}, widgets.NewLine(label).Hinted(d.What), v.entry, widgets.Faint(present.Unit(d.Unit)))
	}
	p.spare = newSparePane(c)
	body := container.NewVBox(
		widgets.Part("Sunlight and temperature by month").Hinted("Twelve typed values of each serve as the sunlight resource."),
		p.serve("Used for solar power: no layer of sunlight is there.", "solar_resource"),
		container.New(monthly{}, sun...),
		gap(8),
		widgets.Part("Wind").Hinted("One mean speed: an even spread of directions and a Rayleigh distribution are assumed."),
		p.serve("Used for wind power: no layer of wind is there.", "wind_resource"),
		one("wind.typed_mean_speed_m_per_s", "Mean wind speed"),
		one("wind.typed_height_m", "Its height above ground"),
		gap(8),
		widgets.Part("Height of the ground"),
		p.serve("Used for the density of the air: no ground heights are there.", "terrain"),
		one("wind.typed_elevation_m", "Height above sea level"),
		gap(8),
		widgets.Part("Use of energy and agreed limits"),
		p.serve("The district's use is taken from here: no table of demand is there.", "demand"),
		one("energy.demand_mwh_per_yr", "Yearly use of the district"),
		one("energy.household_mwh_per_yr", "Yearly use of one household"),
		one("grid.export_limit_kw", "Agreed limit of export of a site"),
		gap(8),
		container.NewGridWithColumns(2, p.reason, p.source),
		p.said,
		container.NewHBox(p.save),
		gap(12),
		p.spare.content,
	)
	p.scroll = container.NewVScroll(container.New(layout.NewCustomPaddedLayout(0, 8, 0, 14), body))
	p.content = padded(p.scroll)
	p.changed()
	return p
}

func (p *typedPane) value(key, label string) *typedValue {
	v := &typedValue{key: key, label: label, entry: widget.NewEntry()}
	d, _ := p.c.Parts.Catalog.Definition(key)
	v.entry.SetPlaceHolder("not set")
	if d.Default != "" && d.Default != study.NotSetText {
		v.entry.SetPlaceHolder(d.Default + " unless typed")
	}
	v.entry.OnChanged = func(string) { p.look() }
	p.values = append(p.values, v)
	return v
}

func (p *typedPane) serve(used string, roles ...string) fyne.CanvasObject {
	l := &servedLine{line: widgets.Faint(""), roles: roles, used: used}
	p.served = append(p.served, l)
	return l.line
}

// changed takes over what the study holds.
func (p *typedPane) changed() {
	v := p.c.View()
	if p.of == v.Snap {
		return
	}
	p.of = v.Snap
	for _, t := range p.values {
		now := v.Snap.Explicit[t.key].Value
		if now == study.NotSetText {
			now = ""
		}
		untouched := strings.TrimSpace(t.entry.Text) == t.saved
		t.saved = now
		if untouched && t.entry.Text != now {
			t.entry.SetText(now)
		}
	}
	for _, s := range p.served {
		var names []string
		for _, r := range s.roles {
			for _, l := range v.Snap.LayersOf(r) {
				names = append(names, l.Name)
			}
		}
		if len(names) > 0 {
			s.line.SetLook("Not used: the layer "+strings.Join(names, ", ")+" serves.", theme.Warm, false)
		} else {
			s.line.SetLook(s.used, theme.Faint, false)
		}
	}
	p.spare.changed(v)
	p.look()
}

// edits gives what was typed and not saved.
func (p *typedPane) edits() []study.SettingEdit {
	var out []study.SettingEdit
	for _, t := range p.values {
		if text := number(t.entry.Text); text != t.saved {
			out = append(out, study.SettingEdit{Key: t.key, Value: text, Source: strings.TrimSpace(p.source.Text), Reason: strings.TrimSpace(p.reason.Text)})
		}
	}
	return out
}

// number takes a decimal comma for a point, as many write it.
func number(text string) string { return strings.ReplaceAll(strings.TrimSpace(text), ",", ".") }

// problem says what keeps the typed values from being saved; empty when nothing does.
func (p *typedPane) problem() string {
	var missing []string
	begun := false
	for i, t := range p.values {
		text := number(t.entry.Text)
		if text != "" {
			if err := run.CheckSetting(p.c.Parts.Catalog, p.c.Parts.Params, t.key, text); err != nil {
				return strings.ToUpper(t.label[:1]) + t.label[1:] + ": " + plainValue(err)
			}
			if _, err := strconv.ParseFloat(text, 64); err != nil {
				return strings.ToUpper(t.label[:1]) + t.label[1:] + " is not a number."
			}
		}
		if i < 2*len(months) {
			if text == "" {
				missing = append(missing, t.label)
			} else {
				begun = true
			}
		}
	}
	if begun && len(missing) > 0 {
		return "Sunlight and temperature of all twelve months belong together. Still missing: " + some(missing, 4) + "."
	}
	return ""
}

// plainValue leaves the key of the setting out of an error, since its label stands before it.
func plainValue(err error) string {
	text := err.Error()
	if _, rest, ok := strings.Cut(text, ": "); ok {
		text = rest
	}
	return text + "."
}

// look tells whether there is something to save, and what keeps it from being saved.
func (p *typedPane) look() {
	if p.spare == nil {
		return
	}
	problem := ""
	changed := len(p.edits()) > 0
	if changed {
		problem = p.problem()
	}
	if problem == "" {
		p.said.Hide()
	} else {
		p.said.SetText(problem)
		p.said.Show()
	}
	if changed && problem == "" {
		p.save.Enable()
	} else {
		p.save.Disable()
	}
}

// keep saves what was typed as one edit.
func (p *typedPane) keep() {
	edits := p.edits()
	if len(edits) == 0 || p.problem() != "" {
		return
	}
	reason := strings.TrimSpace(p.reason.Text)
	if reason == "" {
		reason = "typed values"
	}
	p.c.Set("save the typed values", reason, edits...)
	p.reason.SetText("")
}

// sparePane takes the spare capacity of a line or substation, as told by somebody at some time.
type sparePane struct {
	c       *core.Core
	content fyne.CanvasObject

	find    *widget.Entry
	list    *widget.List
	picked  *widgets.Line
	kw      *widget.Entry
	who     *widget.Entry
	when    *widget.Entry
	save    *widget.Button
	remove  *widget.Button
	all     []spareAsset
	shown   []int // of all, those that the search leaves
	asset   string
	ofLayer string
}

// spareAsset is a line or substation of the study.
type spareAsset struct {
	name, key string
	told      string // in the layer
}

func newSparePane(c *core.Core) *sparePane {
	p := &sparePane{c: c, find: widget.NewEntry(), picked: widgets.NewLine("Choose a line or substation."), kw: widget.NewEntry(), who: widget.NewEntry(), when: widget.NewEntry()}
	p.find.SetPlaceHolder("Find a line or substation by name")
	p.find.OnChanged = func(string) { p.filter() }
	p.kw.SetPlaceHolder("spare capacity")
	p.who.SetPlaceHolder("told by")
	p.when.SetPlaceHolder("told on, as 2031-05-03")
	for _, e := range []*widget.Entry{p.kw, p.who, p.when} {
		e.OnChanged = func(string) { p.look() }
	}
	p.list = widget.NewList(func() int { return len(p.shown) }, func() fyne.CanvasObject {
		name, told := widgets.NewLine(""), widgets.Faint("").Wide()
		return container.New(layout.NewCustomPaddedLayout(0, 0, 0, 14), container.NewBorder(nil, nil, nil, told, name))
	}, func(i widget.ListItemID, o fyne.CanvasObject) {
		a := p.all[p.shown[i]]
		box := o.(*fyne.Container).Objects[0].(*fyne.Container)
		box.Objects[0].(*widgets.Line).Set(a.name)
		told := a.told
		if s, byUser, _ := c.View().Snap.Lookup(a.key); byUser {
			told = s.Value + " kW, typed"
		}
		box.Objects[1].(*widgets.Line).Set(told)
		box.Refresh()
	})
	p.list.OnSelected = func(i widget.ListItemID) { p.pick(p.all[p.shown[i]]) }
	p.save = widget.NewButton("Save the spare capacity", p.keep)
	p.remove = widget.NewButton("Take the typed value out", func() {
		c.Set("take out the spare capacity", "typed spare capacity taken out", study.SettingEdit{Key: p.asset})
	})
	listed := container.New(fixedHeight(150), p.list)
	p.content = container.NewVBox(
		widgets.Part("Spare capacity as told").Hinted("What a line or substation can still take. A typed value stands in place of the one in the layer."),
		widgets.NewParagraph("Only the network operator's study can offer a connection. Write down who told the value and when.", 2),
		p.find, listed, p.picked,
		container.New(oneValue{}, widgets.NewLine("Spare capacity"), p.kw, widgets.Faint("kW")),
		container.NewGridWithColumns(2, p.who, p.when),
		container.NewHBox(p.save, p.remove),
	)
	p.look()
	return p
}

// changed reads the lines and substations when they are others than before.
func (p *sparePane) changed(v *live.View) {
	var layers []study.LayerRecord
	key := ""
	for _, role := range []string{"substations", "grid_lines"} {
		for _, l := range v.Snap.LayersOf(role) {
			layers = append(layers, l)
			key += l.Name + " " + l.Digest + "\n"
		}
	}
	p.look()
	p.list.Refresh()
	if key == p.ofLayer && key != "" {
		return
	}
	p.ofLayer = key
	store := p.c.Session.Study().Store()
	go func() {
		all, err := spareAssets(store, layers)
		p.c.Do(func() {
			if p.ofLayer != key {
				return
			}
			p.c.Fail("read the lines and substations", err)
			p.all = all
			p.filter()
		})
	}()
}

// filter leaves those whose name holds what is searched for.
func (p *sparePane) filter() {
	want := strings.ToLower(strings.TrimSpace(p.find.Text))
	p.shown = p.shown[:0]
	for i, a := range p.all {
		if want == "" || strings.Contains(strings.ToLower(a.name), want) {
			p.shown = append(p.shown, i)
		}
	}
	p.list.UnselectAll()
	p.list.Refresh()
}

func (p *sparePane) pick(a spareAsset) {
	p.asset = a.key
	text := a.name
	if a.told != "" {
		text += ". The layer says " + a.told + "."
	}
	p.picked.Set(text)
	p.kw.SetText(p.c.View().Snap.Explicit[a.key].Value)
	p.look()
}

func (p *sparePane) look() {
	x, err := strconv.ParseFloat(number(p.kw.Text), 64)
	if p.asset != "" && err == nil && x >= 0 && strings.TrimSpace(p.who.Text) != "" && strings.TrimSpace(p.when.Text) != "" {
		p.save.Enable()
	} else {
		p.save.Disable()
	}
	if _, typed := p.c.View().Snap.Explicit[p.asset]; typed {
		p.remove.Enable()
	} else {
		p.remove.Disable()
	}
}

func (p *sparePane) keep() {
	told := fmt.Sprintf("told by %s on %s", strings.TrimSpace(p.who.Text), strings.TrimSpace(p.when.Text))
	p.c.Set("save the spare capacity", told, study.SettingEdit{Key: p.asset, Value: number(p.kw.Text), Source: told, Reason: told})
}

// monthly lays out a table of a month and two entries.
type monthly struct{}

// oneValue lays out a label, an entry and its unit.
type oneValue struct{}

// fixedHeight gives what is in it a height.
type fixedHeight float32

// widths of the columns of typed values.
const (
	monthWidth = 90
	labelWidth = 190
	entryWidth = 120
)

// MinSize implements fyne.Layout.
func (monthly) MinSize(objects []fyne.CanvasObject) fyne.Size {
	h := float32(0)
	for i := 0; i < len(objects); i += 3 {
		h += rowHeight(objects[i : i+3])
	}
	return fyne.NewSize(monthWidth+2*110, h)
}

func rowHeight(objects []fyne.CanvasObject) float32 {
	h := float32(0)
	for _, o := range objects {
		h = max(h, o.MinSize().Height)
	}
	return h + 3
}

// Layout implements fyne.Layout.
func (monthly) Layout(objects []fyne.CanvasObject, s fyne.Size) {
	each := min((s.Width-monthWidth)/2, 170)
	y := float32(0)
	for i := 0; i < len(objects); i += 3 {
		h := rowHeight(objects[i : i+3])
		for j, o := range objects[i : i+3] {
			x, w := float32(0), float32(monthWidth-8)
			if j > 0 {
				x, w = monthWidth+float32(j-1)*each, each-10
			}
			oh := min(o.MinSize().Height, h-3)
			o.Move(fyne.NewPos(x, y+(h-3-oh)/2))
			o.Resize(fyne.NewSize(w, oh))
		}
		y += h
	}
}

// MinSize implements fyne.Layout.
func (oneValue) MinSize(objects []fyne.CanvasObject) fyne.Size {
	return fyne.NewSize(labelWidth+entryWidth+80, objects[1].MinSize().Height)
}

// Layout implements fyne.Layout.
func (oneValue) Layout(objects []fyne.CanvasObject, s fyne.Size) {
	at := func(o fyne.CanvasObject, x, w float32) {
		h := o.MinSize().Height
		o.Move(fyne.NewPos(x, (s.Height-h)/2))
		o.Resize(fyne.NewSize(w, h))
	}
	at(objects[0], 0, labelWidth-8)
	at(objects[1], labelWidth, entryWidth)
	at(objects[2], labelWidth+entryWidth+8, max(s.Width-labelWidth-entryWidth-8, 60))
}

// MinSize implements fyne.Layout.
func (h fixedHeight) MinSize([]fyne.CanvasObject) fyne.Size { return fyne.NewSize(100, float32(h)) }

// Layout implements fyne.Layout.
func (h fixedHeight) Layout(objects []fyne.CanvasObject, s fyne.Size) {
	for _, o := range objects {
		o.Resize(s)
	}
}

// spareAssets reads the lines and substations with what their layers say of spare capacity.
func spareAssets(store study.Store, layers []study.LayerRecord) ([]spareAsset, error) {
	var out []spareAsset
	for _, l := range layers {
		v, _, err := store.Version(context.Background(), l.Digest)
		if err != nil {
			return nil, err
		}
		column := func(field string) int {
			name := l.Match[field]
			if name == "" || slices.Contains(l.Personal, name) {
				return -1
			}
			return v.Layer.ColumnIndex(name)
		}
		name, spare := column("name"), column("spare_capacity")
		unit := l.Units[l.Match["spare_capacity"]]
		kind := "line"
		if l.Role == "substations" {
			kind = "substation"
		}
		for _, f := range v.Layer.Features {
			id := l.Name + "/" + f.ID
			a := spareAsset{name: kind + " " + f.ID, key: "grid.typed_spare_" + strings.ReplaceAll(id, ".", "-") + "_kw"}
			if name >= 0 && f.Values[name].String() != "" {
				a.name = fmt.Sprintf("%s (%s %s)", f.Values[name].String(), kind, f.ID)
			}
			if spare >= 0 && f.Values[spare].String() != "" {
				a.told = strings.TrimSpace(f.Values[spare].String() + " " + unit)
			}
			out = append(out, a)
		}
	}
	return out, nil
}
