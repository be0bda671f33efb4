package gen

import (
	"bytes"
	"fmt"
	"math"
	"time"

	"groundtally/geo"
	"groundtally/scoring/units"
)

const (
	sectors     = 12
	windHeightM = 100
	yearlyMWh   = 38000.0 // demand of the municipality
)

// The rose of the island: share of time, and scale relative to the mean over all sectors, by sector from
// north turning clockwise; each sector is centred on its direction.
var (
	roseShare = [sectors]float64{.05, .04, .045, .05, .055, .065, .09, .135, .165, .15, .095, .06}
	roseScale = [sectors]float64{.86, .80, .82, .86, .90, .95, 1.0, 1.08, 1.12, 1.08, 1.0, .92}
	roseShape = [sectors]float64{1.95, 1.95, 1.98, 2.0, 2.02, 2.05, 2.1, 2.18, 2.22, 2.2, 2.12, 2.0}
)

// meanWind is the yearly mean at 100 m: more on the upland and on the western shore, less in valleys.
func (s *isle) meanWind(p geo.XY, n noise) float64 {
	h := s.land.ground(p)
	d := s.land.inland.at(p)
	v := 8.15 + float64(1.15*step01(20, 300, h)) + float64(0.35*step01(1500, 0, d)) + float64(0.2*step01(4000, -11000, p.X)) + float64(0.12*n.at(p, 3000))
	return clamp(v, 8, 9.5)
}

func (s *isle) windRows(c *collection, id string, p geo.XY, n noise) {
	mean := s.meanWind(p, n)
	var share [sectors]float64
	sum, weighted := 0.0, 0.0
	for k := range sectors {
		share[k] = float64(roseShare[k] * (1 + float64(0.08*n.at(geo.XY{X: p.X + float64(1e5*float64(k)), Y: p.Y}, 5000))))
		sum += share[k]
	}
	last := 1.0
	for k := range sectors {
		share[k] = round(share[k]/sum, 4)
		if k < sectors-1 {
			last -= share[k]
		} else {
			share[k] = round(last, 4) // so that the shares add up to one
		}
		weighted += float64(share[k] * roseScale[k])
	}
	for k := range sectors {
		shape := round(roseShape[k]+float64(0.05*n.at(geo.XY{X: p.X, Y: p.Y + 2e5}, 6000)), 3)
		a := mean * roseScale[k] / weighted / math.Gamma(1+1/shape)
		c.point(p, prop{"point_id", id}, prop{"height", windHeightM}, prop{"weibull_a", round(a, 3)}, prop{"weibull_k", shape}, prop{"sector_from", 30 * k}, prop{"sector_share", share[k]})
	}
}

func (s *isle) windLayers(out map[string][]byte) {
	n := newNoise(s.seed, "wind")
	c := &collection{}
	for i, p := range kms(-10.9, 1.2, -8.0, 3.9, -8.6, -2.6, -5.0, 1.4, -4.2, -4.3, -1.6, 4.2, -1.0, -2.2, 2.6, 3.4, 3.8, -3.2, 6.2, 0.2, 7.2, 4.6, 10.2, 0.3) {
		s.windRows(c, fmt.Sprintf("W-%02d", i+1), p, n)
	}
	out["wind_points.geojson"] = c.bytes()
	c = &collection{}
	for j := range 11 {
		for i := range 17 {
			p := geo.XY{X: -12000 + float64(1500*float64(i)), Y: -7500 + float64(1500*float64(j))}
			if s.land.inland.at(p) > -1100 {
				s.windRows(c, fmt.Sprintf("G-%02d-%02d", j+1, i+1), p, n)
			}
		}
	}
	out["wind_grid.geojson"] = c.bytes()
}

// hour is one row of the hourly year; the stamp is the start of the hour.
type hour struct {
	at            time.Time
	ghi, dni, dhi float64
	tempC         float64
	windMPS       float64
	windFromDeg   float64
}

// Monthly aims of global sunlight on level ground, kWh/m2, for a maritime place at 47.5 N: 1,150 a year.
var monthlySun = [12]float64{30.7, 50.4, 91.8, 128.6, 156.9, 163.3, 164.8, 139.6, 101.2, 62.9, 33.6, 26.2}
var monthlyAlbedo = [12]float64{.19, .19, .18, .18, .19, .19, .20, .20, .19, .18, .18, .18}

