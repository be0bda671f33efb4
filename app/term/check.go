package term

import (
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

var verbCheck = verb{
	name: "check", usage: "check STUDY.gpkg", summary: "all notices on data and settings", places: [2]int{1, 1},
	more: "Exit 1 when something makes results unreliable or stands in the way of computing.",
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
			for _, n := range notices {
				c.say("%-8s %s", n.Severity, c.named(present.Notice(n)))
			}
			if len(questions) > 0 {
				c.say("%v", &questionsError{questions})
			}
			if bad > 0 {
				c.say("%d of %d notices make results unreliable.", bad, len(notices))
			} else {
				c.say("%d notices; none makes results unreliable.", len(notices))
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
