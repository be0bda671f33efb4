package weigh

import (
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
)

// duel says how often one of two candidates is better than the other in a consequence, and which factors alone
// change that.
type duel struct {
	s      *stage
	grew   func() // the height changed
	work   latest
	of     duelOf   // what is answered, or being found
	keys   []string // to choose from
	wish   string   // key that the user chose; kept while other candidates do not have it
	key    *widget.Select
	what   *widgets.Line
	words  *widget.Label
	choice *fyne.Container
	all    *fyne.Container
}

// duelOf is a question: other results are another one.
type duelOf struct {
	results *run.Results
	ids     [2]string
	key     string
}

func newDuel(s *stage, grew func()) *duel {
	d := &duel{s: s, grew: grew, words: widgets.NewText(""), what: widgets.Faint("Consequence").Wide()}
	d.key = widget.NewSelect(nil, func(string) {
		if i := d.key.SelectedIndex(); i >= 0 && i < len(d.keys) {
			d.wish = d.keys[i]
			d.update()
		}
	})
	d.choice = container.NewBorder(nil, nil, d.what, nil, d.key)
	head := widgets.Part("How sure is it that A is better?").Hinted("In how many of 100 trials A is better than B in one consequence. In every trial all that is uncertain is drawn anew; what errs alike on all sites is drawn once for both.")
	d.all = container.NewVBox(head, d.choice, flush(d.words))
	d.all.Hide()
	return d
}

// update asks about the first two chosen candidates, unless that is answered or on its way.
func (d *duel) update() {
	sh, chosen := d.s.shown, d.s.c.ChosenIDs()
	if sh == nil || sh.Err != nil || len(chosen) < 2 {
		d.forget()
		show(d.all, false)
		return
	}
	show(d.all, true)
	ids := [2]string{chosen[0], chosen[1]}
	pair, why := fittedPair(sh, ids)
	show(d.choice, why == "")
	if why != "" {
		d.forget()
		d.say(why)
		return
	}
	d.offer(sh, pair)
	key := d.keys[d.key.SelectedIndex()] // there is an order, so something is weighed
	d.what.Hint = d.s.c.Info(key).Sentence
	of := duelOf{sh.results, ids, key}
	if of == d.of {
		return
	}
	d.of = of
	d.say("…")
	params := d.s.c.Parts.Params
	names := [2]string{}
	for i, id := range ids {
		names[i] = core.Letter(i) + " (" + d.s.c.IDTitle(id) + ")"
	}
	more, _ := better(d.s, key)
	d.work.ask(d.s.c, nil, func() func() {
		words, err := duelWords(params, sh, pair, names, key, more)
		if err != nil {
			words = "Unknown: " + present.Problem(err)
		}
		return func() {
			if d.of == of {
				d.say(words)
			}
		}
	})
}

// forget drops the answer, and what waits to be found.
func (d *duel) forget() { d.of, d.work.next = duelOf{}, nil }

func (d *duel) say(words string) {
	if d.words.Text != words {
		d.words.SetText(words)
		d.grew()
	}
}

// offer fills the choice and keeps what is chosen where it can.
func (d *duel) offer(sh *shown, pair [2]*run.Candidate) {
	infos := duelKeys(d.s, sh, pair)
	titles := keyTitles(infos)
	d.keys = d.keys[:0]
	for _, k := range infos {
		d.keys = append(d.keys, k.Key)
	}
	selected := titles[max(slices.Index(d.keys, d.wish), 0)]
	if selected != d.key.Selected || !slices.Equal(titles, d.key.Options) {
		d.key.Options, d.key.Selected = titles, selected
		d.key.Refresh()
	}
}

// better tells whether more of a consequence is better; ok is false where neither more nor less is.
func better(s *stage, key string) (more, ok bool) {
	c, ok := criterion(s.c.Parts.Catalog, key)
	// What a burden is divided by stays a burden.
	return c.Better == criteria.More && !strings.HasSuffix(key, criteria.BurdenSuffix), ok
}

