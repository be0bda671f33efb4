package appendix

import (
	"fmt"
	"html/template"
	"math"
	"slices"
	"sort"
	"strconv"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/geo"
	"groundtally/scoring"
)

type voiceView struct {
	Title, Anchor string
	Lead          string // sentence on first place
	Chart         template.HTML
	Pair          template.HTML // the first two places against each other
	First, Second string
	Weights       []weightView
	Accounts      []string
	Rows          []rowView
	More, Held    int
	HeldRows      []string // the first of those held back, with the place that each would take without gates
	Beside        []string // what stands beside the candidates
	Sparing       string   // which sites the order would build
	Spared        []sparedView
	Two           template.HTML // the accounts of the first two candidates side by side
	Same          string        // what is unknown in every row shown
	Tipping       []tippingView
	Notices       []string
}

// sparedView is what a saved share of the energy makes needless.
type sparedView struct {
	Share, Sites, Built, Direct, Total, HaYr, Stock, Saved, Economy string
	Own                                                             bool // the share that the study has set
}

type weightView struct {
	Title, Unit, Share, Sentence string
	Number                       int
}

type tippingView struct{ Title, Weight, Below, Above string }

type rowView struct {
	Place, Tier, Site, Plant, ID, Score, Span, Ranks, First, CanBe string
	Accounts                                                       []string
	Over                                                           string
	Marks                                                          []string
	Nothing, Unknown                                               bool
}

// keysOf gives the keys that a voice weighs, the heaviest first.
func keysOf(v run.VoiceOrder) []string {
	if len(v.Order) == 0 {
		return nil
	}
	parts := v.Order[0].Parts
	keys := slices.Clone(parts.Names())
	sort.Slice(keys, func(i, j int) bool {
		a, b := parts.Of(keys[i]).Weight, parts.Of(keys[j]).Weight
		if a != b {
			return a > b
		}
		return keys[i] < keys[j]
	})
	return keys
}

func three(x float64) string { return strconv.FormatFloat(x, 'f', 3, 64) }

// voice writes the order of a voice and remembers the candidates that it shows.
func (b *book) voice(i int) (voiceView, error) {
	v := b.in.Results.Voices[i]
	out := voiceView{Title: first(v.Title, v.Voice), Anchor: "voice-" + strconv.Itoa(i+1), Held: len(v.HeldBack)}
	for _, n := range v.Notices {
		out.Notices = append(out.Notices, present.Notice(n))
	}
	if len(v.Order) == 0 {
		return out, nil
	}
	keys := keysOf(v)
	for j, k := range keys {
		out.Weights = append(out.Weights, weightView{Number: j + 1, Title: b.title(k), Unit: present.UnitWords(b.info[k].Unit), Share: three(v.Order[0].Parts.Of(k).Weight), Sentence: b.info[k].Sentence})
	}
	var accounts []scoring.Account
	for _, a := range scoring.Accounts() {
		if _, ok := v.Order[0].Accounts.Find(string(a)); ok {
			accounts = append(accounts, a)
			out.Accounts = append(out.Accounts, string(a))
		}
	}
	var rows []run.Row
	for j, r := range v.Order {
		if j >= b.in.Top && r.Site != run.NoSite {
			continue
		}
		rows = append(rows, r)
		if r.Site != run.NoSite {
			b.shown[r.Site+"/"+r.Plant] = true
		}
	}
	same := unknownInAll(rows)
	out.Same = b.titles(same)
	for _, r := range rows {
		out.Rows = append(out.Rows, b.row(r, accounts, same))
	}
	out.More = len(v.Order) - len(rows)
	for _, a := range v.Beside {
		out.Beside = append(out.Beside, pictures.Beside(a, b.title))
	}
	for j, h := range v.HeldBack {
		if j == heldShown {
			out.HeldRows = append(out.HeldRows, fmt.Sprintf("%d more", len(v.HeldBack)-j))
			break
		}
		out.HeldRows = append(out.HeldRows, fmt.Sprintf("%s would stand at place %d (held back: %s)", b.candidateName(h.ID()), h.Place, h.By()))
	}
	out.Lead = b.lead(v)
	for _, t := range v.Tipping {
		row := tippingView{Title: b.title(t.Key), Weight: three(t.Weight), Below: "no lower weight changes first place", Above: "no higher weight changes first place"}
		if t.Below != nil {
			row.Below = "below " + three(t.Below.At) + ": " + b.candidateName(t.Below.NewFirst)
		}
		if t.Above != nil {
			row.Above = "above " + three(t.Above.At) + ": " + b.candidateName(t.Above.NewFirst)
		}
		out.Tipping = append(out.Tipping, row)
	}
	out.Chart = picture(b.bars(rows, keys, out.Title, i))
	if out.Pair = b.pair(v, keys, out.Title, i); out.Pair != "" {
		out.First, out.Second = b.candidateName(v.Order[0].ID()), b.candidateName(v.Order[1].ID())
	}
	out.Two = b.sideBySide(v, i)
	return out, b.sparing(v, &out)
}

