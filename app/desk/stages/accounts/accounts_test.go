package accounts

import (
	"context"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
	"groundtally/app/draw"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
)

// open shows the pane on the computed sample.
func open(t testing.TB, every int, width, height float32) (*desktest.Bench, *stage) {
	t.Helper()
	b := desktest.New(t, every)
	b.Settle()
	s := newStage(b.Core)
	b.Core.OnChange(s.Changed)
	b.Show(s.Content(), width, height)
	settled(b, s)
	return b, s
}

// settled waits until the table shows what was asked for last.
func settled(b *desktest.Bench, s *stage) {
	b.T.Helper()
	b.Settle()
	b.Until("the table is listed", func() bool {
		s.lister.mu.Lock()
		defer s.lister.mu.Unlock()
		return !s.lister.running && s.list != nil && s.list.results == b.Core.View().Results
	})
	b.Pump()
}

// cells gives the cells of the table that are on the screen, by place.
func cells(s *stage) map[widget.TableCellID]*cell {
	out := map[widget.TableCellID]*cell{}
	var walk func(o fyne.CanvasObject)
	walk = func(o fyne.CanvasObject) {
		switch x := o.(type) {
		case *cell:
			out[x.id] = x
		case *fyne.Container:
			for _, o := range x.Objects {
				walk(o)
			}
		case fyne.Widget:
			for _, o := range test.WidgetRenderer(x).Objects() {
				walk(o)
			}
		}
	}
	walk(s.grid)
	return out
}

// headers gives the heads of the columns on the screen, by column.
func headers(s *stage) map[int]*header {
	out := map[int]*header{}
	var walk func(o fyne.CanvasObject)
	walk = func(o fyne.CanvasObject) {
		switch x := o.(type) {
		case *header:
			out[x.col] = x
		case *fyne.Container:
			for _, o := range x.Objects {
				walk(o)
			}
		case fyne.Widget:
			for _, o := range test.WidgetRenderer(x).Objects() {
				walk(o)
			}
		}
	}
	walk(s.grid)
	return out
}

// without takes layers of roles out of the study, so that values become unknown.
func without(b *desktest.Bench, roles ...string) {
	b.Core.Edit("take layers out", func(ctx context.Context, st *study.Study) error {
		snap, err := st.Snapshot()
		if err != nil {
			return err
		}
		for _, r := range roles {
			for _, l := range snap.LayersOf(r) {
				if err := st.RemoveLayer(ctx, l.Name, "test"); err != nil {
					return err
				}
			}
		}
		return nil
	}, nil)
}

func column1(s *stage, key string) int { return slices.Index(s.visible, key) + 1 }

func TestPictures(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	without(b, "soil", "habitat")
	b.Core.Set("limit", "test", study.SettingEdit{Key: "limit.nearest_dwelling_m", Value: "300"})
	settled(b, s)
	b.Core.Choose(s.list.results.Candidates[s.list.rows[1]].ID(), s.list.results.Candidates[s.list.rows[3]].ID())
	b.Shoot("accounts-520")
	b.Window.Resize(fyne.NewSize(760, 560))
	s.setColumns([]string{"rated_kw", "nearest_dwelling_m", "flicker_h_per_yr", "connection_spare_kw", "soil_carbon_loss_tc"})
	settled(b, s)
	b.Shoot("accounts-760")
	b.Window.Resize(fyne.NewSize(430, 470))
	s.key.SetSelected("Rated power")
	s.number.SetText("2000")
	settled(b, s)
	b.Shoot("accounts-430")
	s.chooseColumns()
	b.Shoot("accounts-columns")
}

