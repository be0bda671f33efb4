package land

import (
	"errors"
	"fmt"
	"math"

	"groundtally/assets/citedtable"
	"groundtally/scoring/bounds"
)

// ErrNoSoilValue is wrapped when the guidelines give no value for a climate and class.
var ErrNoSoilValue = errors.New("the guidelines give no value")

// SoilValue is a stock or factor with its source.
type SoilValue struct {
	Value      float64
	RelError   float64
	Source     string
	Provenance citedtable.Provenance
}

type soilKey struct{ kind, method, climate, class string }

// SoilTable holds the reference stocks and stock change factors of the IPCC guidelines.
type SoilTable struct{ values map[soilKey]SoilValue }

// ParseSoil reads a cited table with the columns kind,method,climate,class,value,rel_error. kind is
// reference, land_use, management or input; method is 2006 or 2019.
func ParseSoil(t *citedtable.Table) (*SoilTable, error) {
	s := &SoilTable{values: make(map[soilKey]SoilValue, len(t.Rows))}
	for _, c := range []string{"kind", "method", "climate", "class", "value", "rel_error"} {
		if !t.Has(c) {
			return nil, fmt.Errorf("soil table %s: no column %s", t.Name, c)
		}
	}
	for _, r := range t.Rows {
		k := soilKey{r.Text("kind"), r.Text("method"), r.Text("climate"), r.Text("class")}
		if _, dup := s.values[k]; dup {
			return nil, fmt.Errorf("soil table %s, line %d: %v stands twice", t.Name, r.Line, k)
		}
		switch k.kind {
		case "reference", "land_use", "management", "input":
		default:
			return nil, fmt.Errorf("soil table %s, line %d: kind %q is not known", t.Name, r.Line, k.kind)
		}
		v, err := r.Float("value")
		if err != nil {
			return nil, err
		}
		e, err := r.Float("rel_error")
		if err != nil {
			return nil, err
		}
		if v < 0 || e < 0 {
			return nil, fmt.Errorf("soil table %s, line %d: a stock, factor or error below 0", t.Name, r.Line)
		}
		s.values[k] = SoilValue{Value: v, RelError: e, Source: r.Source, Provenance: r.Provenance}
	}
	return s, nil
}

// Lookup gives one value; kind is reference, land_use, management or input, method is 2006 or 2019.
func (s *SoilTable) Lookup(kind, method, climate, class string) (SoilValue, error) {
	v, ok := s.values[soilKey{kind, method, climate, class}]
	if !ok {
		return SoilValue{}, fmt.Errorf("%s, %s, %s, %s: %w", kind, method, climate, class, ErrNoSoilValue)
	}
	return v, nil
}

// SOCTCPerHa is the soil organic carbon of the upper 30 cm, SOC = SOC_ref·F_LU·F_MG·F_I, t C/ha.
//
// SOC_ref referenceTCPerHa; F_LU landUse, F_MG management, F_I input, all 0 or more. IPCC 2006 Guidelines
// Vol 4, Tier 1, mineral soils only; the stated error of a reference stock is about 90 %.
func SOCTCPerHa(referenceTCPerHa, landUse, management, input float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("reference stock", referenceTCPerHa), bounds.NonNegative("land use factor", landUse), bounds.NonNegative("management factor", management), bounds.NonNegative("input factor", input)); err != nil {
		return 0, err
	}
	return referenceTCPerHa * landUse * management * input, nil
}

// UseChange is the change of soil carbon when the use of an area changes,
// ΔC = A·(SOC_before − SOC_after), reached after the transition time (20 yr).
//
// years is how long the new use lasts; the change is linear over transitionYr and then complete.
func UseChange(areaHa, beforeTCPerHa, afterTCPerHa, years, transitionYr float64) (Change, error) {
	if !bounds.AllNonNegative(areaHa, beforeTCPerHa, afterTCPerHa, years) {
		return Change{}, errors.Join(bounds.NonNegative("area", areaHa), bounds.NonNegative("stock before", beforeTCPerHa), bounds.NonNegative("stock after", afterTCPerHa), bounds.NonNegative("years", years))
	}
	if !(transitionYr > 0) || !bounds.Finite(transitionYr) {
		return Change{}, bounds.Error("transition time", transitionYr, "above 0")
	}
	return change(areaHa * (beforeTCPerHa - afterTCPerHa) * math.Min(1, years/transitionYr)), nil
}

// Relaxed is the share of a change that is done after n years when a fixed share of what remains is
// done each year, 1 − (1−r)^n. An alternative to the linear course.
func Relaxed(ratePerYr, years float64) (float64, error) {
	if err := errors.Join(share("rate", ratePerYr), bounds.NonNegative("years", years)); err != nil {
		return 0, err
	}
	return 1 - math.Pow(1-ratePerYr, years), nil
}

// DisturbanceChange is the loss of soil carbon under works, A·SOC·f, at once.
//
// f lossFrac is at most 1 and may be negative, down to −1, where the works bring a gain (panels over
// grass). The loss never exceeds the stock.
func DisturbanceChange(areaHa, stockTCPerHa, lossFrac float64) (Change, error) {
	if !bounds.AllNonNegative(areaHa, stockTCPerHa) {
		return Change{}, errors.Join(bounds.NonNegative("area", areaHa), bounds.NonNegative("stock", stockTCPerHa))
	}
	if !(lossFrac >= -1 && lossFrac <= 1) {
		return Change{}, bounds.Error("loss share", lossFrac, "-1 to 1")
	}
	return change(areaHa * stockTCPerHa * lossFrac), nil
}

// GrassGainTC is the carbon that ploughed land may gain when it turns to lasting grass under a plant,
// A·SOC_ref·(1 − F_LU)·m·min(1, T/20), t C.
//
// F_LU landUse of the cropland, 0 to 1; m multiplier, 0 to 1, for shade and disturbance (an assumption);
// T years. Field measurements disagree about the sign: show that.
func GrassGainTC(areaHa, referenceTCPerHa, landUse, multiplier, years, transitionYr float64) (float64, error) {
	if !(landUse >= 0 && landUse <= 1 && multiplier >= 0 && multiplier <= 1) {
		return 0, errors.Join(share("land use factor", landUse), share("multiplier", multiplier))
	}
	c, err := UseChange(areaHa, referenceTCPerHa*landUse, referenceTCPerHa, years, transitionYr)
	return c.GainTC * multiplier, err
}
