package ground

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/units"
)

// noColumn stands in a field's select for no column at all.
const noColumn = "no column"

// form asks what only the user knows about a file. Nothing is added before it is answered, and nothing
// that was answered is lost when more is asked.
type form struct {
	s       *Stage
	in      study.Import
	before  study.Import      // what was answered earlier of the same columns
	replace study.LayerRecord // the layer in whose place the file goes; without a name when it is new
	made    string
	dialog  *dialog.CustomDialog

	role             *widget.Select
	guess            *widgets.Line
	purpose          *widgets.Paragraph
	usual            *widgets.Line
	name             *widget.Entry
	crs              *widget.Entry
	swap             *widget.Check
	places           *widget.Check // the rows are points at the columns that look like places
	complete         *widget.Check
	only             *widget.Entry
	systemAsked      bool // the user was asked about the coordinate system: what stands there now is an answer
	edition, holder  *widget.Entry
	named, licence   *widget.Entry // of a backdrop
	namedBox         *fyne.Container
	reason           *widget.Entry
	fields           []*fieldRow
	grid             *gridRow // of a grid of wind or sun
	stamp            *widget.Select
	offset           *widget.Entry
	clockBox         *fyne.Container // both, of a table of hours
	fieldBox         *fyne.Container
	personal         map[string]*widget.Check
	personalBox      *fyne.Container
	sample           *fyne.Container
	without          *widget.Check
	asked            *widget.Label // questions and faults, in place
	askedBox         *fyne.Container
	ok, cancelButton *widget.Button
	progress         *widget.ProgressBarInfinite
	scroll           *container.Scroll
	stop             context.CancelFunc // of the adding under way
}

// fieldRow is one field of the role with the column that is it.
type fieldRow struct {
	field  study.RoleField
	column *widget.Select
	unit   *widget.Select
	sure   string // column of the field's own name, which is always taken
}

// gridRow asks what a grid of wind or sun holds.
type gridRow struct {
	study.GridAsks
	field, unit *widget.Select
	number      *widget.Entry
}

// titles gives the fields in words.
func (g *gridRow) titles() []string {
	var out []string
	for _, f := range g.Fields {
		out = append(out, fieldWords(f))
	}
	return out
}

// chosen gives the field that is chosen.
func (g *gridRow) chosen() (study.RoleField, bool) {
	i := slices.Index(g.titles(), g.field.Selected)
	if i < 0 {
		return study.RoleField{}, false
	}
	return g.Fields[i], true
}

// fieldChosen offers the units of the field.
func (g *gridRow) fieldChosen() {
	f, ok := g.chosen()
	visible(g.unit, ok && f.Physical())
	if !ok || !f.Physical() {
		return
	}
	g.unit.SetOptions(study.GridUnits(f))
	if g.unit.ClearSelected(); f.Name == g.Field && g.Unit != "" {
		g.unit.SetSelected(g.Unit)
	}
}

// answers adds what was answered to an import, and gives what is open.
func (g *gridRow) answers(in *study.Import) (open []string) {
	f, ok := g.chosen()
	switch {
	case !ok:
		open = append(open, "What are the values of the grid?")
	case f.Physical() && g.unit.Selected == "":
		in.Match[f.Name] = study.GridBand
		open = append(open, fmt.Sprintf("In which unit are the values (%s)?", fieldWords(f)))
	default:
		in.Match[f.Name] = study.GridBand
		if f.Physical() {
			in.Units[study.GridBand] = g.unit.Selected
		}
	}
	number := strings.TrimSpace(g.number.Text)
	if number == "" {
		what := "At how many metres above the ground is the wind of the grid?"
		if g.Number.Name == "month" {
			what = "Of which month, 1 to 12, is the grid?"
		}
		return append(open, what)
	}
	in.Match[g.Number.Name] = number
	return open
}

