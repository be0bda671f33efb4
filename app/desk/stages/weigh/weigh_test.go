package weigh

import (
	"math"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
)

// open shows the stage on the sample with every n-th parcel.
func open(t testing.TB, every int, width, height float32) (*desktest.Bench, *stage) {
	t.Helper()
	b := desktest.New(t, every)
	s := New(b.Core).(*stage)
	b.Core.OnChange(s.Changed)
	b.Settle()
	b.Show(s.Content(), width, height)
	settle(b, s)
	return b, s
}

// settle waits until what the study says is shown.
func settle(b *desktest.Bench, s *stage) {
	b.T.Helper()
	b.Settle()
	b.Until("the facts are there", func() bool { return s.facts != nil && s.facts.order == b.Core.Order() })
}

func rowOf(t *testing.T, s *stage, key string) *weightRow {
	t.Helper()
	w := s.panes[weightsTab].(*weights)
	i := slices.IndexFunc(w.rows, func(r *weightRow) bool { return r.key == key })
	if i < 0 {
		t.Fatalf("%s is not weighed", key)
	}
	return w.rows[i]
}

func saved(b *desktest.Bench, key string) float64 {
	x, _ := b.Core.View().Snap.Number("voice." + b.Core.Voice() + ".weight." + key)
	return x
}

// dragTo drags a slider in steps, as a hand does.
func dragTo(b *desktest.Bench, s *slider, points float64, steps int, between func()) {
	from := s.points
	for i := 1; i <= steps; i++ {
		p := from + (points-from)*float64(i)/float64(steps)
		x := knobSize/2 + float32(p/mostPoints)*(s.Size().Width-knobSize)
		s.Dragged(&fyne.DragEvent{PointEvent: fyne.PointEvent{Position: fyne.NewPos(x, 10)}, Dragged: fyne.NewDelta(1, 0)})
		if between != nil {
			between()
		}
	}
	s.DragEnd()
}

// under finds the objects of a kind in something shown.
func under[T fyne.CanvasObject](o fyne.CanvasObject) []T {
	var out []T
	if t, ok := o.(T); ok && o.Visible() {
		out = append(out, t)
	}
	var children []fyne.CanvasObject
	switch x := o.(type) {
	case *fyne.Container:
		children = x.Objects
	case fyne.Widget:
		children = test.WidgetRenderer(x).Objects()
	}
	for _, child := range children {
		out = append(out, under[T](child)...)
	}
	return out
}

// dialogParts gives the entries of the dialog on top, and a way to press its buttons.
func dialogParts(t *testing.T, b *desktest.Bench) (entries []*widget.Entry, press func(text string)) {
	t.Helper()
	top := b.Window.Canvas().Overlays().Top()
	if top == nil {
		t.Fatal("there is no dialog")
	}
	return under[*widget.Entry](top), func(text string) {
		t.Helper()
		for _, x := range under[*widget.Button](top) {
			if x.Text == text {
				test.Tap(x)
				b.Pump()
				return
			}
		}
		t.Fatalf("the dialog has no button %q", text)
	}
}

// A weight is dragged: the order changes meanwhile, nothing is saved before the end, then one edit is.
func TestDragChangesTheOrderAndSavesOnce(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	r := rowOf(t, s, "connection_km")
	w := s.panes[weightsTab].(*weights)
	journal := len(b.Core.View().Journal)
	seen := map[string]bool{}
	dragTo(b, r.slider, 100, 20, func() {
		if len(b.Core.View().Journal) != journal {
			t.Fatal("saved while dragging")
		}
		b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[6] == r.slider.points })
		seen[w.order[0].title.Text] = true
		if !b.Core.Trying() || s.head.state.Text != "being tried out" || !s.head.keep.Visible() {
			t.Fatal("it is not said that weights are tried out")
		}
	})
	if len(seen) < 2 {
		t.Errorf("the short order shows %v while dragging", seen)
	}
	settle(b, s)
	if n := len(b.Core.View().Journal); n != journal+1 {
		t.Errorf("%d journal entries instead of one", n-journal)
	}
	if saved(b, "connection_km") != 100 || s.head.state.Text != "saved" || s.head.keep.Visible() {
		t.Errorf("saved %g, state %q", saved(b, "connection_km"), s.head.state.Text)
	}
	if got := w.order[0].title.Text; got != b.Core.IDTitle(b.Core.Order().Order[0].ID()) {
		t.Errorf("the short order begins with %q, the saved order does not", got)
	}
	sum := 0.0
	for _, x := range b.Core.Raw() {
		sum += x
	}
	if want := percentWords(100 / sum); r.share.Text != want || r.points.Text != "100" {
		t.Errorf("share %q, want %q; points %q", r.share.Text, want, r.points.Text)
	}
	b.Core.Undo()
	settle(b, s)
	if saved(b, "connection_km") == 100 || r.points.Text == "100" {
		t.Error("undo did not take the drag back")
	}
}