// sunHeight gives the cosine of the sun's zenith angle in the middle of an hour and the sunlight above the
// air. Declination after Cooper (1969), equation of time after Spencer (1971).
func sunHeight(t time.Time) (cosZenith, beyondAir float64) {
	t = t.Add(30 * time.Minute)
	day := float64(t.YearDay())
	decl := 23.45 * math.Pi / 180 * math.Sin(2*math.Pi*(284+day)/365)
	b := 2 * math.Pi * (day - 1) / 365
	eotMin := 229.18 * (0.000075 + float64(0.001868*math.Cos(b)) - float64(0.032077*math.Sin(b)) - float64(0.014615*math.Cos(2*b)) - float64(0.040849*math.Sin(2*b)))
	solarH := float64(t.Hour()) + float64(t.Minute())/60 + centralMeridianDeg/15 + eotMin/60
	w := (solarH - 12) * math.Pi / 12
	lat := 47.5 * math.Pi / 180
	cosZenith = float64(math.Sin(lat)*math.Sin(decl)) + float64(math.Cos(lat)*math.Cos(decl)*math.Cos(w))
	return cosZenith, 1361 * (1 + float64(0.033*math.Cos(2*math.Pi*day/365)))
}

// makeYear draws one year of weather. Clouds come as a day's share of a clear sky (Haurwitz 1945) with
// hourly changes; each month's cloudiness is set so that the month's sunlight meets its aim. The diffuse
// part follows Erbs, Klein and Duffie (1982). Wind is Weibull with a season, in runs of hours; its
// direction follows the rose. Wind and sunlight are drawn apart from each other, which real weather is not.
func makeYear(seed uint64) []hour {
	r := stream(seed, "weather")
	year := make([]hour, 0, int(units.HoursPerYear))
	t := time.Date(2025, 1, 1, 0, 0, 0, 0, time.UTC)
	var cloud, gust, warm, blow, turn float64
	var day, fast []float64
	for len(year) < int(units.HoursPerYear) {
		if t.Hour() == 0 {
			cloud = float64(0.45*cloud) + float64(0.893*r.NormFloat64())
			warm = float64(0.8*warm) + float64(0.6*r.NormFloat64())
		}
		gust = float64(0.6*gust) + float64(0.8*r.NormFloat64())
		blow = float64(0.965*blow) + float64(0.2622*r.NormFloat64())
		turn = float64(0.985*turn) + float64(0.1726*r.NormFloat64())
		season := math.Cos(2 * math.Pi * (float64(t.YearDay()) - 20) / 365)
		h := hour{at: t}
		h.windMPS = 9.7 * (1 + float64(0.16*season)) * math.Pow(-math.Log(1-clamp(normalShare(blow), 1e-6, 1-1e-6)), 1/2.1)
		h.windFromDeg = roseDirection(normalShare(turn))
		h.tempC = 12.4 + float64(4.5*math.Cos(2*math.Pi*(float64(t.YearDay())-226)/365)) + float64(1.3*warm) + float64(1.5*math.Cos(2*math.Pi*(float64(t.Hour())-16)/24)*(1-float64(0.4*season)))
		day, fast = append(day, normalShare(cloud)), append(fast, gust)
		year = append(year, h)
		t = t.Add(time.Hour)
	}
	mean := 0.0
	for _, h := range year {
		mean += h.windMPS / units.HoursPerYear
	}
	for i := range year {
		year[i].windMPS = round(year[i].windMPS*8.6/mean, 1)
		year[i].tempC = round(year[i].tempC, 1)
	}
	for month := range 12 {
		var hours []int
		for i, h := range year {
			if int(h.at.Month()) == month+1 {
				hours = append(hours, i)
			}
		}
		clear := func(i int, bright float64) float64 {
			cz, _ := sunHeight(year[i].at)
			if cz <= 0.01 {
				return 0
			}
			share := clamp(0.12+float64(0.9*math.Pow(day[i], bright))+float64(0.09*fast[i]), 0.06, 1)
			return round(1098*cz*math.Exp(-0.059/cz)*share, 1)
		}
		lo, hi := 0.02, 12.0
		for range 50 {
			mid := (lo + hi) / 2
			sum := 0.0
			for _, i := range hours {
				sum += clear(i, mid) / units.WPerKW
			}
			if sum > monthlySun[month] {
				lo = mid
			} else {
				hi = mid
			}
		}
		for _, i := range hours {
			g := clear(i, hi)
			if g <= 0 {
				continue
			}
			cz, top := sunHeight(year[i].at)
			kt := g / (top * cz)
			f := 0.165
			switch {
			case kt <= 0.22:
				f = 1 - float64(0.09*kt)
			case kt <= 0.8:
				f = 0.9511 - float64(0.1604*kt) + float64(4.388*math.Pow(kt, 2)) - float64(16.638*math.Pow(kt, 3)) + float64(12.336*math.Pow(kt, 4))
			}
			d := round(g*f, 1)
			if cz < 0.06 {
				d = g // too low a sun to tell the beam
			}
			year[i].ghi, year[i].dhi, year[i].dni = g, d, round((g-d)/cz, 1)
		}
	}
	return year
}

