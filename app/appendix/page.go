package appendix

import (
	"bytes"
	"context"
	_ "embed"
	"fmt"
	"html/template"
	"sort"
	"strings"

	"groundtally/app/draw"
	"groundtally/app/draw/svg"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
)

//go:embed page.html
var pageHTML string

// Input is all that a page is made from. Nothing of it is the time of making: the same study gives the
// same bytes.
type Input struct {
	Snapshot *study.Snapshot
	Results  *run.Results
	Params   *run.Params
	Layers   []draw.MapLayer
	Notices  []geo.Notice
	Engines  []string
	Version  string
	Journal  []study.Entry
	Frozen   []study.Frozen
	Top      int // places of each voice shown in full; 0 takes 15
}

// MapLayers reads the layers that a map shows. Personal columns are never read.
func MapLayers(ctx context.Context, snap *study.Snapshot, load run.Loader) ([]draw.MapLayer, error) {
	shown := map[string]bool{"district": true, "parcels": true, "water": true, "roads": true, "grid_lines": true, "substations": true, "dwellings": true, "place_names": true}
	var out []draw.MapLayer
	for _, rec := range snap.Layers {
		if !shown[rec.Role] || rec.Kind == "raster" || rec.Kind == "table" {
			continue
		}
		v, err := load(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		personal := map[string]bool{}
		for _, p := range rec.Personal {
			personal[p] = true
		}
		field := func(f geo.Feature, name string) geo.Value {
			col := rec.Match[name]
			if i := v.Layer.ColumnIndex(col); col != "" && i >= 0 && !personal[col] {
				return f.Values[i]
			}
			return geo.Value{}
		}
		l := draw.MapLayer{Role: rec.Role}
		for _, f := range v.Layer.Features {
			rank, _ := field(f, "rank").Float()
			l.Features = append(l.Features, draw.MapFeature{ID: f.ID, Name: field(f, "name").String(), Class: field(f, "class").String(), Rank: rank, Geometry: f.Geometry})
		}
		out = append(out, l)
	}
	return out, nil
}

// cautions are printed in every appendix.
var cautions = []string{
	"This is a screening. It sorts candidates; it replaces no permit, no survey, no measurement on site and no licensed engineer. Local codes prevail over every default shown here.",
	"Grid: only the network operator's study can offer a connection, its point, date, limit and charge. Lines and substations are live: never approach, measure, dig or fly near them on the strength of this page; call the operator and the buried-services enquiry first.",
	"Wind: setbacks for topple and ice throw are screening distances; ice throw, noise, shadow and structural safety need their own assessments by qualified people under local law.",
	"Yields rest on climatology without a mast or a year of measurements: the odds stated are those of the model, and realised yields have on average come out lower than forecast.",
	"Figures marked default, unverified rest on values that were not checked against their source.",
}

// alwaysNotAssessed is what the program does not look at whatever the data.
var alwaysNotAssessed = []string{
	"noise, shadow flicker, visibility and glare (in this version of the program)",
	"a routed grid connection: the length is the straight distance times a detour factor",
	"terrain horizon, slope and orientation of the ground in the solar yield; hill speed-up, blockage and far wakes in the wind yield",
	"birds and bats, aviation and radar, telecommunication links, archaeology below ground",
	"storage and backup, labour, finance, insurance; money only where the user enters it",
	"foundations, geology, loads, access for cranes, strength of bridges and roofs",
	"ownership and contracts besides the noted consent; the opinion of anyone not asked",
}

type tableRow struct {
	ID, Site, Plant string
	Cells           []cell
	Marks           string
}

type cell struct {
	Text, Full, Class string
}

type voiceView struct {
	Title, Name string
	Chart       template.HTML
	Rows        []run.Row
	Keys        []string
	Weights     []string
	More        int
	Tipping     []string
	Held        int
	Notices     []string
}

type unfolded struct {
	ID, Title string
	C         *run.Candidate
	Accounts  []accountView
	Chain     []string
	Taken     []string
	Fit       string
	Grid      string
	Notices   []string
}

type accountView struct {
	Name string
	Rows [][]string
}

// pageKeys are the columns of the consequence table on the page.
var pageKeys = []string{"buildable_area_ha", "rated_kw", "energy_p50_mwh_per_yr", "delivered_mwh_per_yr", "eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock", "net_share", "energy_payback_yr",
	"footprint_direct_ha", "footprint_total_ha", "power_density_w_per_m2", "soil_carbon_loss_tc", "habitat_ha", "flood_ha", "ghg_g_per_kwh", "carbon_payback_yr", "nearest_dwelling_m", "noise_dba", "connection_km", "connection_loss_frac"}

// Page writes the appendix as one self-contained HTML page.
func Page(in Input) ([]byte, error) {
	top := in.Top
	if top == 0 {
		top = 15
	}
	info := map[string]run.KeyInfo{}
	for _, k := range in.Params.Keys() {
		info[k.Key] = k
	}
	data := map[string]any{
		"Name": first(in.Snapshot.Text("study.name"), "Study"), "Author": in.Snapshot.Text("study.author"), "Place": in.Snapshot.Text("study.place"),
		"Code": in.Results.Code, "Version": in.Version, "Engines": in.Engines, "Cautions": cautions, "NotAssessed": alwaysNotAssessed,
	}
	shown := map[string]bool{}
	var voices []voiceView
	for _, v := range in.Results.Voices {
		voices = append(voices, voiceOf(v, top, shown))
	}
	data["Voices"] = voices
	data["Map"] = template.HTML(svg.Write(mapOf(in, shown))) // our own scene, escaped by the writer

	var heads []map[string]string
	for _, k := range pageKeys {
		heads = append(heads, map[string]string{"Key": k, "Title": info[k].Title, "Unit": present.Unit(info[k].Unit), "Sentence": info[k].Sentence})
	}
	data["Heads"] = heads
	var rows []tableRow
	var full []unfolded
	counts := map[string]int{}
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		counts[c.Status]++
		if c.Status != run.Fitted {
			continue
		}
		row := tableRow{ID: c.ID(), Site: c.Site, Plant: c.Plant, Marks: marks(c)}
		for _, k := range pageKeys {
			q, _ := c.Consequence(k)
			row.Cells = append(row.Cells, cellOf(q))
		}
		rows = append(rows, row)
		if shown[c.ID()] {
			full = append(full, unfold(c, info))
		}
	}
	data["Rows"], data["Full"], data["Counts"] = rows, full, counts
	data["KeyCount"], data["PageKeyCount"] = len(info), len(pageKeys)

	var settings [][]string
	for _, k := range in.Snapshot.Keys() {
		s, byUser, ok := in.Snapshot.Lookup(k)
		if !ok {
			continue
		}
		from := "default"
		if byUser {
			from = first(s.AcceptedBy, "user")
		} else if s.Provenance == "memory" {
			from = "default, unverified"
		}
		settings = append(settings, []string{k, s.Value, present.Unit(s.Unit), from, s.Source, s.Reason})
	}
	data["Settings"] = settings

	var layers [][]string
	for _, l := range in.Snapshot.Layers {
		complete := "no"
		if l.Complete {
			complete = "yes"
		}
		layers = append(layers, []string{l.Name, l.Role, fmt.Sprint(l.Count), l.CRS, l.Edition, l.Holder, complete, fmt.Sprintf("%d / %d / %d", l.Ledger.Read, l.Ledger.Repaired, l.Ledger.LeftOut), l.Digest[:16]})
	}
	data["Layers"] = layers

	var factors [][]string
	ids := make([]string, 0, len(in.Params.Factors))
	for id := range in.Params.Factors {
		ids = append(ids, id)
	}
	sort.Strings(ids)
	for _, id := range ids {
		f, changed, err := run.UserFactor(in.Params, in.Snapshot, id)
		if err != nil {
			return nil, err
		}
		prov := string(f.Provenance)
		if changed {
			prov = "user"
		}
		if prov == "memory" {
			prov = "default, unverified (memory)"
		}
		factors = append(factors, []string{id, fmt.Sprintf("%.4g / %.4g / %.4g", f.Low, f.Central, f.High), present.Unit(f.Unit), prov, f.Source})
	}
	data["Factors"] = factors

	var glossary [][]string
	var missing []string
	for _, k := range in.Params.Keys() {
		if !k.Derived {
			glossary = append(glossary, []string{k.Title, k.Key, present.Unit(k.Unit), k.Sentence})
		}
	}
	for _, k := range in.Params.Keys() {
		if _, ok := in.Params.Graph.Slot(k.Key); !ok {
			missing = append(missing, k.Title)
		}
	}
	data["Glossary"], data["MissingKeys"] = glossary, missing

	var notices []string
	for _, n := range in.Notices {
		notices = append(notices, n.Severity.String()+": "+present.Notice(n))
	}
	for _, n := range in.Results.Notices {
		notices = append(notices, n.Severity.String()+": "+present.Notice(n))
	}
	data["Notices"] = notices
	data["JournalCount"] = len(in.Journal)
	var journal [][]string
	for _, e := range in.Journal {
		journal = append(journal, []string{fmt.Sprint(e.Seq), e.Verb, fmt.Sprint(len(e.Changes)), e.Reason})
	}
	data["Journal"] = journal
	var frozen []string
	for _, f := range in.Frozen {
		frozen = append(frozen, fmt.Sprintf("%s (after change %d, check code %s)", f.Name, f.Seq, first(f.Code, "not computed")))
	}
	data["Frozen"] = frozen

	t, err := template.New("page").Parse(pageHTML)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if err := t.Execute(&b, data); err != nil {
		return nil, fmt.Errorf("write the appendix: %w", err)
	}
	return b.Bytes(), nil
}

