package accounts

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
)

// stage is the pane of the consequence table.
type stage struct {
	core    *core.Core
	all     []run.KeyInfo // every consequence, in the order of the vocabulary
	visible []string
	lister  *lister

	list    *listed
	of      *run.Results // of the last request
	sortBy  string
	dir     direction
	own     string // candidates that were chosen here, so that the table stays where it is
	filter  filter
	plants  []string
	content fyne.CanvasObject
	tabs    *widgets.Tabs

	grid                       *grid
	count, hidden, unit, left  *widgets.Line
	words, number              *widget.Entry
	plant, status, key, bounds *widget.Select
	bound                      *fyne.Container // the row of the numeric filter
	returns                    *returns
	pictured                   *pictured    // nil before its tab is shown
	methods                    *methodsPane // as pictured
	ground                     *groundHere  // as pictured
	beside                     *besideTable // as pictured
	syncing                    bool         // controls are set by the program
}

// New makes the stage.
func New(c *core.Core) core.Stage { return newStage(c) }

func newStage(c *core.Core) *stage {
	s := &stage{core: c, all: c.Parts.Params.Keys(), filter: filter{status: run.Fitted, most: true}}
	s.visible = s.visibleColumns()
	s.lister = &lister{done: func(l *listed) { c.Do(func() { s.answered(l) }) }}
	s.ask()
	return s
}

// Title implements core.Stage.
func (s *stage) Title() string { return "Accounts" }

// State implements core.Stage.
func (s *stage) State() (first, second string, warn bool) {
	n := 0
	for _, k := range s.all {
		if !k.Derived && s.assessed(k.Key) {
			n++
		}
	}
	first = strconv.Itoa(n) + " consequences"
	v := s.core.View()
	switch {
	case v == nil:
		return first, "no study", false
	case v.Problem != nil:
		return first, "cannot be computed", true
	case v.Stopped && !v.Current:
		return first, "computing stopped", true
	case !v.Current:
		return first, "being computed", false
	case s.list != nil && s.list.over == 1:
		return first, "1 candidate over a limit", true
	case s.list != nil && s.list.over > 1:
		return first, core.Count(s.list.over) + " over a limit", true
	}
	return first, "all current", false
}

// Changed implements core.Stage.
func (s *stage) Changed(ch core.Change) {
	if ch&core.StudyChanged != 0 {
		if v := s.core.View(); v != nil && v.Results != s.of {
			s.ask()
		}
	}
	if s.content == nil {
		return
	}
	if ch&core.StudyChanged != 0 {
		s.fillPlants()
		s.showCount()
	}
	if ch&(core.StudyChanged|core.SelectionChanged) != 0 && s.ground != nil {
		s.ground.update()
	}
	if ch&(core.StudyChanged|core.SelectionChanged) != 0 && s.pictured != nil {
		s.pictured.update()
	}
	if ch&(core.StudyChanged|core.SelectionChanged) != 0 {
		s.showBeside(s.tabs.Chosen())
	}
	if ch&core.StudyChanged != 0 && s.methods != nil {
		s.methods.update()
	}
	if ch&core.LookChanged != 0 {
		if s.methods != nil {
			s.methods.repaint()
		}
		if s.pictured != nil {
			s.pictured.repaint()
		}
		s.grid.setLook()
		if s.ground != nil {
			s.ground.picture.Repaint()
		}
	}
	if ch&core.ShadeChanged != 0 {
		s.grid.Refresh() // the head of the column says that the map shows it
	}
	if ch&core.SelectionChanged != 0 {
		s.selected()
	}
}

// Content implements core.Stage.
func (s *stage) Content() fyne.CanvasObject {
	s.grid = newGrid(s.core)
	s.grid.onSort, s.grid.onPick = s.sort, s.pick
	s.grid.onShade = s.core.SetShade
	s.grid.onHide = func(key string) {
		s.setColumns(slices.DeleteFunc(slices.Clone(s.visible), func(k string) bool { return k == key }))
	}
	s.count, s.hidden, s.unit, s.left = widgets.NewLine(""), widgets.Faint(""), widgets.Faint(""), widgets.Faint("")
	s.left.Hide()
	s.returns = newReturns(s.core)
	s.tabs = widgets.NewTabs(
		widgets.Tab{Text: "Table", Make: s.table},
		widgets.Tab{Text: "Energy return", Make: func() fyne.CanvasObject { return s.returns.body }},
		widgets.Tab{Text: "Pictures", Make: func() fyne.CanvasObject { s.pictured = newPictured(s.core); return s.pictured.body }},
		widgets.Tab{Text: "Beside", Make: func() fyne.CanvasObject { s.beside = newBesideTable(s.core); return s.beside.body }},
		widgets.Tab{Text: "Methods", Make: func() fyne.CanvasObject { s.methods = newMethodsPane(s.core); return s.methods.body }},
		widgets.Tab{Text: "The ground here", Make: func() fyne.CanvasObject { s.ground = newGroundHere(s.core); return s.ground.body }},
		widgets.Tab{Text: "Not assessed", Make: s.notAssessed},
	)
	s.tabs.OnChosen = s.showBeside
	s.content = container.New(insets{12, 8, 12, 4}, container.NewBorder(container.NewVBox(widgets.Heading("Accounts"), space(0)), nil, nil, nil, s.tabs))
	s.fillPlants()
	s.showColumns()
	s.grid.setLook()
	if s.list != nil {
		s.answered(s.list)
	} else {
		s.showCount()
		s.returns.update(nil)
	}
	return s.content
}

