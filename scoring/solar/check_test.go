package solar

import (
	"math"
	"os"
	"slices"
	"testing"
	"time"

	"groundtally/assets/citedtable"
	"groundtally/scoring/sun"
	"groundtally/scoring/units"
)

type inputs struct {
	v map[string]float64
	s map[string]string
}

// ring is a horizon of one height all around; none at 0.
func ring(deg float64) *Horizon {
	h, err := NewHorizon(slices.Repeat([]float64{deg}, 72))
	if err != nil {
		panic(err)
	}
	return h
}

func cosDeg(d float64) float64 { return cosd(d) }

func vectorOf(in inputs) sun.Vec {
	decl, ok := in.v["decl"]
	if !ok {
		decl = sun.CooperDeclinationDeg(in.v["n"])
	}
	return sun.VectorAt(in.v["lat"], decl, in.v["hour_angle_deg"])
}

func beamRatioOf(in inputs) float64 {
	s := vectorOf(in)
	return BeamRatio(s.Dot(sun.PlaneNormal(in.v["tilt_deg"], in.v["azimuth_deg"])), s.Z)
}

// textbookHour gives the light of an hour in MJ/m2 with the clearness taken over the hour, and the
// factor between MJ/m2 and the unit of Light.
func textbookHour(in inputs) (l Light, cosIncidence float64) {
	s := vectorOf(in)
	normal := in.v["solar_constant"] * sun.DistanceFactorOfDay(in.v["n"])
	w := in.v["hour_angle_deg"]
	extra := sun.HourlyWhPerM2(normal, in.v["lat"], sun.CooperDeclinationDeg(in.v["n"]), w-7.5, w+7.5) / units.WPerKW * units.MJPerKWh
	f := ErbsHourly(in.v["hour_mj"] / extra)
	l.GHI = in.v["hour_mj"]
	l.DHI = f * l.GHI
	l.CosZenith = s.Z
	l.DNI = (l.GHI - l.DHI) / s.Z
	l.NormalWPerM2 = extra / s.Z
	return l, s.Dot(sun.PlaneNormal(in.v["tilt_deg"], in.v["azimuth_deg"]))
}

func hourTotal(in inputs, sky func(l Light, cosIncidence, cosTilt float64) SkyLight) float64 {
	l, ci := textbookHour(in)
	ct := cosDeg(in.v["tilt_deg"])
	return l.DNI*math.Max(0, ci) + sky(l, ci, ct).Sum() + GroundLight(l.GHI, in.v["albedo"], ct)
}

func kleinMonth(in inputs) (decl, K float64) {
	m := time.Month(in.v["mo"])
	decl = sun.KleinDeclinationDeg(m)
	n := float64(sun.KleinDay(m))
	for k := time.January; k < m; k++ {
		n += float64(sun.DaysInMonth(k))
	}
	extra := sun.DailyWhPerM2(in.v["solar_constant"]*sun.DistanceFactorOfDay(n), in.v["lat"], decl) / units.WPerKW * units.MJPerKWh
	return decl, in.v["h_mj"] / extra
}

func perezOf(in inputs) (Light, PerezSky) {
	l := Light{DHI: in.v["dhi"], DNI: in.v["dni"], NormalWPerM2: in.v["normal"], CosZenith: cosDeg(in.v["zenith_deg"])}
	l.GHI = l.DHI + l.DNI*l.CosZenith
	return l, PerezState(l, sun.AirMass(in.v["zenith_deg"]))
}

func oneHour(in inputs) float64 {
	at := time.Date(int(in.v["y"]), time.Month(in.v["mo"]), int(in.v["d"]), int(in.v["h"]), int(in.v["mi"]), 0, 0, time.UTC)
	a := sun.At(sun.JulianDay(at))
	p := a.Seen(in.v["lat"], in.v["lon"], sun.StandardAir(0))
	s := sun.Direction(p.GeometricDeg, p.AzimuthDeg)
	ci := s.Dot(sun.PlaneNormal(in.v["tilt_deg"], in.v["azimuth_deg"]))
	ct := cosDeg(in.v["tilt_deg"])
	l := Light{GHI: in.v["ghi"], NormalWPerM2: sun.NormalWPerM2(a.DistanceAU), CosZenith: s.Z}
	kt := l.GHI / (l.NormalWPerM2 * l.CosZenith)
	f := ErbsHourly(kt)
	l.DHI = f * l.GHI
	l.DNI = (l.GHI - l.DHI) / l.CosZenith
	switch in.s["part"] {
	case "clearness":
		return kt
	case "diffuse_share":
		return f
	case "dhi":
		return l.DHI
	case "dni":
		return l.DNI
	case "incidence_deg":
		return math.Acos(ci) / radPerDeg
	case "beam":
		return l.DNI * ci
	case "ground":
		return GroundLight(l.GHI, in.v["albedo"], ct)
	case "isotropic":
		return IsotropicSky(l, ct).Sum()
	case "hay_davies":
		return HayDaviesSky(l, ci, ct).Sum()
	case "perez":
		return PerezState(l, sun.AirMass(90-p.GeometricDeg)).On(l, ci, ct).Sum()
	}
	return math.NaN()
}

