package term

import (
	"fmt"
	"strings"

	"groundtally/app/pictures"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring/criteria"
)

var againstOption = option{name: "against", value: "SITE/PLANT", help: "with a key: how often this candidate is better in it than that one, and which inventory value would change that"}

// against is how two candidates stand against each other in one consequence.
type against struct {
	Site    string        `json:"site"`
	Plant   string        `json:"plant"`
	More    bool          `json:"more_is_better"`
	Better  *float64      `json:"better_in_share_of_trials"` // null where no trial has both
	Trials  int           `json:"trials"`
	Changes []run.Swapped `json:"changes"`
	words   string
}

// against compares a candidate with the one of the option; nil without it.
func (c *call) against(r *run.Results, accounts *run.Accounts, snap *study.Snapshot, cand *run.Candidate, key string) (*against, error) {
	text := c.args.get("against")
	if text == "" {
		return nil, nil
	}
	site, plant, ok := strings.Cut(text, "/")
	if !ok {
		return nil, usagef("--against %q: write it as SITE/PLANT", text)
	}
	if err := c.knownNames(r, site, plant); err != nil {
		return nil, err
	}
	other, err := r.Find(site, plant)
	if err != nil {
		return nil, err
	}
	crit, known := snap.Catalog().Criterion(strings.TrimSuffix(key, criteria.BurdenSuffix))
	if !known || crit.Better == criteria.Neither {
		return nil, usagef("%s: neither more nor less of it is better, so no candidate is", key)
	}
	out := &against{Site: site, Plant: plant, More: crit.Better == criteria.More && !strings.HasSuffix(key, criteria.BurdenSuffix)}
	d, err := accounts.Beats(cand, other, key, out.More)
	if err != nil {
		return nil, err
	}
	out.Trials = d.Used
	if d.Known {
		out.Better = &d.Beats
	}
	if out.Changes, err = accounts.Swaps(cand, other, key); err != nil {
		return nil, err
	}
	if out.Changes == nil {
		out.Changes = []run.Swapped{}
	}
	out.words = pictures.Duel([2]string{cand.Site + " with " + cand.Plant, site + " with " + plant}, d, out.Changes)
	return out, nil
}

// driversJSON gives what a consequence follows, as JSON.
func driversJSON(list []run.Driver) []map[string]any {
	out := []map[string]any{}
	for _, d := range list {
		one := map[string]any{"name": d.Name, "title": d.Title, "rank_correlation": nil}
		if d.Known {
			one["rank_correlation"] = d.Rho
		}
		out = append(out, one)
	}
	return out
}

// sayDrivers tells the strongest of what a consequence follows.
func (c *call) sayDrivers(list []run.Driver, trials int) {
	const most = 8
	n := 0
	for _, d := range list {
		if !d.Known || n == most {
			continue
		}
		if n == 0 {
			c.say("")
			c.say("What it follows, by rank correlation over %d trials:", trials)
		}
		n++
		c.say("  %+.2f  %s", d.Rho, d.Title)
	}
	if rest := len(list) - n; n > 0 && rest > 0 {
		c.say("  and %s more, weaker or without effect", fmt.Sprint(rest))
	}
}
