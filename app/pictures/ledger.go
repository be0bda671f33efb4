package pictures

import (
	"fmt"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/scoring"
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

// HorizonSum shows what a plant gives less what is spent on it, both as electricity, year by year on the common
// horizon; why is a code where there is no ledger. Value gives central values by name.
func HorizonSum(l *energy.Ledger, why string, value func(name string) scoring.Value, title, id string) chart.YearSum {
	in := chart.YearSum{Title: title, ID: id, Item: "horizon_net_gwh", What: "electricity out less energy spent, both as electricity", Unit: "GWh"}
	if l == nil {
		in.Why = present.Reason(why)
		return in
	}
	all, err := l.NetMJ(energy.Electric, false)
	if err != nil {
		in.Why = err.Error()
		return in
	}
	used, err := l.NetMJ(energy.Electric, true)
	if err != nil {
		in.Why = err.Error()
		return in
	}
	crossed, err := l.Crossed(energy.Electric)
	if err != nil {
		in.Why = err.Error()
		return in
	}
	in.Above = chart.Num(crossed.Yr)
	if crossed.Never {
		in.Above = chart.Amount{State: chart.Never}
	}
	in.ByUse = chart.Amount{State: chart.None}
	if used != all {
		in.ByUse = chart.Num(used / units.MJPerGWh)
	}
	for _, y := range l.Years {
		in.Points = append(in.Points, chart.YearPoint{Year: min(float64(y.Year), l.HorizonYr), Sum: y.NetElectricMJ / units.MJPerGWh})
	}
	if life := value("life_yr"); life.OK() {
		for k := 1; k < l.LivesBegun; k++ {
			in.Begun = append(in.Begun, float64(k)*life.X)
		}
	}
	if η := value("grid_efficiency"); η.OK() {
		in.Caption = "Energy spent is primary energy times the grid efficiency, " + present.Exact(η.X) + "."
	}
	if in.ByUse.State == chart.Number {
		in.Caption += "\nBy use: without what serves beyond the horizon, with the dismantling that is due for the years run."
	}
	return in
}
