package pictures

import (
	"fmt"
	"strings"

	"groundtally/app/run"
	"groundtally/scoring/reckon"
)

// Duel tells how often the first of two candidates is the better one in a consequence, and which factors change that
// within their own range.
func Duel(names [2]string, d reckon.Duel, swaps []run.Swapped) string {
	if !d.Known {
		return fmt.Sprintf("%s and %s cannot be compared: no trial gives both a figure.", names[0], names[1])
	}
	text := fmt.Sprintf("In %.0f of 100 trials %s is better than %s; what errs alike on all sites is drawn once for both (%d trials", 100*d.Beats, names[0], names[1], d.Used)
	if d.Equal > 0 {
		text += fmt.Sprintf(", %d of them equal, counted half", d.Equal)
	}
	if d.Left > 0 {
		text += fmt.Sprintf(", %d more without a figure for one of them", d.Left)
	}
	text += "). "
	if len(swaps) == 0 {
		return text + "No factor alone changes that within its range."
	}
	const most = 5
	var each []string
	for _, s := range swaps[:min(most, len(swaps))] {
		each = append(each, fmt.Sprintf("%s at %s %s (central %s, from %s to %s)", s.Title, mwh(s.At), s.Unit, mwh(s.Central), mwh(s.Low), mwh(s.High)))
	}
	text += "They change places, all else central, with: " + strings.Join(each, "; ")
	if rest := len(swaps) - most; rest > 0 {
		text += fmt.Sprintf("; and with %d more", rest)
	}
	return text + "."
}
