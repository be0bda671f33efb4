package appendix

import (
	"fmt"
	"html/template"
	"strconv"
	"strings"

	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// unfolded is a candidate opened: fit, connection, land taken, loss chain, every consequence.
type unfolded struct {
	ID, Title, FirstFor string
	Fit, Grid           string
	Layout, Broken      []string // how its turbines came to stand, and the rules they break
	Taken               []takenView
	Chain               []chainView
	ChainTitle          string
	Accounts            []accountView
	NotAssessed         string
	Notes               []string
	Months              *monthsView // of the first of each voice
	Trace               *traceView
	Losses, Land        template.HTML // pictures
	Pictured            []accountPicture
	Said, Habitat       []string
	Crowding            []crowdingView // of the first of each voice
}

type takenView struct{ Rule, Alone, Shared, Word string }

type chainView struct{ Step, Change, After, Unit string }

type accountView struct {
	Name string
	Rows []consequenceView
}

type consequenceView struct {
	Title, Value, Unit, Span, Quality, Notes, Class string
	Over                                            bool
}

// traceView is how the weighed consequences of a candidate came about: each quantity once, with its
// formula and the names of its inputs, down to facts and settings. Factors stand in their own table.
type traceView struct {
	Quantities []traceRow
	Facts      []traceRow
	Settings   []traceRow
	Factors    int
}

type traceRow struct {
	Name, Anchor, Title, Value, Unit, Span, Formula, Source, From string
	Class                                                         string // u: hatched; s: a state that is known
	Inputs                                                        []inputView
	Weighed                                                       bool
}

type inputView struct{ Name, Href, Value string }

// unfoldings opens the shown candidates; the first of each voice with formulas and inputs.
func (b *book) unfoldings() (leads, others []unfolded, err error) {
	firstFor := map[string][]string{}
	for _, v := range b.in.Results.Voices {
		for _, r := range v.Order {
			if r.Site != run.NoSite {
				firstFor[r.ID()] = append(firstFor[r.ID()], first(v.Title, v.Voice))
				break
			}
		}
	}
	for i := range b.in.Results.Candidates {
		c := &b.in.Results.Candidates[i]
		if !b.shown[c.ID()] {
			continue
		}
		u := b.unfold(c)
		u.Losses, u.Land = losses(c, u.Title), land(c, u.Title, "-land-"+strconv.Itoa(i))
		if u.Pictured, err = b.accountPictures(c, u.Title, "-accounts-"+strconv.Itoa(i)); err != nil {
			return nil, nil, err
		}
		if u.Said, u.Habitat, err = b.said(c); err != nil {
			return nil, nil, err
		}
		voices := firstFor[c.ID()]
		if len(voices) == 0 {
			others = append(others, u)
			continue
		}
		u.FirstFor = strings.Join(voices, ", ")
		if u.Months, err = b.months(c, u.Title, "-months-"+strconv.Itoa(len(leads)+1)); err != nil {
			return nil, nil, err
		}
		if u.Crowding, err = b.crowding(c, u.Title, "-crowding-"+strconv.Itoa(len(leads)+1)); err != nil {
			return nil, nil, err
		}
		if u.Trace, err = b.trace(c, "q"+strconv.Itoa(len(leads)+1)+"-"); err != nil {
			return nil, nil, err
		}
		leads = append(leads, u)
	}
	return leads, others, nil
}

func (b *book) unfold(c *run.Candidate) unfolded {
	u := unfolded{ID: c.ID(), Title: c.Site + ", " + b.plantTitle(c.Plant)}
	var left []string
	for _, a := range scoring.Accounts() {
		v := accountView{Name: string(a)}
		for _, q := range c.All() {
			if q.Account != a {
				continue
			}
			if q.State == scoring.NotAssessed {
				left = append(left, b.title(q.Key))
				continue
			}
			cell := cellOf(q)
			row := consequenceView{Title: b.title(q.Key), Value: cell.Text, Unit: present.UnitWords(q.Unit), Span: span(q), Quality: q.Quality, Notes: b.noteNumbers(q.Notices), Class: cell.Class, Over: contains(c.OverLimit, q.Key)}
			if q.State != scoring.Number {
				row.Quality = present.WhyNot(q)
			}
			v.Rows = append(v.Rows, row)
		}
		if len(v.Rows) > 0 {
			u.Accounts = append(u.Accounts, v)
		}
	}
	u.NotAssessed = strings.Join(left, ", ")
	for _, st := range c.Chain {
		u.Chain = append(u.Chain, chainView{Step: present.Step(st.Name), Change: percent(-100 * st.Share), After: present.Figure(st.After, st.After, st.After), Unit: st.Unit})
	}
	for _, t := range c.Taken {
		v := takenView{Rule: present.Rule(t.Rule), Alone: hectares(t.AloneHa), Shared: hectares(t.SharedHa)}
		if t.TakesAll {
			v.Word = "takes the whole site by itself"
		}
		u.Taken = append(u.Taken, v)
	}
	u.Taken = append(u.Taken, takenView{Rule: "several rules together", Shared: hectares(c.TakenSharedHa), Word: "each hectare counted once"},
		takenView{Rule: "smallest width or patch", Alone: hectares(c.ShapeHa), Word: "after the rules"})
	if f := c.Fit; f != nil {
		parts := []string{present.Named(f.Mode), fmt.Sprintf("%.0f kW rated", f.RatedKW), fmt.Sprintf("%.0f kW at the plant's terminals", f.ACKW)}
		if n := len(f.Turbines); n == 1 {
			parts = append(parts, "1 turbine")
		} else if n > 1 {
			parts = append(parts, fmt.Sprintf("%d turbines", n))
		}
		if f.FencedHa > 0 {
			parts = append(parts, hectares(f.FencedHa)+" ha inside the fence")
		}
		if words := present.PanelDensity(c.Technology, f.Modules, f.SolarKW, f.FencedHa); words != "" {
			parts = append(parts, words)
		}
		if words := present.PanelRows(f.RowPitchM, f.TiltDeg); words != "" {
			parts = append(parts, words)
		}
		u.Fit = strings.Join(append(parts, fmt.Sprintf("%.2f km of new track", f.TrackKm)), "; ")
	}
	u.Layout, u.Broken = pictures.Layout(c.Fit)
	u.Grid = "unknown: " + present.Reason("no_connection")
	if n := c.Connection; n != nil {
		u.Grid = fmt.Sprintf("%s (%s, %g kV), %s", n.Asset, present.Named(n.Kind), n.VoltageKV, present.Named(n.Status))
		if n.Reason != "" {
			u.Grid += ": " + present.Reason(n.Reason)
		}
		u.Grid += fmt.Sprintf("; %.2f km straight, %.2f km with detour; %d × %s", n.StraightKm, n.RouteKm, n.Circuits, present.Named(n.Conductor))
		if n.SpareKW != nil {
			u.Grid += fmt.Sprintf("; spare capacity %.0f kW", *n.SpareKW)
		} else {
			u.Grid += "; spare capacity unknown"
		}
		if n.ToldBy != "" && b.told {
			u.Grid += ", told by " + strings.TrimSpace(n.ToldBy+" "+n.ToldOn)
		}
		if n.Beside != "" {
			u.Grid += "; " + n.Beside + " might be cheaper, but its capacity is unknown"
		}
	}
	for _, n := range c.Notices {
		u.Notes = append(u.Notes, present.Sentence(n, nil))
	}
	return u
}

// span writes low to high; the meaning of the range is added where it is not the usual one.
func span(q scoring.Consequence) string {
	switch {
	case q.State != scoring.Number || q.Low == q.High:
		return ""
	case q.Range == scoring.P10P90:
		return lowToHigh(q)
	}
	return present.Span(q)
}

// percent writes a change with its sign; no change has none.
func percent(x float64) string {
	s := fmt.Sprintf("%+.2f %%", x)
	if s == "+0.00 %" || s == "-0.00 %" {
		return "0.00 %"
	}
	return s
}

// trace follows the weighed consequences of a candidate down to their inputs.
func (b *book) trace(c *run.Candidate, prefix string) (*traceView, error) {
	t := &traceView{}
	seen := map[string]bool{}
	weighed := map[string]bool{}
	var keys []string
	for _, v := range b.in.Results.Voices {
		for _, k := range keysOf(v) {
			if !weighed[k] {
				weighed[k] = true
				keys = append(keys, k)
			}
		}
	}
	var walk func(u *run.Unfolding)
	walk = func(u *run.Unfolding) {
		if seen[u.Name] {
			return
		}
		seen[u.Name] = true
		r := b.traceRow(u, prefix, weighed[u.Name])
		switch u.Kind {
		case string(scoring.FactorLeaf):
			t.Factors++
			return
		case string(scoring.FactLeaf):
			t.Facts = append(t.Facts, r)
		case string(scoring.SettingLeaf):
			t.Settings = append(t.Settings, r)
		default:
			for _, in := range u.Inputs {
				href := "#" + prefix + in.Name
				if in.Kind == string(scoring.FactorLeaf) {
					href = "#f-" + in.Name
				}
				r.Inputs = append(r.Inputs, inputView{Name: in.Name, Href: href, Value: b.value(in)})
			}
			t.Quantities = append(t.Quantities, r)
		}
		for _, in := range u.Inputs {
			walk(in)
		}
	}
	for _, k := range keys {
		u, err := run.Unfold(b.in.Params, b.in.Snapshot, c, k)
		if err != nil {
			return nil, fmt.Errorf("unfold %s of %s: %w", k, c.ID(), err)
		}
		walk(u)
	}
	return t, nil
}

// value writes what a quantity of the trace came to.
func (b *book) value(u *run.Unfolding) string {
	if u.State != scoring.Number.String() {
		return u.State
	}
	if u.Name == "agreed_limit_kw" && u.Value == 0 {
		return "no limit"
	}
	return plainNumber(u.Value)
}

func (b *book) traceRow(u *run.Unfolding, prefix string, weighed bool) traceRow {
	r := traceRow{Name: u.Name, Anchor: prefix + u.Name, Title: first(u.Title, b.info[u.Name].Title), Value: b.value(u), Unit: present.UnitWords(u.Unit), Formula: u.Formula, Source: u.Source, From: present.Provenance(u.Provenance), Weighed: weighed}
	if u.State != scoring.Number.String() {
		r.Class = "u" // hatching means unknown, nothing else
		if u.State == scoring.None.String() || u.State == scoring.Never.String() {
			r.Class = "s"
		}
		r.Source = present.Reason(u.Why)
		if u.State == scoring.NotAssessed.String() {
			r.Source = present.Reason("not_assessed")
		}
		r.Unit = first(r.Unit, b.info[u.Name].Unit)
	} else if u.Range != "" && u.Low != u.High {
		r.Span = plainNumber(u.Low) + " to " + plainNumber(u.High)
	}
	if !b.told {
		r.Source, _, _ = strings.Cut(r.Source, ", told by ")
	}
	return r
}