// The keyboard tries weights out; escape goes back to what is saved, return saves.
func TestKeyboardTriesKeepsAndDrops(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	r := rowOf(t, s, "noise_dba")
	was := saved(b, "noise_dba")
	b.Window.Canvas().Focus(r.slider)
	key := func(names ...fyne.KeyName) {
		for _, n := range names {
			b.Window.Canvas().Focused().TypedKey(&fyne.KeyEvent{Name: n})
		}
	}
	key(fyne.KeyRight, fyne.KeyRight, fyne.KeyPageUp)
	b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[4] == was+12 })
	if r.points.Text != pointWords(was+12) || !b.Core.Trying() {
		t.Fatalf("points %q", r.points.Text)
	}
	key(fyne.KeyEscape)
	settle(b, s)
	if b.Core.Trying() || r.slider.points != was || saved(b, "noise_dba") != was {
		t.Fatal("escape did not go back")
	}
	key(fyne.KeyEnd, fyne.KeyReturn)
	settle(b, s)
	if saved(b, "noise_dba") != 100 {
		t.Errorf("return saved %g", saved(b, "noise_dba"))
	}
	key(fyne.KeyHome)
	b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[4] == 0 })
	test.Tap(s.head.back)
	settle(b, s)
	if saved(b, "noise_dba") != 100 || r.slider.points != 100 {
		t.Error("the button did not go back to the saved weights")
	}
	b.Window.Canvas().Focus(r.slider)
	key(fyne.KeyHome)
	test.Tap(s.head.keep)
	settle(b, s)
	if saved(b, "noise_dba") != 0 {
		t.Error("the button did not save")
	}
}

// Points typed beyond the end of the slider are not cut by the keyboard; a button that goes leaves the
// keyboard in the pane.
func TestPointsBeyondTheSlider(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	r := rowOf(t, s, "noise_dba")
	s.tryOne("noise_dba", 250)
	s.save()
	settle(b, s)
	b.Window.Canvas().Focus(r.slider)
	for _, c := range []struct {
		key  fyne.KeyName
		want float64
	}{{fyne.KeyRight, 250}, {fyne.KeyLeft, 249}, {fyne.KeyHome, 0}, {fyne.KeyEnd, 100}} {
		r.slider.TypedKey(&fyne.KeyEvent{Name: c.key})
		if r.slider.points != c.want {
			t.Errorf("%s gives %g, want %g", c.key, r.slider.points, c.want)
		}
	}
	b.Window.Canvas().Focus(s.head.back)
	if b.Window.Canvas().Focused() != s.head.back || s.head.back.Position().X < s.head.keep.Position().X+s.head.keep.Size().Width {
		t.Fatalf("focus on %T; the buttons stand at %v and %v", b.Window.Canvas().Focused(), s.head.keep.Position(), s.head.back.Position())
	}
	s.head.back.TypedKey(&fyne.KeyEvent{Name: fyne.KeySpace})
	settle(b, s)
	if saved(b, "noise_dba") != 250 || b.Window.Canvas().Focused() != s.head.choice {
		t.Errorf("saved %g, focus on %T", saved(b, "noise_dba"), b.Window.Canvas().Focused())
	}
}

