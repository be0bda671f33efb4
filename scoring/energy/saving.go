package energy

import (
	"errors"
	"fmt"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// Saved is a yearly saving at the place of use, or the statement that no saving does the same.
type Saved struct {
	MWhPerYr float64
	Never    bool
}

// SavedSpan is a saving with all assumptions at their friendly, central and unfriendly end. Low and high are
// corners, not percentiles.
type SavedSpan struct{ Low, Central, High Saved }

// Saving describes a site and the saving that is to equal it.
type Saving struct {
	DeliveredMWhPerYr    float64 // of the site at the grid
	NetMWhPerYr          float64 // the same less what the site costs, as electricity: NE_el/T
	DistributionLossFrac Span    // 0 to 1
	DirectRebound        Span    // share of a saving eaten by more of the same use, 0 or more
	EconomyRebound       Span    // the same with all other uses, the direct one included
	InvestmentMJPerMWh   Span    // primary energy spent on the saving for each MWh saved
	InvestmentKnown      bool
	GridEfficiency       float64 // MJ electric per MJ primary
}

// SavingEquals is what Saving.Equal finds. The net pair is there only when the saving's own investment is
// known; otherwise it is unknown, not the same as without.
type SavingEquals struct {
	Direct, Economy       SavedSpan // gross against gross
	NetDirect, NetEconomy SavedSpan // each less its own investment
	NetKnown              bool
}

// Equal gives the yearly saving at the place of use that does the same as the site.
//
//	gross  S = E·(1−λ)/(1−ρ)
//	net    S = E_net·(1−λ)/((1−ρ) − j·(1−λ)),   j = i·η_G/3600 MWh electric per MWh saved
//
// E delivered, E_net net energy a year, λ distribution loss, ρ rebound, i the saving's own primary energy in MJ
// per MWh saved. Never where rebound and investment eat the whole saving. Low takes the highest loss with the
// lowest rebound and investment, high the reverse. ρ as in Sorrell et al. 2009 (households below 0.3); the range
// for the whole economy is the caller's, with its source. SavingEquivalent is the gross one.
func (s Saving) Equal() (SavingEquals, error) {
	if err := errors.Join(bounds.NonNegative("energy delivered", s.DeliveredMWhPerYr), s.DistributionLossFrac.check("distribution loss", 0, 1),
		s.DirectRebound.check("direct rebound", 0, math.MaxFloat64), s.EconomyRebound.check("economy-wide rebound", 0, math.MaxFloat64)); err != nil {
		return SavingEquals{}, err
	}
	if s.EconomyRebound.Low < s.DirectRebound.Low || s.EconomyRebound.Central < s.DirectRebound.Central || s.EconomyRebound.High < s.DirectRebound.High {
		return SavingEquals{}, bounds.Error("economy-wide rebound", s.EconomyRebound.Central, "no less than the direct one, which it includes")
	}
	λ := s.DistributionLossFrac
	span := func(energy float64, ρ, j Span) SavedSpan {
		return SavedSpan{
			Low:     saved(energy, λ.High, ρ.Low, j.Low),
			Central: saved(energy, λ.Central, ρ.Central, j.Central),
			High:    saved(energy, λ.Low, ρ.High, j.High),
		}
	}
	out := SavingEquals{
		Direct:  span(s.DeliveredMWhPerYr, s.DirectRebound, Span{}),
		Economy: span(s.DeliveredMWhPerYr, s.EconomyRebound, Span{}),
	}
	if !s.InvestmentKnown {
		return out, nil
	}
	if err := errors.Join(s.InvestmentMJPerMWh.check("energy spent on saving", 0, math.MaxFloat64), efficiency(s.GridEfficiency)); err != nil {
		return SavingEquals{}, err
	}
	if !bounds.Finite(s.NetMWhPerYr) || s.NetMWhPerYr > s.DeliveredMWhPerYr {
		return SavingEquals{}, bounds.Error("net energy", s.NetMWhPerYr, "no more than is delivered")
	}
	in := func(mj float64) float64 { return mj * s.GridEfficiency / units.MJPerMWh }
	j := Span{in(s.InvestmentMJPerMWh.Low), in(s.InvestmentMJPerMWh.Central), in(s.InvestmentMJPerMWh.High)}
	out.NetKnown = true
	out.NetDirect, out.NetEconomy = span(s.NetMWhPerYr, s.DirectRebound, j), span(s.NetMWhPerYr, s.EconomyRebound, j)
	return out, nil
}

// saved needs no saving where the site gives nothing net.
func saved(energy, loss, rebound, invested float64) Saved {
	if energy <= 0 {
		return Saved{}
	}
	left := (1 - rebound) - float64(invested*(1-loss))
	if left <= 0 {
		return Saved{Never: true}
	}
	s := energy * (1 - loss) / left
	if !bounds.Finite(s) {
		return Saved{Never: true}
	}
	return Saved{MWhPerYr: s}
}

// SpareSite is a site that saving may make needless.
type SpareSite struct {
	ID                string
	DeliveredMWhPerYr float64
	DirectHa, TotalHa float64
	StockTC           float64 // carbon that would be lost from soil, peat and plants
	StockKnown        bool
	OccupationYr      float64 // how long the direct ground would be held
}

// Spared is what is not built because less energy is needed.
type Spared struct {
	Sites               []string // in the order given
	DirectHa, TotalHa   float64
	OccupationHaYr      float64
	StockTC             float64 // of the spared sites whose stock is known
	StockUnknown        int     // spared sites whose stock is not
	NeededMWhPerYr      float64
	BuiltMWhPerYr       float64 // of the sites still built, whole ones, at least what is needed
	StillBuilt          int
	SavedAtGridMWhPerYr float64
}

// Spare tells which sites a saving makes needless.
//
// sites stand in the order in which they are built; savedFrac, 0 to 1, is the share of their energy together
// that is saved, after rebound. Whole sites are built in that order until what is left to supply is met; the
// rest is spared, so that a small saving may spare none. Never less is spared for more saving.
func Spare(sites []SpareSite, savedFrac float64) (Spared, error) {
	if !(savedFrac >= 0 && savedFrac <= 1) {
		return Spared{}, bounds.Error("saved share", savedFrac, "0 to 1")
	}
	all := 0.0
	for _, s := range sites {
		if err := errors.Join(bounds.NonNegative("energy delivered", s.DeliveredMWhPerYr), bounds.NonNegative("direct ground", s.DirectHa),
			bounds.NonNegative("total ground", s.TotalHa), bounds.NonNegative("years", s.OccupationYr)); err != nil {
			return Spared{}, fmt.Errorf("site %s: %w", s.ID, err)
		}
		if s.StockKnown {
			if err := bounds.NonNegative("carbon stock", s.StockTC); err != nil {
				return Spared{}, fmt.Errorf("site %s: %w", s.ID, err)
			}
		}
		all += s.DeliveredMWhPerYr
	}
	out := Spared{SavedAtGridMWhPerYr: savedFrac * all, NeededMWhPerYr: (1 - savedFrac) * all}
	slack := 1e-12 * all // what rounding of the sum leaves
	for _, s := range sites {
		if out.NeededMWhPerYr-out.BuiltMWhPerYr > slack {
			out.BuiltMWhPerYr += s.DeliveredMWhPerYr
			out.StillBuilt++
			continue
		}
		out.Sites = append(out.Sites, s.ID)
		out.DirectHa += s.DirectHa
		out.TotalHa += s.TotalHa
		out.OccupationHaYr += float64(s.DirectHa * s.OccupationYr)
		if s.StockKnown {
			out.StockTC += s.StockTC
		} else {
			out.StockUnknown++
		}
	}
	return out, nil
}