func TestSortsByTapAndByKey(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	order := slices.Clone(s.list.rows)
	col := column1(s, "rated_kw")
	test.Tap(headers(s)[col])
	settled(b, s)
	values := func() (out []float64) {
		for _, i := range s.list.rows {
			if q, ok := s.list.results.Candidates[i].Consequence("rated_kw"); ok && q.State == scoring.Number {
				out = append(out, q.Central)
			}
		}
		return out
	}
	if v := values(); v[0] == v[len(v)-1] || !slices.IsSortedFunc(v, func(a, b float64) int { return int(b - a) }) {
		t.Errorf("best first gives %v", v)
	}
	if h := headers(s)[col]; !strings.HasSuffix(h.now.unit, "↓") || !strings.HasPrefix(h.now.unit, "kW") {
		t.Errorf("the head says %q", h.now.unit)
	}
	b.Window.Canvas().Focus(s.grid)
	for s.grid.column != col {
		s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyRight})
	}
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyReturn})
	settled(b, s)
	if v := values(); !slices.IsSorted(v) {
		t.Errorf("worst first gives %v", v)
	}
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyReturn})
	settled(b, s)
	if !slices.Equal(s.list.rows, order) {
		t.Error("a third time does not bring the order of the study back")
	}
}

// The sorting of columns agrees with the one home of ranking states.
func TestSortAgreesWithRun(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	without(b, "soil")
	settled(b, s)
	cat := b.Core.Parts.Catalog
	seen := map[scoring.State]bool{}
	for _, k := range s.all {
		col := newColumn(s.list.results, k.Key)
		var rows []int32
		var list []*run.Candidate
		for i := range s.list.results.Candidates {
			rows = append(rows, int32(i))
			list = append(list, &s.list.results.Candidates[i])
			if q, ok := list[i].Consequence(k.Key); ok {
				seen[q.State] = true
			}
		}
		sortRows(rows, col, better(cat, k.Key), bestFirst)
		run.SortBy(list, cat, k.Key)
		for at, i := range rows {
			// Equals stand in the order of the study here, by name there.
			a, _ := s.list.results.Candidates[i].Consequence(k.Key)
			o, _ := list[at].Consequence(k.Key)
			if a.State == scoring.Number && (o.State != scoring.Number || a.Central != o.Central) {
				t.Fatalf("%s: place %d has %v, run.SortBy has %v", k.Key, at, a.Central, o)
			}
		}
		sortRows(rows, col, better(cat, k.Key), worstFirst)
		for at := 1; at < len(rows); at++ {
			x, y := col.state[rows[at-1]], col.state[rows[at]]
			if x != uint8(scoring.Number) && x != uint8(scoring.Never) && x != uint8(scoring.None) && y == uint8(scoring.Number) {
				t.Fatalf("%s: what has no value stands before a number", k.Key)
			}
		}
	}
	for _, st := range []scoring.State{scoring.Number, scoring.Unknown, scoring.None} {
		if !seen[st] {
			t.Errorf("the sample shows no state %v, so the test says nothing of it", st)
		}
	}
}

func TestSortRowsRanksStates(t *testing.T) {
	c := &column{state: []uint8{missing, uint8(scoring.Never), 0, uint8(scoring.Unknown), 0, uint8(scoring.None)}, central: []float64{0, 0, 5, 0, 3, 0}}
	rows := []int32{0, 1, 2, 3, 4, 5}
	sortRows(rows, c, criteria.Less, bestFirst)
	if want := []int32{5, 4, 2, 3, 0, 1}; !slices.Equal(rows, want) {
		t.Errorf("best first %v, want %v", rows, want)
	}
	sortRows(rows, c, criteria.Less, worstFirst)
	if want := []int32{1, 2, 4, 5, 3, 0}; !slices.Equal(rows, want) {
		t.Errorf("worst first %v, want %v", rows, want)
	}
}

