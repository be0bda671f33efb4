package weigh

import (
	"math"
	"slices"
	"strings"
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/test"

	"groundtally/app/desk/desktest"
	"groundtally/app/draw"
	"groundtally/app/draw/raster"
	"groundtally/app/run"
	"groundtally/scoring"
	weighing "groundtally/scoring/weigh"
)

// wait pumps until pictures that are being painted are there.
func wait(b *desktest.Bench, p *picture) {
	b.T.Helper()
	b.Until("the picture is painted", func() bool { return !p.work.running && p.img != nil })
}

// two shows the first and the n-th of the order against each other.
func two(b *desktest.Bench, s *stage, n int) *pairPane {
	ids, order := s.shown.Board.IDs, s.shown.Standing.Order
	var fitted []string
	for _, item := range order {
		if s.shown.candidate(item) != nil {
			fitted = append(fitted, ids[item])
		}
	}
	b.Core.Choose(fitted[0], fitted[n])
	s.tabs.Choose(pairTab)
	p := s.panes[pairTab].(*pairPane)
	b.Until("the pair is compared", func() bool { return p.pair.chart.NameB == b.Core.IDTitle(fitted[n]) })
	wait(b, p.picture)
	return p
}

// The differences add up to the difference of the scores.
func TestPairAddsUp(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	p := two(b, s, 9)
	sum := 0.0
	for _, k := range p.pair.chart.Keys {
		sum += k.Difference
		if k.A == "" || k.B == "" {
			t.Errorf("%s has no value", k.Title)
		}
	}
	ids, st := b.Core.ChosenIDs(), s.shown.Standing
	a, _ := s.shown.item(ids[0])
	c, _ := s.shown.item(ids[1])
	if want := st.Score[a] - st.Score[c]; math.Abs(sum-want) > 1e-9 || p.pair.behind != "B" {
		t.Errorf("sum %g, want %g; behind is %s", sum, want, p.pair.behind)
	}
	test.Tap(p.swap)
	b.Until("A and B are swapped", func() bool { return p.pair.behind == "A" })
	if got := b.Core.ChosenIDs(); got[0] != ids[1] || got[1] != ids[0] {
		t.Errorf("chosen %v after the swap", got)
	}
}

// The swing points and values that are said to be needed are: with them the scores are level.
func TestWhatWouldHaveToBeTrue(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	weights, valuesNeeded := 0, 0
	for _, voice := range b.Core.View().Snap.Voices() {
		b.Core.SetVoice(voice)
		settle(b, s)
		for _, n := range []int{1, 5, 12, 20} {
			two(b, s, n)
			sh := s.shown
			ids := b.Core.ChosenIDs()
			a, _ := sh.item(ids[0])
			c, _ := sh.item(ids[1])
			value := func(item int) (v []float64) {
				for k := range sh.Board.Keys {
					if p := sh.Board.Part(item, k); p.Known {
						v = append(v, p.Mid)
					} else {
						v = append(v, 0.5)
					}
				}
				return v
			}
			va, vb := value(a), value(c)
			score := func(raw, v []float64) float64 {
				x := 0.0
				for k := range v {
					x += raw[k] / total(raw) * v[k]
				}
				return x
			}
			for k := range sh.Board.Keys {
				if lo, hi, ok, err := weighing.WeightNeeded(sh.Standing.Weights, va, vb, k); err == nil && ok {
					edge := lo
					if lo <= sh.Standing.Weights[k] {
						edge = hi
					}
					if at, ok := pointsAt(edge, total(sh.Raw)-sh.Raw[k]); ok && edge > 0 {
						raw := slices.Clone(sh.Raw)
						raw[k] = at
						if d := score(raw, va) - score(raw, vb); math.Abs(d) > 1e-9 {
							t.Errorf("%s: at %g points A is ahead by %g", sh.Board.Keys[k].Info.Key, at, d)
						}
						if words := weightNeeded(sh, va, vb, k); !strings.Contains(words, pointWords(at)) && at < 1e4 && sh.Standing.Weights[k] != lo {
							t.Errorf("%s: %q does not say %s", sh.Board.Keys[k].Info.Key, words, pointWords(at))
						}
						weights++
					}
				}
				if v, ok, err := weighing.ValueNeeded(sh.Standing.Weights, va, vb, k); err == nil && ok && sh.Standing.Weights[k] > 0 {
					other := slices.Clone(vb)
					other[k] = v
					if d := score(sh.Raw, va) - score(sh.Raw, other); math.Abs(d) > 1e-9 {
						t.Errorf("%s: with value %g A is ahead by %g", sh.Board.Keys[k].Info.Key, v, d)
					}
					key := sh.Board.Keys[k]
					words := valueNeeded(sh, va, vb, k, scoring.Consequence{State: scoring.Unknown})
					if !strings.HasPrefix(words, amount(key.Worst+v*(key.Best-key.Worst), key.Info.Unit)) || key.Best < key.Worst != strings.Contains(words, "or less") {
						t.Errorf("%s: %q", key.Info.Key, words)
					}
					valuesNeeded++
				}
			}
		}
	}
	if weights < 5 || valuesNeeded < 5 {
		t.Fatalf("only %d weights and %d values", weights, valuesNeeded)
	}
}

