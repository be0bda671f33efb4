package pictures

import (
	"fmt"
	"strings"

	"groundtally/app/run"
)

// Together tells what wind and sun of one plant need and deliver behind one connection; empty where no hours tell of
// both.
func Together(n *run.Connection) string {
	if n == nil || n.Together == nil || len(n.Together.Limits) == 0 {
		return ""
	}
	t := n.Together
	all := t.WindMWh + t.SolarMWh
	first := t.Limits[0]
	text := fmt.Sprintf("Wind and sun behind one connection, by the hours of the weather file: at most %s kW together and %s kW one by one. Where %.0f %% of the energy may be cut off they need %s kW together and %s kW one by one, so that %s kW of connection (%.0f %%) are saved.", mwh(t.PeakKW), mwh(t.PeaksKW), 100*t.LosingFrac, mwh(t.LosingKW), mwh(t.LosingEachKW), mwh(t.LosingEachKW-t.LosingKW), 100*(1-t.LosingKW/t.LosingEachKW))
	if t.Correlation != nil {
		text += fmt.Sprintf(" Their power goes together at %.2f, on a scale from -1 to 1.", *t.Correlation)
	}
	if first.CurtailedMWh > 0 {
		text += fmt.Sprintf(" Of %s MWh/yr of wind and %s of sun, a connection of %s kW cuts off %s (%.1f %%; wind %s, sun %s) in %.0f hours.", mwh(t.WindMWh), mwh(t.SolarMWh), mwh(first.LimitKW), mwh(first.CurtailedMWh), 100*first.CurtailedMWh/all, mwh(first.WindCutMWh), mwh(first.SolarCutMWh), first.HoursAtLimit)
	} else {
		text += fmt.Sprintf(" Of %s MWh/yr of wind and %s of sun, a connection of %s kW cuts off none.", mwh(t.WindMWh), mwh(t.SolarMWh), mwh(first.LimitKW))
	}
	text += fmt.Sprintf(" It is used to %.0f %% of what it could carry, with the wind alone to %.0f %%.", 100*first.FullFrac, 100*first.AloneFrac)
	var others []string
	for _, l := range t.Limits[1:] {
		others = append(others, fmt.Sprintf("%s kW %.1f %%", mwh(l.LimitKW), 100*l.CurtailedMWh/all))
	}
	if len(others) > 0 {
		text += " Other sizes would cut off: " + strings.Join(others, ", ") + "."
	}
	if t.HoursUnknown > 0 {
		text += fmt.Sprintf(" %.0f hours of the file are not known and count as the mean of the others.", t.HoursUnknown)
	}
	return text + " Means of an hour hide peaks, so a little more is cut off in truth."
}
