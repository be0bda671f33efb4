package term

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/pictures"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// firstPlaces is how many places of an order are printed unless told otherwise.
const firstPlaces = 20

var verbOrder = verb{
	name: "order", usage: "order STUDY.gpkg [--voice NAME] [--top N] [--frozen NAME]", summary: "the order under one voice or all, with its parts",
	options: []option{{name: "voice", value: "NAME", help: "only this voice"},
		{name: "top", value: "N", help: fmt.Sprintf("only the first N places; in print %d unless told otherwise, in the JSON all", firstPlaces)}, frozenOption, coresOption},
	places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		top, err := c.args.whole("top", 1, firstPlaces)
		if err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			names := snap.Voices()
			if len(names) == 0 {
				return 0, &questionsError{[]study.Question{{Text: "the study has no voice yet; what does a group give weight to? For one:",
					Option: "gtally set " + shellWord(c.args.places[0]) + " voice.residents.weight.nearest_dwelling_m 100"}}}
			}
			if v := c.args.get("voice"); c.args.has("voice") && !slices.Contains(names, v) {
				return 0, usagef("there is no voice %q; the voices are: %s", v, strings.Join(names, ", "))
			}
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			if err := r.Unready[c.args.get("voice")]; err != nil {
				return 0, err
			}
			for _, v := range sortedKeys(r.Unready) {
				c.note("voice %s has no order yet: %v", v, r.Unready[v])
			}
			voices := []run.VoiceOrder{}
			for _, v := range r.Voices {
				if c.args.has("voice") && v.Voice != c.args.get("voice") {
					continue
				}
				if v.Title == "" {
					v.Title = v.Voice
				}
				if v.Notices == nil {
					v.Notices = []geo.Notice{}
				}
				if c.json && c.args.has("top") {
					v.Order = v.Order[:min(top, len(v.Order))]
				}
				voices = append(voices, v)
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "voices": voices, "code": r.Code})
				return ExitDone, nil
			}
			accounts, err := run.NewAccounts(c.Params, snap)
			if err != nil {
				return 0, err
			}
			for _, v := range voices {
				c.voice(v, top)
				if err := c.spared(snap, r, accounts, &v); err != nil {
					return 0, err
				}
			}
			return ExitDone, nil
		})
	},
}

// marks shortens what is to be said of many rows to a letter with a line below the table.
type marks struct {
	letters map[string]string
	texts   []string
}

func (m *marks) letter(text string) string {
	if l, ok := m.letters[text]; ok {
		return l
	}
	n := len(m.texts)
	l := string(rune('a' + n%26))
	if n >= 26 {
		l += strconv.Itoa(n / 26)
	}
	m.letters[text] = l
	m.texts = append(m.texts, l+"  "+text)
	return l
}

