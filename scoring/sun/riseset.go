package sun

import (
	"math"
	"time"
)

// DayState says whether the sun rises and sets on a day.
type DayState uint8

// The states of a day. On a Rising day the sun both rises and sets.
const (
	Rising DayState = iota
	AlwaysUp
	AlwaysDown
)

func (s DayState) String() string { return [...]string{"rises", "always up", "always down"}[s] }

// Events are sunrise, noon and sunset around one solar noon. Rise and Set are zero unless State is
// Rising.
type Events struct {
	State           DayState
	Rise, Noon, Set time.Time // UTC
}

// riseElevationDeg is the elevation of the sun's centre when its upper edge touches a flat horizon:
// 34 minutes of arc refraction and 16 of radius.
const riseElevationDeg = -0.8333

// RiseSet gives the rise before and the set after the solar noon that belongs to a calendar date at
// the longitude (the date as people there count it, apart from the drawing of time zones).
//
//	cos H0 = (sin(-0.8333) - sin p sin d) / (cos p cos d)
//
// with declination and equation of time iterated at the event. Accurate to about half a minute
// below 65 degrees of latitude; near the polar circles one degree of refraction more or less shifts
// the event by minutes, and a day whose state changes between rise and set is reported by its state
// at noon. Source: Meeus 1998, chapter 15.
func RiseSet(year int, month time.Month, day int, latDeg, lonDeg float64) Events {
	mean := JulianDay(time.Date(year, month, day, 12, 0, 0, 0, time.UTC)) - lonDeg/360
	noon := mean
	for range 3 {
		noon = mean - At(noon).EquationOfTimeMin/1440
	}
	ev := Events{Noon: Moment(noon)}
	sp, cp := math.Sincos(latDeg * radPerDeg)
	event := func(side float64) (float64, DayState) {
		jd := noon
		state := Rising
		for i := range 8 {
			a := At(jd)
			sd, cd := math.Sincos(a.DeclinationDeg * radPerDeg)
			num, den := sind(riseElevationDeg)-float64(sp*sd), float64(cp*cd)
			if i == 0 {
				switch {
				case num <= -math.Abs(den):
					return 0, AlwaysUp
				case num >= math.Abs(den):
					return 0, AlwaysDown
				}
			}
			h0 := math.Acos(clampUnit(num/den)) / radPerDeg
			jd = mean - a.EquationOfTimeMin/1440 + side*h0/360
		}
		return jd, state
	}
	rise, state := event(-1)
	if state != Rising {
		ev.State = state
		return ev
	}
	set, _ := event(1)
	ev.Rise, ev.Set = Moment(rise), Moment(set)
	return ev
}