func TestFilters(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	all := len(s.list.results.Candidates)
	fitted := len(s.list.rows)
	if fitted == 0 || fitted == all {
		t.Fatalf("%d of %d fitted: nothing to filter", fitted, all)
	}
	if want := core.Count(fitted) + " of " + core.Count(all) + " candidates"; s.count.Text != want {
		t.Errorf("the count says %q, want %q", s.count.Text, want)
	}
	s.status.SetSelected("All")
	settled(b, s)
	if len(s.list.rows) != all {
		t.Errorf("all lists %d of %d", len(s.list.rows), all)
	}
	test.Type(s.words, "no such site")
	settled(b, s)
	if !s.grid.empty.Visible() {
		t.Error("an empty table says nothing")
	}
	s.words.SetText("")
	s.status.SetSelected("No room")
	settled(b, s)
	for _, i := range s.list.rows {
		if c := s.list.results.Candidates[i]; c.Status != run.NoRoom {
			t.Fatalf("%s is %s", c.ID(), c.Status)
		}
	}
	if c := cells(s)[widget.TableCellID{Row: 0, Col: column1(s, "delivered_mwh_per_yr")}]; c == nil || c.now.text != "without room" {
		t.Errorf("a candidate without room shows %+v", c)
	}
	s.status.SetSelected("Fitted")
	s.plant.SetSelected(b.Core.PlantTitle("wind"))
	settled(b, s)
	n := len(s.list.rows)
	for _, i := range s.list.rows {
		if s.list.results.Candidates[i].Plant != "wind" {
			t.Fatal("another plant option is listed")
		}
	}
	if n == 0 || n == fitted {
		t.Fatalf("%d of %d for one option", n, fitted)
	}
	s.plant.SetSelectedIndex(0)
	site := s.list.results.Candidates[s.list.rows[0]].Site
	test.Type(s.words, strings.ToUpper(site)+" wind")
	settled(b, s)
	if len(s.list.rows) == 0 {
		t.Fatal("nothing is found by site and plant")
	}
	for _, i := range s.list.rows {
		if c := s.list.results.Candidates[i]; !strings.Contains(strings.ToLower(c.Site), strings.ToLower(site)) || !strings.Contains(strings.ToLower(b.Core.PlantTitle(c.Plant)), "wind") {
			t.Errorf("%s is listed", c.ID())
		}
	}
	s.words.SetText("")
	s.key.SetSelected(b.Core.Info("connection_km").Title)
	if s.unit.Text != "km" {
		t.Errorf("the unit beside the number is %q", s.unit.Text)
	}
	test.Type(s.number, "1,5")
	settled(b, s)
	low := len(s.list.rows)
	for _, i := range s.list.rows {
		if q, ok := s.list.results.Candidates[i].Consequence("connection_km"); !ok || q.State != scoring.Number || q.Central > 1.5 {
			t.Fatal("beyond the number")
		}
	}
	without := s.list.without
	if without > 0 != s.left.Visible() || without > 0 && !strings.HasPrefix(s.left.Text, core.Count(without)+" ") {
		t.Errorf("%d left out, the line says %q", without, s.left.Text)
	}
	s.bounds.SetSelected("at least")
	settled(b, s)
	if high := len(s.list.rows); low == 0 || high == 0 || low+high+without != fitted {
		t.Errorf("%d at most, %d at least, %d without a value, of %d", low, high, without, fitted)
	}
	s.number.SetText("abc")
	settled(b, s)
	if s.unit.Text != "no number" || len(s.list.rows) != fitted {
		t.Errorf("a text that is no number: %q, %d listed", s.unit.Text, len(s.list.rows))
	}
}

