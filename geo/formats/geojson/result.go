package geojson

import (
	"sort"
	"strconv"
	"strings"

	"groundtally/geo"
)

// notices tells the severity of each code. Args: count; features, the numbers of the first ones.
var notices = map[string]geo.Severity{
	"geometry_missing":        geo.Warning, // geometry is null or not there
	"geometry_empty":          geo.Warning, // geometry without a position
	"ring_closed":             geo.Info,    // last position differed from the first
	"part_too_short":          geo.Warning, // a line of one position, a ring of fewer than three
	"collection_parted":       geo.Warning, // parts of another dimension left out
	"height_left_out":         geo.Info,    // third and further numbers of positions
	"property_nested":         geo.Info,    // a list or object kept as JSON text; Field
	"number_as_text":          geo.Info,    // a whole number beyond 2^53 kept as text; Field
	"column_mixed":            geo.Info,    // values of several kinds made text; Field
	"id_repeated":             geo.Warning, // an identifier came again and got a suffix
	"record_left_out":         geo.Fault,   // a broken record of a sequence; Args what
	"crs_not_understood":      geo.Warning, // passed over as asked; Args what
	"layer_empty":             geo.Warning, // the file has no feature
	"coordinates_not_degrees": geo.Fault,   // no crs member, and coordinates beyond 180 or 90
}

// result pads the values, settles identifiers and mixed columns, and sums the events up.
func (d *decoder) result() Result {
	l := d.layer
	l.Name = d.name
	for i := range l.Features {
		for len(l.Features[i].Values) < len(l.Columns) {
			l.Features[i].Values = append(l.Features[i].Values, geo.Value{})
		}
	}
	d.identify(&l)
	d.unmix(&l)
	if d.crs == "" && !d.o.IgnoreCRS {
		for i, f := range l.Features {
			if outside(f.Geometry) {
				d.events = append(d.events, event{code: "coordinates_not_degrees", row: d.rows[i], n: 1})
			}
		}
	}
	if len(l.Features) == 0 {
		d.events = append(d.events, event{code: "layer_empty", n: 1})
	}
	res := Result{Layer: &l, CRS: d.crs, Notices: d.sum()}
	res.Ledger = d.ledger(&l)
	return res
}

func outside(g geo.LonLatGeometry) bool {
	out := false
	g.Each(func(p geo.LonLat) {
		if p.Lon < -180 || p.Lon > 180 || p.Lat < -90 || p.Lat > 90 {
			out = true
		}
	})
	return out
}

// identify makes identifiers unique. Those of the file go first, so that they stay as they are.
func (d *decoder) identify(l *geo.Layer) {
	used := make(map[string]bool, len(l.Features))
	next := map[string]int{} // the suffix to try next, so that many repeats do not take long
	unique := func(id string) string {
		got := id
		for n := max(next[id], 2); used[got]; n++ {
			got = id + "-" + strconv.Itoa(n)
			next[id] = n + 1
		}
		used[got] = true
		return got
	}
	for _, named := range []bool{true, false} {
		for i := range l.Features {
			if d.named[i] != named {
				continue
			}
			want := l.Features[i].ID
			if !named {
				want = strconv.Itoa(d.rows[i])
			}
			got := unique(want)
			if named && got != want {
				d.events = append(d.events, event{code: "id_repeated", row: d.rows[i], n: 1})
			}
			l.Features[i].ID = got
		}
	}
}

// unmix makes columns with values of several kinds text.
func (d *decoder) unmix(l *geo.Layer) {
	for j, c := range l.Columns {
		var seen [geo.Bool + 1]bool
		kinds := 0
		for i := range l.Features {
			if k := l.Features[i].Values[j].Kind; k != geo.Null && !seen[k] {
				seen[k] = true
				kinds++
			}
		}
		if kinds < 2 {
			continue
		}
		n := 0
		for i := range l.Features {
			v := &l.Features[i].Values[j]
			switch v.Kind {
			case geo.Number:
				*v = geo.TextValue(plain(v.Number))
				n++
			case geo.Bool:
				*v = geo.TextValue(v.String())
				n++
			}
		}
		d.events = append(d.events, event{code: "column_mixed", field: c.Name, n: n})
	}
}

// plain writes a number without an exponent where a person would.
func plain(f float64) string {
	if f != 0 && (f >= 1<<53 || f <= -1<<53 || (f < 1e-6 && f > -1e-6)) {
		return strconv.FormatFloat(f, 'g', -1, 64)
	}
	return strconv.FormatFloat(f, 'f', -1, 64)
}

const named = 10 // features named in a notice

func (d *decoder) sum() []geo.Notice {
	type key struct{ code, field string }
	type total struct {
		n, features, lastRow int
		rows                 []string
	}
	totals := map[key]*total{}
	for _, e := range d.events {
		k := key{e.code, e.field}
		t := totals[k]
		if t == nil {
			t = &total{}
			totals[k] = t
		}
		t.n += e.n
		if e.row > 0 && e.row != t.lastRow {
			t.features++
			t.lastRow = e.row
			if len(t.rows) < named {
				t.rows = append(t.rows, strconv.Itoa(e.row))
			}
		}
	}
	keys := make([]key, 0, len(totals))
	for k := range totals {
		keys = append(keys, k)
	}
	sort.Slice(keys, func(i, j int) bool {
		if keys[i].code != keys[j].code {
			return keys[i].code < keys[j].code
		}
		return keys[i].field < keys[j].field
	})
	out := make([]geo.Notice, 0, len(keys))
	for _, k := range keys {
		t := totals[k]
		n := geo.Notice{Code: k.code, Severity: notices[k.code], File: d.o.File, Layer: d.name, Args: map[string]string{"count": strconv.Itoa(t.n)}}
		switch k.code {
		case "record_left_out", "crs_not_understood":
			n.Args["what"] = k.field
		default:
			n.Field = k.field
		}
		if len(t.rows) > 0 {
			n.Feature = t.rows[0]
			n.Args["features"] = strings.Join(t.rows, ", ")
			if more := t.features - len(t.rows); more > 0 {
				n.Args["more"] = strconv.Itoa(more)
			}
		}
		out = append(out, n)
	}
	return out
}

func (d *decoder) ledger(l *geo.Layer) Ledger {
	g := Ledger{Read: len(l.Features), LeftOut: d.leftOut}
	repaired := map[int]bool{}
	for _, e := range d.events {
		switch e.code {
		case "geometry_missing":
			g.NoGeometry += e.n
		case "geometry_empty":
			g.Empty += e.n
		case "ring_closed":
			g.RingsClosed += e.n
			repaired[e.row] = true
		case "part_too_short", "collection_parted":
			g.PartsLeftOut += e.n
			repaired[e.row] = true
		case "height_left_out":
			g.HeightsLeft += e.n
		case "number_as_text":
			g.NumbersAsText += e.n
		}
	}
	g.Repaired = len(repaired)
	return g
}
