package term

import (
	"context"
	"fmt"

	"groundtally/app/study"
)

var (
	verbUndo = verb{name: "undo", usage: "undo STUDY.gpkg", summary: "takes back the last edit", places: [2]int{1, 1}, run: stepVerb((*study.Study).Undo, "Took back")}
	verbRedo = verb{name: "redo", usage: "redo STUDY.gpkg", summary: "brings back the edit last taken back", places: [2]int{1, 1}, run: stepVerb((*study.Study).Redo, "Brought back")}
)

// stepVerb makes the body of undo and of redo.
func stepVerb(step func(*study.Study, context.Context) (study.Entry, error), word string) func(*call) (int, error) {
	return func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			e, err := step(s, c.ctx)
			if err != nil {
				return 0, err
			}
			what := changeWords(e)
			text := fmt.Sprintf("%s change %d (%s): %s.", word, e.Of, e.Reason, what)
			c.answer(map[string]any{"study": c.args.places[0], "done": text, "of": e.Of, "seq": e.Seq}, "%s", text)
			return ExitDone, nil
		})
	}
}
