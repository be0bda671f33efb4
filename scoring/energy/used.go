package energy

import (
	"groundtally/scoring/bounds"
	"groundtally/scoring/params"
)

// Unused is electricity of the life that a plant could give and nobody takes.
type Unused struct {
	CurtailedMJ float64 // cut off; 0 where the energy delivered is already without it
	SurplusMJ   float64 // delivered when there is no demand for it nearby
	UnsoldFrac  float64 // share of the surplus that nobody takes, 0 to 1
}

// Used is the electricity of the life that is really used, E_used = E_del − E_cut − s·E_surplus, MJ.
//
// Cut and surplus together must not exceed what is delivered. What is sold elsewhere counts as used. The
// definition is this program's; returns up to the point of use are in Hall, Balogh & Murphy 2009 (from memory).
func (b Balance) Used(u Unused) (float64, error) {
	if !bounds.Finite(b.DeliveredMJ) {
		return 0, bounds.Error("energy delivered", b.DeliveredMJ, "a finite number")
	}
	if err := bounds.NonNegative("energy cut off", u.CurtailedMJ); err != nil {
		return 0, err
	}
	if err := bounds.NonNegative("surplus", u.SurplusMJ); err != nil {
		return 0, err
	}
	if !(u.UnsoldFrac >= 0 && u.UnsoldFrac <= 1) {
		return 0, bounds.Error("unsold share", u.UnsoldFrac, "0 to 1")
	}
	if u.CurtailedMJ+u.SurplusMJ > b.DeliveredMJ {
		return 0, bounds.Error("energy cut off and surplus", u.CurtailedMJ+u.SurplusMJ, "no more than is delivered")
	}
	return b.DeliveredMJ - u.CurtailedMJ - float64(u.UnsoldFrac*u.SurplusMJ), nil
}

// EROIUsed is the return on the energy used, E_used / I_B3; never above the return on what is delivered.
func (b Balance) EROIUsed(u Unused) (float64, error) {
	e, err := b.Used(u)
	if err != nil {
		return 0, err
	}
	b.DeliveredMJ = e
	return b.EROI(params.Extended)
}
