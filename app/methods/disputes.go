package methods

import (
	"fmt"
	"io/fs"
	"regexp"
	"slices"
	"strings"
	"sync"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/assets"
	"groundtally/assets/citedtable"
	"groundtally/scoring"
)

// Accounts are those whose methods are told, in their order.
var Accounts = []scoring.Account{scoring.Energy, scoring.Land, scoring.Climate}

// Dispute is a question on which the literature disagrees, with what the program does about it.
type Dispute struct {
	Topic      string
	Account    scoring.Account
	Disputed   string // what is disputed
	Here       string // what the program does, and which setting or row changes it; these are named as they are
	Source     string
	Provenance citedtable.Provenance // of the weakest source
}

// disputesFile is where the table ships.
const disputesFile = "words/disputes.csv"

var disputesColumns = []string{"topic", "account", "disputed", "here", "source", "provenance"}

// Disputes reads the table of disputes. Another column, an empty cell, an account that has no methods here and an
// unknown provenance are errors that name file and line.
func Disputes(fsys fs.FS) ([]Dispute, error) {
	t, err := citedtable.ParseFS(fsys, disputesFile)
	if err != nil {
		return nil, err
	}
	if !slices.Equal(t.Columns, disputesColumns) {
		return nil, fmt.Errorf("cited table %s, line 1: the columns are %s, not %s", disputesFile, strings.Join(t.Columns, ","), strings.Join(disputesColumns, ","))
	}
	out := make([]Dispute, 0, len(t.Rows))
	seen := map[string]int{}
	for _, r := range t.Rows {
		bad := func(format string, args ...any) error {
			return fmt.Errorf("cited table %s, line %d: %s", disputesFile, r.Line, fmt.Sprintf(format, args...))
		}
		for _, c := range disputesColumns {
			if r.Text(c) == "" {
				return nil, bad("the cell of %s is empty", c)
			}
		}
		d := Dispute{Topic: r.Text("topic"), Account: scoring.Account(r.Text("account")), Disputed: r.Text("disputed"), Here: r.Text("here"), Source: r.Source, Provenance: r.Provenance}
		if !slices.Contains(Accounts, d.Account) {
			return nil, bad("there is no account %q here", d.Account)
		}
		if at, twice := seen[d.Topic]; twice {
			return nil, bad("the topic %q stands already in line %d", d.Topic, at)
		}
		seen[d.Topic] = r.Line
		out = append(out, d)
	}
	return out, nil
}

// Shipped gives the disputes that ship with the program, read once.
var Shipped = sync.OnceValues(func() ([]Dispute, error) { return Disputes(assets.FS()) })

// SourceWords gives the source with how it was come by.
func (d Dispute) SourceWords() string {
	words := map[citedtable.Provenance]string{citedtable.Read: "read", citedtable.Secondary: "second-hand", citedtable.Derived: "in part derived", citedtable.Memory: "at least in part from memory, to be checked"}[d.Provenance]
	if words == "" {
		return d.Source + "."
	}
	return d.Source + " (" + words + ")."
}

// Of gives the disputes about one account, in their order.
func Of(list []Dispute, a scoring.Account) (out []Dispute) {
	for _, d := range list {
		if d.Account == a {
			out = append(out, d)
		}
	}
	return out
}

// nameInText is the form of a setting, a row or a consequence within a sentence.
var nameInText = regexp.MustCompile(`[a-z][a-z0-9]*(?:[._][a-z0-9<>-]+)+`)

// Names lists the settings, rows and consequences that the program's part names, in the order of the text.
func (d Dispute) Names() (out []string) {
	for _, n := range nameInText.FindAllString(d.Here, -1) {
		if !slices.Contains(out, n) {
			out = append(out, n)
		}
	}
	return out
}

// HereWords gives the program's part with the titles of consequences in place of their keys.
func (d Dispute) HereWords(p *run.Params) string {
	return nameInText.ReplaceAllStringFunc(d.Here, func(name string) string {
		if q, ok := p.Graph.Quantity(name); ok && q.Title != "" {
			return "'" + q.Title + "'"
		}
		return name
	})
}

// InForce tells what the settings and rows that a dispute names stand at in a study; empty where it names none that
// holds for the whole study.
func InForce(p *run.Params, snap *study.Snapshot, d Dispute) (string, error) {
	var parts []string
	for _, name := range d.Names() {
		if _, row := p.Factors[name]; row {
			f, changed, err := run.UserFactor(p, snap, name)
			if err != nil {
				return "", err
			}
			text := name + " " + present.Exact(f.Central)
			if f.Low < f.High {
				text += " (" + present.Exact(f.Low) + " to " + present.Exact(f.High) + ")"
			}
			if u := present.Unit(f.Unit); u != "" {
				text += " " + u
			}
			if changed {
				text += ", your own"
			}
			parts = append(parts, text)
			continue
		}
		def, ok := snap.Catalog().Definition(name)
		if !ok || def.Key != name || strings.Contains(name, "<") { // a family of settings has no one value
			continue
		}
		text := snap.Text(name)
		if text == "" {
			text = study.NotSetText
		} else if u := present.Unit(def.Unit); u != "" && text != study.NotSetText {
			text += " " + u
		}
		parts = append(parts, name+" "+text)
	}
	return strings.Join(parts, "; "), nil
}
