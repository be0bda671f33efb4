package solar

import (
	"errors"
	"time"
)

// ErrNoHours tells that a climate was made from months: its moments stand for kinds of day and are no hours.
var ErrNoHours = errors.New("sunlight by month has no hours")

// Hours are the intervals of the years on which NewWeather laid a file, without gaps; of a file of several years
// all of them, one year after another. 29 February is not among them. They do not change.
type Hours struct {
	step   time.Duration
	years  int
	perDay int
	first  int // number of the first, see weather.index
	of     []hourOf
}

// hourOf is kept small: a climate has one for each hour.
type hourOf struct {
	row    int32
	year   int16
	filled bool
}

// Hour is one interval of a file.
type Hour struct {
	// Start is the beginning in UTC, on a whole step of the day, in the year of the file's row. Where the file has no
	// row it is in the year laid for it; in a typical year, in that of the month's other rows, or in
	// sun.TypicalYear where the month has none.
	Start  time.Time
	Row    int  // in WeatherInput.Rows, -1 where the file has none for this interval
	Filled bool // light and temperature come from other hours; true as well where the row is there without them
}

// Hours gives the intervals in the order of PowerSeries. ErrNoHours with a climate from months.
func (c *Climate) Hours() (*Hours, error) {
	if len(c.hours.of) == 0 {
		return nil, ErrNoHours
	}
	return &c.hours, nil
}

// Len gives the number of intervals, Years times 8760 h over Step.
func (h *Hours) Len() int { return len(h.of) }

// Step gives the length of an interval: an hour, or the part of one that the file has.
func (h *Hours) Step() time.Duration { return h.step }

// Years gives the number of years of 365 days, 1 for a typical year.
func (h *Hours) Years() int { return h.years }

// At gives the interval i, from 0 to Len less 1.
func (h *Hours) At(i int) Hour {
	o := h.of[i]
	t := timeOf(h.first+i, h.perDay, h.step)
	// Months of a typical year come from their own years; rows that a file has beyond whole years stand in the
	// gap at its beginning.
	t = t.AddDate(int(o.year)-t.Year(), 0, 0)
	return Hour{Start: t, Row: int(o.row), Filled: o.filled}
}

// PowerSeries gives the power of a plant in its first year, interval by interval: kW per kWp of direct-current
// rating, mean over the interval, alternating current as it leaves the plant. All of Yield's chain is in it: the
// inverter's limit, what is lost behind it, the month's dirt and snow (by the file's clock).
//
// Values go by time; a typical year begins with January (UTC). Hours tells which interval a value belongs to. Without
// sun the value is 0. The sum, times the hours of a step, over Hours.Years, is SpecificYieldKWhPerKWp: every interval
// has the same weight.
//
// Losses that are shares of energy lower every interval alike, AvailabilityFrac, CurtailmentFrac and SnowFrac too,
// although a plant that stands still gives nothing and a clean one everything: the greatest value is too low by
// those shares. For the size of a connection leave them at 0. Means hide peaks within the interval.
//
// ErrNoHours with a climate from months; *InputError for a plant that Yield refuses.
func (c *Climate) PowerSeries(p Plant) ([]float64, error) {
	if len(c.hours.of) == 0 {
		return nil, ErrNoHours
	}
	power := make([]float64, len(c.hours.of))
	if _, err := c.yield(p, power); err != nil {
		return nil, err
	}
	return power, nil
}
