package grid

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"groundtally/assets/citedtable"
	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// Material of a conductor. ACSR is aluminium around a steel core, of which the aluminium carries.
type Material string

// The materials.
const (
	Aluminium Material = "Al"
	Copper    Material = "Cu"
	ACSR      Material = "ACSR"
)

// Temperature coefficients at 20 °C, 1/K; resistivities at 20 °C, Ω·m; densities, kg/dm3. IEC 60287-1-1
// as transcribed on public pages.
const (
	alphaAl, alphaCu     = 0.00403, 0.00393
	rhoAl, rhoCu         = 2.8264e-8, 1.7241e-8
	densityAl, densityCu = 2.703, 8.89
	densitySteel         = 7.78
	layAl, laySteel      = 1.0226, 1.004 // length of the wires over length of the line, ACSR
	reference            = 20.0          // °C
)

// Kind of line.
type Kind string

// The kinds of line.
const (
	Cable    Kind = "cable"
	Overhead Kind = "overhead"
)

// Conductor is one standard size for one circuit at one level.
type Conductor struct {
	ID                                 string
	Level                              LevelID
	Kind                               Kind
	Material                           Material
	SectionMM2                         float64
	RatedA                             float64 // Iz under the conditions of the table
	R20OhmPerKm                        float64
	XOhmPerKm                          float64 // at 50 Hz
	CNFPerKm                           float64
	ThetaMaxC, ThetaAmbientC           float64
	ACFactor                           float64
	AlKgPerKm, CuKgPerKm, SteelKgPerKm float64 // of one circuit
	Source                             string
	Provenance                         citedtable.Provenance
}

// ParseConductors reads the cited table of conductors; the order of the rows is kept.
func ParseConductors(t *citedtable.Table) ([]Conductor, error) {
	out := make([]Conductor, 0, len(t.Rows))
	seen := map[string]bool{}
	for _, r := range t.Rows {
		c := Conductor{ID: r.Text("id"), Level: LevelID(r.Text("level")), Kind: Kind(r.Text("kind")), Material: Material(r.Text("material")), Source: r.Source, Provenance: r.Provenance}
		for _, f := range []struct {
			column string
			to     *float64
			zero   bool
		}{{"section_mm2", &c.SectionMM2, false}, {"iz_a", &c.RatedA, false}, {"r20_ohm_per_km", &c.R20OhmPerKm, false}, {"x_ohm_per_km", &c.XOhmPerKm, false},
			{"c_nf_per_km", &c.CNFPerKm, false}, {"theta_max_c", &c.ThetaMaxC, false}, {"theta_ambient_c", &c.ThetaAmbientC, false}, {"ac_factor", &c.ACFactor, false},
			{"al_kg_per_km", &c.AlKgPerKm, true}, {"cu_kg_per_km", &c.CuKgPerKm, true}, {"steel_kg_per_km", &c.SteelKgPerKm, true}} {
			v, err := r.Float(f.column)
			if err != nil {
				return nil, err
			}
			if v < 0 || (v == 0 && !f.zero) {
				return nil, fmt.Errorf("conductor table %s, line %d: %s must be above 0", t.Name, r.Line, f.column)
			}
			*f.to = v
		}
		if c.ID == "" || seen[c.ID] {
			return nil, fmt.Errorf("conductor table %s, line %d: id %q is empty or stands twice", t.Name, r.Line, c.ID)
		}
		seen[c.ID] = true
		if c.Kind != Cable && c.Kind != Overhead {
			return nil, fmt.Errorf("conductor table %s, line %d: kind %q is not cable or overhead", t.Name, r.Line, c.Kind)
		}
		if _, err := alpha(c.Material); err != nil {
			return nil, fmt.Errorf("conductor table %s, line %d: %w", t.Name, r.Line, err)
		}
		if c.ThetaMaxC <= c.ThetaAmbientC {
			return nil, fmt.Errorf("conductor table %s, line %d: highest temperature not above ambient", t.Name, r.Line)
		}
		out = append(out, c)
	}
	return out, nil
}