// askGrid puts the questions about a grid into the form.
func (f *form) askGrid(role study.Role) {
	asks, ok := study.AskGrid(f.in, role, f.replace)
	if f.grid = nil; !ok {
		return
	}
	g := &gridRow{GridAsks: asks, unit: widget.NewSelect(nil, nil), number: widget.NewEntry()}
	g.field = widget.NewSelect(g.titles(), func(string) { g.fieldChosen() })
	g.field.PlaceHolder = "choose what they are"
	g.unit.PlaceHolder = "choose its unit"
	g.unit.Hide()
	g.number.SetText(g.Value)
	label, hint := "Height above the ground (m)", "The wind of the grid is that of this height."
	if g.Number.Name == "month" {
		label, hint = "Month, 1 to 12", "The grid holds the values of one month; add each month as a layer of its own."
	}
	f.grid = g
	f.fieldBox.Add(widgets.Part("What the grid holds").Hinted("What the file's name says is chosen already. Change what is wrong."))
	f.fieldBox.Add(container.New(columns{label: 150}, widgets.NewLine("Values"), g.field, widgets.NewLine("Unit"), container.NewStack(g.unit), widgets.NewLine(label).Hinted(hint), g.number))
	for _, field := range g.Fields {
		if field.Name == g.Field {
			g.field.SetSelected(fieldWords(field))
		}
	}
}

// The words of what the times of a table of hours mark, and the answers that they stand for.
var stampWords = []string{"the start of the interval", "its centre", "its end"}

var stamps = []string{"start", "centre", "end"}

// askClock asks how the times of a table of hours are meant.
func (f *form) askClock(role study.Role) {
	f.clockBox = nil
	if role.Name != study.HourlyRole || f.in.Layer == nil {
		return
	}
	f.stamp, f.offset = widget.NewSelect(stampWords, nil), widget.NewEntry()
	f.stamp.PlaceHolder = "choose what they mark"
	f.offset.SetPlaceHolder("as 1; not needed where the times say their zone")
	snap := f.s.c.View().Snap
	if said, ok := snap.Explicit[study.StampKey]; ok {
		f.stamp.SetSelectedIndex(slices.Index(stamps, said.Value))
	}
	if said, ok := snap.Explicit[study.OffsetKey]; ok {
		f.offset.SetText(said.Value)
	}
	f.clockBox = container.New(columns{label: 150}, widgets.NewLine("Times mark").Hinted("Whether an hour's time is that of its start, its centre or its end."), f.stamp,
		widgets.NewLine("Hours ahead of UTC").Hinted("Of the file's clock, without daylight saving time."), f.offset)
	f.fieldBox.Add(widgets.Part("The clock of the file"))
	f.fieldBox.Add(f.clockBox)
}