func TestEndsSource(t *testing.T) {
	for text, want := range map[string]string{
		"ends of the scale [wind.md 11: R2]; WHO [memory]": "ends of the scale; WHO; default, unverified",
		"guidance of 2009 [wind.md check 27]":              "guidance of 2009",
	} {
		if got := endsSource(text); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
}

func TestTypedWeights(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	told := ""
	b.Core.Tell = func(words string) { told = words }
	r := rowOf(t, s, "habitat_ha_per_gwh")
	for _, c := range []struct {
		typed string
		want  float64
	}{{"37.5", 37.5}, {"12,5", 12.5}, {"250", 250}, {"-4", 250}, {"much", 250}} {
		b.Window.Canvas().Focus(r.points)
		r.points.SetText("")
		test.Type(r.points, c.typed)
		told = ""
		b.Window.Canvas().Unfocus()
		settle(b, s)
		if got := saved(b, "habitat_ha_per_gwh"); got != c.want || r.points.Text != pointWords(c.want) {
			t.Errorf("typed %q: saved %g, shown %q, want %g", c.typed, got, r.points.Text, c.want)
		}
		if refused := c.typed == "-4" || c.typed == "much"; refused != (told != "") {
			t.Errorf("typed %q: told %q", c.typed, told)
		}
	}
}

// Without any weight there is no order; that is said, and not saved.
func TestNoWeightAtAll(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	journal := len(b.Core.View().Journal)
	b.Core.Try(make([]float64, len(b.Core.View().Board.Keys)))
	b.Until("the ranking fails", func() bool { return b.Core.Ranking().Err != nil })
	s.save()
	w := s.panes[weightsTab].(*weights)
	if !strings.Contains(w.problem.Text, "at least one") || w.order[0].Visible() || len(b.Core.View().Journal) != journal || s.head.state.Text != "give something a weight" {
		t.Errorf("problem %q, state %q", w.problem.Text, s.head.state.Text)
	}
	for i := range tabCount { // none of the parts falls over it
		s.tabs.Choose(i)
		b.Pump()
	}
	s.tabs.Choose(weightsTab)
	s.back()
	settle(b, s)
	if w.problem.Text != "" || !w.order[0].Visible() {
		t.Error("the order did not come back")
	}
}

// Swing points said to tip the first place do so: just short of them the leader stays, just beyond the
// named one leads.
func TestTippingPointsHold(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	checked := 0
	for _, voice := range b.Core.View().Snap.Voices() {
		b.Core.SetVoice(voice)
		settle(b, s)
		o := b.Core.Order()
		leader := o.Order[0].ID()
		raw := b.Core.Raw()
		for k, key := range b.Core.View().Board.Keys {
			i := slices.IndexFunc(o.Tipping, func(x run.TippingRow) bool { return x.Key == key.Info.Key })
			if i < 0 {
				continue
			}
			for side, at := range map[float64]*run.TippingSide{-1: o.Tipping[i].Below, 1: o.Tipping[i].Above} {
				if at == nil {
					continue
				}
				points, ok := pointsAt(at.At, total(raw)-raw[k])
				if !ok {
					continue
				}
				for _, beyond := range []float64{-1, 1} {
					other := slices.Clone(raw)
					// Two that are nearly alike in the key need a step that moves their scores by more than what counts as a tie.
					other[k] = points * (1 + 1e-5*side*beyond)
					b.Core.Try(other)
					b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[k] == other[k] })
					first := b.Core.Ranking().Board.IDs[b.Core.Ranking().Standing.Order[0]]
					want := leader
					if beyond > 0 {
						want = at.NewFirst
					}
					if first != want {
						t.Errorf("%s, %s at %g points: %s leads, want %s", voice, key.Info.Key, other[k], first, want)
					}
					checked++
				}
			}
		}
		s.back()
		settle(b, s)
	}
	if checked < 6 {
		t.Fatalf("only %d tipping weights", checked)
	}
}

