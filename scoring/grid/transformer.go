package grid

import (
	"errors"
	"fmt"
	"math"

	"groundtally/assets/citedtable"
	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// TransformerLoss are the loss at no load and the loss at rated load, W.
type TransformerLoss struct{ NoLoadW, LoadW float64 }

type transformerRow struct {
	kva, p0, pk, pei float64
}

// Transformers holds the loss limits by kind ("liquid", "dry") and tier.
type Transformers struct{ rows map[string][]transformerRow }

func trKey(kind string, tier int) string { return fmt.Sprintf("%s/%d", kind, tier) }

// ParseTransformers reads the cited table with the columns kind,tier,rated_kva,no_load_w,load_w,pei_percent;
// a row has either losses or a peak efficiency index, ratings rise within kind and tier.
func ParseTransformers(t *citedtable.Table) (*Transformers, error) {
	out := &Transformers{rows: map[string][]transformerRow{}}
	for _, r := range t.Rows {
		tier, err := r.Float("tier")
		if err != nil {
			return nil, err
		}
		var row transformerRow
		if row.kva, err = r.Float("rated_kva"); err != nil {
			return nil, err
		}
		if r.Text("pei_percent") != "" {
			if row.pei, err = r.Float("pei_percent"); err != nil {
				return nil, err
			}
			row.pei /= fraction
			if !(row.pei > 0 && row.pei < 1) {
				return nil, fmt.Errorf("transformer table %s, line %d: peak efficiency outside 0 to 100 %%", t.Name, r.Line)
			}
		} else {
			if row.p0, err = r.Float("no_load_w"); err != nil {
				return nil, err
			}
			if row.pk, err = r.Float("load_w"); err != nil {
				return nil, err
			}
			if row.p0 <= 0 || row.pk <= 0 {
				return nil, fmt.Errorf("transformer table %s, line %d: losses must be above 0", t.Name, r.Line)
			}
		}
		k := trKey(r.Text("kind"), int(tier))
		list := out.rows[k]
		if len(list) > 0 && (row.kva <= list[len(list)-1].kva || (row.pei == 0 && list[len(list)-1].pei != 0)) {
			return nil, fmt.Errorf("transformer table %s, line %d: ratings must rise, losses before efficiencies", t.Name, r.Line)
		}
		out.rows[k] = append(list, row)
	}
	return out, nil
}

// Loss gives the loss limits of a rating, linear between the rows.
//
// Below the smallest row its losses are taken. Above the largest row with losses the peak efficiency
// index is used, linear between rows, split by P0/Pk = ρ pei split; beyond the last row its index holds.
// A kind without efficiency rows refuses larger ratings. Commission Regulation (EU) 548/2014.
func (t *Transformers) Loss(kind string, tier int, ratedKVA, peiSplit float64) (TransformerLoss, error) {
	if err := bounds.Positive("rated power", ratedKVA); err != nil {
		return TransformerLoss{}, err
	}
	rows := t.rows[trKey(kind, tier)]
	if len(rows) == 0 {
		return TransformerLoss{}, fmt.Errorf("no transformers of kind %q, tier %d: %w", kind, tier, ErrInput)
	}
	if ratedKVA <= rows[0].kva && rows[0].pei == 0 {
		return TransformerLoss{rows[0].p0, rows[0].pk}, nil
	}
	for i := 1; i < len(rows); i++ {
		a, b := rows[i-1], rows[i]
		if ratedKVA > b.kva {
			continue
		}
		w := (ratedKVA - a.kva) / (b.kva - a.kva)
		switch {
		case b.pei == 0:
			return TransformerLoss{a.p0 + float64(w*(b.p0-a.p0)), a.pk + float64(w*(b.pk-a.pk))}, nil
		case a.pei == 0:
			return SplitPEI(b.pei, ratedKVA, peiSplit)
		default:
			return SplitPEI(a.pei+float64(w*(b.pei-a.pei)), ratedKVA, peiSplit)
		}
	}
	last := rows[len(rows)-1]
	if last.pei == 0 {
		return TransformerLoss{}, bounds.Error("rated power", ratedKVA, "within the table")
	}
	return SplitPEI(last.pei, ratedKVA, peiSplit)
}

// PeakEfficiency is PEI = 1 − 2√(P0·Pk)/Sr. The formula is that of EN 50588 from memory; the equation was
// missing in the text of the regulation at hand.
func (l TransformerLoss) PeakEfficiency(ratedKVA float64) (float64, error) {
	if err := errors.Join(bounds.NonNegative("no-load loss", l.NoLoadW), bounds.NonNegative("load loss", l.LoadW), bounds.Positive("rated power", ratedKVA)); err != nil {
		return 0, err
	}
	return 1 - 2*math.Sqrt(l.NoLoadW*l.LoadW)/(ratedKVA*units.WPerKW), nil
}

// BestLoad is the load at which the efficiency peaks, √(P0/Pk), as a share of rated.
func (l TransformerLoss) BestLoad() (float64, error) {
	if err := errors.Join(bounds.NonNegative("no-load loss", l.NoLoadW), bounds.Positive("load loss", l.LoadW)); err != nil {
		return 0, err
	}
	return math.Sqrt(l.NoLoadW / l.LoadW), nil
}

// SplitPEI gives losses that have a peak efficiency index, Pk = (1−PEI)·Sr/(2√ρ), P0 = ρ·Pk.
//
// ρ split, no-load over load loss, an assumption of 0.08 to 0.2.
func SplitPEI(pei, ratedKVA, split float64) (TransformerLoss, error) {
	if !(pei > 0 && pei < 1) {
		return TransformerLoss{}, bounds.Error("peak efficiency", pei, "inside 0 to 1")
	}
	if err := errors.Join(bounds.Positive("rated power", ratedKVA), bounds.Positive("loss split", split)); err != nil {
		return TransformerLoss{}, err
	}
	pk := (1 - pei) * ratedKVA * units.WPerKW / (2 * math.Sqrt(split))
	return TransformerLoss{NoLoadW: split * pk, LoadW: pk}, nil
}

// YearKWh is the energy that a transformer takes in a year, E = P0·8760 + Pk·LLF·(Smax/Sr)²·8760, kWh/yr,
// in its two parts. It is always live; the no-load part of a solar plant at night is an import.
func (l TransformerLoss) YearKWh(lossLoadFactor, peakOverRated float64) (noLoad, load float64, err error) {
	if err := errors.Join(bounds.NonNegative("no-load loss", l.NoLoadW), bounds.NonNegative("load loss", l.LoadW), unitShare("loss load factor", lossLoadFactor), bounds.NonNegative("peak over rated", peakOverRated)); err != nil {
		return 0, 0, err
	}
	return l.NoLoadW * units.HoursPerYear / units.WPerKW, l.LoadW * lossLoadFactor * peakOverRated * peakOverRated * units.HoursPerYear / units.WPerKW, nil
}

// TransformerImpedance is the series impedance at a voltage, Z = uk·U²/Sr, R = Pk·U²/Sr², X = √(Z² − R²).
//
// uk shortCircuitVoltage as a share; the impedance counts towards the voltage rise only where the voltage
// is not regulated behind it.
func TransformerImpedance(voltageKV, ratedKVA, shortCircuitVoltage, loadW float64) (Path, error) {
	if err := errors.Join(bounds.Positive("voltage", voltageKV), bounds.Positive("rated power", ratedKVA), bounds.Positive("short-circuit voltage", shortCircuitVoltage), bounds.NonNegative("load loss", loadW)); err != nil {
		return Path{}, err
	}
	sr := ratedKVA / units.KWPerMW
	z := shortCircuitVoltage * voltageKV * voltageKV / sr
	r := loadW / wPerMW * voltageKV * voltageKV / (sr * sr)
	if r > z {
		return Path{}, bounds.Error("load loss", loadW, "less than the short-circuit voltage allows")
	}
	return Path{VoltageKV: voltageKV, ROhm: r, XOhm: math.Sqrt(float64(z*z) - float64(r*r))}, nil
}
