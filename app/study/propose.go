package study

import (
	"strings"

	"groundtally/geo"
)

// Propose gives by field the column that AddLayer would take for it or ask about: one of the field's own
// name, else a filled one with a name that is known for it. For a form, which shows it for the user to
// change.
func Propose(l *geo.Layer, role Role) map[string]string {
	find := func(name string) string {
		for _, c := range l.Columns {
			if strings.EqualFold(c.Name, name) {
				return c.Name
			}
		}
		return ""
	}
	out := map[string]string{}
	taken := map[string]bool{}
	for _, f := range role.Fields {
		if c := find(f.Name); c != "" {
			out[f.Name], taken[c] = c, true
		}
	}
	for _, f := range role.Fields {
		if out[f.Name] != "" {
			continue
		}
		for _, s := range synonyms[f.Name] {
			if c := find(s); c != "" && !taken[c] && mostlyFilled(l, c) {
				out[f.Name], taken[c] = c, true
				break
			}
		}
	}
	return out
}