func newForm(s *Stage, in study.Import, replace string) *form {
	f := &form{s: s, in: in, made: madeOf(in), guess: widgets.Faint(""), purpose: widgets.NewParagraph("", 2), usual: widgets.Faint(""), name: widget.NewEntry(), crs: widget.NewEntry(), only: widget.NewEntry(), edition: widget.NewEntry(), holder: widget.NewEntry(), reason: widget.NewEntry(),
		fieldBox: container.NewVBox(), personalBox: container.NewVBox(), sample: container.NewVBox(), personal: map[string]*widget.Check{}, asked: widgets.NewText(""), progress: widget.NewProgressBarInfinite()}
	cat := s.c.Parts.Catalog
	if rec, ok := hasLayer(s.c.View().Snap, replace); ok && replace != "" {
		f.replace = rec
	}
	var titles []string
	for _, r := range cat.Roles {
		if fits(r, f.made) || r.Name == f.replace.Role {
			titles = append(titles, r.Title)
		}
	}
	f.role = widget.NewSelect(titles, func(string) { f.roleChosen() })
	f.role.PlaceHolder = "What does the file mean here?"
	f.crs.SetPlaceHolder("as EPSG:25832; empty for degrees")
	f.crs.SetText(in.CRS)
	f.swap = widget.NewCheck("The file has latitude before longitude", nil)
	f.places = widget.NewCheck("", func(bool) { f.remade() })
	if len(in.Places) > 0 {
		f.places.Text = fmt.Sprintf("Each row is a point: %s and %s", in.Places[0].X, in.Places[0].Y)
	}
	f.complete = widget.NewCheck("It covers the whole place", nil)
	f.purpose.Colour = theme.Faint
	f.only.SetPlaceHolder("all; or natural=wood, landuse=forest|orchard")
	for i, w := range f.replace.Only {
		if i > 0 {
			f.only.Text += ", "
		}
		f.only.Text += w.Column + "=" + strings.Join(w.Values, "|")
	}
	f.edition.SetPlaceHolder("edition or date of the data")
	f.holder.SetPlaceHolder("who holds the data")
	f.reason.SetPlaceHolder("for the journal")
	f.named, f.licence = widget.NewEntry(), widget.NewEntry()
	f.named.SetPlaceHolder("needed; as © Survey office 2031. It stands in the corner of the map")
	f.licence.SetPlaceHolder("what may be done with the picture; empty means not stated")
	f.without = widget.NewCheck("Go on without the columns that are missing: what rests on them is unknown", nil)
	f.without.Hide()
	f.progress.Hide()
	f.progress.Stop()
	f.askedBox = container.NewVBox(container.New(layout.NewCustomPaddedLayout(4, 0, 6, 0), widgets.Warm("Before it can be added")), f.asked, f.without)
	f.askedBox.Hide()

	base := strings.TrimSuffix(in.Base, filepath.Ext(in.Base))
	if in.Table != "" && !strings.EqualFold(filepath.Ext(in.Base), ".zip") {
		base = in.Table
	}
	f.name.SetText(base)
	if r := f.replace; r.Name != "" {
		f.name.SetText(r.Name)
		f.name.Disable()
		f.complete.SetChecked(r.Complete)
		f.holder.SetText(r.Holder)
		f.named.SetText(r.Credit().Attribution)
		f.licence.SetText(r.Credit().Licence)
		f.swap.SetChecked(r.Swapped)
		if in.CRS == "" && r.CRS != "OGC:CRS84" {
			f.crs.SetText(r.CRS)
		}
		role, _ := cat.Role(r.Role)
		f.role.SetSelected(role.Title)
		f.role.Disable()
	} else if in.Picture() {
		role, _ := cat.Role(study.BackdropRole)
		f.role.SetSelected(role.Title)
	} else if guess := study.ProposeRole(cat, in); guess != "" {
		role, _ := cat.Role(guess)
		f.role.SetSelected(role.Title)
		f.guess.Set("A guess from the file's name. Change it if it is wrong.")
	}
	f.role.OnChanged = func(string) { f.guess.Set(""); f.roleChosen() }
	return f
}

// chosen gives the role that is chosen.
func (f *form) chosen() (study.Role, bool) {
	for _, r := range f.s.c.Parts.Catalog.Roles {
		if r.Title == f.role.Selected {
			return r, true
		}
	}
	return study.Role{}, false
}