func TestChoosingGoesBothWays(t *testing.T) {
	b, s := open(t, 12, 520, 480)
	tap := func(row int, m fyne.KeyModifier) {
		c := cells(s)[widget.TableCellID{Row: row, Col: 1}]
		c.MouseDown(&desktop.MouseEvent{Button: desktop.MouseButtonPrimary, Modifier: m})
		test.Tap(c)
		b.Pump()
	}
	id := func(row int) string { return s.list.results.Candidates[s.list.rows[row]].ID() }
	tap(1, 0)
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(1)}) {
		t.Fatalf("chosen %v", got)
	}
	tap(3, fyne.KeyModifierControl)
	tap(2, fyne.KeyModifierShift)
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(1), id(3), id(2)}) {
		t.Fatalf("chosen %v", got)
	}
	for row, letter := range map[int]string{1: "A", 3: "B", 2: "C", 0: ""} {
		if c := cells(s)[widget.TableCellID{Row: row}]; c.now.letter != letter || c.now.chosen != (letter != "") {
			t.Errorf("row %d has the letter %q", row, c.now.letter)
		}
	}
	tap(3, fyne.KeyModifierControl)
	if got := b.Core.ChosenIDs(); len(got) != 2 {
		t.Errorf("a second tap with control leaves %v", got)
	}
	visible := func(row int) bool {
		for place := range cells(s) {
			if place.Row == row && place.Col == 0 {
				y := cells(s)[place].Position().Y
				return y >= -1 && y+2*rowHeight <= s.grid.Size().Height+1
			}
		}
		return false
	}
	for _, row := range []int{len(s.list.rows) - 1, 40, 41, 39, 0, 1, 20} {
		b.Core.Choose(id(row)) // as on the map
		b.Pump()
		if !visible(row) {
			t.Errorf("row %d was chosen elsewhere and is not seen", row)
		}
	}
	b.Core.Choose(id(0))
	b.Window.Canvas().Focus(s.grid)
	if !s.grid.frame.Visible() {
		t.Error("the keyboard's place is not seen")
	}
	for range 12 {
		s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyDown})
	}
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(12)}) || !visible(12) {
		t.Errorf("twelve times down chooses %v", got)
	}
	for range 12 {
		s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyUp})
	}
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(0)}) || !visible(0) {
		t.Errorf("and up again %v", got)
	}
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeyEnd})
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(len(s.list.rows) - 1)}) {
		t.Errorf("end chooses %v", got)
	}
	s.grid.TypedKey(&fyne.KeyEvent{Name: fyne.KeySpace})
	if got := b.Core.ChosenIDs(); len(got) != 0 {
		t.Errorf("space leaves %v chosen", got)
	}
}

func TestHiddenColumnsAreCountedNamedAndRemembered(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	hidden := len(s.all) - len(s.visible)
	if want := core.Count(hidden) + " columns hidden: "; !strings.HasPrefix(s.hidden.Text, want) || !strings.Contains(s.hidden.Hint, b.Core.Info("flicker_h_per_yr").Title) {
		t.Errorf("the line says %q", s.hidden.Text)
	}
	if len(s.visible) != len(usualColumns) {
		t.Errorf("%v are visible", s.visible)
	}
	c := s.chooseColumns()
	line := slices.IndexFunc(c.lines, func(e entry) bool { return e.key.Key == "noise_dba" })
	o := c.list.CreateItem()
	c.list.UpdateItem(line, o)
	test.Tap(o.(*fyne.Container).Objects[0].(*fyne.Container).Objects[0].(*widget.Check))
	settled(b, s)
	if !slices.Contains(s.visible, "noise_dba") || strings.Contains(s.hidden.Hint, b.Core.Info("noise_dba").Title) {
		t.Error("a marked column stays hidden")
	}
	if got := cells(s)[widget.TableCellID{Row: 0, Col: len(s.visible)}]; got == nil && len(s.grid.keys) != len(s.visible) {
		t.Error("the table has no such column")
	}
	if again := newStage(b.Core); !slices.Equal(again.visible, s.visible) {
		t.Errorf("the choice is not remembered: %v", again.visible)
	}
	s.grid.onHide("rated_kw")
	settled(b, s)
	if slices.Contains(s.visible, "rated_kw") || !strings.Contains(s.hidden.Hint, b.Core.Info("rated_kw").Title) {
		t.Error("hiding does not name the column")
	}
	c.set("rated_kw", true)
	all := c.lines
	for _, e := range all {
		if e.account == "" {
			c.set(e.key.Key, true)
		}
	}
	settled(b, s)
	if s.hidden.Text != "No column is hidden" {
		t.Errorf("with all columns the line says %q", s.hidden.Text)
	}
}