func normalShare(z float64) float64 { return 0.5 * (1 + math.Erf(z/math.Sqrt2)) }

// roseDirection gives the direction below which the share u of time lies, counted from the edge of the
// north sector.
func roseDirection(u float64) float64 {
	for k, s := range roseShare {
		if u < s || k == sectors-1 {
			d := float64(30*float64(k)) - 15 + float64(30*clamp(u/s, 0, 0.999))
			return math.Mod(math.Round(d)+units.DegreesPerCircle, units.DegreesPerCircle)
		}
		u -= s
	}
	return 0
}

const stamp = "2006-01-02T15:04Z"

func weatherTable(year []hour) []byte {
	var b bytes.Buffer
	b.WriteString("time,ghi,dni,dhi,temperature,wind_speed,wind_direction,wind_height\n")
	for _, h := range year {
		fmt.Fprintf(&b, "%s,%s,%s,%s,%s,%s,%s,%d\n", h.at.Format(stamp), decimal(h.ghi, 1), decimal(h.dni, 1), decimal(h.dhi, 1), decimal(h.tempC, 1), decimal(h.windMPS, 1), decimal(h.windFromDeg, 0), windHeightM)
	}
	return b.Bytes()
}

// monthTable sums the hourly year, so that both files agree to the last printed digit.
func monthTable(year []hour) []byte {
	var b bytes.Buffer
	b.WriteString("month,ghi,dhi,temperature,albedo\n")
	for m := range 12 {
		var g, d, t, n float64
		for _, h := range year {
			if int(h.at.Month()) == m+1 {
				g, d, t, n = g+h.ghi, d+h.dhi, t+h.tempC, n+1
			}
		}
		fmt.Fprintf(&b, "%d,%s,%s,%s,%s\n", m+1, decimal(g/units.WPerKW, 2), decimal(d/units.WPerKW, 2), decimal(t/n, 2), decimal(monthlyAlbedo[m], 2))
	}
	return b.Bytes()
}

// demandTable draws the use of the municipality hour by hour. The running sum is rounded, not each
// hour, so that the year adds up to its stated total.
func demandTable(seed uint64, year []hour) []byte {
	r := stream(seed, "demand")
	daily := [24]float64{.66, .61, .59, .58, .60, .68, .84, 1.02, 1.08, 1.06, 1.05, 1.07, 1.10, 1.04, 1.0, 1.0, 1.06, 1.22, 1.34, 1.33, 1.24, 1.1, .93, .77}
	load := make([]float64, len(year))
	drift, sum := 0.0, 0.0
	for i, h := range year {
		drift = float64(0.9*drift) + float64(0.436*r.NormFloat64())
		v := daily[h.at.Hour()] * (1 + float64(0.026*math.Max(0, 14-h.tempC))) * (1 + float64(0.025*drift))
		if wd := h.at.Weekday(); wd == time.Saturday || wd == time.Sunday {
			v *= 0.93
		}
		load[i] = v
		sum += v
	}
	var b bytes.Buffer
	b.WriteString("time,load\n")
	running, written := 0.0, 0.0
	for i, h := range year {
		running += float64(load[i] / sum * yearlyMWh * units.KWhPerMWh)
		v := math.Round((running-written)*10) / 10
		written = math.Round((written+v)*10) / 10
		fmt.Fprintf(&b, "%s,%s\n", h.at.Format(stamp), decimal(v, 1))
	}
	return b.Bytes()
}
