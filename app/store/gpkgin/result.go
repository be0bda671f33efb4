package gpkgin

import (
	"cmp"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
)

// severities of the notices. Args: count; features, the keys of the first ones; more, how many others.
var severities = map[string]geo.Severity{
	"geometry_missing":         geo.Warning, // NULL
	"geometry_empty":           geo.Warning, // geometry without a position
	"geometry_unreadable":      geo.Fault,   // features left out; Args what: why the first of them was
	"geometry_curved":          geo.Fault,   // features left out; Args what
	"ring_closed":              geo.Info,    // last position differed from the first
	"part_too_short":           geo.Warning, // a line of one position, a ring of fewer than three
	"collection_parted":        geo.Warning, // parts of another dimension left out
	"height_left_out":          geo.Info,    // heights or measures
	"reference_system_differs": geo.Warning, // a geometry names another one than its table; Args table
	"reference_system_missing": geo.Warning, // it is named and not described; Args number
	"coordinates_not_degrees":  geo.Fault,   // beyond 180 or 90 in a system of degrees
	"number_as_text":           geo.Info,    // a whole number beyond 2^53 kept as text; Field
	"number_not_finite":        geo.Warning, // an infinite number, read as missing; Field
	"text_not_utf8":            geo.Warning, // bytes that are no characters, replaced; Field
	"value_left_out":           geo.Warning, // binary data in a column of other values, read as missing; Field
	"column_left_out":          geo.Info,    // a column of binary data; Field
	"column_mixed":             geo.Info,    // values of several kinds made text; Field
	"id_repeated":              geo.Warning, // a key came again and got a suffix
	"no_key":                   geo.Info,    // the table has no primary key
	"layer_empty":              geo.Warning, // the table has no row
}

// A sumKey is what notices are summed up by: the code and the field, reason or number it concerns.
type sumKey struct{ code, about string }

type sum struct {
	n, features int
	last, what  string
	rows        []string
}

const namedInNotice = 10 // features

// count notes that something was met n times in a feature; an empty feature stands for the table.
func (r *reader) count(code, about, feature string, n int) {
	r.countWhat(code, about, feature, n, "")
}

func (r *reader) countWhat(code, about, feature string, n int, what string) {
	if n == 0 {
		return
	}
	k := sumKey{code, about}
	s := r.sums[k]
	if s == nil {
		s = &sum{what: what}
		r.sums[k] = s
	}
	s.n += n
	if feature == "" || s.features > 0 && feature == s.last {
		return
	}
	s.features++
	s.last = feature
	if len(s.rows) < namedInNotice {
		s.rows = append(s.rows, feature)
	}
}

func (r *reader) result() Result {
	r.dropBinary()
	r.identify()
	r.unmix()
	if r.rows == 0 {
		r.count("layer_empty", "", "", 1)
	}
	r.ledger.Read = len(r.layer.Features)
	r.layer.Name = r.t.Title
	return Result{Layer: &r.layer, CRS: r.t.CRS, Notices: r.summed(), Ledger: r.ledger}
}

// dropBinary takes out columns that turned out to hold nothing but binary data.
func (r *reader) dropBinary() {
	for i := len(r.columns) - 1; i >= 0; i-- {
		c := r.columns[i]
		if c.binary == 0 || c.seen[geo.Text]+c.seen[geo.Number]+c.seen[geo.Bool] > 0 {
			continue
		}
		delete(r.sums, sumKey{"value_left_out", c.name})
		r.count("column_left_out", c.name, "", 1)
		r.columns = slices.Delete(r.columns, i, i+1)
		r.layer.Columns = slices.Delete(r.layer.Columns, i, i+1)
		for j := range r.layer.Features {
			r.layer.Features[j].Values = slices.Delete(r.layer.Features[j].Values, i, i+1)
		}
	}
}

// identify makes identifiers unique. Those of the file go first, so that they stay as they are.
func (r *reader) identify() {
	used := make(map[string]bool, len(r.layer.Features))
	next := map[string]int{} // the suffix to try next, so that many repeats do not take long
	for _, named := range []bool{true, false} {
		for i := range r.layer.Features {
			if r.named[i] != named {
				continue
			}
			id := r.layer.Features[i].ID
			got := id
			for n := max(next[id], 2); used[got]; n++ {
				got = id + "-" + strconv.Itoa(n)
				next[id] = n + 1
			}
			used[got] = true
			if named && got != id {
				r.count("id_repeated", "", got, 1)
			}
			r.layer.Features[i].ID = got
		}
	}
}

// unmix makes columns with values of several kinds text.
func (r *reader) unmix() {
	for i, c := range r.columns {
		kinds := 0
		for _, k := range []geo.ValueKind{geo.Text, geo.Number, geo.Bool} {
			if c.seen[k] > 0 {
				kinds++
			}
		}
		if kinds < 2 {
			continue
		}
		for j := range r.layer.Features {
			switch v := &r.layer.Features[j].Values[i]; v.Kind {
			case geo.Number:
				*v = geo.TextValue(decimal(v.Number))
			case geo.Bool:
				*v = geo.TextValue(v.String())
			}
		}
		r.count("column_mixed", c.name, "", c.seen[geo.Number]+c.seen[geo.Bool])
	}
}

// decimal writes a number without an exponent where a person would.
func decimal(f float64) string {
	if f != 0 && (f > maxExact || f < -maxExact || (f < 1e-6 && f > -1e-6)) {
		return strconv.FormatFloat(f, 'g', -1, 64)
	}
	return strconv.FormatFloat(f, 'f', -1, 64)
}

// summed gives the notices of the file, then those of the table by code and field.
func (r *reader) summed() []geo.Notice {
	keys := make([]sumKey, 0, len(r.sums))
	for k := range r.sums {
		keys = append(keys, k)
	}
	slices.SortFunc(keys, func(a, b sumKey) int {
		return cmp.Or(cmp.Compare(a.code, b.code), cmp.Compare(a.about, b.about))
	})
	out := slices.Clone(r.f.notices)
	for i := range out {
		out[i].File = r.o.File
	}
	for _, k := range keys {
		s := r.sums[k]
		n := geo.Notice{Code: k.code, Severity: severities[k.code], File: r.o.File, Layer: r.t.Title, Args: map[string]string{"count": strconv.Itoa(s.n)}}
		switch k.code {
		case "geometry_unreadable", "geometry_curved":
			n.Args["what"] = s.what
		case "reference_system_missing":
			n.Args["number"] = k.about
		case "reference_system_differs":
			n.Args["table"] = k.about
		default:
			n.Field = k.about
		}
		if len(s.rows) > 0 {
			n.Feature = s.rows[0]
			n.Args["features"] = strings.Join(s.rows, ", ")
			if more := s.features - len(s.rows); more > 0 {
				n.Args["more"] = strconv.Itoa(more)
			}
		}
		out = append(out, n)
	}
	return out
}
