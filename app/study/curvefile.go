package study

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/scoring/units"
)

// CurveOptions say how a table is a power curve. What they leave open and the head of the table does not say is
// asked.
type CurveOptions struct {
	Speed, Power, Thrust string // columns; empty when the head tells, NoThrust for a curve that is to have none
	PowerUnit            string // kW, W or MW; empty when the head tells
}

// NoThrust stands in the place of a column of thrust that is to be left out.
const NoThrust = "none"

// CurveTable is a power curve as it was read from a table.
type CurveTable struct {
	Points               []CurvePoint
	Rows                 []string // of each point: its row below the head of the table
	Speed, Power, Thrust string   // columns; no thrust when empty
	SpeedUnit, PowerUnit string   // of the columns
	AirKgPerM3           float64  // that the head says; 0 when it says none
}

// Names that columns of power curves have, without units, blanks and marks, in several languages. Source: common
// practice of makers, institutes and planners' programs.
var (
	speedNames = names("v", "vw", "vhub", "u", "ws", "wind", "windspeed", "wind speed", "wind speed at hub height", "speed", "velocity", "wind velocity",
		"windgeschwindigkeit", "wind geschwindigkeit", "geschwindigkeit", "wind", "vitesse", "vitesse du vent", "vitesse vent", "vent",
		"velocidad", "velocidad del viento", "velocidad de viento", "viento", "velocità", "velocita", "velocità del vento", "velocita del vento", "vento",
		"velocidade", "velocidade do vento", "windsnelheid", "snelheid", "vindhastighet", "vindhastighed", "vindstyrke", "tuulen nopeus", "tuulennopeus", "nopeus",
		"prędkość", "prędkość wiatru", "predkosc wiatru", "rychlost", "rychlost větru", "rychlost vetru", "szélsebesség")
	powerNames = names("p", "pel", "pe", "pout", "pelec", "power", "electrical power", "electric power", "power output", "output", "output power", "power curve", "leistung", "elektrische leistung",
		"puissance", "puissance électrique", "puissance electrique", "potencia", "potencia eléctrica", "potencia electrica", "potência", "potência elétrica", "potenza", "potenza elettrica",
		"vermogen", "elektrisch vermogen", "effekt", "eleffekt", "teho", "sähköteho", "moc", "moc elektryczna", "výkon", "vykon", "teljesítmény")
	thrustNames = names("ct", "c t", "cts", "ct value", "thrust", "thrust coefficient", "thrust coeff", "thrust coefficient ct", "schubbeiwert", "schubkoeffizient", "schub", "schubbeiwert ct",
		"coefficient de poussée", "coefficient de poussee", "poussée", "coeficiente de empuje", "coefficiente di spinta", "coeficiente de impulso", "coeficiente de empuxo",
		"stuwkrachtcoëfficiënt", "stuwkrachtcoefficient", "trækkoefficient", "trykkoeffisient", "työntövoimakerroin", "współczynnik ciągu", "součinitel tahu")
)

func names(list ...string) map[string]bool {
	out := map[string]bool{}
	for _, n := range list {
		out[n] = true
	}
	return out
}

// headUnits are the ways in which heads of columns write the units that can stand there.
var headUnits = map[string]string{
	"m/s": "m/s", "ms": "m/s", "m s-1": "m/s", "m s^-1": "m/s", "m.s-1": "m/s", "m·s-1": "m/s", "ms-1": "m/s", "m per s": "m/s", "m_per_s": "m/s", "mps": "m/s", "m_s": "m/s", "m s⁻¹": "m/s",
	"km/h": "km/h", "kmh": "km/h", "kph": "km/h", "kn": "kn", "kt": "kn", "knots": "kn", "mph": "mph", "ft/s": "ft/s",
	"kw": "kW", "kilowatt": "kW", "w": "W", "watt": "W", "watts": "W", "mw": "MW", "megawatt": "MW",
	"-": "1", "1": "1", "–": "1",
}

var (
	headAir     = regexp.MustCompile(`(\d[.,]\d+)\s*kg\s*(?:/|per|\s)?\s*m\s*(?:\^?-?3|³|⁻³)`)
	headTail    = regexp.MustCompile(`(?:^|[\s,;:@(\[=])(?:at|bei|à|a|ved|vid|for|für|pour|with|rho|ρ|air density|density|luftdichte)?\s*[@=]?[\s,;:@(\[=]*$`)
	headBracket = regexp.MustCompile(`^(.*?)\s*[\[(]\s*([^\])]*?)\s*[\])]\s*$`)
	headMarks   = regexp.MustCompile(`[\s._-]+`)
)