// heldShown is how many candidates that a gate holds back are named.
const heldShown = 10

// sparing tells which sites an order would build, and what saved shares of their energy would make needless.
func (b *book) sparing(v run.VoiceOrder, out *voiceView) error {
	accounts, err := b.openAccounts()
	if err != nil {
		return err
	}
	order, err := b.in.Results.Ordered(&v)
	if err != nil || len(order) == 0 {
		return err
	}
	plan, err := accounts.SparePlan(b.in.Results, order)
	if err != nil {
		return err
	}
	own, _ := b.in.Snapshot.Number("saving.share")
	shares := []float64{0.1, 0.2, 0.3, 0.4, 0.5}
	if own > 0 && !slices.Contains(shares, own) {
		shares = append(shares, own)
		slices.Sort(shares)
	}
	for _, share := range shares {
		s, e, err := plan.At(share)
		if err != nil {
			return err
		}
		figure := func(x float64) string { return present.Figure(x, x, x) }
		row := sparedView{Share: figure(100*share) + " %", Sites: strconv.Itoa(len(s.Sites)), Built: strconv.Itoa(s.StillBuilt), Direct: figure(s.DirectHa), Total: figure(s.TotalHa), HaYr: figure(s.OccupationHaYr), Stock: figure(s.StockTC),
			Saved: pictures.SavedSpan(e.Direct), Economy: pictures.SavedSpan(e.Economy), Own: share == own}
		if s.StockUnknown > 0 {
			row.Stock += fmt.Sprintf(", unknown for %d", s.StockUnknown)
		}
		out.Spared = append(out.Spared, row)
	}
	s, e, err := plan.At(0)
	if err != nil {
		return err
	}
	out.Sparing = pictures.Spared(plan, 0, s, e)
	return nil
}

// sideBySide draws the accounts of the first two candidates of an order; nothing where there is only one.
func (b *book) sideBySide(v run.VoiceOrder, index int) template.HTML {
	var pair [2]*run.Candidate
	n := 0
	for _, r := range v.Order {
		if c := b.by[r.ID()]; c != nil && n < 2 {
			pair[n] = c
			n++
		}
	}
	if n < 2 {
		return ""
	}
	title := [2]string{b.candidateName(pair[0].ID()), b.candidateName(pair[1].ID())}
	in := pictures.Accounts(pair, title, func(key string) run.KeyInfo { return b.info[key] }, pictures.Better(b.in.Snapshot.Catalog()), "Bar chart: energy, land and climate of "+title[0]+" and "+title[1]+" side by side", "-accounts-two-"+strconv.Itoa(index+1))
	return picture(chart.SideBySide(in, draw.Light(), fullWidth))
}

// candidateName writes a candidate's id in words.
func (b *book) candidateName(id string) string {
	if id == run.NoSite {
		return "doing nothing"
	}
	if c, ok := b.by[id]; ok {
		return c.Site + ", " + b.plantTitle(c.Plant)
	}
	return id
}

// lead says in one or two sentences what an order amounts to.
func (b *book) lead(v run.VoiceOrder) string {
	tier, nothing := 0, 0
	for _, r := range v.Order {
		if r.Tier == v.Order[0].Tier {
			tier++
		}
		if r.Site == run.NoSite {
			nothing = r.Place
		}
	}
	r := v.Order[0]
	name := b.candidateName(r.ID())
	if r.Site == run.NoSite {
		name = "Doing nothing"
	}
	s := fmt.Sprintf("%s leads with a score of %s (%s to %s) and comes first in %.0f of 100 weight mixes. ", name, three(r.Score), three(r.ScoreLow), three(r.ScoreHigh), r.FirstIn100)
	if tier > 1 {
		s += fmt.Sprintf("%d of %d places share its tier and cannot be told apart from it. ", tier, len(v.Order))
	} else {
		s += "No other place shares its tier. "
	}
	if nothing > 0 {
		s += fmt.Sprintf("Doing nothing stands at place %d of %d.", nothing, len(v.Order))
	}
	return s
}