var plainGlass = Glass{Ar: 0.16}

// madisonYear takes the diffuse light from ErbsMonthly, as the engine it is held against did.
func madisonYear(in inputs) YearResult {
	c := madison()
	var dhi [12]float64
	for m := range dhi {
		mo := time.Month(m + 1)
		decl, _, extra := sun.MonthMean(c.LatDeg, c.LonDeg, mo)
		K := c.GHIKWhPerM2[m] * units.WPerKW / float64(sun.DaysInMonth(mo)) / extra
		dhi[m] = c.GHIKWhPerM2[m] * ErbsMonthly(K, sun.SunsetHourAngleDeg(c.LatDeg, decl))
	}
	c.DHIKWhPerM2 = &dhi
	p := defaultPlant(Mount{Kind: FixedTilt, TiltDeg: in.v["tilt_deg"], AzimuthDeg: 180})
	r, err := Year(YearInput{c, p})
	if err != nil {
		panic(err)
	}
	return r
}

var quantities = map[string]func(in inputs) float64{
	"sky_view": func(in inputs) float64 {
		return ring(in.v["horizon_deg"]).SkyView(sun.PlaneNormal(in.v["tilt_deg"], 180))
	},
	"orgill_hollands_hourly": func(in inputs) float64 { return OrgillHollandsHourly(in.v["kt"]) },
	"reindl_hourly":          func(in inputs) float64 { return ReindlHourly(in.v["kt"], sind(in.v["elevation_deg"])) },
	"erbs_hourly":            func(in inputs) float64 { return ErbsHourly(in.v["kt"]) },
	"beam_ratio":             beamRatioOf,
	"beam_ratio_of_day":      beamRatioOf,
	"isotropic_hour_mj": func(in inputs) float64 {
		l, ci := textbookHour(in)
		ct := cosDeg(in.v["tilt_deg"])
		beam, sky, ground := l.DNI*math.Max(0, ci), IsotropicSky(l, ct).Sum(), GroundLight(l.GHI, in.v["albedo"], ct)
		switch in.s["part"] {
		case "beam":
			return beam
		case "diffuse":
			return sky
		case "ground":
			return ground
		case "total":
			return beam + sky + ground
		}
		return math.NaN()
	},
	"hdkr_hour_mj":       func(in inputs) float64 { return hourTotal(in, HDKRSky) },
	"hay_davies_hour_mj": func(in inputs) float64 { return hourTotal(in, HayDaviesSky) },
	"monthly_tilted_mj": func(in inputs) float64 {
		decl, K := kleinMonth(in)
		h, ok := MonthlyTilted(in.v["h_mj"], K, in.v["lat"], decl, in.v["tilt_deg"], in.v["albedo"])
		if !ok {
			return math.NaN()
		}
		return h
	},
	"monthly_clearness": func(in inputs) float64 { _, K := kleinMonth(in); return K },
	"monthly_diffuse": func(in inputs) float64 {
		decl, K := kleinMonth(in)
		return ErbsMonthly(K, sun.SunsetHourAngleDeg(in.v["lat"], decl))
	},
	"monthly_beam_ratio": func(in inputs) float64 {
		r, ok := MonthlyBeamRatio(in.v["lat"], sun.KleinDeclinationDeg(time.Month(in.v["mo"])), in.v["tilt_deg"])
		if !ok {
			return math.NaN()
		}
		return r
	},
	"hour_share":         func(in inputs) float64 { return HourShare(in.v["hour_angle_deg"], in.v["sunset_deg"]) },
	"hour_share_diffuse": func(in inputs) float64 { return DiffuseHourShare(in.v["hour_angle_deg"], in.v["sunset_deg"]) },
	"perez_coefficient":  func(in inputs) float64 { return perezF[int(in.v["bin"])-1][int(in.v["coefficient"])-1] },
	"perez_sky": func(in inputs) float64 {
		l, s := perezOf(in)
		return s.On(l, cosDeg(in.v["incidence_deg"]), cosDeg(in.v["tilt_deg"])).Sum()
	},
	"perez_clearness":      func(in inputs) float64 { _, s := perezOf(in); return s.Clearness },
	"perez_brightness":     func(in inputs) float64 { _, s := perezOf(in); return s.Brightness },
	"perez_f1":             func(in inputs) float64 { _, s := perezOf(in); return s.F1 },
	"perez_f2":             func(in inputs) float64 { _, s := perezOf(in); return s.F2 },
	"ashrae_beam":          func(in inputs) float64 { return ASHRAEBeam(cosDeg(in.v["incidence_deg"])) },
	"fresnel_beam":         func(in inputs) float64 { return FresnelBeam(in.v["incidence_deg"]) },
	"fresnel_transmission": func(in inputs) float64 { return FresnelTransmission(in.v["incidence_deg"]) },
	"martin_ruiz_beam":     func(in inputs) float64 { return plainGlass.Beam(cosDeg(in.v["incidence_deg"])) },
	"martin_ruiz_sky":      func(in inputs) float64 { return plainGlass.Sky(in.v["tilt_deg"]) },
	"martin_ruiz_ground":   func(in inputs) float64 { return plainGlass.Ground(in.v["tilt_deg"]) },
	"tracker_angle_deg": func(in inputs) float64 {
		return TrackerAngleDeg(in.v["sun_angle_deg"], in.v["cross_tilt_deg"], in.v["gcr"], 90, true)
	},
	"axis_tilt_deg": func(in inputs) float64 {
		return NewFrame(in.v["axis_azimuth_deg"], in.v["slope_deg"], in.v["aspect_deg"]).AxisTiltDeg
	},
	"cross_tilt_deg": func(in inputs) float64 {
		return NewFrame(in.v["axis_azimuth_deg"], in.v["slope_deg"], in.v["aspect_deg"]).CrossTiltDeg
	},
	"view_front_sky":    func(in inputs) float64 { return ViewOfRows(cosDeg(in.v["tilt_deg"]), in.v["gcr"]).FrontSky },
	"view_front_ground": func(in inputs) float64 { return ViewOfRows(cosDeg(in.v["tilt_deg"]), in.v["gcr"]).FrontGround },
	"view_front_row":    func(in inputs) float64 { return ViewOfRows(cosDeg(in.v["tilt_deg"]), in.v["gcr"]).FrontRow },
	"view_ground_sky":   func(in inputs) float64 { return ViewOfRows(cosDeg(in.v["tilt_deg"]), in.v["gcr"]).GroundSky },
	"profile_angle_deg": func(in inputs) float64 {
		return 90 - math.Abs(NewFrame(in.v["azimuth_deg"]-90, 0, 0).SunAngleDeg(vectorOf(in)))
	},
	"faiman_cell_c": func(in inputs) float64 {
		return FaimanCellC(in.v["air_c"], in.v["irradiance"], in.v["wind"], 25.0, 6.84)
	},
	"noct_cell_c":   func(in inputs) float64 { return NOCTCellC(in.v["air_c"], in.v["irradiance"], in.v["noct_c"]) },
	"dc_kw_per_kwp": func(in inputs) float64 { return DCKWPerKWp(in.v["irradiance"], in.v["cell_c"], in.v["gamma"]) },
	"shade_power_loss": func(in inputs) float64 {
		return ShadePowerLoss(in.v["shaded"], int(in.v["blocks"]))
	},
	"lifetime_mean_factor": func(in inputs) float64 { return LifetimeMeanFactor(in.v["degradation"], int(in.v["years"])) },
	"exceeded_with": func(in inputs) float64 {
		v, ok := ExceededWith(in.v["p50"], in.v["sigma"], in.v["probability"])
		if !ok {
			return math.NaN()
		}
		return v
	},
	"day_clearness": func(in inputs) float64 { return DayClearness(in.v["clearness"])[int(in.v["i"])-1] },
	"bendt_exponent": func(in inputs) float64 {
		return BendtExponent(in.v["clearness"], 0.05, ClearnessMost(in.v["clearness"]))
	},
	"hour":                oneHour,
	"inverter_efficiency": func(in inputs) float64 { return Inverter{1, .003, .006, .010}.Efficiency(in.v["load"]) },
	"inverter_european":   func(in inputs) float64 { return Inverter{1, .003, .006, .010}.EuropeanEfficiency() },
	"mw_per_ha_of_acre":   func(in inputs) float64 { return in.v["mw_per_acre"] / units.HaPerAcre },
	"capacity_mwp_per_ha": func(in inputs) float64 {
		return CapacityMWpPerHa(in.v["efficiency"], in.v["gcr"], in.v["usable"])
	},
	"madison_diffuse_share": func(in inputs) float64 { return madisonYear(in).DiffuseShare },
	"madison_plane_kwh":     func(in inputs) float64 { return madisonYear(in).PlaneKWhPerM2 },
}

func TestCheckTable(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "solar.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	if len(checks) < 80 {
		t.Fatalf("only %d checks", len(checks))
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			f, ok := quantities[c.Quantity]
			if !ok {
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if got := f(inputs{c.In, c.Text}); !c.OK(got) {
				t.Errorf("%s = %v, want %v within %v (%s)", c.Quantity, got, c.Expected, c.Tolerance, c.Source)
			}
		})
	}
}
