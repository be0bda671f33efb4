package weigh

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/draw"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
)

// told waits until the trials of the shown pair are compared.
func told(b *desktest.Bench, p *pairPane) string {
	b.T.Helper()
	b.Until("the trials are compared", func() bool { return !p.duel.work.running && p.duel.words.Text != "…" })
	return p.duel.words.Text
}

// pick chooses what is compared by its key.
func pick(b *desktest.Bench, p *pairPane, key string) string {
	b.T.Helper()
	p.duel.key.SetSelectedIndex(slices.Index(p.duel.keys, key))
	return told(b, p)
}

// share reads in how many of 100 trials A is better.
func share(t *testing.T, words string) (x float64) {
	t.Helper()
	_, rest, ok := strings.Cut(words, "In ")
	if _, err := fmt.Sscanf(rest, "%f of 100 trials", &x); !ok || err != nil {
		t.Fatalf("%q says no share", words)
	}
	return x
}

// How sure it is that one is better is told for the consequence that is picked, by letter and name; it is what the
// accounts say, on the side that the values speak for, and the rest of 100 after a swap.
func TestHowSureADifferenceIs(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	p := two(b, s, 9)
	d := p.duel
	first := told(b, p)
	ids := b.Core.ChosenIDs()
	for i, id := range ids {
		if name := core.Letter(i) + " (" + b.Core.IDTitle(id) + ")"; !strings.Contains(first, name) {
			t.Errorf("it does not say who is %s: %q", name, first)
		}
	}
	var weighed []string
	for k, key := range s.shown.Board.Keys {
		if s.shown.Standing.Weights[k] > 0 {
			weighed = append(weighed, key.Info.Key)
		}
	}
	if n := len(weighed); n == 0 || len(d.keys) < n+10 || !slices.Equal(d.keys[:n], weighed) {
		t.Fatalf("weighed are %v, to choose from are %v", weighed, d.keys)
	}
	accounts, err := run.NewAccounts(b.Core.Parts.Params, b.Core.View().Of)
	if err != nil {
		t.Fatal(err)
	}
	pair, why := fittedPair(s.shown, [2]string(ids))
	if why != "" {
		t.Fatal(why)
	}
	seen, sided, fixed, swapped := map[string]bool{}, 0, 0, map[string]float64{}
	for _, key := range slices.Clone(d.keys) {
		words := pick(b, p, key)
		x, _ := pair[0].Consequence(key)
		y, _ := pair[1].Consequence(key)
		if x.State != scoring.Number || y.State != scoring.Number {
			if !slices.Contains(weighed, key) {
				t.Errorf("%s, which nobody weighs, is to choose from: %v against %v", key, x.State, y.State)
			}
			continue
		}
		seen[words] = true
		crit, ok := criterion(b.Core.Parts.Catalog, key)
		more, _ := better(s, key)
		if want := string(crit.Better) + " of it is better"; !ok || !strings.Contains(words, want) {
			t.Errorf("%s: %q, want %q", key, words, want)
		}
		beats, err := accounts.Beats(pair[0], pair[1], key, more)
		if err != nil {
			t.Fatal(err)
		}
		if !beats.Known {
			if !strings.Contains(words, "cannot be compared") {
				t.Errorf("%s: %q", key, words)
			}
			continue
		}
		if beats.Equal == beats.Used {
			if !strings.Contains(words, "equal in all") {
				t.Errorf("%s: %q", key, words)
			}
			continue
		}
		if strings.Contains(words, "Neither figure has a range") {
			ahead := 0
			if (y.Central > x.Central) == more {
				ahead = 1
			}
			if x.Low != x.High || y.Low != y.High || !strings.Contains(words, core.Letter(ahead)+" ("+b.Core.IDTitle(ids[ahead])+") is the better one") {
				t.Errorf("%s: %q", key, words)
			}
			fixed++
			continue
		}
		swapped[key] = 100 - share(t, words)
		if want := fmt.Sprintf("In %.0f of 100 trials", 100*beats.Beats); !strings.Contains(words, want) {
			t.Errorf("%s: %q, want %q", key, words, want)
		}
		// Ranges that do not meet leave no doubt on which side most trials are, however it is found.
		if apart := x.Low > y.High || y.Low > x.High; apart {
			sided++
			if aIsBetter := (x.Low > y.High) == (crit.Better == "more"); aIsBetter != (share(t, words) > 50) {
				t.Errorf("%s: %q", key, words)
			}
		}
	}
	if len(seen) < 10 || sided < 3 || fixed < 3 || len(swapped) < 10 {
		t.Errorf("%d answers differ, %d leave no doubt, %d have no range, %d say a share", len(seen), sided, fixed, len(swapped))
	}
	key := d.wish
	b.Core.Choose(ids[1], ids[0])
	told(b, p)
	if got := d.keys[d.key.SelectedIndex()]; got != key {
		t.Errorf("after a swap %s is compared, not %s", got, key)
	}
	for key, want := range swapped {
		if words := pick(b, p, key); share(t, words) < want-1 || share(t, words) > want+1 || !strings.Contains(words, "A ("+b.Core.IDTitle(ids[1])+")") {
			t.Errorf("%s after a swap: %q, want %g of 100", key, words, want)
		}
	}
	b.Core.Choose(ids[0])
	b.Until("one alone has no opponent", func() bool { return !d.all.Visible() })
}

