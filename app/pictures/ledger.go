package pictures

import (
	"fmt"

	"groundtally/app/present"
	"groundtally/scoring/energy"
	"groundtally/scoring/units"
)

// Ledger tells a plant's account on the common horizon; why is a code where there is none.
func Ledger(l *energy.Ledger, why string) string {
	if l == nil {
		return "No account on a common horizon: " + present.Reason(why) + "."
	}
	gwh := func(mj float64) string { return mwh(mj / units.MJPerGWh) }
	net, err := l.NetMJ(energy.Electric, true)
	if err != nil {
		return "No account on a common horizon: " + err.Error() + "."
	}
	lives := "built once"
	if l.LivesBegun > 1 {
		lives = fmt.Sprintf("built %d times", l.LivesBegun)
	}
	text := fmt.Sprintf("On a horizon of %g years, which all candidates share, the plant is %s: %s GWh of electricity come back for %s GWh of primary energy spent", l.HorizonYr, lives, gwh(l.OutMJ), gwh(l.SpentMJ))
	if l.RemainingMJ > 0 {
		text += fmt.Sprintf(", of which %s GWh serve beyond the horizon", gwh(l.RemainingMJ))
	}
	if l.EndDueMJ > 0 {
		text += fmt.Sprintf(" and %s GWh of dismantling are due after it", gwh(l.EndDueMJ))
	}
	text += fmt.Sprintf(". By use, %s GWh remain as electricity", gwh(net))
	if r, err := l.EROI(true); err == nil {
		text += fmt.Sprintf(", a return of %s", mwh(r))
	}
	return text + fmt.Sprintf("; %s ha years of ground are held.", mwh(l.OccupiedHaYr))
}
