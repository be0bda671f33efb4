package appendix

import (
	"fmt"
	"html"
	"html/template"
	"sort"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring"
)

// pageKeys are the columns of the consequence tables on the page.
var pageKeys = []string{"buildable_area_ha", "rated_kw", "energy_p50_mwh_per_yr", "delivered_mwh_per_yr", "eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock", "net_share", "energy_payback_yr",
	"footprint_direct_ha", "footprint_total_ha", "power_density_w_per_m2", "soil_carbon_loss_tc", "habitat_ha", "flood_ha", "ghg_g_per_kwh", "carbon_payback_yr", "nearest_dwelling_m", "noise_dba", "connection_km", "connection_loss_frac"}

// groupView is the consequence table of the shown candidates for some accounts.
type groupView struct {
	Title string
	Heads []headView
	Rows  []groupRow
	Words []string // what the states in it mean
}

type headView struct{ Title, Unit, Sentence string }

type groupRow struct {
	ID, Site, Plant string
	Cells           []cellView
}

type cellView struct {
	Text, Span, Class string
	Over              bool
}

// widest is how many columns a table may have and still be read on paper.
const widest = 7

// groups writes the consequences of the shown candidates account by account, with low to high. Beside the
// columns of the page every weighed consequence has one.
func (b *book) groups() []groupView {
	wanted := map[string]bool{}
	for _, k := range pageKeys {
		wanted[k] = true
	}
	for _, v := range b.in.Results.Voices {
		for _, k := range keysOf(v) {
			wanted[k] = true
		}
	}
	var candidates []*run.Candidate
	for i := range b.in.Results.Candidates {
		if c := &b.in.Results.Candidates[i]; b.shown[c.ID()] {
			candidates = append(candidates, c)
		}
	}
	var out []groupView
	var keys, names []string
	flush := func() {
		if len(keys) == 0 {
			return
		}
		g := b.group(keys, candidates)
		g.Title = "Account: " + names[0]
		if len(names) > 1 {
			g.Title = "Accounts: " + strings.Join(names, ", ")
		}
		out, keys, names = append(out, g), nil, nil
	}
	for _, a := range scoring.Accounts() {
		var own []string
		for _, k := range b.in.Params.Keys() {
			if wanted[k.Key] && k.Account == a {
				own = append(own, k.Key)
			}
		}
		if len(own) == 0 {
			continue
		}
		if len(keys)+len(own) > widest {
			flush()
		}
		// A large account is parted evenly, so that no table is left with one column; small ones share a table.
		parts := (len(own) + widest - 1) / widest
		for i := range parts {
			name := fmt.Sprintf("%s (%d columns", a, len(own))
			if parts > 1 {
				name = fmt.Sprintf("%s (part %d of %d", a, i+1, parts)
			}
			keys, names = append(keys, own[i*len(own)/parts:(i+1)*len(own)/parts]...), append(names, name+")")
			if parts > 1 {
				flush()
			}
		}
	}
	flush()
	return out
}

func (b *book) group(keys []string, candidates []*run.Candidate) groupView {
	var g groupView
	words := map[string]bool{}
	for _, k := range keys {
		g.Heads = append(g.Heads, headView{Title: b.title(k), Unit: present.UnitWords(b.info[k].Unit), Sentence: b.info[k].Sentence})
	}
	for _, c := range candidates {
		r := groupRow{ID: c.ID(), Site: c.Site, Plant: b.plantTitle(c.Plant)}
		for _, k := range keys {
			q, _ := c.Consequence(k)
			cell := cellOf(q)
			cell.Over = contains(c.OverLimit, k)
			if q.State != scoring.Number {
				words[b.title(k)+", "+present.WhyNot(q)] = true
			}
			r.Cells = append(r.Cells, cell)
		}
		g.Rows = append(g.Rows, r)
	}
	nothing := groupRow{Site: "Doing nothing", Plant: "nothing is built"}
	for range keys {
		nothing.Cells = append(nothing.Cells, cellView{Text: "none", Class: "s"})
	}
	g.Rows = append(g.Rows, nothing)
	for i := range b.in.Results.Alternatives {
		a := &b.in.Results.Alternatives[i]
		r := groupRow{Site: a.Title, Plant: "beside the candidates"}
		for _, k := range keys {
			q := a.Consequence(k)
			r.Cells = append(r.Cells, cellOf(q))
			if q.State != scoring.Number && q.State != scoring.None {
				words[a.Title+": "+b.title(k)+", "+present.WhyNot(q)] = true
			}
		}
		g.Rows = append(g.Rows, r)
	}
	g.Words = sorted(words)
	return g
}

func contains(list []string, s string) bool {
	for _, x := range list {
		if x == s {
			return true
		}
	}
	return false
}