// head reads the name of a column: the word without its unit, the unit, and the density of the air where one is said.
func head(name string) (word, unit string, air float64) {
	text := strings.ToLower(strings.TrimSpace(name))
	if m := headAir.FindStringSubmatchIndex(text); m != nil {
		air, _ = strconv.ParseFloat(strings.Replace(text[m[2]:m[3]], ",", ".", 1), 64) // the pattern holds numbers alone
		text = strings.TrimRight(headTail.ReplaceAllString(text[:m[0]], ""), " ,;:@=") + strings.TrimRight(" "+strings.Trim(text[m[1]:], " ,;:"), " ")
		for _, pair := range []string{"()", "[]"} { // the bracket that held the density
			if open, shut := pair[:1], pair[1:]; strings.Count(text, shut) > strings.Count(text, open) {
				at := strings.LastIndex(text, shut)
				text = strings.TrimSpace(text[:at] + text[at+1:])
			}
		}
	}
	plain := func(s string) string { return strings.TrimSpace(headMarks.ReplaceAllString(s, " ")) }
	if m := headBracket.FindStringSubmatch(text); m != nil {
		if u, ok := headUnits[m[2]]; ok {
			return plain(m[1]), u, air
		}
		return plain(text), "", air
	}
	best, length := "", 0
	for u := range headUnits {
		rest, ok := strings.CutSuffix(text, u)
		if ok && len(u) > length && len(rest) > 0 && strings.ContainsAny(rest[len(rest)-1:], " _/,;:.([") && strings.Trim(rest, " _/,;:.-([") != "" {
			best, length = u, len(u)
		}
	}
	if length > 0 {
		word = strings.TrimRight(text[:len(text)-length], " _/,;:.([")
		word = strings.TrimSuffix(strings.TrimSuffix(word, " in"), "_in")
		return plain(word), headUnits[best], air
	}
	return plain(text), "", air
}

// PowerUnits are the units in which the power of a curve can be given.
func PowerUnits() []string { return []string{"kW", "W", "MW"} }

// ReadCurve reads a power curve from a table. It answers with a *QuestionError when head and options leave open
// which column is which or what its unit is, and with a *FileError that names the row when a cell cannot serve.
func ReadCurve(in Import, o CurveOptions) (CurveTable, error) {
	var t CurveTable
	if in.Layer == nil || len(in.Layer.Features) == 0 {
		return t, &FileError{File: in.File, What: "it holds no rows of a table", Cure: "Give a table with a wind speed and a power in each row"}
	}
	var qs []Question
	ask := func(option, format string, args ...any) {
		qs = append(qs, Question{fmt.Sprintf(format, args...), option})
	}
	all := columnNames(in.Layer)
	find := func(given, what, option string, known map[string]bool, fits func(unit string) bool, needed bool) int {
		if given != "" {
			at := in.Layer.ColumnIndex(given)
			for i, c := range in.Layer.Columns {
				if at < 0 && strings.EqualFold(c.Name, given) {
					at = i
				}
			}
			if at < 0 {
				ask(option+" COLUMN", "there is no column %q; the columns are: %s", given, all)
			}
			return at
		}
		var found []int
		for i, c := range in.Layer.Columns {
			if word, unit, _ := head(c.Name); known[word] && fits(unit) && hasValues(in.Layer, i) {
				found = append(found, i)
			}
		}
		switch {
		case len(found) == 1:
			return found[0]
		case len(found) > 1:
			var list []string
			for _, i := range found {
				list = append(list, in.Layer.Columns[i].Name)
			}
			ask(fmt.Sprintf("%s %q (for one)", option, list[0]), "which column holds %s? It can be: %s", what, strings.Join(list, ", "))
		case needed:
			ask(option+" COLUMN", "which column holds %s? The columns are: %s", what, all)
		}
		return -1
	}
	speed := find(o.Speed, "the wind speed", "--speed", speedNames, func(u string) bool {
		return u == "" || slices.Contains([]string{"m/s", "km/h", "kn", "mph", "ft/s"}, u)
	}, true)
	power := find(o.Power, "the electrical power", "--power", powerNames, func(u string) bool { return u == "" || slices.Contains(PowerUnits(), u) }, true)
	thrust := -1
	if o.Thrust != NoThrust {
		thrust = find(o.Thrust, "the thrust coefficient (--thrust none leaves it out)", "--thrust", thrustNames, func(u string) bool { return u == "" || u == "1" }, false)
	}
	if speed >= 0 && (speed == power || speed == thrust) || power >= 0 && power == thrust {
		ask("--speed COLUMN --power COLUMN --thrust COLUMN", "one column cannot be two things; which is which? The columns are: %s", all)
	}
	if speed >= 0 {
		t.Speed = in.Layer.Columns[speed].Name
		_, t.SpeedUnit, _ = head(t.Speed)
		if t.SpeedUnit == "" || t.SpeedUnit == "1" {
			t.SpeedUnit = "m/s"
		}
		if _, err := units.Convert(1, t.SpeedUnit, "m/s"); err != nil {
			return t, &FileError{File: in.File, Where: "column " + t.Speed, What: "wind speeds in " + t.SpeedUnit + " are not read", Cure: "Bring them to m/s"}
		}
	}
	if power >= 0 {
		t.Power = in.Layer.Columns[power].Name
		_, said, air := head(t.Power)
		t.AirKgPerM3 = air
		if !slices.Contains(PowerUnits(), said) {
			said = ""
		}
		switch t.PowerUnit = first(o.PowerUnit, said); {
		case t.PowerUnit == "":
			ask("--power-unit kW, --power-unit W or --power-unit MW", "in which unit is the power in column %q?", t.Power)
		case !slices.Contains(PowerUnits(), t.PowerUnit):
			ask("--power-unit kW, --power-unit W or --power-unit MW", "%q is no unit of a power curve; in which unit is the power in column %q?", t.PowerUnit, t.Power)
		case said != "" && said != t.PowerUnit:
			ask("--power-unit "+said+", or correct the head of the column", "column %q says that the power is in %s, and %s was given; which is right?", t.Power, said, t.PowerUnit)
		}
	}
	if thrust >= 0 {
		t.Thrust = in.Layer.Columns[thrust].Name
	}
	if len(qs) > 0 {
		return t, &QuestionError{File: in.File, Questions: qs}
	}
	return t, t.rows(in, speed, power, thrust)
}