// open shows the form.
func (f *form) open() {
	what := fmt.Sprintf("%s: %s", f.in.Base, ledgerWords(f.in.Ledger))
	if f.in.Table != "" {
		what = fmt.Sprintf("%s, %s: %s", f.in.Base, f.in.Table, ledgerWords(f.in.Ledger))
	}
	if f.in.Layer == nil {
		what = f.in.Base + ": a grid of values"
	}
	if f.made == "picture" {
		what = fmt.Sprintf("%s: a picture of %d kB, kept in the study as it stands", f.in.Base, (len(f.in.Blob)+1023)/1024)
	}
	found := "The file says " + f.in.CRS + "."
	switch {
	case f.in.CRS == "" && f.in.Layer == nil:
		found = "The file does not say, so it is needed."
	case f.in.CRS == "":
		found = "The file does not say; empty means degrees."
	}
	form := container.New(columns{label: 150})
	row := func(label, hint string, o fyne.CanvasObject) {
		form.Add(widgets.NewLine(label).Hinted(hint))
		form.Add(o)
	}
	row("Meaning", "The role of the layer in the study.", f.role)
	row("", "", container.NewVBox(f.guess, f.purpose))
	row("Name", "The name of the layer.", f.name)
	if len(f.in.Places) > 0 {
		row("Places", "Whether columns hold the place of each row.", f.places)
	}
	if f.made != "table" || len(f.in.Places) > 0 {
		row("Coordinate system", "The system in which the coordinates of the file are.", f.crs)
		row("", "", container.NewVBox(widgets.Faint(found), f.swap))
	}
	if f.in.Layer == nil {
		f.swap.Hide() // it is about the coordinates of features
		f.namedBox = container.New(columns{label: 150}, widgets.NewLine("Named with it").Hinted("Who must be named where the picture is shown."), f.named, widgets.NewLine("Licence").Hinted("The appendix lists it."), f.licence)
	}
	if f.in.Layer != nil {
		row("Only", "The part of the features that is added: columns with the values that count. Several are joined by or.", f.only)
	}
	if f.made != "picture" {
		row("Whole place", "Whether nothing found means that nothing is there.", f.complete)
		row("", "", widgets.Faint("Ticked: where nothing is drawn, nothing is there."))
	}
	row("Edition", "", f.edition)
	row("Holder", "", f.holder)
	row("", "", f.usual)
	row("Reason", "", f.reason)
	if f.namedBox != nil {
		form = container.NewVBox(form, f.namedBox)
	}
	body := container.NewVBox(widgets.Faint(what), gap(2), form, gap(4), f.fieldBox, f.sample, f.personalBox)
	f.scroll = container.NewVScroll(container.New(layout.NewCustomPaddedLayout(0, 0, 0, 14), body))
	f.ok = widget.NewButton("Add", f.add)
	f.ok.Importance = widget.HighImportance
	title := "Add " + f.in.Base
	if f.replace.Name != "" {
		f.ok.SetText("Replace")
		title = fmt.Sprintf("Put %s in place of %s", f.in.Base, f.replace.Name)
	}
	f.cancelButton = widget.NewButton("Leave it out", f.leave)
	waits := widgets.Faint("")
	if n := len(f.s.queue); n > 0 {
		waits.Set(fmt.Sprintf("%d more to come", n))
	}
	foot := container.NewVBox(f.askedBox, f.progress, container.NewBorder(nil, nil, nil, container.NewHBox(f.cancelButton, f.ok), waits))
	f.dialog = dialog.NewCustomWithoutButtons(title, container.NewBorder(nil, foot, nil, nil, f.scroll), f.s.c.Window)
	f.roleChosen()
	f.dialog.Resize(dialogSize(f.s.c, 760, 640))
	f.dialog.Show()
	f.s.c.Window.Canvas().Focus(f.role)
}

// remade offers the roles that fit, rows with places being points.
func (f *form) remade() {
	f.made = madeOf(f.in)
	if f.places.Checked {
		f.made = "point"
	}
	var titles []string
	for _, r := range f.s.c.Parts.Catalog.Roles {
		if fits(r, f.made) || r.Name == f.replace.Role {
			titles = append(titles, r.Title)
		}
	}
	f.role.SetOptions(titles)
	if !slices.Contains(titles, f.role.Selected) {
		f.role.ClearSelected()
	}
}

// leave ends the form without adding the file, or stops the adding under way.
func (f *form) leave() {
	if f.stop != nil {
		f.stop()
		return
	}
	f.close()
}

func (f *form) close() {
	f.dialog.Hide()
	f.s.finished()
}

