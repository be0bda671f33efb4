package sun

import (
	"math"
	"os"
	"testing"
	"time"

	"groundtally/assets/citedtable"
	"groundtally/scoring/units"
)

func moment(in map[string]float64) time.Time {
	return time.Date(int(in["y"]), time.Month(in["mo"]), int(in["d"]), int(in["h"]), int(in["mi"]), int(in["s"]), 0, time.UTC)
}

// clockMin gives the minutes since local midnight of the date in in.
func clockMin(t time.Time, in map[string]float64) float64 {
	midnight := time.Date(int(in["y"]), time.Month(in["mo"]), int(in["d"]), 0, 0, 0, 0, time.UTC)
	return t.Sub(midnight).Minutes() + in["offset_h"]*units.MinutesPerHour
}

func riseSet(in map[string]float64) Events {
	return RiseSet(int(in["y"]), time.Month(in["mo"]), int(in["d"]), in["lat"], in["lon"])
}

func seen(in map[string]float64) Place {
	return Where(moment(in), in["lat"], in["lon"], Air{PressureHPa: in["pressure_hpa"], TempC: in["temp_c"]})
}

func apparent(in map[string]float64) Apparent { return At(JulianDay(moment(in))) }

func byHourAngle(in map[string]float64) Vec {
	return VectorAt(in["lat"], in["decl"], in["hour_angle_deg"])
}

func textbookNormal(in map[string]float64) float64 {
	return in["solar_constant"] * DistanceFactorOfDay(in["n"])
}

var quantities = map[string]func(in map[string]float64) float64{
	"julian_day":                func(in map[string]float64) float64 { return JulianDay(moment(in)) },
	"distance_au":               func(in map[string]float64) float64 { return apparent(in).DistanceAU },
	"right_ascension_deg":       func(in map[string]float64) float64 { return apparent(in).RightAscensionDeg },
	"declination_deg":           func(in map[string]float64) float64 { return apparent(in).DeclinationDeg },
	"sidereal_deg":              func(in map[string]float64) float64 { return apparent(in).SiderealDeg },
	"equation_of_time_min":      func(in map[string]float64) float64 { return apparent(in).EquationOfTimeMin },
	"normal_w_per_m2":           func(in map[string]float64) float64 { return NormalWPerM2(apparent(in).DistanceAU) },
	"hour_angle_deg":            func(in map[string]float64) float64 { return seen(in).HourAngleDeg },
	"elevation_topocentric_deg": func(in map[string]float64) float64 { return seen(in).TopocentricDeg },
	"zenith_apparent_deg":       func(in map[string]float64) float64 { return 90 - seen(in).ApparentElevationDeg },
	"zenith_geometric_deg":      func(in map[string]float64) float64 { return 90 - seen(in).GeometricDeg },
	"azimuth_deg":               func(in map[string]float64) float64 { return seen(in).AzimuthDeg },
	"refraction_deg": func(in map[string]float64) float64 {
		return RefractionDeg(in["elevation_deg"], Air{PressureHPa: in["pressure_hpa"], TempC: in["temp_c"]})
	},
	"incidence_deg": func(in map[string]float64) float64 {
		return IncidenceDeg(Direction(90-in["zenith_deg"], in["azimuth_deg"]), PlaneNormal(in["tilt_deg"], in["plane_azimuth_deg"]))
	},
	"sunrise_min": func(in map[string]float64) float64 { return clockMin(riseSet(in).Rise, in) },
	"sunset_min":  func(in map[string]float64) float64 { return clockMin(riseSet(in).Set, in) },
	"day_state":   func(in map[string]float64) float64 { return float64(riseSet(in).State) },
	"eot_extreme_min": func(in map[string]float64) float64 {
		most := math.Inf(-1)
		for t := time.Date(int(in["y"]), 1, 1, 12, 0, 0, 0, time.UTC); t.Year() == int(in["y"]); t = t.AddDate(0, 0, 1) {
			most = math.Max(most, in["side"]*At(JulianDay(t)).EquationOfTimeMin)
		}
		return in["side"] * most
	},
	"spencer_eot_min": func(in map[string]float64) float64 { return SpencerEquationOfTimeMin(in["n"]) },
	"solar_time_min": func(in map[string]float64) float64 {
		return units.MinutesPerHour * SolarTimeH(in["utc_h"], in["lon"], SpencerEquationOfTimeMin(in["n"]))
	},
	"incidence_of_hour_angle_deg": func(in map[string]float64) float64 {
		return IncidenceDeg(byHourAngle(in), PlaneNormal(in["tilt_deg"], in["plane_azimuth_deg"]))
	},
	"zenith_of_hour_angle_deg":  func(in map[string]float64) float64 { return 90 - byHourAngle(in).ElevationDeg() },
	"azimuth_of_hour_angle_deg": func(in map[string]float64) float64 { return byHourAngle(in).AzimuthDeg() },
	"sunset_hour_angle_deg":     func(in map[string]float64) float64 { return SunsetHourAngleDeg(in["lat"], in["decl"]) },
	"sunset_hour_angle_of_day_deg": func(in map[string]float64) float64 {
		return SunsetHourAngleDeg(in["lat"], CooperDeclinationDeg(in["n"]))
	},
	"daily_mj_per_m2": func(in map[string]float64) float64 {
		return DailyWhPerM2(textbookNormal(in), in["lat"], CooperDeclinationDeg(in["n"])) / units.WPerKW * units.MJPerKWh
	},
	"hourly_mj_per_m2": func(in map[string]float64) float64 {
		return HourlyWhPerM2(textbookNormal(in), in["lat"], CooperDeclinationDeg(in["n"]), in["from_deg"], in["to_deg"]) / units.WPerKW * units.MJPerKWh
	},
	"klein_declination_deg": func(in map[string]float64) float64 {
		m := time.Month(in["mo"])
		return KleinDeclinationDeg(m)
	},
	"air_mass": func(in map[string]float64) float64 { return AirMass(in["zenith_deg"]) },
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "sun.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	if len(checks) < 60 {
		t.Fatalf("only %d checks", len(checks))
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			f, ok := quantities[c.Quantity]
			if !ok {
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if got := f(c.In); !c.OK(got) {
				t.Errorf("%s = %v, want %v within %v (%s)", c.Quantity, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}