func alpha(m Material) (float64, error) {
	switch m {
	case Aluminium, ACSR:
		return alphaAl, nil
	case Copper:
		return alphaCu, nil
	}
	return 0, fmt.Errorf("material %q: %w", m, ErrInput)
}

// ResistanceAt is the direct-current resistance at a temperature, r(θ) = r20·[1 + α(θ − 20)], Ω/km.
//
// r20 is the largest value that the standard allows, with stranding and lay already in it; never compute
// it from the nominal section. α .00403 for aluminium, .00393 for copper, 1/K.
func ResistanceAt(r20OhmPerKm float64, m Material, thetaC float64) (float64, error) {
	a, err := alpha(m)
	if err != nil {
		return 0, err
	}
	if err := bounds.Positive("resistance", r20OhmPerKm); err != nil {
		return 0, err
	}
	if !(thetaC >= -60 && thetaC <= 250) {
		return 0, bounds.Error("conductor temperature", thetaC, "-60 to 250 °C")
	}
	return r20OhmPerKm * (1 + float64(a*(thetaC-reference))), nil
}

// ResistanceOhmPerKm is the alternating-current resistance of a conductor at a temperature.
func (c Conductor) ResistanceOhmPerKm(thetaC float64) (float64, error) {
	r, err := ResistanceAt(c.R20OhmPerKm, c.Material, thetaC)
	return r * c.ACFactor, err
}

// OperatingC is the temperature of a conductor under load, θ = θa + (θmax − θa)(I/Iz)², °C.
//
// For yearly losses I is the root mean square current. Above Iz the temperature exceeds θmax.
func OperatingC(currentA, ratedA, ambientC, maxC float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("current", currentA), bounds.Positive("rating", ratedA)); err != nil {
		return 0, err
	}
	if !(maxC > ambientC) || !bounds.Finite(ambientC) || !bounds.Finite(maxC) {
		return 0, bounds.Error("highest temperature", maxC, "above ambient")
	}
	q := currentA / ratedA
	return ambientC + float64((maxC-ambientC)*q*q), nil
}

// ACFactor is R_ac/R_dc = 1 + ys + yp of three touching or spaced round cores.
//
//	xs² = 8πf·1e−7·ks/R′, ks = 1;   ys = xs⁴/(192 + 0.8xs⁴) for xs ≤ 2.8,
//	−0.136 − 0.0177xs + 0.0563xs² to 3.8, 0.354xs − 0.733 above
//	xp² = 8πf·1e−7·kp/R′;   yp = F(dc/s)²[0.312(dc/s)² + 1.18/(F + 0.27)], F = xp⁴/(192 + 0.8xp⁴)
//
// R′ dcOhmPerKm at the temperature; kp 1 for copper, 0.8 for stranded aluminium; dc diameterMM; s
// spacingMM between centres, not below dc; xp up to 2.8. IEC 60287-1-1; yp was not read in the standard.
func ACFactor(dcOhmPerKm, kp, diameterMM, spacingMM, frequencyHz float64) (float64, error) {
	if err := errors.Join(bounds.Positive("resistance", dcOhmPerKm), bounds.Positive("kp", kp), bounds.Positive("diameter", diameterMM), bounds.Positive("frequency", frequencyHz)); err != nil {
		return 0, err
	}
	if !(spacingMM >= diameterMM) || !bounds.Finite(spacingMM) {
		return 0, bounds.Error("spacing", spacingMM, "the diameter or more")
	}
	R := dcOhmPerKm / units.MPerKm
	x2 := 8 * math.Pi * frequencyHz * 1e-7 / R
	xs := math.Sqrt(x2)
	var ys float64
	switch {
	case xs <= 2.8:
		ys = x2 * x2 / (192 + float64(0.8*x2*x2))
	case xs <= 3.8:
		ys = -0.136 - float64(0.0177*xs) + float64(0.0563*x2)
	default:
		ys = float64(0.354*xs) - 0.733
	}
	xp2 := x2 * kp
	if math.Sqrt(xp2) > 2.8 {
		return 0, bounds.Error("xp of the proximity effect", math.Sqrt(xp2), "2.8 or less")
	}
	F := xp2 * xp2 / (192 + float64(0.8*xp2*xp2))
	g := diameterMM / spacingMM
	g *= g
	yp := F * g * (float64(0.312*g) + 1.18/(F+0.27))
	return 1 + ys + yp, nil
}