// roleChosen puts the fields of the role into the form, with proposals.
func (f *form) roleChosen() {
	f.fieldBox.RemoveAll()
	f.personalBox.RemoveAll()
	f.fields, f.grid = nil, nil
	role, ok := f.chosen()
	if f.namedBox != nil {
		visible(f.namedBox, ok && role.Name == study.BackdropRole)
	}
	if !ok {
		f.purpose.Hide()
		f.showSample()
		return
	}
	f.purpose.Set(role.Purpose)
	f.purpose.Show()
	f.usual.Set("Usually: " + role.Holder)
	f.askGrid(role)
	f.askClock(role)
	if f.in.Layer == nil || len(f.in.Layer.Columns) == 0 {
		f.showSample()
		return
	}
	proposed := study.Propose(f.in.Layer, role)
	f.before = study.Import{Layer: f.in.Layer, Replace: f.replace.Name}
	study.Remember(&f.before, role, f.s.c.View().Snap)
	names := make([]string, len(f.in.Layer.Columns))
	for i, c := range f.in.Layer.Columns {
		names[i] = c.Name
	}
	table := container.New(layout.NewGridLayoutWithColumns(3), widgets.Faint("field"), widgets.Faint("column of the file"), widgets.Faint("unit of the column"))
	for _, field := range role.Fields {
		r := &fieldRow{field: field}
		r.unit = widget.NewSelect(units.Alike(field.Unit), func(string) { f.showSample() })
		r.unit.PlaceHolder = "choose its unit"
		options := names
		at := slices.IndexFunc(names, func(n string) bool { return strings.EqualFold(n, field.Name) })
		if at < 0 {
			options = append([]string{noColumn}, names...)
		} else {
			r.sure = names[at]
		}
		r.column = widget.NewSelect(options, func(string) { f.columnChosen(r) })
		r.column.PlaceHolder = noColumn
		label := fieldWords(field)
		if field.Required {
			label += " (needed)"
		}
		hint := "In the program's own unit: " + present.UnitWords(field.Unit) + "."
		if !field.Physical() {
			hint = "Text or choice: " + field.Unit + "."
		}
		table.Add(widgets.NewLine(label).Hinted(hint))
		table.Add(r.column)
		table.Add(container.NewStack(r.unit))
		f.fields = append(f.fields, r)
		column := proposed[field.Name]
		if old := f.before.Match[field.Name]; old != "" && slices.Contains(names, old) {
			column = old
		}
		r.column.SetSelected(cmp.Or(column, noColumn))
	}
	f.fieldBox.Add(widgets.Part("Which column is which").Hinted("What the program proposes is chosen already. Change what is wrong."))
	f.fieldBox.Add(table)

	f.personalBox.Add(gap(4))
	f.personalBox.Add(widgets.Part("Personal columns").Hinted("They are kept in the study, never drawn, and never leave it unasked."))
	f.personalBox.Add(widgets.NewParagraph("Tick what says something about a person: names, addresses, contacts. It is never drawn and never leaves the study unasked.", 2))
	grid := container.NewGridWithColumns(3)
	f.personal = map[string]*widget.Check{}
	for _, n := range names {
		check := widget.NewCheck(n, func(bool) { f.showSample() })
		for _, field := range role.Fields {
			if field.Personal && strings.EqualFold(field.Name, n) {
				check.SetChecked(true)
				check.Disable() // the role says so
			}
		}
		if slices.Contains(f.replace.Personal, n) {
			check.SetChecked(true)
		}
		f.personal[n] = check
		grid.Add(check)
	}
	f.personalBox.Add(grid)
	f.showSample()
}

// columnChosen asks for the unit of a column where the field is a measure.
func (f *form) columnChosen(r *fieldRow) {
	column := r.column.Selected
	if column == noColumn || !r.field.Physical() {
		r.unit.Hide()
	} else {
		r.unit.Show()
		r.unit.ClearSelected()
		known := cmp.Or(f.before.Units[column], f.unitOf(column))
		if unit, why := study.ProposeUnit(f.in.Layer, column, r.field); known == "" && why != "" {
			known = unit
		}
		if slices.Contains(r.unit.Options, known) {
			r.unit.SetSelected(known)
		}
	}
	if check := f.personal[column]; check != nil && r.field.Personal {
		check.SetChecked(true)
	}
	f.showSample()
}

// unitOf gives the unit that the file says of a column.
func (f *form) unitOf(column string) string {
	if i := f.in.Layer.ColumnIndex(column); i >= 0 {
		return f.in.Layer.Columns[i].Unit
	}
	return ""
}

// sampled is how many features the sample shows.
const sampled = 3

