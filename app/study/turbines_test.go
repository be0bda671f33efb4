package study_test

import (
	"context"
	"errors"
	"math"
	"reflect"
	"strings"
	"testing"

	"groundtally/app/study"
	"groundtally/geo"
)

// ramp is a curve of 1,000 kW with thrust, in steps of 1 m/s from 3 to 25 m/s.
func ramp() []study.CurvePoint {
	var out []study.CurvePoint
	for v := 3.0; v <= 25; v++ {
		out = append(out, study.CurvePoint{SpeedMPerS: v, PowerKW: math.Min(1000, 100*(v-3)), Ct: 0.8, HasCt: true})
	}
	return out
}

func machine() study.OwnTurbine {
	return study.OwnTurbine{ID: "mine", Title: "Mine 1.0", RatedKW: 1000, RotorDiameterM: 60, Points: ramp(), Source: "sheet of 2031"}
}

func snapshot(t *testing.T, s *study.Study) *study.Snapshot {
	t.Helper()
	n, err := s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	return n
}

func TestTurbinesAreKeptAndUndone(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	before := snapshot(t, s)
	if err := s.PutTurbine(ctx, machine(), "the machine on offer"); err != nil {
		t.Fatal(err)
	}
	b := machine()
	b.ID = "a-second"
	if err := s.PutTurbine(ctx, b, ""); err != nil {
		t.Fatal(err)
	}
	list := snapshot(t, s).Turbines()
	if len(list) != 2 || list[0].ID != "a-second" || list[1].ID != "mine" {
		t.Fatalf("the turbines are %v", list)
	}
	m := list[1]
	if m.CutInMPerS != 4 || m.CutOutMPerS != 25 || m.AirKgPerM3 != 1.225 || m.Reason != "the machine on offer" || !reflect.DeepEqual(m.Points, ramp()) {
		t.Errorf("kept as %+v", m)
	}
	if study.SameInputs(before, snapshot(t, s)) {
		t.Error("a turbine more counts as the same inputs")
	}
	j := s.Journal()
	if len(j) != 2 || study.ChangeTitle(j[0].Changes[0]) != "power curve of the turbine mine added" {
		t.Errorf("journal %+v", j)
	}
	if _, err := s.Undo(ctx); err != nil {
		t.Fatal(err)
	}
	if n := len(snapshot(t, s).Turbines()); n != 1 {
		t.Errorf("after undo there are %d turbines", n)
	}
	if _, err := s.Redo(ctx); err != nil {
		t.Fatal(err)
	}
	if _, ok := snapshot(t, s).Turbine("a-second"); !ok {
		t.Error("redo does not bring the turbine back")
	}
	// A frozen state keeps its turbines.
	f, err := s.Freeze(ctx, "shown", "")
	if err != nil {
		t.Fatal(err)
	}
	if err := s.RemoveTurbine(ctx, "mine", ""); err != nil {
		t.Fatal(err)
	}
	old, err := study.NewSnapshot(s.Catalog(), f.Records)
	if err != nil {
		t.Fatal(err)
	}
	if len(old.Turbines()) != 2 || len(snapshot(t, s).Turbines()) != 1 {
		t.Error("a frozen state lost its turbine, or the present one kept it")
	}
}

func TestTurbineInUseStays(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	if err := s.PutTurbine(ctx, machine(), ""); err != nil {
		t.Fatal(err)
	}
	set(t, s, "plant.wind.turbine", "mine")
	err := s.RemoveTurbine(ctx, "mine", "")
	if err == nil || !strings.Contains(err.Error(), "the plant option wind uses its curve") || !strings.Contains(err.Error(), "plant.wind.turbine") {
		t.Errorf("removing a turbine in use: %v", err)
	}
	set(t, s, "plant.wind.turbine", "nrel_5mw_126")
	if err := s.RemoveTurbine(ctx, "mine", ""); err != nil {
		t.Error(err)
	}
	if err := s.RemoveTurbine(ctx, "mine", ""); !errors.Is(err, study.ErrNotThere) {
		t.Errorf("removing what is not there: %v", err)
	}
	if err := s.RemoveTurbine(ctx, "nrel_5mw_126", ""); err == nil || !strings.Contains(err.Error(), "ships with the program") {
		t.Errorf("removing a shipped one: %v", err)
	}
}