// ReactanceOhmPerKm is x′ = ω·2e−4·[ln(GMD/r) + 1/4] of solid round conductors, Ω/km.
//
// GMD gmdMM, geometric mean distance ∛(d12·d23·d31); r radiusMM of the conductor.
func ReactanceOhmPerKm(gmdMM, radiusMM, frequencyHz float64) (float64, error) {
	if err := errors.Join(bounds.Positive("radius", radiusMM), bounds.Positive("frequency", frequencyHz)); err != nil {
		return 0, err
	}
	if !(gmdMM >= radiusMM) || !bounds.Finite(gmdMM) {
		return 0, bounds.Error("mean distance", gmdMM, "the radius or more")
	}
	return 2 * math.Pi * frequencyHz * 2e-4 * (math.Log(gmdMM/radiusMM) + 0.25), nil
}

// MassTPerKm is the metal of n conductors of a nominal section, n·S·δ·1e−3, t/km, without lay.
func MassTPerKm(n int, sectionMM2 float64, m Material) (float64, error) {
	if n < 1 {
		return 0, bounds.Error("number of conductors", float64(n), "1 or more")
	}
	if err := bounds.Positive("section", sectionMM2); err != nil {
		return 0, err
	}
	d := densityAl
	switch m {
	case Aluminium:
	case Copper:
		d = densityCu
	default:
		return 0, fmt.Errorf("material %q: %w", m, ErrInput)
	}
	return float64(n) * sectionMM2 * d / units.KgPerT, nil
}

// ElectricalSectionMM2 is the section that gives the standard's resistance with the metal's resistivity,
// ρ/r20, mm2. It is 4 to 12 % below the nominal section for common sizes.
func ElectricalSectionMM2(r20OhmPerKm float64, m Material) (float64, error) {
	if err := bounds.Positive("resistance", r20OhmPerKm); err != nil {
		return 0, err
	}
	const mm2PerM2 = 1e6
	switch m {
	case Aluminium:
		return rhoAl * units.MPerKm / r20OhmPerKm * mm2PerM2, nil
	case Copper:
		return rhoCu * units.MPerKm / r20OhmPerKm * mm2PerM2, nil
	}
	return 0, fmt.Errorf("material %q: %w", m, ErrInput)
}

// ACSRMassKgPerKm is the mass of one steel-cored conductor, Al·2.703·1.0226 + St·7.78·1.004, kg/km.
// The lay increments were not read in a source.
func ACSRMassKgPerKm(aluminiumMM2, steelMM2 float64) (float64, error) {
	if err := errors.Join(bounds.Positive("aluminium section", aluminiumMM2), bounds.NonNegative("steel section", steelMM2)); err != nil {
		return 0, err
	}
	return float64(aluminiumMM2*densityAl*layAl) + float64(steelMM2*densitySteel*laySteel), nil
}

// standard gives the conductors of a level, kind and material in rising section.
func standard(all []Conductor, level LevelID, kind Kind, m Material) []Conductor {
	var out []Conductor
	for _, c := range all {
		if c.Level == level && c.Kind == kind && c.Material == m {
			out = append(out, c)
		}
	}
	slices.SortStableFunc(out, func(a, b Conductor) int {
		switch {
		case a.SectionMM2 < b.SectionMM2:
			return -1
		case a.SectionMM2 > b.SectionMM2:
			return 1
		}
		return 0
	})
	return out
}
