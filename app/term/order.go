package term

import (
	"fmt"
	"strconv"
	"strings"

	"groundtally/app/run"
	"groundtally/app/study"
)

var verbOrder = verb{
	name: "order", usage: "order STUDY.gpkg [--voice NAME] [--top N]", summary: "the order under one voice or all, with its parts",
	options: []option{{name: "voice", value: "NAME", help: "only this voice"}, {name: "top", value: "N", help: "only the first N places"}, {name: "cores", value: "N", help: "cores for computing what is stale"}},
	places:  [2]int{1, 1},
	run: func(c *call) (int, error) {
		top := 20
		if v := c.args.get("top"); v != "" {
			var err error
			if top, err = strconv.Atoi(v); err != nil || top < 1 {
				return 0, usagef("--top wants a whole number from 1, not %q", v)
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			if len(snap.Voices()) == 0 {
				return 0, usagef("the study has no voice yet; give weights with gtally set STUDY.gpkg voice.NAME.weight.KEY POINTS")
			}
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			var voices []run.VoiceOrder
			for _, v := range r.Voices {
				if !c.args.has("voice") || v.Voice == c.args.get("voice") {
					voices = append(voices, v)
				}
			}
			if len(voices) == 0 {
				return 0, fmt.Errorf("voice %q: %w; the voices are %s", c.args.get("voice"), study.ErrNotThere, strings.Join(snap.Voices(), ", "))
			}
			if c.json {
				if c.args.has("top") {
					for i := range voices {
						voices[i].Order = voices[i].Order[:min(top, len(voices[i].Order))]
					}
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "voices": voices, "code": r.Code})
				return ExitDone, nil
			}
			for _, v := range voices {
				c.voice(v, top)
			}
			return ExitDone, nil
		})
	},
}

// voice prints the first places of an order; a score never stands without its parts.
func (c *call) voice(v run.VoiceOrder, top int) {
	title := v.Title
	if title == "" {
		title = v.Voice
	}
	c.say("%s (%s): %d candidates in order", title, v.Voice, len(v.Order)-1)
	if len(v.Order) == 0 {
		return
	}
	keys := sortedKeys(v.Order[0].Parts)
	for i, k := range keys {
		c.say("  [%d] %s, weight %.3f", i+1, k, v.Order[0].Parts[k].Weight)
	}
	head := []string{"place", "tier", "site", "plant", "score", "low", "high", "ranks", "first in 100", "can be first"}
	for i := range keys {
		head = append(head, fmt.Sprintf("[%d]", i+1))
	}
	rows := [][]string{append(head, "marks")}
	row := func(r run.Row) []string {
		cells := []string{strconv.Itoa(r.Place), strconv.Itoa(r.Tier), r.Site, r.Plant, fmt.Sprintf("%.3f", r.Score), fmt.Sprintf("%.3f", r.ScoreLow), fmt.Sprintf("%.3f", r.ScoreHigh),
			fmt.Sprintf("%d-%d", r.RankBest, r.RankWorst), fmt.Sprintf("%.0f", r.FirstIn100), r.CanBeFirst}
		if r.Site == run.NoSite {
			cells[2], cells[3] = "do nothing", ""
		}
		for _, k := range keys {
			p := r.Parts[k]
			cell := fmt.Sprintf("%.3f", p.Share)
			if p.Value == nil {
				cell += " ?"
			}
			cells = append(cells, cell)
		}
		var marks []string
		if len(r.OverLimit) > 0 {
			marks = append(marks, "over the limit: "+strings.Join(r.OverLimit, ", "))
		}
		if len(r.Unknown) > 0 {
			marks = append(marks, fmt.Sprintf("%d unknown", len(r.Unknown)))
		}
		if len(r.Incomplete) > 0 {
			marks = append(marks, "incomplete: "+strings.Join(r.Incomplete, ", "))
		}
		if len(r.DominatedBy) > 0 {
			marks = append(marks, "dominated by "+r.DominatedBy[0])
		}
		if len(r.Alerts) > 0 {
			marks = append(marks, "very low: "+strings.Join(r.Alerts, ", "))
		}
		if g, ok := r.Gates["owner_consent"]; ok && g.State != "yes" {
			marks = append(marks, "owner's consent: "+g.State)
		}
		return append(cells, strings.Join(marks, "; "))
	}
	for i, r := range v.Order {
		if i < top || r.Site == run.NoSite {
			rows = append(rows, row(r))
		}
	}
	columns(c.Out, rows)
	for _, t := range v.Tipping {
		var ends []string
		if t.Below != nil {
			ends = append(ends, fmt.Sprintf("below %.3f %s leads", t.Below.At, t.Below.NewFirst))
		}
		if t.Above != nil {
			ends = append(ends, fmt.Sprintf("above %.3f %s leads", t.Above.At, t.Above.NewFirst))
		}
		if len(ends) == 0 {
			ends = []string{"no weight of it changes first place"}
		}
		c.say("  tipping weight of %s (now %.3f): %s", t.Key, t.Weight, strings.Join(ends, "; "))
	}
	if len(v.HeldBack) > 0 {
		c.say("  held back by a gate: %d", len(v.HeldBack))
	}
	c.say("  \"?\" marks an unknown part: it counts half its weight and widens the interval. \"first in 100\": of 100 weight mixes near the voice's weights.")
	c.say("")
}