// showSample shows the first features in the columns that are matched.
func (f *form) showSample() {
	f.sample.RemoveAll()
	if f.in.Layer == nil {
		return
	}
	type shown struct {
		title    string
		at       int
		personal bool
	}
	var cols []shown
	for _, r := range f.fields {
		i := f.in.Layer.ColumnIndex(r.column.Selected)
		if i < 0 || len(cols) == 5 {
			continue
		}
		check := f.personal[r.column.Selected]
		title := r.column.Selected
		if r.unit.Visible() && r.unit.Selected != "" {
			title += " (" + r.unit.Selected + ")"
		}
		cols = append(cols, shown{title, i, r.field.Personal || check != nil && check.Checked})
	}
	if len(cols) == 0 {
		return
	}
	table := container.NewGridWithColumns(len(cols))
	for _, c := range cols {
		table.Add(widgets.Faint(c.title))
	}
	for _, x := range f.in.Layer.Features[:min(sampled, len(f.in.Layer.Features))] {
		for _, c := range cols {
			l := widgets.NewLine(x.Values[c.at].String())
			l.TextSize = 12
			switch {
			case x.Values[c.at].Kind == geo.Null:
				l.Text, l.Colour = "no value", theme.Faint
			case c.personal:
				l.Text, l.Colour = "personal", theme.Faint
			}
			table.Add(l)
		}
	}
	f.sample.Add(gap(4))
	f.sample.Add(widgets.Part("First features"))
	f.sample.Add(table)
}

// ask shows questions in place.
func (f *form) ask(words string) {
	f.asked.SetText(words)
	f.askedBox.Show()
	f.askedBox.Refresh()
}

// answers gives the import with the answers; unanswered says in words what is open.
func (f *form) answers() (in study.Import, unanswered string) {
	in = f.in
	in.Notices = slices.Clone(f.in.Notices)
	role, ok := f.chosen()
	if !ok {
		return in, "Choose what the file means here."
	}
	in.Role, in.Name, in.CRSOption = role.Name, strings.TrimSpace(f.name.Text), strings.TrimSpace(f.crs.Text)
	switch {
	case in.CRSOption == "":
		in.CRS = "" // the user took out what the file says
	case in.CRSOption == in.CRS && !f.systemAsked:
		in.CRSOption = "" // the file's word, not the user's
	}
	for _, text := range strings.Split(f.only.Text, ",") {
		if strings.TrimSpace(text) == "" {
			continue
		}
		w, err := study.ParseWanted(text)
		if err != nil {
			return in, "Only: " + err.Error() + "."
		}
		in.Only = append(in.Only, w)
	}
	in.Replace = f.replace.Name
	if f.places.Checked && len(f.in.Places) > 0 {
		in.At = &f.in.Places[0]
	}
	in.SwapAxes, in.Complete = f.swap.Checked, f.complete.Checked
	in.Edition, in.Holder, in.Reason = strings.TrimSpace(f.edition.Text), strings.TrimSpace(f.holder.Text), strings.TrimSpace(f.reason.Text)
	in.Match, in.Units = map[string]string{}, map[string]string{}
	var open []string
	for _, r := range f.fields {
		column := r.column.Selected
		if column == noColumn || column == "" {
			continue
		}
		in.Match[r.field.Name] = column
		if !r.field.Physical() {
			continue
		}
		if r.unit.Selected == "" {
			open = append(open, fmt.Sprintf("In which unit is column %s (%s)?", column, fieldWords(r.field)))
			continue
		}
		in.Units[column] = r.unit.Selected
	}
	if f.clockBox != nil {
		if i := slices.Index(stampWords, f.stamp.Selected); i >= 0 {
			in.Stamp = stamps[i]
		} else {
			open = append(open, "What do the times mark?")
		}
		in.OffsetH = strings.TrimSpace(f.offset.Text)
	}
	if f.grid != nil {
		open = append(open, f.grid.answers(&in)...)
	}
	for n, check := range f.personal {
		if check.Checked {
			in.Personal = append(in.Personal, n)
		}
	}
	slices.Sort(in.Personal)
	in.AcceptProposals = f.without.Visible() && f.without.Checked
	if f.in.Layer == nil && in.CRSOption == "" && in.CRS == "" {
		open = append(open, "In which coordinate system are the corners of the "+map[bool]string{true: "picture", false: "grid"}[in.Role == study.BackdropRole]+"?")
	}
	if in.Role == study.BackdropRole && strings.TrimSpace(f.named.Text) == "" {
		open = append(open, "Who must be named where the picture is shown?")
	}
	return in, strings.Join(open, "\n")
}

