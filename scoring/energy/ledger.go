package energy

import (
	"errors"
	"fmt"
	"math"

	"groundtally/scoring/bounds"
	"groundtally/scoring/params"
	"groundtally/scoring/units"
)

// LedgerInput is primary energy spent on one thing each time it is built.
//
// LifeYr is how long it lasts, yr; 0 means as long as the plant. What lasts no longer than the plant is
// built again with it, and within its life whenever it is worn out. What lasts longer (tracks, grid) has a
// clock of its own and serves more than one life of the plant.
type LedgerInput struct {
	ItemID string
	MJ     float64
	LifeYr float64
}

// LedgerPlant is a plant as the ledger sees it.
type LedgerPlant struct {
	FirstYearMWh     float64 // electricity delivered in the first year of each life
	DegradationPerYr float64 // 1/yr, 0 to below 1
	LifeYr           float64 // yr, 1 or more
	Lives            int     // 0: built again and again until the horizon
	Inputs           []LedgerInput
	UpkeepMJPerYr    float64 // primary energy while it runs
	EndMJ            float64 // primary energy of dismantling and restoring at the end of each life
	OccupiedHa       float64
	RestorationYr    float64 // how long the ground stays occupied after the last life
}

// LedgerYear is one year of the ledger; year 0 holds what is spent before the first one.
type LedgerYear struct {
	Year                      int
	OutMJ                     float64 // electricity
	BuiltMJ, UpkeepMJ, EndMJ  float64 // primary energy
	NetMixedMJ, NetElectricMJ float64 // from year 0 to the end of this one: as accounted, and as electricity
	OccupiedHaYr              float64
}

// SpentMJ is the primary energy spent in the year.
func (y LedgerYear) SpentMJ() float64 { return y.BuiltMJ + y.UpkeepMJ + y.EndMJ }

// Ledger is the yearly account of a plant on a horizon that it shares with others.
//
// At the horizon a life, and a thing with a clock of its own, may be cut short. What was spent on it is
// counted in full in SpentMJ; RemainingShare is the part of the plant's last life still to come, RemainingMJ
// the unused part of all that was built, in proportion to the years, and EndDueMJ the part of the dismantling
// still to come that belongs to the years run. ByUseMJ is SpentMJ − RemainingMJ + EndDueMJ, by which plants of
// different lives compare.
type Ledger struct {
	Years             []LedgerYear
	HorizonYr         float64
	LivesBegun        int
	OutMJ, SpentMJ    float64
	RemainingShare    float64
	RemainingMJ       float64
	EndDueMJ          float64
	ByUseMJ           float64
	OccupiedHaYr      float64
	OccupiedAfterHaYr float64 // by the last life and its restoration beyond the horizon

	gridEfficiency float64
}

// mostLedgerYears bounds the length of a ledger.
const mostLedgerYears = 1000

// NewLedger reckons a plant year by year over the horizon.
//
// horizonYr, yr, above 0 to 1000; η_G gridEfficiency turns energy spent into electricity. Purchases stand in
// the year that they begin, dismantling in the year that it ends a life. Years and lives need not be whole: the
// electricity of a piece of a life is Y1·(D(b) − D(a)) by EffectiveYears. When horizon and life are the same and
// nothing lasts longer, the totals are those of Balance at the extended boundary. Built on IEA-PVPS T12 for what
// counts; that the unused part is spread evenly over the years is common practice.
func NewLedger(p LedgerPlant, horizonYr, gridEfficiency float64) (*Ledger, error) {
	if err := errors.Join(efficiency(gridEfficiency), bounds.NonNegative("first-year energy", p.FirstYearMWh),
		bounds.NonNegative("upkeep", p.UpkeepMJPerYr), bounds.NonNegative("energy of dismantling", p.EndMJ),
		bounds.NonNegative("ground", p.OccupiedHa), bounds.NonNegative("restoration", p.RestorationYr)); err != nil {
		return nil, err
	}
	if !(horizonYr > 0 && horizonYr <= mostLedgerYears) {
		return nil, bounds.Error("horizon", horizonYr, "above 0 to 1000")
	}
	if p.Lives < 0 {
		return nil, bounds.Error("lives", float64(p.Lives), "0 or more")
	}
	if !(p.LifeYr >= 1) {
		return nil, bounds.Error("life", p.LifeYr, "1 or more")
	}
	if _, err := EffectiveYears(p.DegradationPerYr, p.LifeYr); err != nil {
		return nil, err
	}
	for _, in := range p.Inputs {
		if err := errors.Join(bounds.NonNegative("energy of building", in.MJ), bounds.NonNegative("life", in.LifeYr)); err != nil {
			return nil, fmt.Errorf("input %s: %w", in.ItemID, err)
		}
		if in.LifeYr != 0 && in.LifeYr < 1 {
			return nil, fmt.Errorf("input %s: %w", in.ItemID, bounds.Error("life", in.LifeYr, "0, or 1 or more"))
		}
	}
	H, T := horizonYr, p.LifeYr
	l := &Ledger{HorizonYr: H, gridEfficiency: gridEfficiency, Years: make([]LedgerYear, 1+int(math.Ceil(H-sameTime)))}
	for i := range l.Years {
		l.Years[i].Year = i
	}
	lives := p.Lives
	if lives == 0 {
		lives = int(math.Ceil(H/T - sameTime))
	}
	stop := math.Min(H, float64(lives)*T) // when the plant stops running, or the horizon
	for k := 0; k < lives; k++ {
		start := float64(float64(k) * T)
		if start > H-sameTime {
			break
		}
		l.LivesBegun++
		if err := l.run(p, start, math.Min(start+T, H)); err != nil {
			return nil, err
		}
		for _, in := range p.Inputs {
			if in.LifeYr > T {
				continue
			}
			l.buy(in.MJ, lifeOr(in.LifeYr, T), start, math.Min(start+T, H), start+T)
		}
		if start+T <= H+sameTime {
			l.year(start+T, true).EndMJ += p.EndMJ
			continue
		}
		used := (H - start) / T
		l.RemainingShare = 1 - used
		l.EndDueMJ = float64(p.EndMJ * used)
	}
	for _, in := range p.Inputs {
		if in.LifeYr > T {
			end := math.Inf(1)
			if p.Lives != 0 {
				end = float64(lives) * T // gone with the last life
			}
			l.buy(in.MJ, in.LifeYr, 0, stop, end)
		}
	}
	gone := float64(lives)*T + p.RestorationYr
	for i := 1; i < len(l.Years); i++ {
		from, to := float64(i-1), math.Min(float64(i), H)
		l.Years[i].OccupiedHaYr = float64(p.OccupiedHa * math.Max(0, math.Min(to, gone)-from))
		l.OccupiedHaYr += l.Years[i].OccupiedHaYr
	}
	l.OccupiedAfterHaYr = float64(p.OccupiedHa * math.Max(0, gone-H))
	for i := range l.Years {
		y := &l.Years[i]
		l.OutMJ += y.OutMJ
		l.SpentMJ += y.SpentMJ()
		y.NetMixedMJ = l.OutMJ - l.SpentMJ
		y.NetElectricMJ = l.OutMJ - float64(gridEfficiency*l.SpentMJ)
	}
	l.ByUseMJ = l.SpentMJ - l.RemainingMJ + l.EndDueMJ
	return l, nil
}