func first(texts ...string) string {
	for _, t := range texts {
		if t != "" {
			return t
		}
	}
	return ""
}

func marks(c *run.Candidate) string {
	var m []string
	if len(c.OverLimit) > 0 {
		m = append(m, "over the limit: "+strings.Join(c.OverLimit, ", "))
	}
	if len(c.Incomplete) > 0 {
		m = append(m, "incomplete: "+strings.Join(c.Incomplete, ", "))
	}
	return strings.Join(m, "; ")
}

func cellOf(q scoring.Consequence) cell {
	out := cell{Text: present.Cell(q), Full: present.Span(q)}
	switch q.State {
	case scoring.Unknown, scoring.NotAssessed, scoring.NotSet:
		out.Class, out.Full = "unknown", q.Why
	case scoring.None, scoring.Never, scoring.Class:
		out.Class, out.Full = "state", q.Why
	}
	return out
}

func voiceOf(v run.VoiceOrder, top int, shown map[string]bool) voiceView {
	out := voiceView{Title: first(v.Title, v.Voice), Name: v.Voice, Held: len(v.HeldBack)}
	if len(v.Order) == 0 {
		return out
	}
	for k := range v.Order[0].Parts {
		out.Keys = append(out.Keys, k)
	}
	sort.Strings(out.Keys)
	for _, k := range out.Keys {
		out.Weights = append(out.Weights, fmt.Sprintf("%.3f", v.Order[0].Parts[k].Weight))
	}
	for i, r := range v.Order {
		if i < top || r.Site == run.NoSite {
			out.Rows = append(out.Rows, r)
			if r.Site != run.NoSite {
				shown[r.Site+"/"+r.Plant] = true
			}
		}
	}
	out.More = len(v.Order) - len(out.Rows)
	for _, t := range v.Tipping {
		s := fmt.Sprintf("%s, weight %.3f: ", t.Key, t.Weight)
		switch {
		case t.Below == nil && t.Above == nil:
			s += "no weight of it changes first place"
		case t.Below == nil:
			s += fmt.Sprintf("above %.3f %s leads", t.Above.At, t.Above.NewFirst)
		case t.Above == nil:
			s += fmt.Sprintf("below %.3f %s leads", t.Below.At, t.Below.NewFirst)
		default:
			s += fmt.Sprintf("below %.3f %s leads, above %.3f %s leads", t.Below.At, t.Below.NewFirst, t.Above.At, t.Above.NewFirst)
		}
		out.Tipping = append(out.Tipping, s)
	}
	for _, n := range v.Notices {
		out.Notices = append(out.Notices, present.Notice(n))
	}
	out.Chart = template.HTML(svg.Write(bars(out.Rows, out.Keys, out.Title))) // our own scene, escaped by the writer
	return out
}

