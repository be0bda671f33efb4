package criteria

import (
	"os"
	"testing"

	"groundtally/scoring"
)

func TestVocabularyHolds(t *testing.T) {
	cs, err := Parse(os.DirFS("../../assets/words"), "keys.csv")
	if err != nil {
		t.Fatal(err)
	}
	if len(cs) < 80 {
		t.Fatalf("only %d keys", len(cs))
	}
	known := map[scoring.Account]bool{}
	for _, a := range scoring.Accounts() {
		known[a] = true
	}
	weighable := map[scoring.Account]int{}
	for _, c := range cs {
		if !known[c.Account] {
			t.Errorf("%s: unknown account %q", c.Key, c.Account)
		}
		if c.Title == "" || c.Sentence == "" || c.Unit == "" {
			t.Errorf("%s lacks title, sentence or unit", c.Key)
		}
		if c.WeighableByDefault {
			weighable[c.Account]++
			if c.Worst.Ask || c.Best.Ask {
				t.Errorf("%s can be weighed by default but has no fixed anchors", c.Key)
			}
			if (c.Better == More) != (c.Best.X > c.Worst.X) {
				t.Errorf("%s: anchors stand against the direction %q", c.Key, c.Better)
			}
		}
	}
	for _, a := range scoring.Accounts()[:5] {
		if weighable[a] == 0 {
			t.Errorf("account %s has no key that can be weighed by default", a)
		}
	}
}
