package accounts

import (
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/scoring"
)

// columnsKey is where the program remembers the visible columns.
const columnsKey = "accounts.columns"

// usualColumns are visible until a person chooses others.
var usualColumns = []string{
	"buildable_area_ha", "rated_kw", "delivered_mwh_per_yr", "eroi_delivered", "net_share",
	"footprint_direct_ha_per_gwh", "ghg_g_per_kwh", "nearest_dwelling_m", "habitat_ha", "connection_km",
}

// visibleColumns reads the remembered columns, in the order of the vocabulary.
func (s *stage) visibleColumns() []string {
	want := s.core.App.Preferences().StringListWithFallback(columnsKey, usualColumns)
	var out []string
	for _, k := range s.all {
		if slices.Contains(want, k.Key) {
			out = append(out, k.Key)
		}
	}
	return out
}

func (s *stage) setColumns(keys []string) {
	s.core.App.Preferences().SetStringList(columnsKey, keys)
	s.visible = s.visibleColumns()
	s.showColumns()
	s.ask()
}

// assessed reports whether the program works a consequence out at all.
func (s *stage) assessed(key string) bool {
	_, ok := s.core.Parts.Params.Graph.Slot(key)
	return ok
}

// hiddenLine counts and names the columns that are not shown.
func (s *stage) hiddenLine() string {
	var names []string
	for _, k := range s.all {
		if !slices.Contains(s.visible, k.Key) {
			names = append(names, k.Title)
		}
	}
	switch len(names) {
	case 0:
		return "No column is hidden"
	case 1:
		return "1 column hidden: " + names[0]
	}
	return strconv.Itoa(len(names)) + " columns hidden: " + strings.Join(names, ", ")
}

// accountTitle writes the name of an account for people.
func accountTitle(a scoring.Account) string {
	if a == scoring.Own {
		return "Your own"
	}
	return strings.ToUpper(string(a[:1])) + string(a[1:])
}

// entry is a line of the list of columns: an account, or a consequence of it.
type entry struct {
	account scoring.Account
	key     run.KeyInfo
}

func (s *stage) entries() []entry {
	var out []entry
	for _, a := range scoring.Accounts() {
		first := true
		for _, k := range s.all {
			if k.Account != a {
				continue
			}
			if first {
				out = append(out, entry{account: a})
				first = false
			}
			out = append(out, entry{key: k})
		}
	}
	return out
}

// chooser is the list of all consequences with check marks.
type chooser struct {
	stage  *stage
	marked map[string]bool
	list   *widget.List
	lines  []entry
}

// chooseColumns opens the list of columns.
func (s *stage) chooseColumns() *chooser {
	c := &chooser{stage: s, marked: map[string]bool{}, lines: s.entries()}
	for _, k := range s.visible {
		c.marked[k] = true
	}
	c.list = widget.NewList(func() int { return len(c.lines) }, func() fyne.CanvasObject {
		check := widget.NewCheck("", nil)
		part, title, note := widgets.Part(""), widgets.NewLine(""), widgets.Faint("")
		return container.NewStack(widgets.Fields(6, []float32{26, 0, 130}, check, title, note), part)
	}, c.update)
	c.list.OnSelected = func(i int) {
		c.list.Unselect(i)
		if k := c.lines[i].key.Key; k != "" {
			c.set(k, !c.marked[k])
			c.list.RefreshItem(i)
		}
	}
	all := func(keys []string) func() {
		return func() {
			c.marked = map[string]bool{}
			for _, k := range keys {
				c.marked[k] = true
			}
			c.save()
			c.list.Refresh()
		}
	}
	every := make([]string, len(s.all))
	for i, k := range s.all {
		every[i] = k.Key
	}
	buttons := container.NewHBox(widgets.NewPill("The usual ones", all(usualColumns)), widgets.NewPill("All", all(every)), widgets.NewPill("None", all(nil)))
	body := container.NewBorder(container.NewVBox(widgets.Faint("A hidden column is counted and named over the table."), buttons), nil, nil, nil, c.list)
	d := dialog.NewCustom("Columns", "Close", body, s.core.Window)
	size := s.core.Window.Canvas().Size()
	d.Resize(fyne.NewSize(min(size.Width-40, 480), min(size.Height-30, 560)))
	d.Show()
	return c
}

func (c *chooser) update(i widget.ListItemID, o fyne.CanvasObject) {
	line := c.lines[i]
	both := o.(*fyne.Container)
	row, part := both.Objects[0].(*fyne.Container), both.Objects[1].(*widgets.Line)
	if line.account != "" {
		part.Set(accountTitle(line.account))
		part.Show()
		row.Hide()
		return
	}
	part.Hide()
	row.Show()
	check, title, note := row.Objects[0].(*widget.Check), row.Objects[1].(*widgets.Line), row.Objects[2].(*widgets.Line)
	title.Set(line.key.Title)
	title.Hint = line.key.Title + ": " + line.key.Sentence
	if c.stage.assessed(line.key.Key) {
		note.Set(unitOf(line.key))
	} else {
		note.Set("not assessed")
	}
	check.OnChanged = nil
	check.SetChecked(c.marked[line.key.Key])
	check.OnChanged = func(on bool) { c.set(line.key.Key, on) }
}

func (c *chooser) set(key string, on bool) {
	if c.marked[key] == on {
		return
	}
	c.marked[key] = on
	c.save()
}

func (c *chooser) save() {
	keys := []string{}
	for _, k := range c.stage.all {
		if c.marked[k.Key] {
			keys = append(keys, k.Key)
		}
	}
	c.stage.setColumns(keys)
}
