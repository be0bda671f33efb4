package weigh

import (
	"fmt"
	"strings"
)

// partsOf gives what each key adds to the score of an item, appended to parts.
func partsOf(sh *shown, item int, parts []barPart) []barPart {
	for k := range sh.Board.Keys {
		_, mid, _ := sh.Board.Share(&sh.Standing, item, k)
		parts = append(parts, barPart{mid, !sh.Board.Part(item, k).Known})
	}
	return parts
}

// partWords says of what a score is made.
func partWords(s *stage, sh *shown, item int) string {
	st := &sh.Standing
	lines := []string{fmt.Sprintf("%s: score %s (%s to %s)", s.c.IDTitle(sh.Board.IDs[item]), scoreWords(st.Score[item]), scoreWords(st.Low[item]), scoreWords(st.High[item]))}
	for k, key := range sh.Board.Keys {
		if st.Weights[k] == 0 {
			continue
		}
		_, mid, _ := sh.Board.Share(st, item, k)
		line := fmt.Sprintf("%s %s of %s", key.Info.Title, scoreWords(mid), scoreWords(st.Weights[k]))
		if !sh.Board.Part(item, k).Known {
			line += ", unknown: counts half its weight"
		}
		lines = append(lines, line)
	}
	return strings.Join(lines, "\n")
}