// bars draws scores as stacked parts with the interval under them; an unknown part is hatched.
func bars(rows []run.Row, keys []string, title string) *draw.Scene {
	const label, width, rowH = 230.0, 980.0, 24.0
	head := 24*float64((len(keys)+1)/2) + 14
	s := &draw.Scene{Width: width, Height: head + rowH*float64(len(rows)) + 30, Title: "Scores under " + title + ", by part"}
	s.Rect(0, 0, s.Width, s.Height, draw.Style{Fill: draw.Paper}, "")
	for i, k := range keys {
		x, y := 10+float64(i%2)*width/2, 8+24*float64(i/2)
		s.Rect(x, y, 14, 12, draw.Style{Fill: draw.Category(i)}, "")
		s.Text(draw.Text{At: draw.Point{X: x + 20, Y: y + 11}, Text: k, Size: 12, Colour: draw.Ink})
	}
	scale := width - label - 70
	for i, r := range rows {
		y := head + rowH*float64(i)
		name := fmt.Sprintf("%d. %s, %s", r.Place, r.Site, r.Plant)
		if r.Site == run.NoSite {
			name = fmt.Sprintf("%d. do nothing", r.Place)
		}
		s.Text(draw.Text{At: draw.Point{X: label - 8, Y: y + 14}, Text: name, Size: 12, Colour: draw.Ink, Anchor: draw.End})
		x := label
		for j, k := range keys {
			p := r.Parts[k]
			st := draw.Style{Fill: draw.Category(j)}
			words := fmt.Sprintf("%s: %.3f of weight %.3f", k, p.Share, p.Weight)
			if p.Value == nil {
				st = draw.Style{Hatch: true, Stroke: draw.Category(j), Width: 1.2}
				words = k + ": unknown, counts half its weight"
			}
			s.Rect(x, y+3, p.Share*scale, 13, st, words)
			x += p.Share * scale
		}
		s.Line(draw.Style{Stroke: draw.Ink, Width: 1.2}, draw.Point{X: label + r.ScoreLow*scale, Y: y + 19}, draw.Point{X: label + r.ScoreHigh*scale, Y: y + 19})
		s.Text(draw.Text{At: draw.Point{X: width - 56, Y: y + 14}, Text: fmt.Sprintf("%.3f", r.Score), Size: 12, Colour: draw.Ink, Bold: true})
	}
	s.Text(draw.Text{At: draw.Point{X: label, Y: s.Height - 9}, Text: "Coloured parts add up to the score; hatching: unknown; the line below each bar runs from the lowest to the highest score.", Size: 11, Colour: draw.Faint})
	return s
}