func TestMarksStandAtTheTippingPoints(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	o := b.Core.Order()
	raw := b.Core.Raw()
	w := s.panes[weightsTab].(*weights)
	marks := 0
	for k, r := range w.rows {
		for _, m := range r.slider.marks {
			share := m / (m + total(raw) - raw[k])
			i := slices.IndexFunc(o.Tipping, func(x run.TippingRow) bool { return x.Key == r.key })
			near := func(side *run.TippingSide) bool { return side != nil && math.Abs(side.At-share) < 1e-9 }
			if !near(o.Tipping[i].Below) && !near(o.Tipping[i].Above) {
				t.Errorf("%s: a mark at %g points is no tipping weight", r.key, m)
			}
			if !strings.Contains(r.tip.Text, pointWords(m)+":") {
				t.Errorf("%s: mark at %g, words %q", r.key, m, r.tip.Text)
			}
			marks++
		}
	}
	if marks == 0 {
		t.Fatal("no tipping weight is marked")
	}
	r := w.rows[0]
	b.Window.Canvas().Focus(r.slider)
	r.slider.TypedKey(&fyne.KeyEvent{Name: fyne.KeyRight})
	if len(r.slider.marks) != 0 || r.tip.Text != "" {
		t.Error("tipping weights of the saved weights stand beside others")
	}
}

// Another consequence is weighed: at once where the ends of its scale are known, else after asking.
func TestWeighAnother(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	c := b.Core
	for _, k := range addable(s) {
		if k.Key == "noise_dba" {
			t.Fatal("what is weighed is offered again")
		}
	}
	askKey(s)
	entries, press := dialogParts(t, b)
	test.Type(entries[0], "visible_turbines_nothing")
	press("Weigh it")
	settle(b, s)
	if n := len(c.View().Board.Keys); n != 7 {
		t.Fatalf("%d keys after choosing nothing", n)
	}
	known, asked := "", ""
	for _, k := range addable(s) {
		worst, best := ends(c.View().Snap, k.Key)
		switch {
		case worst != "" && best != "" && known == "":
			known = k.Key
		case (worst == "" || best == "") && asked == "":
			asked = k.Key
		}
	}
	choice := func(key string) {
		askKey(s)
		entries, press := dialogParts(t, b)
		test.Type(entries[0], key)
		list := under[*widget.List](b.Window.Canvas().Overlays().Top())[0]
		list.Select(0)
		press("Weigh it")
	}
	choice(known)
	settle(b, s)
	if saved(b, known) != 50 || rowOf(t, s, known).slider.points != 50 {
		t.Fatalf("%s is not weighed with 50", known)
	}
	choice(asked)
	crit, _ := criterion(c.Parts.Catalog, asked)
	worst, best := "0", "100"
	if crit.Better == "less" {
		worst, best = best, worst
	}
	entries, press = dialogParts(t, b)
	entries[0].SetText(best) // the wrong way round
	entries[1].SetText(worst)
	if entries[1].Validate() == nil {
		t.Error("ends that stand the wrong way round are taken")
	}
	entries[0].SetText(worst)
	entries[1].SetText(best)
	if err := entries[1].Validate(); err != nil {
		t.Error(err)
	}
	journal := len(c.View().Journal)
	press("Weigh it")
	settle(b, s)
	if w, _ := c.View().Snap.Number("anchor." + asked + ".worst"); pointWords(w) != worst || saved(b, asked) != 50 || len(c.View().Journal) != journal+1 {
		t.Errorf("%s: worst %g, weight %g", asked, w, saved(b, asked))
	}
	rowOf(t, s, asked)
	askScale(s, asked)
	_, press = dialogParts(t, b)
	press("Stop weighing it, for every voice")
	settle(b, s)
	if slices.ContainsFunc(s.panes[weightsTab].(*weights).rows, func(r *weightRow) bool { return r.key == asked }) {
		t.Error("it is still weighed")
	}
}

// A weight without a value scale, as the terminal or a file may bring it, is shown with its cure.
func TestUnreadyKeyIsShownAndCured(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	const key = "flood_ha" // of a family that no voice weighs yet
	if worst, best := ends(b.Core.View().Snap, key); worst != "" || best == "" {
		t.Fatalf("its scale has the ends %q and %q", worst, best)
	}
	b.Core.Set("weigh", "test", study.SettingEdit{Key: "voice." + b.Core.Voice() + ".weight." + key, Value: "10"})
	b.Settle()
	w := s.panes[weightsTab].(*weights)
	if len(w.unready) != 1 || w.unready[0].key != key || w.unready[0].reason.Text != "the ends of its value scale are not set" {
		t.Fatalf("unready: %v", w.unready)
	}
	if _, second, warn := s.State(); !warn || !strings.Contains(second, "ends of a value scale") {
		t.Errorf("state %q", second)
	}
	test.Tap(under[*widget.Button](w.unready[0].box)[0])
	entries, press := dialogParts(t, b)
	entries[0].SetText("500")
	press("Set the ends")
	settle(b, s)
	if len(w.unready) != 0 {
		t.Error("it is still unready")
	}
	rowOf(t, s, key)
}

