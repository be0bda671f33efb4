package appendix

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"slices"
	"sort"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// exceptionView is something that holds by the user's word alone.
type exceptionView struct{ Where, What, Reason, By string }

// exceptions lists the rules that do not hold on a site by the user's word, and the changes of features by
// hand. One of a site or a rule that is not there is said to have no effect.
func exceptions(snap *study.Snapshot, r *run.Results) []exceptionView {
	sites := map[string]bool{}
	for i := range r.Candidates {
		sites[r.Candidates[i].Site] = true
	}
	rules := run.RuleNames(snap.Catalog())
	var out []exceptionView
	for _, key := range snap.Keys() {
		rest, ok := strings.CutPrefix(key, study.ExceptPrefix)
		if !ok || !snap.Yes(key) {
			continue
		}
		s, _, _ := snap.Lookup(key)
		name, site, _ := strings.Cut(rest, ".")
		what := present.Rule(name) + " does not hold"
		switch {
		case !slices.Contains(rules, name):
			what = present.Rule(name) + ": no effect: no such rule"
		case !sites[site]:
			what = present.Rule(name) + ": no effect: no such site"
		case !run.RuleInForce(snap, name):
			what = present.Rule(name) + ": no effect: the rule is not in force"
		}
		out = append(out, exceptionView{Where: "site " + site, What: what, Reason: s.Reason, By: s.AcceptedBy})
	}
	sort.Slice(out, func(i, j int) bool { return out[i].Where+out[i].What < out[j].Where+out[j].What })
	verbs := map[string]string{study.HandAdd: "added", study.HandMove: "moved", study.HandSet: "given other values", study.HandRemove: "taken out"}
	for _, l := range snap.Layers {
		for _, h := range l.Hand {
			what := verbs[h.Verb] + " by hand"
			var values []string
			for k, v := range h.Values {
				values = append(values, strings.ReplaceAll(k, "_", " ")+" "+v)
			}
			if sort.Strings(values); len(values) > 0 {
				what += ": " + strings.Join(values, ", ")
			}
			where := l.Name + ", feature " + h.Feature
			if h.Called != "" {
				where += " (" + h.Called + ")"
			}
			out = append(out, exceptionView{Where: where, What: what, Reason: h.Reason})
		}
	}
	return out
}

// outView counts the candidates of an option that are out, by the rule that takes most of their site.
type outView struct {
	Plant      string
	Rule       string
	Sites, All int // where it takes most, where it takes all
}

// out sums up who is out.
func (b *book) out() []outView {
	at := map[[2]string]int{}
	var list []outView
	for _, o := range run.Register(b.in.Snapshot, b.in.Results) {
		rule, all := "no rule: "+present.Named(o.Status), false
		switch {
		case len(o.Rules) > 0:
			rule, all = present.Rule(o.Rules[0].Rule), o.Rules[0].TakesAll
		case o.Reason != "":
			rule = "no rule: " + present.Reason(o.Reason)
		}
		k := [2]string{o.Plant, rule}
		i, ok := at[k]
		if !ok {
			i = len(list)
			at[k] = i
			list = append(list, outView{Plant: b.plantTitle(o.Plant), Rule: rule})
		}
		list[i].Sites++
		if all {
			list[i].All++
		}
	}
	slices.SortStableFunc(list, func(a, c outView) int {
		if a.Plant != c.Plant {
			return strings.Compare(a.Plant, c.Plant)
		}
		return c.Sites - a.Sites
	})
	return list
}

// coverView is a line of the coverage of the data.
type coverView struct {
	Title                     string
	Known, None, Unknown, Not int
	Why                       string
}

func coverage(p *run.Params, r *run.Results) []coverView {
	titles := map[string]string{}
	for _, k := range p.Keys() {
		if !k.Derived {
			titles[k.Key] = k.Title
		}
	}
	var out []coverView
	for _, c := range run.Covered(p, r) {
		if titles[c.Key] == "" || c.Known+c.None+c.Unknown+c.NotSet == 0 {
			continue // figures per GWh follow from their own; what is not looked at has a section of its own
		}
		v := coverView{Title: titles[c.Key], Known: c.Known, None: c.None, Unknown: c.Unknown + c.NotSet, Not: c.Not}
		var words []string
		for _, w := range c.Why[:min(2, len(c.Why))] {
			words = append(words, fmt.Sprintf("%s (%d)", present.Reason(w.Why), w.Count))
		}
		v.Why = strings.Join(words, "; ")
		out = append(out, v)
	}
	return out
}

//go:embed lists.html
var listsHTML string

// requestView is what is asked for one role.
type requestView struct {
	Title, Purpose, Needed, Useful, Holder, Without, Geometry, Have string
}

// Requests writes a printable page of the data that the study could use: per role what it is for, which fields
// are needed, who usually holds it, what stays unknown without it. With all, roles that the study has are
// listed too, with the edition at hand.
func Requests(snap *study.Snapshot, p *run.Params, all bool) ([]byte, error) {
	var rows []requestView
	titles := p.Titled()
	for _, role := range snap.Catalog().Roles {
		have := snap.LayersOf(role.Name)
		if len(have) > 0 && !all {
			continue
		}
		v := requestView{Title: role.Title, Purpose: role.Purpose, Holder: role.Holder, Without: titles(role.WithoutIt), Geometry: strings.Join(role.Geometry, ", ")}
		for _, f := range role.Fields {
			word := strings.ReplaceAll(f.Name, "_", " ")
			if f.Unit != "" && f.Unit != "1" && f.Unit != "text" {
				word += " (" + present.Unit(f.Unit) + ")"
			}
			to := &v.Useful
			if f.Required {
				to = &v.Needed
			}
			if *to != "" {
				*to += ", "
			}
			*to += word
		}
		var there []string
		for _, l := range have {
			there = append(there, l.Name+", edition "+first(l.Edition, "not stated"))
		}
		v.Have = strings.Join(there, "; ")
		rows = append(rows, v)
	}
	return list("requests", map[string]any{"Name": first(snap.Text("study.name"), "Study"), "Rows": rows})
}

// CoveragePage writes a printable page that says for how many candidates each consequence is known.
func CoveragePage(snap *study.Snapshot, p *run.Params, r *run.Results) ([]byte, error) {
	fitted := 0
	for i := range r.Candidates {
		if r.Candidates[i].Status == run.Fitted {
			fitted++
		}
	}
	return list("coverage", map[string]any{"Name": first(snap.Text("study.name"), "Study"), "Rows": coverage(p, r), "Fitted": fitted})
}

func list(name string, data any) ([]byte, error) {
	t, err := template.New("lists").Parse(listsHTML)
	if err != nil {
		return nil, err
	}
	var out bytes.Buffer
	if err := t.ExecuteTemplate(&out, name, data); err != nil {
		return nil, fmt.Errorf("write the page: %w", err)
	}
	return out.Bytes(), nil
}