func sorted(m map[string]bool) []string {
	out := make([]string, 0, len(m))
	for k := range m {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}

func cellOf(q scoring.Consequence) cellView {
	out := cellView{Text: present.Cell(q)}
	switch q.State {
	case scoring.Number:
		if q.Range != scoring.NoRange && q.Range != "" && q.Low != q.High {
			out.Span = lowToHigh(q)
		}
	case scoring.Unknown, scoring.NotAssessed, scoring.NotSet:
		out.Class = "u"
	default:
		out.Class = "s"
	}
	return out
}

func lowToHigh(q scoring.Consequence) string {
	return present.Figure(q.Low, q.Low, q.High) + " to " + present.Figure(q.High, q.Low, q.High)
}

// bulkView is one plant option's table of every candidate, and of the sites without room.
type bulkView struct {
	Title, ID       string
	Fitted          int
	Table           template.HTML
	LeftOut         []string // columns in which no candidate has a number, with the reason
	Words           []string
	NoRoom          int
	NoRoomTable     template.HTML
	NotComputed     int
	NotComputedText []string
}

// bulk writes every candidate, by plant option. The tables are large, so their cells are written
// without the template; every text is escaped here.
func (b *book) bulk() (out []bulkView, fitted, noRoom int) {
	for _, plant := range b.in.Snapshot.Plants() {
		v := bulkView{Title: b.plantTitle(plant), ID: plant}
		var in, without []*run.Candidate
		reasons := map[string]bool{}
		for i := range b.in.Results.Candidates {
			c := &b.in.Results.Candidates[i]
			if c.Plant != plant {
				continue
			}
			switch c.Status {
			case run.Fitted:
				in = append(in, c)
			case run.NoRoom:
				without = append(without, c)
			default:
				v.NotComputed++
				reasons[present.Reason(c.Reason)] = true
			}
		}
		v.Fitted, v.NoRoom, v.NotComputedText = len(in), len(without), sorted(reasons)
		if len(in) > 0 {
			b.bulkFitted(&v, in)
		}
		if len(without) > 0 {
			v.NoRoomTable = b.bulkWithout(v.Title, without)
		}
		fitted, noRoom = fitted+len(in), noRoom+len(without)
		out = append(out, v)
	}
	return out, fitted, noRoom
}

func (b *book) bulkFitted(v *bulkView, in []*run.Candidate) {
	var keys []string
	words := map[string]bool{}
	for _, k := range pageKeys {
		numbers, why := false, map[string]bool{}
		for _, c := range in {
			q, _ := c.Consequence(k)
			if q.State == scoring.Number {
				numbers = true
			} else {
				why[b.title(k)+", "+present.WhyNot(q)] = true
			}
		}
		if !numbers {
			v.LeftOut = append(v.LeftOut, sorted(why)...)
			continue
		}
		keys = append(keys, k)
		for w := range why {
			words[w] = true
		}
	}
	v.Words = sorted(words)
	var w strings.Builder
	fmt.Fprintf(&w, "<table class=bulk><caption>%s: %d candidates</caption><thead><tr><th scope=col>site", html.EscapeString(v.Title), len(in))
	for _, k := range keys {
		fmt.Fprintf(&w, "<th scope=col>%s<br>(%s)", html.EscapeString(b.title(k)), html.EscapeString(present.UnitWords(b.info[k].Unit)))
	}
	w.WriteString("<th scope=col>marks<tbody>")
	for _, c := range in {
		fmt.Fprintf(&w, "<tr><th scope=row>%s", html.EscapeString(c.Site))
		for _, k := range keys {
			q, _ := c.Consequence(k)
			cell := cellOf(q)
			w.WriteString("\n<td")
			if cell.Class != "" {
				w.WriteString(" class=" + cell.Class)
			}
			w.WriteString(">" + html.EscapeString(cell.Text))
			if cell.Span != "" {
				w.WriteString("<i>" + html.EscapeString(cell.Span) + "</i>")
			}
			if contains(c.OverLimit, k) {
				w.WriteString("<b class=over>over the limit</b>")
			}
		}
		w.WriteString("<td class=t>" + b.marks(c))
	}
	w.WriteString("</table>")
	v.Table = template.HTML(w.String())
}

// marks writes what is remarkable about a candidate, escaped.
func (b *book) marks(c *run.Candidate) string {
	var m []string
	if len(c.OverLimit) > 0 {
		m = append(m, `<b class=over>over the limit: `+html.EscapeString(b.titles(c.OverLimit))+`</b>`)
	}
	if len(c.Incomplete) > 0 {
		m = append(m, "incomplete: "+html.EscapeString(b.rules(c.Incomplete)))
	}
	if contains(c.Notices, "peat_touched") {
		m = append(m, "peat")
	}
	if contains(c.Notices, "old_habitat_touched") {
		m = append(m, "irreplaceable habitat")
	}
	return strings.Join(m, "; ")
}

func (b *book) bulkWithout(title string, without []*run.Candidate) template.HTML {
	var w strings.Builder
	fmt.Fprintf(&w, "<table class=bulk><caption>%s: %d sites without room, and how near they came</caption><thead><tr><th scope=col>site<th scope=col>buildable<br>(ha)<th scope=col>largest patch<br>(ha)<th scope=col>patch needed<br>(ha)<th scope=col>rule that takes most<th scope=col>it takes<br>(ha)<tbody>", html.EscapeString(title), len(without))
	for _, c := range without {
		fmt.Fprintf(&w, "\n<tr><th scope=row>%s", html.EscapeString(c.Site))
		m := c.Miss
		if m == nil {
			w.WriteString("<td class=t colspan=5>" + html.EscapeString(present.Reason(c.Reason)))
			continue
		}
		needs, taker, takes := "no least patch", "none", ""
		if m.NeedsPatchHa > 0 {
			needs = hectares(m.NeedsPatchHa)
		}
		if m.LargestTaker != "" {
			taker, takes = present.Rule(m.LargestTaker), hectares(m.TakesHa)
		}
		fmt.Fprintf(&w, "<td>%s<td>%s<td>%s<td class=t>%s<td>%s", hectares(m.BuildableHa), hectares(m.LargestPatchHa), needs, html.EscapeString(taker), takes)
	}
	w.WriteString("</table>")
	return template.HTML(w.String())
}

func hectares(x float64) string { return fmt.Sprintf("%.2f", x) }