func TestCellsSayStates(t *testing.T) {
	b, s := open(t, 60, 900, 560)
	at := func(cand, key string) content {
		c := content{}
		for row, i := range s.list.rows {
			if s.list.results.Candidates[i].ID() == cand {
				c = s.grid.content(widget.TableCellID{Row: row, Col: column1(s, key)})
			}
		}
		return c
	}
	all := []string{}
	for _, k := range s.all {
		all = append(all, k.Key)
	}
	s.setColumns(all)
	without(b, "soil")
	b.Core.Set("limit", "test", study.SettingEdit{Key: "limit.connection_km", Value: "0.1", Source: "test"})
	settled(b, s)
	found := map[scoring.State]bool{}
	warm := 0
	for _, i := range s.list.rows {
		c := &s.list.results.Candidates[i]
		for _, q := range c.All() {
			n := at(c.ID(), q.Key)
			found[q.State] = true
			switch {
			case q.State == scoring.Number && (n.text == "" || n.unknown || n.word):
				t.Fatalf("%s %s shows %+v", c.ID(), q.Key, n)
			case q.State == scoring.Unknown && (!n.unknown || n.text != "unknown" || n.bar):
				t.Fatalf("%s %s is unknown and shows %+v", c.ID(), q.Key, n)
			case q.State != scoring.Number && (n.text == "0" || n.text == ""):
				t.Fatalf("%s %s is %v and shows %q", c.ID(), q.Key, q.State, n.text)
			}
			if over := slices.Contains(c.OverLimit, q.Key); over != n.warm || over && n.sub != "over" {
				t.Fatalf("%s %s: over the limit %v, shows %+v", c.ID(), q.Key, over, n)
			} else if over {
				warm++
			}
		}
	}
	if warm == 0 || !found[scoring.Unknown] || !found[scoring.NotAssessed] || !found[scoring.None] {
		t.Errorf("the test saw too little: %d over, states %v", warm, found)
	}
	if _, second, alarm := s.State(); !alarm || !strings.HasSuffix(second, "over a limit") {
		t.Errorf("the rail says %q", second)
	}
	for _, i := range s.list.rows[:1] {
		c := &s.list.results.Candidates[i]
		if text := inFull(b.Core, c, "connection_km"); !strings.Contains(text, " km") || !strings.Contains(text, "over the limit of 0.1 km") {
			t.Errorf("the hint says %q", text)
		}
	}
}

// chooseFromMenu opens the menu of the marked column with the keyboard and takes an item.
func chooseFromMenu(t *testing.T, b *desktest.Bench, s *stage, words string) {
	t.Helper()
	b.Window.Canvas().Focus(s.grid)
	s.grid.TypedRune('m')
	if !tapLabelled(b.Window.Canvas().Overlays().Top(), words) {
		t.Fatalf("no menu with %q", words)
	}
}

// tapLabelled taps the innermost thing that has these words on it.
func tapLabelled(o fyne.CanvasObject, words string) bool {
	inner := func() []fyne.CanvasObject {
		switch x := o.(type) {
		case *fyne.Container:
			return x.Objects
		case fyne.Widget:
			return test.WidgetRenderer(x).Objects()
		}
		return nil
	}()
	for _, i := range inner {
		if tapLabelled(i, words) {
			return true
		}
	}
	if tap, ok := o.(fyne.Tappable); ok && slices.ContainsFunc(labels(o), func(l string) bool { return strings.Contains(l, words) }) {
		test.Tap(tap)
		return true
	}
	return false
}

func labels(o fyne.CanvasObject) (out []string) {
	switch x := o.(type) {
	case *canvas.Text:
		return []string{x.Text}
	case *fyne.Container:
		for _, o := range x.Objects {
			out = append(out, labels(o)...)
		}
	case fyne.Widget:
		for _, o := range test.WidgetRenderer(x).Objects() {
			out = append(out, labels(o)...)
		}
	}
	return out
}

func TestMenuOfAColumn(t *testing.T) {
	b, s := open(t, 60, 760, 480)
	s.grid.column = column1(s, "net_share")
	chooseFromMenu(t, b, s, "Shade the map")
	b.Pump()
	if b.Core.Shade() != "net_share" {
		t.Errorf("the map shows %q", b.Core.Shade())
	}
	if h := headers(s)[column1(s, "net_share")]; h == nil || !h.now.shades {
		t.Error("the head does not say that the map shows it")
	}
	b.Core.SetShade("") // elsewhere
	if h := headers(s)[column1(s, "net_share")]; h.now.shades {
		t.Error("the head still says so")
	}
	chooseFromMenu(t, b, s, "Hide")
	settled(b, s)
	if slices.Contains(s.visible, "net_share") {
		t.Error("the column is not hidden")
	}
}

