package grid

import (
	"math"

	"groundtally/scoring"
)

// Quantities gives the grid account as a graph. Leaves: what Assess found for the chosen line or
// substation at the central detour, and the detour's spread.
func Quantities() []scoring.Quantity {
	plain := scoring.Plain
	product := func(x []float64) float64 { return x[0] * x[1] }
	return []scoring.Quantity{
		{Name: "connection_km", Unit: "km", Title: "Length of grid connection", Formula: "straight distance × detour factor, with its spread; no routed length yet", Source: "detour factor: common practice, arXiv 2406.06490",
			Inputs: []string{"connection_route_km", "detour_ratio"}, Eval: plain(product)},
		{Name: "connection_loss_frac", Unit: "1", Title: "Loss in the connection", Formula: "3·R·I²·LLF/LF over the year, in proportion to the length", Source: "loss load factor: Buller & Woodrow 1928, weights derived for wind and sun",
			Inputs: []string{"connection_route_loss_frac", "detour_ratio"}, Eval: plain(func(x []float64) float64 { return math.Min(1, x[0]*x[1]) })},
		{Name: "connection_voltage_rise_frac", Unit: "1", Title: "Voltage rise at connection", Formula: "(P·R + Q·X)/U², in proportion to the length; the existing network is not counted unless its short-circuit power is known", Source: "theory of short lines",
			Inputs: []string{"connection_route_rise_frac", "detour_ratio"}, Eval: plain(product)},
		{Name: "cable_lv_km", Unit: "km", Title: "Low-voltage cable", Formula: "circuits × connection_km", Source: "identity", Inputs: []string{"circuits_lv", "connection_km"}, Eval: plain(product)},
		{Name: "cable_mv_km", Unit: "km", Title: "Medium-voltage cable", Formula: "circuits × connection_km", Source: "identity", Inputs: []string{"circuits_mv", "connection_km"}, Eval: plain(product)},
		{Name: "cable_hv_km", Unit: "km", Title: "High-voltage cable", Formula: "circuits × connection_km", Source: "identity", Inputs: []string{"circuits_hv", "connection_km"}, Eval: plain(product)},
		{Name: "export_kw", Unit: "kW", Title: "Power that may flow", Formula: "the smallest of plant, spare capacity and agreed limit", Source: "identity",
			Inputs: []string{"ac_kw", "connection_spare_kw", "agreed_limit_kw"}, Eval: scoring.Plain(func(x []float64) float64 { return min(x[0], x[1], x[2]) })},
		{Name: "curtailed_mwh_per_yr", Unit: "MWh/yr", Title: "Energy cut off", Formula: "curtailed_share × energy_p50; the share is a bound without an hourly file", Source: "identity",
			Inputs: []string{"curtailed_share", "energy_p50_mwh_per_yr"}, Eval: plain(product)},
	}
}