// besideTab is the place of the tab Beside, whose many rows are only made anew where they are looked at.
const besideTab = 3

func (s *stage) showBeside(tab int) {
	if tab == besideTab && s.beside != nil {
		s.beside.update()
	}
}

// table lays the first tab out.
func (s *stage) table() fyne.CanvasObject {
	s.words = widget.NewEntry()
	s.words.SetPlaceHolder("Site, parcel or plant")
	s.words.OnChanged = func(t string) { s.filter.words = t; s.ask() }
	s.plant = widget.NewSelect(nil, func(string) {
		s.filter.plant = ""
		if i := s.plant.SelectedIndex(); i > 0 && i <= len(s.plants) {
			s.filter.plant = s.plants[i-1]
		}
		s.ask()
	})
	s.status = widget.NewSelect([]string{"Fitted", "No room", "Not computed", "All"}, func(string) {
		s.filter.status = []string{run.Fitted, run.NoRoom, run.NotComputed, anyStatus}[max(s.status.SelectedIndex(), 0)]
		s.ask()
	})
	s.key = widget.NewSelect(nil, func(string) { s.numberChanged() })
	s.bounds = widget.NewSelect([]string{"at most", "at least"}, func(string) { s.numberChanged() })
	s.number = widget.NewEntry()
	s.number.SetPlaceHolder("number")
	s.number.OnChanged = func(string) { s.numberChanged() }
	s.quietly(func() {
		s.status.SetSelectedIndex(0)
		s.bounds.SetSelectedIndex(0)
	})
	s.bound = widgets.Fields(6, []float32{0, 92, 74, 76}, s.key, s.bounds, s.number, s.unit)
	head := container.NewVBox(
		widgets.Fields(6, []float32{0, 150, 118}, s.words, s.plant, s.status),
		s.bound,
		s.left,
		widgets.Fields(8, []float32{0, 84}, s.count, widget.NewButton("Columns", func() { s.chooseColumns() })),
		s.hidden,
	)
	foot := widgets.Faint(brief).Hinted(caution)
	return container.NewBorder(head, foot, nil, nil, container.New(insets{0, 4, 0, 2}, s.grid.object()))
}

func (s *stage) quietly(do func()) {
	was := s.syncing
	s.syncing = true
	do()
	s.syncing = was
}

// ask wants the table anew.
func (s *stage) ask() {
	v := s.core.View()
	if s.syncing || v == nil || v.Results == nil || v.Index == nil {
		return
	}
	titles := map[string]string{}
	for _, p := range v.Of.Plants() {
		titles[p] = s.core.PlantTitle(p)
	}
	keys := slices.Clone(s.visible)
	for _, f := range families {
		keys = append(keys, f.keys...)
	}
	s.of = v.Results
	s.lister.ask(request{results: v.Results, index: v.Index, catalog: s.core.Parts.Catalog, titles: titles, keys: keys, sortBy: s.sortBy, dir: s.dir, filter: s.filter})
}

// answered takes over what was listed.
func (s *stage) answered(l *listed) {
	v := s.core.View()
	if v == nil || l.results != v.Results {
		return
	}
	first := s.list == nil || s.list.over != l.over
	s.list = l
	if s.content != nil {
		s.grid.setList(l)
		s.showCount()
		s.returns.update(l.columns)
	}
	if first {
		s.core.Emit(core.WorkChanged) // the rail says how many are over a limit
	}
}

func (s *stage) sort(key string) {
	switch {
	case key == "":
		s.dir = studyOrder
	case key == s.sortBy:
		s.dir = s.dir.next()
	default:
		s.dir = bestFirst
	}
	s.sortBy = key
	s.ask()
}