// voice prints the first places of an order; a score never stands without its parts.
func (c *call) voice(v run.VoiceOrder, top int) {
	title := v.Voice
	if v.Title != v.Voice {
		title = fmt.Sprintf("%s (%s)", v.Title, v.Voice)
	}
	if len(v.Order) == 0 {
		c.say("%s: nothing to order", title)
		return
	}
	count := 0
	for _, r := range v.Order {
		if r.Site != run.NoSite {
			count++
		}
	}
	c.say("%s: %d candidates and doing nothing, in order. Score = sum of the parts [1], [2] and so on; each part is weight times value.", title, count)
	keys := v.Order[0].Parts.Names()
	for i, k := range keys {
		c.say("  [%d] %s, weight %.3f", i+1, k, v.Order[0].Parts.Of(k).Weight)
	}
	head := []string{"place", "tier", "site", "plant", "score", "low", "high", "places", "first in 100", "can lead"}
	right := map[int]bool{0: true, 1: true, 4: true, 5: true, 6: true, 7: true, 8: true}
	for i := range keys {
		right[len(head)] = true
		head = append(head, fmt.Sprintf("[%d]", i+1))
	}
	rows := [][]string{append(head, "marks")}
	m := &marks{letters: map[string]string{}}
	for i, r := range v.Order {
		if i < top || r.Site == run.NoSite {
			rows = append(rows, orderRow(r, keys, m))
		}
	}
	columns(c.out, rows, right)
	for _, t := range m.texts {
		c.say("  %s", t)
	}
	for _, t := range v.Tipping {
		var ends []string
		if t.Below != nil {
			ends = append(ends, fmt.Sprintf("below %.3f %s leads", t.Below.At, leader(t.Below.NewFirst)))
		}
		if t.Above != nil {
			ends = append(ends, fmt.Sprintf("above %.3f %s leads", t.Above.At, leader(t.Above.NewFirst)))
		}
		if len(ends) == 0 {
			ends = []string{"no weight of it changes first place"}
		}
		c.say("  tipping weight of %s (now %.3f): %s", t.Key, t.Weight, strings.Join(ends, "; "))
	}
	for _, b := range v.Beside {
		c.say("  %s", pictures.Beside(b, func(key string) string { return key }))
	}
	if n := len(v.HeldBack); n > 0 {
		c.say("  held back by a gate: %d candidates. Without gates their places would be:", n)
		for i, h := range v.HeldBack {
			if i == heldShown {
				c.say("    and %d more, in the JSON", n-i)
				break
			}
			c.say("    %d  %s with %s (%s)", h.Place, h.Site, h.Plant, h.By())
		}
		for _, r := range v.Order {
			if r.Place == 1 && r.PlaceWithout > 1 {
				c.say("    %s, first now, would be at place %d", leader(r.ID()), r.PlaceWithout)
			}
		}
	}
	c.notices(v.Notices)
	c.say("  Candidates of one tier cannot be told apart. \"places\": best and worst place within the intervals.\n  \"first in 100\": of 100 weight mixes near the voice's weights. \"?\": an unknown part counts half its weight and widens the interval.")
}

// heldShown is how many candidates that a gate holds back are printed.
const heldShown = 5

func leader(id string) string {
	if id == run.NoSite {
		return "doing nothing"
	}
	return id
}

// spared prints which sites the order would build, and what the saved share of the study spares.
func (c *call) spared(snap *study.Snapshot, r *run.Results, accounts *run.Accounts, v *run.VoiceOrder) error {
	order, err := r.Ordered(v)
	if err != nil || len(order) == 0 {
		return err
	}
	plan, err := accounts.SparePlan(r, order)
	if err != nil {
		return err
	}
	share, _ := snap.Number("saving.share")
	s, e, err := plan.At(share)
	if err != nil {
		return err
	}
	c.say("  %s", pictures.Spared(plan, share, s, e))
	c.say("")
	return nil
}

func orderRow(r run.Row, keys []string, m *marks) []string {
	cells := []string{strconv.Itoa(r.Place), strconv.Itoa(r.Tier), r.Site, r.Plant, fmt.Sprintf("%.3f", r.Score), fmt.Sprintf("%.3f", r.ScoreLow), fmt.Sprintf("%.3f", r.ScoreHigh),
		fmt.Sprintf("%d-%d", r.RankBest, r.RankWorst), fmt.Sprintf("%.0f", r.FirstIn100), r.CanBeFirst}
	if r.Site == run.NoSite {
		cells[2], cells[3] = "do nothing", ""
	}
	for _, k := range keys {
		p := r.Parts.Of(k)
		mark := "  "
		if !p.Known {
			mark = " ?"
		}
		cells = append(cells, fmt.Sprintf("%.3f", p.Share)+mark)
	}
	var said []string
	if len(r.OverLimit) > 0 {
		said = append(said, "OVER THE LIMIT: "+strings.Join(r.OverLimit, ", "))
	}
	if len(r.Unknown) > 0 {
		said = append(said, m.letter("unknown: "+strings.Join(r.Unknown, ", ")))
	}
	if len(r.Incomplete) > 0 {
		var without []string
		for _, k := range r.Incomplete {
			without = append(without, missingRule(k))
		}
		said = append(said, m.letter("incomplete: computed without what is not set: "+strings.Join(without, ", ")))
	}
	if len(r.Alerts) > 0 {
		said = append(said, m.letter("very low: "+strings.Join(r.Alerts, ", ")))
	}
	if g, ok := r.Gates["owner_consent"]; ok && g.State != "yes" {
		said = append(said, m.letter("owner's consent: "+g.State))
	}
	if len(r.DominatedBy) > 0 {
		said = append(said, "dominated by "+leader(r.DominatedBy[0]))
	}
	return append(cells, strings.Join(said, ", "))
}
