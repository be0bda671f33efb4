package term

import (
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf8"

	"groundtally/app/present"
	"groundtally/geo"
)

func unitWords(u string) string { return present.Unit(u) }

// notices writes notices to standard error; many of one code are counted after the third.
func (c *call) notices(ns []geo.Notice) {
	if c.calm {
		return
	}
	shown := map[string]int{}
	for _, n := range ns {
		shown[n.Code]++
		if shown[n.Code] <= 3 {
			fmt.Fprintf(c.Err, "  %s: %s\n", n.Severity, present.Notice(n))
		}
	}
	for _, code := range sortedKeys(shown) {
		if shown[code] > 3 {
			fmt.Fprintf(c.Err, "  and %d more of the kind \"%s\"; gtally check lists all\n", shown[code]-3, strings.ReplaceAll(code, "_", " "))
		}
	}
}

// counted writes a number of things: "1 zone", "2 zones".
func counted(n int, what string) string {
	if n != 1 {
		what += "s"
	}
	return strconv.Itoa(n) + " " + what
}

// wrapped breaks a text at blanks into lines of at most so many characters; edge stands between them.
func wrapped(text string, width int, edge string) string {
	var b strings.Builder
	n := 0
	for _, w := range strings.Fields(text) {
		switch {
		case n == 0:
		case n+1+len(w) > width:
			b.WriteString(edge)
			n = 0
		default:
			b.WriteByte(' ')
			n++
		}
		b.WriteString(w)
		n += len(w)
	}
	return b.String()
}

// figure writes a number for redoing a sum by hand.
func figure(x float64) string { return present.Exact(x) }

// columns writes rows with their cells under each other; cells of columns in right stand at the right
// edge.
func columns(w io.Writer, rows [][]string, right map[int]bool) {
	var width []int
	for _, r := range rows {
		for i, cell := range r {
			if i == len(width) {
				width = append(width, 0)
			}
			width[i] = max(width[i], utf8.RuneCountInString(cell))
		}
	}
	for _, r := range rows {
		var b strings.Builder
		for i, cell := range r {
			pad := strings.Repeat(" ", width[i]-utf8.RuneCountInString(cell))
			if right[i] {
				b.WriteString(pad + cell)
			} else {
				b.WriteString(cell + pad)
			}
			b.WriteString("  ")
		}
		fmt.Fprintln(w, strings.TrimRight(b.String(), " "))
	}
}

// stacked breaks keys at their underscores so that columns need not be wider than their numbers: it
// gives the lines of a table's head, bottom lines filled first.
func stacked(keys []string, width int) [][]string {
	parts := make([][]string, len(keys))
	most := 1
	for i, k := range keys {
		line := ""
		for _, word := range strings.SplitAfter(k, "_") {
			if line != "" && len(line)+len(word) > width {
				parts[i] = append(parts[i], line)
				line = ""
			}
			line += word
		}
		parts[i] = append(parts[i], line)
		most = max(most, len(parts[i]))
	}
	out := make([][]string, most)
	for l := range out {
		out[l] = make([]string, len(keys))
		for i, p := range parts {
			if at := l - (most - len(p)); at >= 0 {
				out[l][i] = p[at]
			}
		}
	}
	return out
}