// unknownInAll gives the keys that are unknown in every row that is a site, so that the page says it once.
func unknownInAll(rows []run.Row) []string {
	var out []string
	sites := 0
	count := map[string]int{}
	for _, r := range rows {
		if r.Site == run.NoSite {
			continue
		}
		if sites++; sites == 1 {
			out = append(out, r.Unknown...)
		}
		for _, k := range r.Unknown {
			count[k]++
		}
	}
	return slices.DeleteFunc(out, func(k string) bool { return count[k] < sites || sites < 2 })
}

func (b *book) row(r run.Row, accounts []scoring.Account, same []string) rowView {
	out := rowView{Place: strconv.Itoa(r.Place), Tier: strconv.Itoa(r.Tier), Site: r.Site, Plant: b.plantTitle(r.Plant), ID: r.ID(), Score: three(r.Score), Span: three(r.ScoreLow) + " to " + three(r.ScoreHigh),
		Ranks: fmt.Sprintf("%d to %d", r.RankBest, r.RankWorst), First: fmt.Sprintf("%.0f", r.FirstIn100), CanBe: r.CanBeFirst, Nothing: r.Site == run.NoSite, Unknown: len(r.Unknown) > 0}
	for _, a := range accounts {
		out.Accounts = append(out.Accounts, three(r.Accounts.Of(string(a))))
	}
	if len(r.OverLimit) > 0 {
		out.Over = "over the limit: " + b.titles(r.OverLimit)
	}
	add := func(word, text string) {
		if text != "" {
			out.Marks = append(out.Marks, word+text)
		}
	}
	var unknown []string
	for _, k := range r.Unknown {
		if !slices.Contains(same, k) {
			unknown = append(unknown, k)
		}
	}
	add("unknown: ", b.titles(unknown))
	add("incomplete, not set: ", b.rules(r.Incomplete))
	if len(r.DominatedBy) > 0 {
		add("dominated by ", b.candidateName(r.DominatedBy[0]))
	}
	add("very low: ", b.titles(r.Alerts))
	if c, ok := b.by[out.ID]; ok {
		for _, n := range c.Notices {
			switch n {
			case "peat_touched":
				add("", "stands on mapped peat")
			case "old_habitat_touched":
				add("", "touches irreplaceable habitat")
			}
		}
	}
	if g, ok := r.Gates["owner_consent"]; ok {
		add("owner's consent: ", g.State)
	}
	if r.PlaceWithout > 0 && r.PlaceWithout != r.Place {
		add("without gates at place ", strconv.Itoa(r.PlaceWithout))
	}
	return out
}

type mapView struct {
	Caption string
	Picture template.HTML
	Small   bool
}

// maps draws the district once for each voice: the first in full, the others small and on the same
// scale of shades, so that they can be compared.
func (b *book) maps() []mapView {
	vs := b.in.Results.Voices
	if len(vs) == 0 {
		return []mapView{{Caption: "The district. The study has no voice yet, so no parcel is shaded.", Picture: picture(b.mapOf(nil, nil, 0, 0, false))}}
	}
	best := make([]map[string]run.Row, len(vs))
	lo, hi := 1.0, 0.0
	for i, v := range vs {
		best[i] = map[string]run.Row{}
		for _, r := range v.Order {
			c, ok := b.by[r.ID()]
			if !ok {
				continue
			}
			for _, p := range c.Parcels {
				if _, there := best[i][p]; !there {
					best[i][p] = r
					lo, hi = min(lo, r.Score), max(hi, r.Score)
				}
			}
		}
	}
	out := make([]mapView, len(vs))
	for i := range vs {
		v := &vs[i]
		out[i] = mapView{Small: i > 0, Caption: fmt.Sprintf("Best score that any plant option reaches on each site, under the voice %s. The numbers are places in its order: the first three that are a site.", first(v.Title, v.Voice)),
			Picture: picture(b.mapOf(v, best[i], lo, hi, i > 0))}
	}
	return out
}