func TestNewVoiceCopiesThePresentOne(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	b.Core.SetVoice("residents")
	settle(b, s)
	was := b.Core.Raw()
	test.Tap(s.head.add)
	entries, press := dialogParts(t, b)
	test.Type(entries[0], "Bird Protection, north")
	if entries[1].Text != "bird_protection_north" {
		t.Fatalf("proposed name %q", entries[1].Text)
	}
	entries[1].SetText("farmers")
	if entries[1].Validate() == nil {
		t.Error("a name that is there is taken")
	}
	entries[1].SetText("birds")
	press("Add voice")
	settle(b, s)
	if b.Core.Voice() != "birds" || !slices.Equal(b.Core.Raw(), was) || s.head.choice.Selected != "Bird Protection, north" {
		t.Errorf("voice %q, weights %v, want %v", b.Core.Voice(), b.Core.Raw(), was)
	}
	test.Tap(s.head.rename)
	entries, press = dialogParts(t, b)
	entries[0].SetText("Bird society")
	press("Rename")
	settle(b, s)
	if b.Core.VoiceTitle("birds") != "Bird society" || s.head.choice.Selected != "Bird society" {
		t.Errorf("title %q", b.Core.VoiceTitle("birds"))
	}
	s.head.choice.SetSelected("Network operator")
	settle(b, s)
	if b.Core.Voice() != "operator" || rowOf(t, s, "connection_km").points.Text != "100" {
		t.Errorf("voice %q", b.Core.Voice())
	}
}

func TestState(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	first, second, warn := s.State()
	o := b.Core.Order()
	if !strings.HasPrefix(first, "3 voices, ") || !strings.Contains(second, o.Order[0].Site+": ") || warn {
		t.Errorf("%q, %q, %v", first, second, warn)
	}
	raw := b.Core.Raw()
	raw[0]++
	b.Core.Try(raw)
	if _, second, warn = s.State(); second != "weights being tried out" || !warn {
		t.Errorf("%q, %v", second, warn)
	}
}

func orderOf(s *stage) *order {
	s.tabs.Choose(orderTab)
	return s.panes[orderTab].(*order)
}

// Everything that is ordered is in the list, doing nothing too, with what was computed of it.
func TestOrderListsEverything(t *testing.T) {
	b, s := open(t, 60, 760, 560)
	o := orderOf(s)
	saved := b.Core.Order()
	if o.list.Length() != len(saved.Order) {
		t.Fatalf("%d rows, %d ordered", o.list.Length(), len(saved.Order))
	}
	nothing := false
	for i, item := range o.rows() {
		id, row := o.filtered.Board.IDs[item], s.facts.row(item)
		want := &saved.Order[i]
		nothing = nothing || id == run.NoSite
		if row != want || id != want.ID() || o.filtered.Standing.Tier[item] != want.Tier {
			t.Fatalf("row %d is %s, the order has %s/%s", i, id, want.Site, want.Plant)
		}
	}
	if !nothing {
		t.Error("doing nothing is not in the order")
	}
	for _, r := range under[*orderRow](o.list) {
		want := &saved.Order[o.filtered.Standing.Place[r.item]-1]
		sum := 0.0
		for _, p := range r.bar.parts {
			sum += p.share
		}
		if math.Abs(sum-want.Score) > 1e-9 || r.score.Text != scoreWords(want.Score) || r.firstIn.Text != share100(want.FirstIn100) {
			t.Errorf("%s: parts add up to %g, score %s, first in %s; want %g, %g", want.Site, sum, r.score.Text, r.firstIn.Text, want.Score, want.FirstIn100)
		}
	}
	if !strings.Contains(o.lead.Text, "leads with "+scoreWords(saved.Order[0].Score)) || !strings.Contains(o.lead.Text, "of 100 weight mixes") {
		t.Errorf("lead %q", o.lead.Text)
	}
}

