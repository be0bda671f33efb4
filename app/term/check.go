package term

import (
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// fewNotices is how many notices of a kind on features of one layer are written out.
const fewNotices = 5

var verbCheck = verb{
	name: "check", usage: "check STUDY.gpkg [--all]", summary: "all notices on data and settings", places: [2]int{1, 1},
	options: []option{{name: "all", help: "every notice of a kind, not the first five of each layer"}},
	more:    "Exit 1 when something makes results unreliable or stands in the way of computing.",
	run: func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			if err := s.Store().Check(c.ctx); err != nil {
				return 0, err
			}
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			notices, err := run.Check(c.ctx, s.Store(), snap, c.Params)
			if err != nil {
				return 0, err
			}
			questions := c.unanswered(snap)
			if questions == nil {
				questions = []study.Question{}
			}
			bad := 0
			for _, n := range notices {
				if n.Severity >= geo.Fault {
					bad++
				}
			}
			code := ExitDone
			if bad > 0 || len(questions) > 0 {
				code = ExitNo
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "notices": c.noticeList(notices), "questions": questions, "unreliable": bad, "exit": code})
				return code, nil
			}
			type kind struct{ code, layer, field string }
			seen := map[kind]int{}
			for i, n := range notices {
				k := kind{n.Code, n.Layer, n.Field}
				if seen[k]++; seen[k] <= fewNotices || c.args.has("all") || n.Feature == "" {
					c.say("%-8s %s", n.Severity, c.named(present.Notice(n)))
				}
				last := i+1 == len(notices) || kind{notices[i+1].Code, notices[i+1].Layer, notices[i+1].Field} != k
				if more := seen[k] - fewNotices; last && more > 0 && n.Feature != "" && !c.args.has("all") {
					c.say("%-8s and %d more like it; gtally check --all lists them", n.Severity, more)
				}
			}
			if len(questions) > 0 {
				c.say("%v", &questionsError{questions})
			}
			if bad > 0 {
				c.say("%d of %s make results unreliable.", bad, counted(len(notices), "notice"))
			} else {
				c.say("%s; none makes results unreliable.", counted(len(notices), "notice"))
			}
			return code, nil
		})
	},
}

// noticeList gives notices as JSON, each with its text.
func (c *call) noticeList(ns []geo.Notice) []map[string]any {
	out := make([]map[string]any, len(ns))
	for i, n := range ns {
		m := map[string]any{"code": n.Code, "severity": n.Severity.String(), "text": c.named(present.Notice(n))}
		for k, v := range map[string]string{"file": n.File, "layer": n.Layer, "feature": n.Feature, "field": n.Field, "cause": n.Cause} {
			if v != "" {
				m[k] = v
			}
		}
		if n.Line > 0 {
			m["line"] = n.Line
		}
		if n.At != nil {
			m["at"] = map[string]float64{"lon": n.At.Lon, "lat": n.At.Lat}
		}
		if len(n.Args) > 0 {
			m["args"] = n.Args
		}
		out[i] = m
	}
	return out
}