// duelKeys lists what two candidates can be compared in: what the voice weighs, then what else of the accounts has a
// better side and is a number for both.
func duelKeys(s *stage, sh *shown, pair [2]*run.Candidate) []run.KeyInfo {
	var out []run.KeyInfo
	weighed := map[string]bool{}
	for k, key := range sh.Board.Keys {
		if sh.Standing.Weights[k] > 0 {
			out, weighed[key.Info.Key] = append(out, key.Info), true
		}
	}
	for _, k := range s.c.Parts.Params.Keys() {
		if k.Account != scoring.Energy && k.Account != scoring.Land && k.Account != scoring.Climate || weighed[k.Key] {
			continue
		}
		_, ok := better(s, k.Key)
		for _, c := range pair {
			q, known := c.Consequence(k.Key)
			ok = ok && known && q.State == scoring.Number
		}
		if ok {
			out = append(out, k)
		}
	}
	return out
}

// fittedPair finds the candidates of two ids; why says what keeps them from being compared. One that a gate holds back
// is in no order, and can be compared all the same.
func fittedPair(sh *shown, ids [2]string) (pair [2]*run.Candidate, why string) {
	const nothing = "There is nothing to compare: "
	for i, id := range ids {
		at, ok := sh.Index.ByID[id]
		switch {
		case id == run.NoSite:
			return pair, nothing + core.Letter(i) + " is doing nothing, which gives no uncertain figure."
		case !ok:
			return pair, nothing + core.Letter(i) + " is not among the candidates."
		}
		if pair[i] = &sh.results.Candidates[at]; pair[i].Status != run.Fitted {
			return pair, nothing + core.Letter(i) + " was not computed: " + present.Reason(pair[i].Status) + "."
		}
	}
	return pair, ""
}

// duelWords finds what trials say of two fitted candidates in a consequence, off the window's goroutine.
func duelWords(params *run.Params, sh *shown, pair [2]*run.Candidate, names [2]string, key string, more bool) (string, error) {
	var of [2]scoring.Consequence
	numbers := true
	for i, c := range pair {
		q, ok := c.Consequence(key)
		switch {
		case !ok:
			return fmt.Sprintf("There is nothing to compare: %s does not have it.", names[i]), nil
		case q.State != scoring.Number && q.State != scoring.None && q.State != scoring.Never:
			return fmt.Sprintf("There is nothing to compare: for %s it is %s.", names[i], present.WhyNot(q)), nil
		}
		of[i] = q
		numbers = numbers && q.State == scoring.Number
	}
	accounts, err := run.NewAccounts(params, sh.of)
	if err != nil {
		return "", err
	}
	d, err := accounts.Beats(pair[0], pair[1], key, more)
	if err != nil {
		return "", err
	}
	way := criteria.Less
	if more {
		way = criteria.More
	}
	text := fmt.Sprintf("%s %s, %s %s; %s.\n", core.Letter(0), present.Value(of[0]), core.Letter(1), present.Value(of[1]), betterWords(way))
	switch {
	case d.Known && d.Equal == d.Used:
		return text + fmt.Sprintf("The two are equal in all of %d trials.", d.Used), nil
	case d.Known && !numbers: // what makes two numbers change places is not looked for
		return text + fmt.Sprintf("In %.0f of 100 trials %s is better than %s (%d trials); no such effect counts as best, a payback that never comes as worst.", 100*d.Beats, names[0], names[1], d.Used), nil
	}
	swaps, err := accounts.Swaps(pair[0], pair[1], key)
	if err != nil {
		return "", err
	}
	if of[0].Low == of[0].High && of[1].Low == of[1].High && len(swaps) == 0 && (d.Beats == 0 || d.Beats == 1) {
		// Trials that are all alike would pass for a certainty that was found.
		ahead := names[0]
		if d.Beats == 0 {
			ahead = names[1]
		}
		return text + fmt.Sprintf("Neither figure has a range, so no trial differs from the others: %s is the better one, and no factor alone changes that.", ahead), nil
	}
	return text + pictures.Duel(names, d, swaps), nil
}