func TestTurbinesThatCannotBe(t *testing.T) {
	ctx := context.Background()
	s := open(t)
	if err := s.PutTurbine(ctx, machine(), ""); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		what  string
		point int
		wreck func(m *study.OwnTurbine)
	}{
		{"cannot be used in settings", 0, func(m *study.OwnTurbine) { m.ID = "a.b" }},
		{"already. Choose another name", 0, func(m *study.OwnTurbine) { m.ID = "NREL_5mw_126" }},
		{"already. Choose another name", 0, func(m *study.OwnTurbine) { m.ID = "Mine" }},
		{"rated power must be above zero", 0, func(m *study.OwnTurbine) { m.RatedKW = 0 }},
		{"diameter must be above zero", 0, func(m *study.OwnTurbine) { m.RotorDiameterM = math.NaN() }},
		{"lies outside 0 to 300", 0, func(m *study.OwnTurbine) { m.RotorDiameterM = 301 }},
		{"air density", 0, func(m *study.OwnTurbine) { m.AirKgPerM3 = 1225 }},
		{"at least two speeds", 0, func(m *study.OwnTurbine) { m.Points = m.Points[:1] }},
		{"stands twice", 3, func(m *study.OwnTurbine) { m.Points[2].SpeedMPerS = 4 }},
		{"less than the one before", 3, func(m *study.OwnTurbine) { m.Points[2].SpeedMPerS = 3.5 }},
		{"not between 0 and 60", 23, func(m *study.OwnTurbine) { m.Points[22].SpeedMPerS = 90 }},
		{"no number", 5, func(m *study.OwnTurbine) { m.Points[4].PowerKW = math.Inf(1) }},
		{"below zero", 1, func(m *study.OwnTurbine) { m.Points[0].PowerKW = -4 }},
		{"others have none", 2, func(m *study.OwnTurbine) { m.Points[1].HasCt = false }},
		{"not between 0 and 2", 2, func(m *study.OwnTurbine) { m.Points[1].Ct = 2.5 }},
		{"reaches 1000 kW, and rated power is 500 kW", 0, func(m *study.OwnTurbine) { m.RatedKW = 500 }},
		{"no more than 1000 kW, and rated power is 20000 kW", 0, func(m *study.OwnTurbine) { m.RatedKW = 20000 }},
		{"do not rise", 0, func(m *study.OwnTurbine) { m.CutInMPerS, m.CutOutMPerS = 25, 20 }},
		{"cut-out is at 20 m/s", 23, func(m *study.OwnTurbine) { m.CutOutMPerS = 20 }},
		{"no power above zero", 0, func(m *study.OwnTurbine) { m.Points = []study.CurvePoint{{SpeedMPerS: 3}, {SpeedMPerS: 4}} }},
	} {
		m := machine()
		c.wreck(&m)
		err := s.PutTurbine(ctx, m, "")
		if err == nil || !strings.Contains(err.Error(), c.what) {
			t.Errorf("want %q, got %v", c.what, err)
			continue
		}
		var te *study.TurbineError
		if errors.As(err, &te) && te.Point != c.point {
			t.Errorf("%q is at point %d, want %d", c.what, te.Point, c.point)
		}
	}
	if n := len(s.Journal()); n != 1 {
		t.Errorf("the journal has %d entries, want 1", n)
	}
}

func TestTurbineNotices(t *testing.T) {
	for want, change := range map[string]func(m *study.OwnTurbine){
		"":                    func(*study.OwnTurbine) {},
		"turbine_above_rated": func(m *study.OwnTurbine) { m.Points[15].PowerKW = 1100 },
		"turbine_below_rated": func(m *study.OwnTurbine) { m.RatedKW = 1100 },
		"turbine_power_falls": func(m *study.OwnTurbine) { m.Points[5].PowerKW = 350 },
		"turbine_starts_late": func(m *study.OwnTurbine) { m.Points = m.Points[3:] },
		"turbine_ends_early":  func(m *study.OwnTurbine) { m.Points = m.Points[:15] },
		"turbine_no_thrust": func(m *study.OwnTurbine) {
			for i := range m.Points {
				m.Points[i].HasCt, m.Points[i].Ct = false, 0
			}
		},
		"turbine_thrust_clipped": func(m *study.OwnTurbine) { m.Points[1].Ct = 1.1 },
		"turbine_uneven_steps":   func(m *study.OwnTurbine) { m.Points = append(m.Points[:20:20], m.Points[22]) },
	} {
		m := machine()
		change(&m)
		if err := m.Check(); err != nil {
			t.Errorf("%s: %v", want, err)
		}
		got := ""
		for _, n := range m.Notices() {
			got += n.Code
			if n.Args["turbine"] != "mine" {
				t.Errorf("%s does not name its turbine", n.Code)
			}
		}
		if got != want {
			t.Errorf("notices %q, want %q", got, want)
		}
	}
}