func TestChooseInTheOrder(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	o := orderOf(s)
	rows := under[*orderRow](o.list)
	id := func(r *orderRow) string { return o.filtered.Board.IDs[r.item] }
	test.Tap(rows[1])
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(rows[1])}) {
		t.Fatalf("chosen %v", got)
	}
	if rows[1].badge.letter != "A" || !rows[1].chosen {
		t.Error("the row does not show that it is chosen")
	}
	rows[2].MouseDown(&desktop.MouseEvent{Modifier: fyne.KeyModifierControl})
	test.Tap(rows[2])
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{id(rows[1]), id(rows[2])}) {
		t.Fatalf("chosen %v", got)
	}
	key := func(n fyne.KeyName) { b.Window.Canvas().Focused().TypedKey(&fyne.KeyEvent{Name: n}) }
	key(fyne.KeyHome)
	key(fyne.KeyDown)
	key(fyne.KeyDown)
	key(fyne.KeyDown)
	key(fyne.KeyReturn)
	want := o.filtered.Board.IDs[o.rows()[3]]
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{want}) {
		t.Fatalf("return chose %v, want %s", got, want)
	}
	key(fyne.KeyEnd)
	b.Window.Canvas().Focused().TypedRune('+')
	if got := b.Core.ChosenIDs(); len(got) != 2 {
		t.Errorf("+ gave %v", got)
	}
	for at, item := range o.rows() {
		if o.filtered.candidate(item) == nil {
			o.list.at = at
			key(fyne.KeyReturn)
			if got := b.Core.ChosenIDs(); len(got) != 2 {
				t.Errorf("doing nothing was chosen: %v", got)
			}
		}
	}
}

// An unfolded row shows parts that add up, and stays unfolded where its candidate goes.
func TestUnfold(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	o := orderOf(s)
	rows := under[*orderRow](o.list)
	test.Tap(rows[0].fold)
	r := under[*orderRow](o.list)[0]
	if !r.unfolded || r.Size().Height != unfoldedHeight(7, r.Size().Width) {
		t.Fatalf("height %g", r.Size().Height)
	}
	if len(r.parts) != 7 || !strings.Contains(r.parts[6].cells[1].Text, " km") {
		t.Errorf("parts %d, value %q", len(r.parts), r.parts[6].cells[1].Text)
	}
	for k, p := range r.parts {
		if known := o.filtered.Board.Part(r.item, k).Known; p.hatch.Visible() == known || (p.cells[2].Text == "unknown") == known {
			t.Errorf("part %d: known %v, shown as %q", k, known, p.cells[2].Text)
		}
	}
	id := o.open
	raw := b.Core.Raw()
	for i := range raw {
		raw[i] = 1
	}
	b.Core.Try(raw)
	b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[0] == 1 })
	if at := o.openAt; at < 0 || o.filtered.Board.IDs[o.rows()[at]] != id {
		t.Errorf("row %d is unfolded", o.openAt)
	}
	o.list.at = o.openAt
	o.list.TypedKey(&fyne.KeyEvent{Name: fyne.KeyLeft})
	if o.openAt != -1 {
		t.Error("left did not fold")
	}
	o.list.TypedKey(&fyne.KeyEvent{Name: fyne.KeyRight})
	if o.openAt != o.list.at {
		t.Error("right did not unfold")
	}
}