// mapOf draws the district: a parcel is shaded by the best score that any option reaches there under the
// first voice.
func mapOf(in Input, shown map[string]bool) *draw.Scene {
	best := map[string]float64{}
	words := map[string]string{}
	lo, hi := 1.0, 0.0
	title := "Map of the district"
	var marks draw.Marks
	first := map[string]bool{}
	parcels := map[string][]string{}
	for i := range in.Results.Candidates {
		parcels[in.Results.Candidates[i].Site] = in.Results.Candidates[i].Parcels
	}
	if len(in.Results.Voices) > 0 {
		v := in.Results.Voices[0]
		title = "Best score of each site under " + v.Title
		for i, r := range v.Order {
			if r.Site == run.NoSite {
				continue
			}
			if i < 3 {
				first[r.Site+"/"+r.Plant] = true
			}
			for _, p := range parcels[r.Site] {
				if _, there := best[p]; !there {
					best[p] = r.Score
					words[p] = fmt.Sprintf("%s: %.3f with %s", r.Site, r.Score, r.Plant)
				}
			}
			lo, hi = min(lo, r.Score), max(hi, r.Score)
		}
	}
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		if !first[c.ID()] || c.Fit == nil {
			continue
		}
		marks.Turbines = append(marks.Turbines, c.Fit.Turbines...)
		if !c.Fit.Panels.Empty() {
			marks.Fences = append(marks.Fences, c.Fit.Panels)
		}
		if c.Connection != nil {
			marks.Routes = append(marks.Routes, [2]geo.LonLat{c.Connection.From, c.Connection.To})
		}
	}
	shade := func(id string) (draw.Style, string) {
		if s, ok := best[id]; ok && hi > lo {
			return draw.Style{Fill: draw.Ramp((s - lo) / (hi - lo)), Stroke: "#ffffff", Width: 0.4}, words[id]
		}
		return draw.Style{Fill: "#ffffff", Stroke: draw.Rule, Width: 0.5}, id + ": no room for any option"
	}
	legend := []draw.Legend{
		{Style: draw.Style{Fill: draw.Ramp(0)}, Text: fmt.Sprintf("lowest best score, %.3f", lo)},
		{Style: draw.Style{Fill: draw.Ramp(0.5)}, Text: fmt.Sprintf("middle, %.3f", (lo+hi)/2)},
		{Style: draw.Style{Fill: draw.Ramp(1)}, Text: fmt.Sprintf("highest, %.3f", hi)},
		{Style: draw.Style{Fill: "#ffffff", Stroke: draw.Rule, Width: 1}, Text: "no room for any option"},
		{Style: draw.Style{Stroke: draw.Ink, Width: 1.4}, Text: "plant of the first three places"},
		{Style: draw.Style{Stroke: draw.Ink, Width: 1.2, Dash: "3 3"}, Text: "straight line of its connection"},
	}
	return draw.Map(title, in.Layers, shade, marks, legend, 1000)
}

