package climate

import (
	"errors"
	"fmt"
	"math"

	"groundtally/scoring/bounds"
)

// Span is a low, a central and a high value of one thing.
type Span struct{ Low, Central, High float64 }

func (s Span) check(name string) error {
	if err := errors.Join(bounds.NonNegative(name, s.Low), bounds.NonNegative(name, s.Central), bounds.NonNegative(name, s.High)); err != nil {
		return err
	}
	if s.Low > s.Central || s.Central > s.High {
		return bounds.Error(name, s.Central, "between its low and its high")
	}
	return nil
}

// LineInput describes what a plant causes and what it displaces.
type LineInput struct {
	CausedTCO2e      Span    // plant and land, all booked at the start, which is cautious
	FirstYearKWh     Span    // delivered
	DegradationPerYr float64 // 0 to below 1
	LifeYr           float64 // above 0
	DisplacedShare   Span    // 0 to 1: added supply does not displace its own amount
}

// NamedGrid is one of the grid factors that stand side by side: average, marginal, the user's own.
type NamedGrid struct {
	Name string
	Grid Grid
}

// LinePoint is the greenhouse gas displaced less that caused, up to the end of a year, t CO2e.
type LinePoint struct {
	Year               float64 // whole, but for the last when the life is not
	Low, Central, High float64
}

// Line is the course of that sum under one grid factor, and when it crosses zero. Low joins the most caused with
// the least displaced and High the reverse: corners, not percentiles.
type Line struct {
	Grid               NamedGrid
	Points             []LinePoint // year 0 to the end of the life
	Low, Central, High Payback     // of the three courses; High comes first
}

// Lines gives one line per grid factor, in their order. The crossings are PaybackYears of the same numbers with
// the grid factor times the displaced share; never also when the plant is gone before.
func Lines(in LineInput, grids []NamedGrid) ([]Line, error) {
	if err := errors.Join(in.CausedTCO2e.check("greenhouse gas"), in.FirstYearKWh.check("energy delivered"), in.DisplacedShare.check("displaced share"),
		bounds.Positive("life", in.LifeYr)); err != nil {
		return nil, err
	}
	if in.DisplacedShare.High > 1 {
		return nil, bounds.Error("displaced share", in.DisplacedShare.High, "0 to 1")
	}
	if in.LifeYr > mostLineYears {
		return nil, bounds.Error("life", in.LifeYr, "1000 or less")
	}
	out := make([]Line, 0, len(grids))
	for _, g := range grids {
		if err := g.Grid.check(); err != nil {
			return nil, fmt.Errorf("grid %s: %w", g.Name, err)
		}
		l := Line{Grid: g, Points: make([]LinePoint, 1+int(math.Ceil(in.LifeYr)))}
		for i := range l.Points {
			l.Points[i].Year = math.Min(float64(i), in.LifeYr)
		}
		for _, c := range []struct {
			caused, kwh, share float64
			put                func(p *LinePoint, t float64)
			crossing           *Payback
		}{
			{in.CausedTCO2e.High, in.FirstYearKWh.Low, in.DisplacedShare.Low, func(p *LinePoint, t float64) { p.Low = t }, &l.Low},
			{in.CausedTCO2e.Central, in.FirstYearKWh.Central, in.DisplacedShare.Central, func(p *LinePoint, t float64) { p.Central = t }, &l.Central},
			{in.CausedTCO2e.Low, in.FirstYearKWh.High, in.DisplacedShare.High, func(p *LinePoint, t float64) { p.High = t }, &l.High},
		} {
			grid := Grid{KgPerKWh: g.Grid.KgPerKWh * c.share, DeclinePerYr: g.Grid.DeclinePerYr}
			for i := range l.Points {
				s, err := DisplacedT(c.kwh, in.DegradationPerYr, l.Points[i].Year, grid)
				if err != nil {
					return nil, fmt.Errorf("grid %s: %w", g.Name, err)
				}
				c.put(&l.Points[i], s-c.caused)
			}
			var err error
			if *c.crossing, err = PaybackYears(c.caused, c.kwh, in.DegradationPerYr, grid, in.LifeYr); err != nil {
				return nil, fmt.Errorf("grid %s: %w", g.Name, err)
			}
		}
		out = append(out, l)
	}
	return out, nil
}

const mostLineYears = 1000

// DrainedGas is the greenhouse gas of drained peat by its parts, t CO2e/(ha yr).
type DrainedGas struct {
	CO2, CH4  float64 // from the ground
	N2O       float64
	Dissolved float64 // carbon that the water carries off
	DitchCH4  float64
}

// TotalTCO2ePerHaYr sums the parts. CH4 may be negative where drained ground takes it up, the others not. IPCC
// 2013 Wetlands Supplement, Tier 1.
func (d DrainedGas) TotalTCO2ePerHaYr() (float64, error) {
	if !bounds.Finite(d.CH4) {
		return 0, bounds.Error("methane", d.CH4, "a finite number")
	}
	if err := errors.Join(bounds.NonNegative("carbon dioxide", d.CO2), bounds.NonNegative("nitrous oxide", d.N2O),
		bounds.NonNegative("dissolved carbon", d.Dissolved), bounds.NonNegative("methane of ditches", d.DitchCH4)); err != nil {
		return 0, err
	}
	return d.CO2 + d.CH4 + d.N2O + d.Dissolved + d.DitchCH4, nil
}