func TestEnergyReturnsStandTogether(t *testing.T) {
	b, s := open(t, 60, 760, 560)
	a, z := s.list.results.Candidates[s.list.rows[0]].ID(), s.list.results.Candidates[s.list.rows[1]].ID()
	b.Core.Choose(a, z)
	shown := 0
	for _, row := range s.returns.rows {
		for i, id := range []string{a, z} {
			c := &s.list.results.Candidates[b.Core.View().Index.ByID[id]]
			q, ok := c.Consequence(row.key)
			if !ok {
				t.Fatalf("%s is not among the results", row.key)
			}
			l := row.lines[i]
			if !l.all.Visible() || l.value.Text == "" || q.State == scoring.Unknown && l.value.Text != "unknown" {
				t.Errorf("%s of %s shows %q", row.key, id, l.value.Text)
			}
			shown++
		}
		if row.lines[2].all.Visible() {
			t.Error("a third line for two candidates")
		}
	}
	if shown < 10 {
		t.Errorf("%d figures are shown", shown)
	}
	tabs := findTabs(s.content)
	tabs.Choose(1)
	b.Shoot("accounts-returns-760")
	b.Window.Resize(fyne.NewSize(430, 470))
	b.Shoot("accounts-returns-430")
	tabs.Choose(6)
	b.Shoot("accounts-notassessed-430")
}

func TestStateFollowsTheComputing(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	if first, second, warm := s.State(); !strings.HasSuffix(first, " consequences") || second != "all current" || warm {
		t.Errorf("at rest: %q, %q, %v", first, second, warm)
	}
	b.Core.Set("rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "900"})
	b.Until("the edit is seen", func() bool { return !b.Core.View().Current })
	if _, second, _ := s.State(); second != "being computed" {
		t.Errorf("while computing: %q", second)
	}
	if !strings.Contains(s.count.Text, "being computed") {
		t.Errorf("the count passes for current: %q", s.count.Text)
	}
	before := s.list.results
	settled(b, s)
	if s.list.results == before || strings.Contains(s.count.Text, "being") {
		t.Error("the table stays with the state before")
	}
}

func TestShadesKeepContrast(t *testing.T) {
	for _, p := range []draw.Palette{draw.Light(), draw.Dark()} {
		for v := 0.0; v <= 1; v += 0.05 {
			if c := draw.Contrast(p.Ink, shadeOf(p, v)); c < 4.5 {
				t.Errorf("text on the shade of %.2f has a contrast of %.1f", v, c)
			}
		}
		if draw.Contrast(shadeOf(p, 0), shadeOf(p, 1)) < 1.3 {
			t.Error("the shades of least and most look alike")
		}
	}
	for _, m := range []theme.Mode{theme.Light, theme.Dark} {
		tint := theme.New(m).Color(theme.Tint, 0)
		r, g, bl, _ := tint.RGBA()
		hex := hexOf(uint8(r>>8), uint8(g>>8), uint8(bl>>8))
		if c := draw.Contrast(theme.New(m).Palette(0).Ink, hex); c < 4.5 {
			t.Errorf("text on a chosen row has a contrast of %.1f", c)
		}
	}
}

func hexOf(r, g, b uint8) string {
	const digits = "0123456789abcdef"
	out := "#"
	for _, x := range []uint8{r, g, b} {
		out += string(digits[x>>4]) + string(digits[x&15])
	}
	return out
}

var _ core.Stage = (*stage)(nil)

// tabbed is what a test needs of a row of tabs.
type tabbed interface{ Choose(i int) }

func findTabs(o fyne.CanvasObject) tabbed {
	switch x := o.(type) {
	case tabbed:
		return x
	case *fyne.Container:
		for _, o := range x.Objects {
			if t := findTabs(o); t != nil {
				return t
			}
		}
	}
	return nil
}