func (s *stage) pick(id string, add bool) {
	s.own = id
	if add {
		s.core.Toggle(id)
	} else {
		s.core.Choose(id)
	}
	s.own = ""
}

// selected follows the chosen candidates.
func (s *stage) selected() {
	if s.grid.mark() {
		s.grid.Refresh()
	}
	if s.list != nil {
		s.returns.update(s.list.columns)
	}
	ids := s.core.ChosenIDs()
	v := s.core.View()
	if s.own != "" || len(ids) == 0 || s.list == nil || v.Index == nil || v.Results != s.list.results {
		return
	}
	i, ok := v.Index.ByID[ids[len(ids)-1]] // the one that came last
	if !ok {
		return
	}
	if row := s.list.at[i]; row >= 0 {
		s.grid.atRow = int(row)
		s.grid.toRow(int(row))
	}
}

// fillPlants brings the choice of plant options up to date.
func (s *stage) fillPlants() {
	v := s.core.View()
	if v == nil {
		return
	}
	s.plants = v.Snap.Plants()
	options := []string{"All plant options"}
	seen := map[string]bool{}
	for _, p := range s.plants {
		t := s.core.PlantTitle(p)
		if seen[t] { // two of one title are told apart by their names
			t += " (" + p + ")"
		}
		seen[t] = true
		options = append(options, t)
	}
	at := slices.Index(s.plants, s.filter.plant) + 1
	if slices.Equal(options, s.plant.Options) && s.plant.SelectedIndex() == at {
		return
	}
	gone := s.filter.plant != "" && at == 0
	s.quietly(func() {
		s.plant.SetOptions(options)
		s.plant.SetSelectedIndex(at)
	})
	if gone {
		s.filter.plant = ""
		s.ask()
	}
}

// anyValue is the choice that holds candidates to no number.
const anyValue = "Any value"

// showColumns follows the choice of columns.
func (s *stage) showColumns() {
	if s.grid == nil {
		return
	}
	s.grid.setKeys(s.visible)
	s.hidden.Set(s.hiddenLine())
	s.hidden.Hint = s.hiddenLine()
	options := []string{anyValue}
	for _, k := range s.offered() {
		options = append(options, s.core.Info(k).Title)
	}
	s.quietly(func() {
		s.key.SetOptions(options)
		s.key.SetSelectedIndex(slices.Index(s.offered(), s.filter.key) + 1)
	})
	s.numberChanged()
}

// offered are the consequences that the numeric filter offers: the visible columns with the one in use.
func (s *stage) offered() []string {
	var out []string
	for _, k := range s.all {
		if slices.Contains(s.visible, k.Key) || k.Key == s.filter.key {
			out = append(out, k.Key)
		}
	}
	return out
}

// numberChanged reads the three controls of the numeric filter.
func (s *stage) numberChanged() {
	if s.syncing || s.key == nil {
		return
	}
	key := ""
	if i := s.key.SelectedIndex(); i > 0 && i <= len(s.offered()) {
		key = s.offered()[i-1]
	}
	for _, o := range []fyne.CanvasObject{s.bounds, s.number, s.unit} {
		if (key != "") != o.Visible() {
			shown(key != "", o)
			s.bound.Refresh()
		}
	}
	s.unit.SetLook("", theme.Faint, false)
	f := filter{words: s.filter.words, plant: s.filter.plant, status: s.filter.status, most: s.bounds.SelectedIndex() == 0}
	if key != "" {
		s.unit.Set(unitOf(s.core.Info(key)))
		text := strings.ReplaceAll(strings.ReplaceAll(s.number.Text, " ", ""), ",", ".") // a comma for a point, as many write it
		x, err := strconv.ParseFloat(text, 64)
		switch {
		case err == nil:
			f.key, f.number = key, x
		case text != "":
			s.unit.SetLook("no number", theme.Warm, true)
		}
	}
	if f != s.filter {
		s.filter = f
		s.ask()
	}
}

// showCount writes how many candidates are listed.
func (s *stage) showCount() {
	v := s.core.View()
	if v == nil || v.Results == nil || s.list == nil {
		s.count.Set("Nothing computed yet")
		return
	}
	text := fmt.Sprintf("%s of %s candidates", core.Count(len(s.list.rows)), core.Count(len(s.list.results.Candidates)))
	if !v.Current {
		text += ", being computed"
	}
	s.count.Set(text)
	if s.list.without > 0 {
		s.left.Set(core.Count(s.list.without) + " without a value are left out")
		s.left.Hint = fmt.Sprintf("%s: %s candidates have no number for it, since it is unknown or nothing is fitted.", s.core.Info(s.list.filter.key).Title, core.Count(s.list.without))
	}
	shown(s.list.without > 0, s.left)
}