// Where nothing can be compared it is said why: doing nothing, no plant, what the study does not know.
func TestWhyNothingIsCompared(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	p := two(b, s, 9)
	told(b, p)
	ids := b.Core.ChosenIDs()
	says := func(what string) {
		t.Helper()
		if words := told(b, p); !strings.HasPrefix(words, "There is nothing to compare: ") || !strings.Contains(words, what) || !p.duel.all.Visible() {
			t.Errorf("it says %q, want %q", words, what)
		}
	}
	b.Core.Choose(ids[0], run.NoSite)
	says("B is doing nothing")
	if p.duel.choice.Visible() {
		t.Error("there is a choice of nothing")
	}
	b.Core.Choose(run.NoSite, ids[0])
	says("A is doing nothing")
	b.Core.Choose(ids...)
	if !p.duel.work.running {
		t.Fatal("the pair is not compared anew")
	}
	b.Core.Choose(ids[0], run.NoSite) // an answer that comes too late is dropped
	says("B is doing nothing")
	cands := b.Core.View().Results.Candidates
	at := slices.IndexFunc(cands, func(c run.Candidate) bool { return c.Status != run.Fitted })
	if at < 0 {
		t.Fatal("every candidate is fitted")
	}
	b.Core.Choose(ids[0], cands[at].ID())
	says("B was not computed: ")
	without := func(c run.Candidate) string {
		for k, key := range s.shown.Board.Keys {
			if q, ok := c.Consequence(key.Info.Key); ok && c.Status == run.Fitted && c.ID() != ids[0] && (q.State == scoring.Unknown || q.State == scoring.NotAssessed) && s.shown.Standing.Weights[k] > 0 {
				return key.Info.Key
			}
		}
		return ""
	}
	at = slices.IndexFunc(cands, func(c run.Candidate) bool { return without(c) != "" })
	if at < 0 {
		t.Fatal("everything that is weighed is known")
	}
	b.Core.Choose(ids[0], cands[at].ID())
	told(b, p)
	if !p.duel.choice.Visible() {
		t.Error("the choice did not come back")
	}
	pick(b, p, without(cands[at]))
	q, _ := cands[at].Consequence(without(cands[at]))
	says(" it is " + present.WhyNot(q))
}

// The newest question is answered; results that changed are asked anew; while the part is not shown nothing is asked.
func TestDuelFollows(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	p := two(b, s, 9)
	d := p.duel
	told(b, p)
	want := pick(b, p, "ghg_g_per_kwh")
	d.key.SetSelectedIndex(slices.Index(d.keys, "eroi_extended"))
	if d.words.Text != "…" {
		t.Errorf("until it is known it says %q", d.words.Text)
	}
	d.key.SetSelectedIndex(slices.Index(d.keys, "energy_p50_mwh_per_yr"))
	d.key.SetSelectedIndex(slices.Index(d.keys, "ghg_g_per_kwh"))
	if got := told(b, p); got != want {
		t.Errorf("the last of three questions is answered with %q, want %q", got, want)
	}

	of := d.of
	raw := b.Core.Raw()
	raw[0] += 5
	b.Core.Try(raw)
	b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[0] == raw[0] })
	if d.work.running || d.of != of {
		t.Error("other weights ask the same question again")
	}
	s.back()
	settle(b, s)

	s.tabs.Choose(weightsTab)
	ids := b.Core.ChosenIDs()
	b.Core.Choose(ids[1], ids[0])
	b.Pump()
	if d.work.running || d.of != of {
		t.Error("it asks while it is not shown")
	}
	s.tabs.Choose(pairTab)
	if d.of.ids != [2]string{ids[1], ids[0]} || d.words.Text != "…" {
		t.Errorf("when it is shown again it says %q of %v", d.words.Text, d.of.ids)
	}
	before := told(b, p)
	of = d.of
	b.Core.Set("set the life", "test", study.SettingEdit{Key: "limit.ghg_g_per_kwh", Value: "40"})
	settle(b, s)
	if told(b, p); d.of.results == of.results || d.of.results != b.Core.View().Results {
		t.Error("new results are not asked")
	}
	if d.words.Text != before {
		t.Errorf("a limit changes the trials: %q, before %q", d.words.Text, before)
	}
}

// The answer finds room at every width and in a high window: it ends above what follows.
func TestDuelHasRoom(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	p := two(b, s, 9)
	for _, size := range [][2]float32{{430, 470}, {760, 560}, {520, 2400}} {
		b.Show(s.Content(), size[0], size[1])
		for _, key := range []string{"energy_p50_mwh_per_yr", "eroi_extended"} {
			words := pick(b, p, key)
			wait(b, p.picture)
			lines := len(draw.Lines(words, 13, false, float64(p.duel.words.Size().Width), 99))
			end := p.duel.all.Position().Y + p.duel.all.Size().Height
			if h := p.duel.words.Size().Height; h < float32(lines)*15 || p.duel.words.MinSize().Height > h+1 || p.needs.Position().Y < end {
				t.Errorf("%v, %s: %d lines in a height of %g; the part ends at %g, the next begins at %g", size, key, lines, h, end, p.needs.Position().Y)
			}
		}
		p.all.Offset.Y = max(p.duel.all.Position().Y-60, 0)
		p.all.Refresh()
		b.Shoot(fmt.Sprintf("weigh-duel-%g", size[0]))
	}
}
