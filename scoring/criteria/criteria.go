package criteria

import (
	"encoding/csv"
	"fmt"
	"io/fs"
	"strconv"
	"strings"

	"groundtally/scoring"
)

// Better says which direction of a consequence is the better one.
type Better string

// The directions.
const (
	More    Better = "more"
	Less    Better = "less"
	Neither Better = "none" // not scored
)

// Anchor is an end of a value scale: a number, or one that the user must set first.
type Anchor struct {
	X   float64
	Ask bool
}

// Criterion is one consequence key with what a person needs to read and to weigh it.
type Criterion struct {
	Key                string
	Title              string
	Sentence           string
	Unit               string
	Account            scoring.Account
	Families           []string // the events counted; one voice weighs at most one key per family
	WeighableByDefault bool
	Better             Better
	Worst, Best        Anchor
	AnchorSource       string
	Technologies       string // "all", "wind" or "solar"
	NotApplicable      string // "none: reason" or another sentence
	NeedsRoles         string
	Basis              string
	Burden             bool // also shown per GWh
}

// BurdenSuffix is added to the key of a burden when it is divided by the energy.
const BurdenSuffix = "_per_gwh"

// PerLife reports whether the burden is divided by the energy of the whole life (tonnes, hectare
// years) and not by that of the first year.
func (c Criterion) PerLife() bool { return strings.Contains(c.Basis, "per GWh of life") }

// Parse reads the vocabulary table words/keys.csv.
func Parse(fsys fs.FS, name string) ([]Criterion, error) {
	f, err := fsys.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		return nil, fmt.Errorf("vocabulary %s: %w", name, err)
	}
	if len(rows) == 0 {
		return nil, fmt.Errorf("vocabulary %s is empty", name)
	}
	col := make(map[string]int, len(rows[0]))
	for i, h := range rows[0] {
		col[h] = i
	}
	for _, h := range []string{"key", "title", "sentence", "unit", "account", "family", "weighable_by_default", "better", "worst_anchor", "best_anchor", "anchor_source", "technologies", "when_not_applicable", "needs_roles", "basis", "burden"} {
		if _, ok := col[h]; !ok {
			return nil, fmt.Errorf("vocabulary %s: no column %q", name, h)
		}
	}
	seen := map[string]bool{}
	out := make([]Criterion, 0, len(rows)-1)
	for i, r := range rows[1:] {
		get := func(h string) string { return strings.TrimSpace(r[col[h]]) }
		c := Criterion{
			Key: get("key"), Title: get("title"), Sentence: get("sentence"), Unit: get("unit"), Account: scoring.Account(get("account")),
			Families: strings.Split(get("family"), ";"), WeighableByDefault: get("weighable_by_default") == "yes", Better: Better(get("better")),
			AnchorSource: get("anchor_source"), Technologies: get("technologies"), NotApplicable: get("when_not_applicable"),
			NeedsRoles: get("needs_roles"), Basis: get("basis"), Burden: get("burden") == "yes",
		}
		if c.Key == "" || seen[c.Key] {
			return nil, fmt.Errorf("vocabulary %s, row %d: key %q is empty or stands twice", name, i+2, c.Key)
		}
		seen[c.Key] = true
		if c.Better != Neither {
			if c.Worst, err = anchor(get("worst_anchor")); err != nil {
				return nil, fmt.Errorf("vocabulary %s, key %s, worst anchor: %w", name, c.Key, err)
			}
			if c.Best, err = anchor(get("best_anchor")); err != nil {
				return nil, fmt.Errorf("vocabulary %s, key %s, best anchor: %w", name, c.Key, err)
			}
		}
		out = append(out, c)
	}
	return out, nil
}

func anchor(s string) (Anchor, error) {
	if s == "ask" {
		return Anchor{Ask: true}, nil
	}
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return Anchor{}, fmt.Errorf("%q is neither a number nor ask", s)
	}
	return Anchor{X: x}, nil
}