// A curve of thin air is brought to the standard: with pitch control its speeds become less, with stall its powers more.
func TestCurveOfAnotherDensity(t *testing.T) {
	m := machine()
	m.AirKgPerM3 = 1.0
	w, err := m.Machine()
	if err != nil {
		t.Fatal(err)
	}
	cbrt := math.Cbrt(1.0 / 1.225)
	if got := w.Curve.PowerKW(8 * cbrt); math.Abs(got-500) > 1e-9 {
		t.Errorf("pitch: %g kW at the normalised speed, want 500", got)
	}
	m.Stall = true
	if w, err = m.Machine(); err != nil {
		t.Fatal(err)
	}
	if got := w.Curve.PowerKW(8); math.Abs(got-500*1.225) > 1e-9 {
		t.Errorf("stall: %g kW, want %g", got, 500*1.225)
	}
	if !w.Stall || w.Name != "Mine 1.0" || w.RatedKW != 1000 {
		t.Errorf("the machine is %+v", w)
	}
}

// table makes an import of a table whose cells are given as a reader would give them.
func table(columns []string, rows ...[]geo.Value) study.Import {
	l := &geo.Layer{}
	for _, c := range columns {
		l.Columns = append(l.Columns, geo.Column{Name: c})
	}
	for i, r := range rows {
		l.Features = append(l.Features, geo.Feature{ID: string(rune('1' + i)), Values: r})
	}
	return study.Import{File: "curve.csv", Base: "curve.csv", Layer: l}
}

func numbers(xs ...float64) []geo.Value {
	var out []geo.Value
	for _, x := range xs {
		out = append(out, geo.NumberValue(x))
	}
	return out
}

func TestHeadsOfCurves(t *testing.T) {
	for _, c := range []struct {
		columns []string
		unit    string
		air     float64
		thrust  bool
	}{
		{[]string{"v [m/s]", "P (kW)", "Ct"}, "kW", 0, true},
		{[]string{"speed_m_per_s", "power_kw", "ct"}, "kW", 0, true},
		{[]string{"Windgeschwindigkeit in m/s", "Leistung in kW", "Schubbeiwert [-]"}, "kW", 0, true},
		{[]string{"Vitesse du vent (m/s)", "Puissance (MW)", "Coefficient de poussée"}, "MW", 0, true},
		{[]string{"v / m/s", "P / W", "c_t"}, "W", 0, true},
		{[]string{"Wind speed m/s", "Power output [kW] at 1.225 kg/m3", "Cp"}, "kW", 1.225, false},
		{[]string{"WindSpeed", "Power at 1,1 kg/m³ [kW]", "Thrust [kN]"}, "kW", 1.1, false},
		{[]string{"velocidad del viento", "potencia (kW, 1.0 kg/m^3)", "Coeficiente de empuje"}, "kW", 1, true},
		{[]string{"Windsnelheid (m/s)", "Vermogen (kW) (rho = 0.95 kg/m3)", "CT-value"}, "kW", 0.95, true},
		{[]string{"wind km/h", "Effekt.kW", "Ct (-)"}, "kW", 0, true},
	} {
		got, err := study.ReadCurve(table(c.columns, numbers(36, 100, 0.8), numbers(72, 200, 0.7)), study.CurveOptions{})
		if err != nil {
			t.Errorf("%v: %v", c.columns, err)
			continue
		}
		if got.Speed != c.columns[0] || got.Power != c.columns[1] || (got.Thrust != "") != c.thrust || got.PowerUnit != c.unit || got.AirKgPerM3 != c.air {
			t.Errorf("%v: read as %+v", c.columns, got)
		}
		if c.columns[0] == "wind km/h" && math.Abs(got.Points[0].SpeedMPerS-10) > 1e-12 {
			t.Errorf("36 km/h are %g m/s", got.Points[0].SpeedMPerS)
		}
		if kw := map[string]float64{"kW": 100, "MW": 1e5, "W": 0.1}[c.unit]; math.Abs(got.Points[0].PowerKW-kw) > 1e-9 {
			t.Errorf("%v: %g kW, want %g", c.columns, got.Points[0].PowerKW, kw)
		}
	}
}

