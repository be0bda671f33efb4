package term

import (
	"strings"
	"testing"
)

func TestWhyAgainstAnother(t *testing.T) {
	b := newBench(t)
	b.district()
	b.run(0, "group", "four", "S-05", "S-06", "S-07", "S-08")
	text := b.run(0, "why", "four", "wind", "eroi_extended", "--against", "S-01/wind")
	for _, want := range []string{"What it follows, by rank correlation over ", "wind turbine, energy spent", "of 100 trials four with wind is better than S-01 with wind"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
	o := object(t, b.run(0, "why", "four", "wind", "eroi_extended", "--against", "S-01/wind", "--json"))
	if a := o["against"].(map[string]any); a["site"] != "S-01" || a["better_in_share_of_trials"] == nil || number(t, a, "trials") < 10 {
		t.Errorf("%v", o["against"])
	}
	if d := o["drivers"].([]any); len(d) < 3 || d[0].(map[string]any)["rank_correlation"] == nil {
		t.Errorf("%v", o["drivers"])
	}
	for args, want := range map[string]string{"S-01": "SITE/PLANT", "S-99/wind": `no site "S-99"`} {
		b.run(ExitUsage, "why", "four", "wind", "eroi_extended", "--against", args)
		if text := b.err.String(); !strings.Contains(text, want) {
			t.Errorf("%s: %s", args, text)
		}
	}
	b.run(ExitUsage, "why", "four", "wind", "turbine_count", "--against", "S-01/wind")
	if text := b.err.String(); !strings.Contains(text, "neither more nor less") {
		t.Error(text)
	}
}
