// Package wind computes what wind turbines at given positions yield in a typical year.
//
// It works from plain numbers: a rose of Weibull distributions, a power curve, positions in metres.
// The way of the data is: site speed (weibull.go, shear.go, density.go), machine (curve.go,
// turbine.go, generic.go), one machine's energy (aep.go), wakes (wake.go, field.go), the farm's year
// (farm.go), losses (losses.go), uncertainty (uncertainty.go), ground taken by the works (land.go).
// Evaluator (evaluator.go) judges layouts while they are being searched. A series of hours can stand in
// for the rose (series.go). What the wakes take away anywhere on the map is in wakemap.go.
//
// All power curves are at the reference density of 1.225 kg/m3. A typical year has 8,760 hours.
// Nothing here starts goroutines, so results do not depend on the number of cores.
//
// Left out on purpose: blockage, wakes of far farms, terrain speed-up, wake meandering, added
// turbulence, load limits on spacing. Wakes act on the hub point of the Gaussian models and on the
// rotor area in the Jensen model.
package wind
