package wind

import (
	"fmt"
	"math"

	"groundtally/scoring/units"
)

// ReferenceDensityKgPerM3 is the air density of all power curves here, that of IEC 61400-12-1.
const ReferenceDensityKgPerM3 = 1.225

// International Standard Atmosphere (US Standard Atmosphere 1976), geopotential heights 0 to 11 km.
const (
	isaT0K      = 288.15
	isaP0Pa     = 101325.0
	isaLapseKPM = 0.0065
	isaExponent = 5.255876
	isaRJPerKgK = 287.05287
)

// Atmosphere is the state of the air at one height.
type Atmosphere struct {
	TemperatureK    float64
	PressurePa      float64
	DensityKgPerM3  float64
	FromTemperature bool // the temperature was given, not that of the standard atmosphere
}

// StandardAtmosphere is T = 288.15 - 0.0065 h, p = 101325 (T/288.15)^5.255876, rho = p/(287.05287 T)
// at h metres above sea level (ground elevation plus hub height). Valid from 0 to 11 km; accepted
// from -500 m; an error outside.
func StandardAtmosphere(hM float64) (Atmosphere, error) {
	if !(hM >= -500 && hM <= 11000) {
		return Atmosphere{}, fmt.Errorf("height %g m above sea level lies outside -500 to 11000 m", hM)
	}
	t := isaT0K - float64(isaLapseKPM*hM)
	p := isaP0Pa * math.Pow(t/isaT0K, isaExponent)
	return Atmosphere{TemperatureK: t, PressurePa: p, DensityKgPerM3: p / (isaRJPerKgK * t)}, nil
}

// AtmosphereAt is StandardAtmosphere with the temperature at that height replaced by a given one in
// degrees Celsius: pressure from the standard atmosphere, rho = p/(287.05287 T).
func AtmosphereAt(hM, tempC float64) (Atmosphere, error) {
	a, err := StandardAtmosphere(hM)
	if err != nil {
		return a, err
	}
	if !(tempC >= -60 && tempC <= 60) {
		return Atmosphere{}, fmt.Errorf("mean temperature %g degrees Celsius lies outside -60 to 60", tempC)
	}
	a.TemperatureK = tempC + units.ZeroCelsiusK
	a.DensityKgPerM3 = a.PressurePa / (isaRJPerKgK * a.TemperatureK)
	a.FromTemperature = true
	return a, nil
}

// MoistAirDensity is the density of moist air after IEC 61400-12-1:
// rho = (1/T) [p/R0 - phi pw (1/R0 - 1/Rw)], R0 = 287.05 and Rw = 461.5 J/(kg K),
// pw = 0.0000205 exp(0.0631846 T) Pa. T in K (213 to 333), p in Pa (above 0), phi relative humidity 0
// to 1. An error outside.
func MoistAirDensity(tempK, pressurePa, humidityFrac float64) (float64, error) {
	const r0, rw = 287.05, 461.5
	if !(tempK >= 213 && tempK <= 333) || !(pressurePa > 0) || math.IsInf(pressurePa, 0) || !(humidityFrac >= 0 && humidityFrac <= 1) {
		return 0, fmt.Errorf("moist air at %g K, %g Pa, humidity %g: outside 213 to 333 K, above 0 Pa, 0 to 1", tempK, pressurePa, humidityFrac)
	}
	pw := 0.0000205 * math.Exp(0.0631846*tempK)
	return (pressurePa/r0 - float64(humidityFrac*pw*(1/r0-1/rw))) / tempK, nil
}

// NormalisedSpeed is the speed at which a machine with pitch control finds the same power on its
// curve: vn = v (rho/1.225)^(1/3), speeds in m/s. Source: IEC 61400-12-1.
func NormalisedSpeed(vMPerS, rhoKgPerM3 float64) float64 {
	return vMPerS * math.Cbrt(rhoKgPerM3/ReferenceDensityKgPerM3)
}