// sameTime is how far two times may lie apart, in years, and still be one: what rounding leaves.
const sameTime = 1e-9

func lifeOr(own, plant float64) float64 {
	if own == 0 {
		return plant
	}
	return own
}

// year gives the row of a moment: the year that begins there, or with ends the one that ends there.
func (l *Ledger) year(at float64, ends bool) *LedgerYear {
	i := int(math.Ceil(at - sameTime))
	if !ends && at > sameTime {
		i = int(math.Floor(at+sameTime)) + 1
	}
	return &l.Years[min(max(i, 0), len(l.Years)-1)]
}

// run books the electricity and the upkeep of one life from start to end.
func (l *Ledger) run(p LedgerPlant, start, end float64) error {
	before := 0.0
	for i := int(math.Floor(start+sameTime)) + 1; i < len(l.Years); i++ {
		to := math.Min(float64(i), end)
		from := math.Max(float64(i-1), start)
		if to-from <= sameTime {
			break
		}
		d, err := EffectiveYears(p.DegradationPerYr, to-start)
		if err != nil {
			return err
		}
		l.Years[i].OutMJ += float64(units.MJPerMWh * p.FirstYearMWh * (d - before))
		l.Years[i].UpkeepMJ += float64(p.UpkeepMJPerYr * (to - from))
		before = d
	}
	return nil
}

// buy books a thing that lasts life, first at start and then whenever it is worn out before stop. What is left
// of the last one at the horizon, up to end, when nothing needs it any more, is added to what remains.
func (l *Ledger) buy(mj, life, start, stop, end float64) {
	for k := 0; ; k++ {
		at := start + float64(float64(k)*life)
		if k > 0 && at > stop-sameTime {
			return
		}
		l.year(at, false).BuiltMJ += mj
		serves := math.Min(at+life, end) - at // what is thrown away early is used up by then
		if left := at + serves - l.HorizonYr; left > sameTime {
			l.RemainingMJ += float64(mj * left / serves)
		}
	}
}

// NetMJ is the net energy over the horizon, as accounted or as electricity; byUse counts only what was used up
// and what is due for it.
func (l *Ledger) NetMJ(c Currency, byUse bool) (float64, error) {
	spent := l.SpentMJ
	if byUse {
		spent = l.ByUseMJ
	}
	return Balance{DeliveredMJ: l.OutMJ, Inputs: Inputs{B3MJ: spent}}.NetMJ(params.Extended, c, l.gridEfficiency)
}

// EROI is the return over the horizon, electricity out over primary energy in; byUse as in NetMJ.
func (l *Ledger) EROI(byUse bool) (float64, error) {
	spent := l.SpentMJ
	if byUse {
		spent = l.ByUseMJ
	}
	return Balance{DeliveredMJ: l.OutMJ, Inputs: Inputs{B3MJ: spent}}.EROI(params.Extended)
}

// Crossed gives the first year at whose end the cumulative net energy is zero or more and stays so to the
// horizon; never when it is below zero there.
func (l *Ledger) Crossed(c Currency) (Payback, error) {
	if c != AsAccounted && c != Electric {
		return Payback{}, fmt.Errorf("currency %d: %w", c, ErrInput)
	}
	at := -1
	for i, y := range l.Years {
		net := y.NetElectricMJ
		if c == AsAccounted {
			net = y.NetMixedMJ
		}
		if net < 0 {
			at = -1
		} else if at < 0 {
			at = i
		}
	}
	if at < 0 {
		return Payback{Never: true}, nil
	}
	return Payback{Yr: float64(at)}, nil
}