func TestOpenHeadsAreAsked(t *testing.T) {
	for _, c := range []struct {
		columns []string
		o       study.CurveOptions
		want    string
	}{
		{[]string{"v", "P", "Ct"}, study.CurveOptions{}, `in which unit is the power in column "P"?`},
		{[]string{"v", "P", "Ct"}, study.CurveOptions{PowerUnit: "hp"}, "no unit of a power curve"},
		{[]string{"v", "P [MW]", "Ct"}, study.CurveOptions{PowerUnit: "kW"}, "says that the power is in MW, and kW was given"},
		{[]string{"a", "b", "c"}, study.CurveOptions{}, "which column holds the wind speed? The columns are: a, b, c"},
		{[]string{"v", "P 1.1 kg/m3 [kW]", "P 1.225 kg/m3 [kW]"}, study.CurveOptions{}, "which column holds the electrical power? It can be: P 1.1 kg/m3 [kW], P 1.225 kg/m3 [kW]"},
		{[]string{"v", "P [kW]", "Ct"}, study.CurveOptions{Power: "Q"}, `there is no column "Q"`},
		{[]string{"v", "P [kW]", "Ct"}, study.CurveOptions{Thrust: "v"}, "one column cannot be two things"},
	} {
		_, err := study.ReadCurve(table(c.columns, numbers(4, 100, 0.8), numbers(5, 200, 0.7)), c.o)
		var q *study.QuestionError
		if !errors.As(err, &q) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("want %q, got %v", c.want, err)
		}
	}
	got, err := study.ReadCurve(table([]string{"a", "b", "Ct"}, numbers(4, 100, 0.8)), study.CurveOptions{Speed: "a", Power: "B", PowerUnit: "W", Thrust: study.NoThrust})
	if err != nil || got.Power != "b" || got.Thrust != "" || got.Points[0].HasCt || got.Points[0].PowerKW != 0.1 {
		t.Errorf("%+v, %v", got, err)
	}
}

func TestCellsOfCurvesNameTheirRow(t *testing.T) {
	head := []string{"v [m/s]", "P [kW]", "Ct"}
	text := func(xs ...string) []geo.Value {
		var out []geo.Value
		for _, x := range xs {
			v := geo.TextValue(x)
			if x == "" {
				v = geo.Value{}
			}
			out = append(out, v)
		}
		return out
	}
	for _, c := range []struct {
		rows [][]geo.Value
		want string
	}{
		{[][]geo.Value{text("3,5", "10", "0,8"), text("4", "cut-in", "0,8")}, `row 2 below the head, column P [kW]: "cut-in" is not a number`},
		{[][]geo.Value{text("3,5", "10", "0,8"), text("4,5", "", "0,8")}, "row 2 below the head, column P [kW]: the power is missing"},
		{[][]geo.Value{text("3,5", "10", "0,8"), text("", "20", "0,8")}, "column v [m/s]: the wind speed is missing"},
		{[][]geo.Value{text("3,5", "10", ""), text("4", "20", "0,8")}, "leave thrust out with --thrust none"},
	} {
		_, err := study.ReadCurve(table(head, c.rows...), study.CurveOptions{})
		var f *study.FileError
		if !errors.As(err, &f) || !strings.Contains(err.Error(), c.want) {
			t.Errorf("want %q, got %v", c.want, err)
		}
	}
	got, err := study.ReadCurve(table(head, text("3,5", "10", "0,8"), text("", "", ""), text("4,5", "20,5", "0,75")), study.CurveOptions{})
	if err != nil || len(got.Points) != 2 || got.Points[1] != (study.CurvePoint{SpeedMPerS: 4.5, PowerKW: 20.5, Ct: 0.75, HasCt: true}) || got.Rows[1] != "3" {
		t.Errorf("%+v, %v", got, err)
	}
}