func TestFilter(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	o := orderOf(s)
	all := o.list.Length()
	test.Type(o.filter, "WIND 5")
	b.Until("the filter holds", func() bool { return o.items != nil })
	want := 0
	for _, r := range b.Core.Order().Order {
		if r.Plant == "wind_large" {
			want++
		}
	}
	if got := o.list.Length(); got != want || want == 0 || want == all {
		t.Fatalf("%d of %d rows, want %d", got, all, want)
	}
	raw := b.Core.Raw()
	raw[0]++
	b.Core.Try(raw)
	b.Until("the filtered order follows", func() bool { return o.filtered.Raw[0] == raw[0] && o.items != nil })
	places := make([]int, 0, want)
	for _, item := range o.rows() {
		places = append(places, o.filtered.Standing.Place[item])
	}
	if !slices.IsSorted(places) || len(places) != want {
		t.Errorf("places %v", places)
	}
	o.filter.SetText("")
	b.Pump()
	if o.list.Length() != all {
		t.Errorf("%d rows without the filter, %d before", o.list.Length(), all)
	}
	o.filter.SetText("no such thing")
	b.Until("nothing is found", func() bool { return o.items != nil && o.list.Length() == 0 })
	o.list.TypedKey(&fyne.KeyEvent{Name: fyne.KeyDown}) // harmless
}

// The list holds few rows however many are ordered, and an edit of the study renews everything.
func TestEditRenewsEveryPart(t *testing.T) {
	b, s := open(t, 30, 520, 480)
	for i := range tabCount {
		s.tabs.Choose(i)
		b.Pump()
	}
	o := orderOf(s)
	if n := len(under[*orderRow](o.list)); n > 20 || o.list.Length() < 60 {
		t.Errorf("%d rows are laid out of %d", n, o.list.Length())
	}
	was := s.shown
	b.Core.Set("set the rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "1500"})
	b.Until("the edit is seen", func() bool { return !b.Core.View().Current })
	for i := range tabCount { // while the results are out of date
		s.tabs.Choose(i)
		b.Pump()
	}
	settle(b, s)
	if s.shown == was || s.shown.results != b.Core.View().Results {
		t.Fatal("the old order is still shown")
	}
	for i := range tabCount {
		s.tabs.Choose(i)
		b.Pump()
	}
	if o.list.Length() != len(b.Core.Order().Order) {
		t.Errorf("%d rows, %d ordered", o.list.Length(), len(b.Core.Order().Order))
	}
}

// What is over a limit says so in the order, by name.
func TestOverTheLimitIsSaid(t *testing.T) {
	b, s := open(t, 60, 760, 560)
	o := orderOf(s)
	b.Core.Set("limit", "test", study.SettingEdit{Key: "limit.ghg_g_per_kwh", Value: "0.001"})
	b.Until("the limit is seen", func() bool { return !b.Core.View().Current })
	settle(b, s)
	title := b.Core.Info("ghg_g_per_kwh").Title
	over := 0
	for _, r := range under[*orderRow](o.list) {
		c := o.filtered.candidate(r.item)
		want := c != nil && slices.Contains(c.OverLimit, "ghg_g_per_kwh")
		if got := strings.HasPrefix(r.flags.Text, "over: ") && strings.Contains(r.flags.Text, title); got != want || want != (r.flags.Colour == theme.Warm) {
			t.Errorf("%s: over %v, said %q", r.title.Text, want, r.flags.Text)
		}
		if want {
			over++
		}
	}
	if over == 0 {
		t.Fatal("nothing is over the limit")
	}
}

// A new study has nothing to weigh: every part says what is missing, and a voice can be added.
func TestEmptyStudy(t *testing.T) {
	b := desktest.Over(t, studytest.New())
	s := New(b.Core).(*stage)
	b.Core.OnChange(s.Changed)
	b.Until("the study is looked at", func() bool { return b.Core.View().Problem != nil || b.Core.View().Current })
	b.Show(s.Content(), 520, 480)
	for i := range tabCount {
		s.tabs.Choose(i)
		b.Pump()
	}
	if first, second, warn := s.State(); first != "no voice yet" || second == "" || !warn {
		t.Errorf("state %q, %q", first, second)
	}
	if !s.head.rename.Disabled() {
		t.Error("no voice can be renamed")
	}
	s.head.addVoice("residents", "Residents", "")
	b.Until("the voice is there", func() bool { return b.Core.Voice() == "residents" })
	b.Until("it can be chosen", func() bool { return s.head.choice.Selected == "Residents" })
	s.tabs.Choose(weightsTab)
	if w := s.panes[weightsTab].(*weights); w.problem.Text == "" || !w.problem.Visible() {
		t.Error("it is not said what is missing")
	}
}