// add adds the layer; what is asked comes back into the form.
func (f *form) add() {
	in, open := f.answers()
	if open != "" {
		f.ask(open)
		return
	}
	stopped, stop := context.WithCancel(context.Background())
	f.stop = stop
	f.ok.Disable()
	f.cancelButton.SetText("Stop")
	f.progress.Show()
	f.progress.Start()
	var rec study.LayerRecord
	var failed error
	credit := study.Credit{Attribution: f.named.Text, Licence: f.licence.Text}
	parts := f.s.c.Parts
	c := f.s.c
	c.Session.Edit(func(ctx context.Context, s *study.Study) error {
		ctx, cancel := context.WithCancel(ctx)
		defer cancel()
		defer context.AfterFunc(stopped, cancel)()
		tools, done := parts.Tools()
		defer done()
		if in.Role == study.BackdropRole {
			rec, failed = s.AddBackdrop(ctx, in, credit, tools)
		} else {
			rec, failed = s.AddLayer(ctx, in, tools)
		}
		return nil // shown in the form, so that no answer is lost
	}, func(err error) { // told whatever happened, since the form waits for it
		c.Do(func() {
			c.Update()
			f.added(rec, errors.Join(failed, err))
		})
	})
}

func (f *form) added(rec study.LayerRecord, err error) {
	f.stop()
	f.stop = nil
	f.ok.Enable()
	f.cancelButton.SetText("Leave it out")
	f.progress.Stop()
	f.progress.Hide()
	var question *study.QuestionError
	var file *study.FileError
	switch {
	case err == nil:
		f.dialog.Hide()
		f.s.c.Tell(fmt.Sprintf("%s: %s.", rec.Name, ledgerWords(rec.Ledger)))
		if f.s.layers != nil {
			f.s.layers.open(rec.Name)
		}
		f.s.finished()
	case errors.Is(err, context.Canceled):
		f.ask("Stopped. Nothing was added.")
	case errors.As(err, &question):
		f.ask(f.questions(question))
	case errors.As(err, &file):
		shown := *file
		shown.File = f.in.Base
		f.ask(inWindow.Replace(present.Problem(&shown)))
	default:
		f.s.c.Fail("add the layer", err)
	}
}

// questions writes what is asked in words of the form.
func (f *form) questions(e *study.QuestionError) string {
	var lines []string
	for _, q := range e.Questions {
		text := strings.ToUpper(q.Text[:1]) + q.Text[1:]
		if !strings.ContainsAny(text[len(text)-1:], ".?") && (strings.HasPrefix(q.Option, "--match") || strings.HasPrefix(q.Option, "--at") || strings.HasPrefix(q.Option, "--crs")) {
			text += "."
		}
		switch {
		case q.Option == "--swap-axes":
			text += ". If so, tick that the file has latitude before longitude."
		case strings.HasPrefix(q.Option, "--replace"):
			text += ". Give another name, or take the other layer and replace it by this file."
		case strings.HasPrefix(q.Option, "leave out --personal"):
			text += ". Take the tick away, or choose another column."
		case strings.HasPrefix(q.Option, "--match"):
			text += " Choose the column above."
			f.without.Show()
		case strings.HasPrefix(q.Option, "--only"):
			text += ". Change what stands at Only."
		case strings.HasPrefix(q.Option, "--at"):
			text += " Tick that each row is a point."
		case strings.HasPrefix(q.Option, "--utc-offset"):
			text += " Enter it at Hours ahead of UTC."
		case strings.HasPrefix(q.Option, "--crs"):
			f.systemAsked = true
			text += " Enter it above."
		}
		lines = append(lines, text)
	}
	return strings.Join(lines, "\n")
}