func TestPairSaysHowToChoose(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	b.Core.Choose()
	s.tabs.Choose(pairTab)
	p := s.panes[pairTab].(*pairPane)
	if !strings.Contains(p.words.Text, "Ctrl or Shift") || p.picture.Visible() || !p.take.Visible() {
		t.Fatalf("words %q", p.words.Text)
	}
	test.Tap(p.take)
	b.Until("two are compared", func() bool { return len(p.pair.chart.Keys) > 0 })
	if len(b.Core.ChosenIDs()) != 2 || !p.picture.Visible() {
		t.Errorf("chosen %v", b.Core.ChosenIDs())
	}
	wait(b, p.picture)
	hovered := false
	for y := range int(p.picture.scene.Height) {
		if _, title := raster.Hit(p.picture.scene, 100, float64(y)); title != "" {
			hovered = true
		}
	}
	if !hovered {
		t.Error("the picture says nothing to the pointer")
	}
	for i := range b.Core.View().Results.Candidates {
		if c := &b.Core.View().Results.Candidates[i]; c.Status != run.Fitted {
			b.Core.Choose(b.Core.ChosenIDs()[0], c.ID())
			b.Until("it is said why not", func() bool { return strings.Contains(p.words.Text, "is not in the order") })
			return
		}
	}
	t.Fatal("every candidate is fitted")
}

func TestVoicesSideBySide(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	two(b, s, 9)
	s.tabs.Choose(voicesTab)
	p := s.panes[voicesTab].(*voicesPane)
	b.Until("the voices are there", func() bool { return len(p.columns) == 3 && len(p.quarrel.leads) == 3 })
	chosen := b.Core.Chosen()
	for _, col := range p.columns {
		i := slices.IndexFunc(b.Core.View().Results.Voices, func(o run.VoiceOrder) bool { return o.Voice == col.voice })
		o := b.Core.View().Results.Voices[i]
		if len(col.first) != firstPlaces || col.first[0].Site != o.Order[0].Site || col.ordered != len(o.Order) {
			t.Errorf("%s: first %v", col.voice, col.first[0])
		}
		for k, c := range chosen {
			if at := slices.IndexFunc(o.Order, func(r run.Row) bool { return r.Site == c.Site && r.Plant == c.Plant }); col.chosen[k] == nil || col.chosen[k].Place != at+1 {
				t.Errorf("%s: place of %s", col.voice, c.ID())
			}
		}
	}
	// The leads are the differences of the scores that the voices' own orders give.
	for i, voice := range b.Core.View().Snap.Voices() {
		col := p.columns[i]
		if want := b.Core.VoiceTitle(voice) + ": " + leadOf(col.chosen[0].Score-col.chosen[1].Score); p.quarrel.leads[i] != want {
			t.Errorf("lead %q, want %q", p.quarrel.leads[i], want)
		}
	}
	if len(p.quarrel.shares) == 0 || !strings.Contains(p.quarrel.shares[0], "% of the quarrel") {
		t.Errorf("shares %v", p.quarrel.shares)
	}
	p.s.c.SetVoice("residents")
	settle(b, s)
	if first, _, _ := s.State(); !strings.HasPrefix(first, "3 voices") {
		t.Errorf("state %q", first)
	}
	b.Core.Choose(chosen[0].ID())
	b.Until("two are asked for", func() bool { return len(p.quarrel.leads) == 0 })
}

// A click on a point of the scatter chooses its candidate; those without a number are counted.
func TestScatter(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(scatterTab)
	p := s.panes[scatterTab].(*scatterPane)
	wait(b, p.picture)
	b.Core.Choose()
	wait(b, p.picture)
	click := func(m fyne.KeyModifier, not string) string {
		for _, item := range p.picture.scene.Items {
			path, ok := item.(draw.Path)
			if !ok || path.Item == "" || path.Item == not {
				continue
			}
			var at draw.Point
			for _, q := range path.Rings[0] {
				at.X, at.Y = at.X+q.X/float64(len(path.Rings[0])), at.Y+q.Y/float64(len(path.Rings[0]))
			}
			if hit, _ := raster.Hit(p.picture.scene, at.X, at.Y); hit == path.Item {
				p.picture.MouseDown(&desktop.MouseEvent{Modifier: m})
				p.picture.Tapped(&fyne.PointEvent{Position: fyne.NewPos(float32(at.X), float32(at.Y))})
				return hit
			}
		}
		t.Fatal("no point can be hit")
		return ""
	}
	first := click(0, "")
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{first}) {
		t.Fatalf("chosen %v, clicked %s", got, first)
	}
	wait(b, p.picture)
	second := click(fyne.KeyModifierShift, first)
	if got := b.Core.ChosenIDs(); !slices.Equal(got, []string{first, second}) {
		t.Fatalf("chosen %v, clicked %s too", got, second)
	}
	wait(b, p.picture)
	text := func() (all string) {
		for _, item := range p.picture.scene.Items {
			if x, ok := item.(draw.Text); ok {
				all += x.Text + "\n"
			}
		}
		return all
	}
	if !strings.Contains(text(), "A\n") || !strings.Contains(text(), "B\n") {
		t.Error("the chosen ones have no letters")
	}
	p.y.SetSelected(b.Core.Info("noise_dba").Title)
	wait(b, p.picture)
	without := 0
	for i := range b.Core.View().Results.Candidates {
		c := &b.Core.View().Results.Candidates[i]
		if q, _ := c.Consequence("noise_dba"); c.Status == run.Fitted && q.State != scoring.Number {
			without++
		}
	}
	if without == 0 || !strings.Contains(text(), "without a number") && !strings.Contains(text(), "no candidate has both") {
		t.Errorf("%d are without a number, the picture says:\n%s", without, text())
	}
	p.y.SetSelected(b.Core.Info("connection_km").Title)
	wait(b, p.picture)
	all := text()
	p.plant.SetSelected("Wind 5 MW")
	wait(b, p.picture)
	if text() == all {
		t.Error("the plant filter changes nothing")
	}
}