// mapOf draws one map. Shades go by tenths of a score, the same in all maps of a page.
func (b *book) mapOf(v *run.VoiceOrder, best map[string]run.Row, lo, hi float64, small bool) *draw.Scene {
	from, to := math.Floor(lo*10), math.Max(math.Ceil(hi*10), math.Floor(lo*10)+1)
	class := func(score float64) float64 { return math.Min(math.Max(math.Floor(score*10), from), to-1) }
	tone := func(c float64) string {
		if to-from < 2 {
			return draw.Ramp(0.5)
		}
		return draw.Ramp((c - from) / (to - 1 - from))
	}
	bare := draw.Style{Fill: "#ffffff", Stroke: draw.Rule, Width: 0.5}
	shade := func(id string) (draw.Style, string) {
		r, ok := best[id]
		if !ok {
			if small {
				return bare, ""
			}
			return bare, id + ": no room for any option"
		}
		st := draw.Style{Fill: tone(class(r.Score)), Stroke: "#ffffff", Width: 0.4}
		if small {
			return st, ""
		}
		return st, fmt.Sprintf("%s: %s with %s", r.Site, three(r.Score), b.plantTitle(r.Plant))
	}
	title, width := "Map of the district", 1000.0
	var legend []draw.Legend
	var marks draw.Marks
	if v != nil && len(best) > 0 {
		title = "Map of the district, parcels shaded by their best score under the voice " + first(v.Title, v.Voice)
		for c := from; c < to; c++ {
			legend = append(legend, draw.Legend{Style: draw.Style{Fill: tone(c)}, Text: fmt.Sprintf("score %.1f to %.1f", c/10, (c+1)/10)})
		}
		legend = append(legend, draw.Legend{Style: bare, Text: "no room for any option"})
		b.mark(v, &marks, !small)
		if len(marks.Numbers) > 0 {
			legend = append(legend, draw.Legend{Sign: "number", Text: "place in the order"})
		}
		if len(marks.Turbines) > 0 {
			legend = append(legend, draw.Legend{Sign: "turbine", Text: "turbine of the first three"})
		}
		if len(marks.Fences) > 0 {
			legend = append(legend, draw.Legend{Style: draw.Style{Stroke: draw.Ink, Width: 1.2, Dash: "2 2"}, Text: "fence of the first three"})
		}
		if len(marks.Routes) > 0 {
			legend = append(legend, draw.Legend{Style: draw.Style{Stroke: draw.Ink, Width: 1.4, Dash: "3 3"}, Line: true, Text: "straight line to grid"})
		}
	}
	layers := b.in.Layers
	if small {
		width, layers = 560, nil
		for _, l := range b.in.Layers {
			switch l.Role {
			case "place_names":
				towns := draw.MapLayer{Role: l.Role}
				for _, f := range l.Features {
					if f.Rank > 0 && f.Rank <= 1 {
						towns.Features = append(towns.Features, f)
					}
				}
				layers = append(layers, towns)
			case "district", "parcels", "water":
				layers = append(layers, l)
			}
		}
	}
	return draw.Map(title, layers, shade, marks, legend, width)
}

// mark collects the plant of the first three places of a voice.
func (b *book) mark(v *run.VoiceOrder, m *draw.Marks, plant bool) {
	for _, r := range v.Order {
		c, ok := b.by[r.ID()]
		if !ok || len(m.Numbers) == 3 {
			continue
		}
		n := draw.Numbered{Text: strconv.Itoa(r.Place), Parcels: map[string]bool{}}
		for _, p := range c.Parcels {
			n.Parcels[p] = true
		}
		m.Numbers = append(m.Numbers, n)
		if !plant || c.Fit == nil {
			continue
		}
		m.Turbines = append(m.Turbines, c.Fit.Turbines...)
		if !c.Fit.Panels.Empty() {
			m.Fences = append(m.Fences, c.Fit.Panels)
		}
		if c.Connection != nil {
			m.Routes = append(m.Routes, [2]geo.LonLat{c.Connection.From, c.Connection.To})
		}
	}
}