func unfold(c *run.Candidate, info map[string]run.KeyInfo) unfolded {
	u := unfolded{ID: c.ID(), Title: c.Site + ", " + c.Plant, C: c}
	for _, a := range scoring.Accounts() {
		v := accountView{Name: string(a)}
		for _, q := range c.Consequences {
			if q.Account != a {
				continue
			}
			why := q.Quality
			if q.State != scoring.Number && q.Why != "" {
				why = q.Why
			}
			var ns []string
			for _, n := range q.Notices {
				ns = append(ns, present.Sentence(n, nil))
			}
			v.Rows = append(v.Rows, []string{info[q.Key].Title, present.Cell(q), present.Unit(q.Unit), present.Span(q), why, strings.Join(ns, " ")})
		}
		if len(v.Rows) > 0 {
			u.Accounts = append(u.Accounts, v)
		}
	}
	for _, st := range c.Chain {
		u.Chain = append(u.Chain, fmt.Sprintf("%s: %.1f %s (%+.2f %%)", strings.ReplaceAll(st.Name, "_", " "), st.After, st.Unit, -100*st.Share))
	}
	for _, t := range c.Taken {
		s := fmt.Sprintf("%s: %.2f ha alone, %.2f ha shared", t.Rule, t.AloneHa, t.SharedHa)
		if t.TakesAll {
			s += "; alone it takes the whole site"
		}
		u.Taken = append(u.Taken, s)
	}
	u.Taken = append(u.Taken, fmt.Sprintf("by several rules: %.2f ha; by smallest width or patch: %.2f ha", c.TakenSharedHa, c.ShapeHa))
	if f := c.Fit; f != nil {
		u.Fit = fmt.Sprintf("%s: %.0f kW rated, %.0f kW at the terminals, %d turbines, %.2f ha fenced, %.2f km of new track", strings.ReplaceAll(f.Mode, "_", " "), f.RatedKW, f.ACKW, len(f.Turbines), f.FencedHa, f.TrackKm)
	}
	if n := c.Connection; n != nil {
		u.Grid = fmt.Sprintf("%s (%s, %g kV): %s %s; %.2f km straight, %.2f km with detour; %d × %s", n.Asset, n.Kind, n.VoltageKV, n.Status, strings.ReplaceAll(n.Reason, "_", " "), n.StraightKm, n.RouteKm, n.Circuits, n.Conductor)
		if n.ToldBy != "" {
			u.Grid += "; spare capacity told by " + n.ToldBy + " " + n.ToldOn
		}
	}
	for _, n := range c.Notices {
		u.Notices = append(u.Notices, present.Sentence(n, nil))
	}
	return u
}