// hasValues reports whether a column has any value; spare columns of a form have none.
func hasValues(l *geo.Layer, col int) bool {
	return slices.ContainsFunc(l.Features, func(f geo.Feature) bool { return strings.TrimSpace(f.Values[col].String()) != "" })
}

// CurveRow names a row of a table for an error.
func CurveRow(row string) string { return "row " + row + " below the head" }

func (t *CurveTable) rows(in Import, speed, power, thrust int) error {
	comma := decimalCommas(in.Layer, []int{speed, power, thrust})
	for _, f := range in.Layer.Features {
		cell := func(col int) string {
			if col < 0 {
				return ""
			}
			return strings.TrimSpace(f.Values[col].String())
		}
		if cell(speed) == "" && cell(power) == "" && cell(thrust) == "" {
			continue
		}
		var got [3]float64
		for i, col := range []int{speed, power, thrust} {
			if col < 0 {
				continue
			}
			what := [...]string{"the wind speed", "the power", "the thrust coefficient"}[i]
			where := CurveRow(f.ID) + ", column " + in.Layer.Columns[col].Name
			text := cell(col)
			if text == "" {
				cure := "Fill it, or take the row out"
				if i == 2 {
					cure = "Fill it, or leave thrust out with --thrust " + NoThrust
				}
				return &FileError{File: in.File, Where: where, What: what + " is missing", Cure: cure}
			}
			x, ok := f.Values[col].Float()
			if !ok && comma {
				x, ok = geo.TextValue(strings.Replace(text, ",", ".", 1)).Float()
			}
			if !ok {
				return &FileError{File: in.File, Where: where, What: fmt.Sprintf("%q is not a number", text), Cure: "Write " + what + " as a plain number, or take the row out; a unit belongs into the head of the column"}
			}
			got[i] = x
		}
		v, err := units.Convert(got[0], t.SpeedUnit, "m/s")
		if err != nil {
			return err
		}
		kw, err := units.Convert(got[1], t.PowerUnit, "kW")
		if err != nil {
			return err
		}
		t.Points = append(t.Points, CurvePoint{SpeedMPerS: v, PowerKW: kw, Ct: got[2], HasCt: thrust >= 0})
		t.Rows = append(t.Rows, f.ID)
	}
	return nil
}

// decimalCommas tells whether text cells of the columns write their fractions with a comma: a table reader keeps a
// column as text as soon as one of its cells is no number, so the others are read here.
func decimalCommas(l *geo.Layer, cols []int) bool {
	some := false
	for _, f := range l.Features {
		for _, c := range cols {
			if c < 0 || f.Values[c].Kind != geo.Text {
				continue
			}
			switch text := f.Values[c].Text; {
			case strings.Contains(text, ".") && strings.ContainsAny(text, "0123456789"):
				return false
			case strings.Count(text, ",") == 1:
				some = true
			}
		}
	}
	return some
}
