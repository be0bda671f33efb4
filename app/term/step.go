package term

import (
	"context"
	"fmt"

	"groundtally/app/study"
)

// stepVerb makes the body of undo and of redo.
func stepVerb(step func(*study.Study, context.Context) (study.Entry, error), word string) func(*call) (int, error) {
	return func(c *call) (int, error) {
		return c.with(func(s *study.Study) (int, error) {
			e, err := step(s, c.ctx)
			if err != nil {
				return 0, err
			}
			c.done(fmt.Sprintf("%s change %d: %s.", word, e.Of, e.Reason))
			return ExitDone, nil
		})
	}
}
