package manifest

import (
	"strings"
	"testing"
)

func TestParseRefuses(t *testing.T) {
	for _, c := range []struct{ name, in, want string }{
		{"no JSON", `{`, "parse manifest"},
		{"unknown member", `{"name":"x","colour":"red"}`, "colour"},
		{"no role", `{"files":[{"path":"a.csv"}]}`, "file 1"},
		{"twice", `{"files":[{"path":"a.csv","role":"demand"},{"path":"a.csv","role":"demand"}]}`, "stands twice"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := Parse([]byte(c.in)); err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("error is %v, want one with %q", err, c.want)
			}
		})
	}
}

func TestParseReads(t *testing.T) {
	m, err := Parse([]byte(`{"name":"x","files":[{"path":"v.geojson","role":"viewpoints","swap_axes":true,"match":{"quality":"grade"}}],"flaws":[{"file":"v.geojson","feature":"all","what":"swapped"}]}`))
	if err != nil {
		t.Fatal(err)
	}
	if f := m.Files[0]; !f.SwapAxes || f.Match["quality"] != "grade" || m.Flaws[0].What != "swapped" {
		t.Errorf("read as %+v", m)
	}
}
