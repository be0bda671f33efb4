package main

import (
	"context"
	"fmt"
	"io"
)

// doctor lists each need, how it was found, and what the package manager says of it. It
// changes nothing. The answer is how many needs are not met.
func doctor(ctx context.Context, m machine, out io.Writer) int {
	g, known := pickManager(m)
	if known {
		fmt.Fprintf(out, "package manager: %s\n", g)
	} else {
		fmt.Fprintln(out, "package manager: none that this program knows")
	}
	lacking := 0
	for _, f := range detect(ctx, m, needsFor(m.goos(), true)) {
		name := f.need.name
		if f.need.tests {
			name += " (for the tests)"
		}
		if f.found {
			fmt.Fprintf(out, "found    %s, %s %s\n", name, f.through, f.detail)
		} else {
			lacking++
			fmt.Fprintf(out, "MISSING  %s, which %s: %s\n", name, f.need.purpose, f.detail)
		}
		if known {
			fmt.Fprintf(out, "         packages: %s\n", g.recorded(ctx, m, f.need))
		}
	}
	if lacking == 0 {
		fmt.Fprintln(out, "nothing is missing")
	}
	return lacking
}
