package run

import (
	"fmt"
	"math"
	"testing"

	"groundtally/scoring"
)

// A turbine upwind of a site costs it energy, and the site's machines cost that one; what is missing is unknown, not
// zero.
func TestWakesOfNeighbours(t *testing.T) {
	study0 := func() *plain {
		p := windYield(t)
		p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
		return p
	}
	columns := []string{"technology", "rated_power", "hub_height", "rotor_diameter", "state"}
	machine := func(x, y float64, state string) thing {
		return thing{dot(x, y), map[string]string{"technology": "wind", "rated_power": "2000", "hub_height": "100", "rotor_diameter": "90", "state": state}}
	}
	energy := func(p *plain) (mwh float64, lost Leaf, c *Candidate) {
		c = p.computed(nil)
		return p.leaf(c, "wind_p50_mwh").X, p.leaf(c, "existing_loss_mwh"), c
	}
	alone, lost, _ := energy(study0())
	if lost.State != scoring.Unknown || lost.Why != "no_layer:existing_plant" {
		t.Errorf("without a layer: %+v", lost)
	}
	near := study0()
	near.add(neighbourRole, columns, machine(-1500, 0, "existing"), machine(1500, 0, "permitted"))
	between, lost, c := energy(near)
	if between >= alone || between < 0.85*alone {
		t.Errorf("between two turbines %v MWh, alone %v", between, alone)
	}
	if lost.State != scoring.Number || lost.X <= 0 || lost.X > 0.2*alone {
		t.Errorf("the two lose %+v", lost)
	}
	if q, ok := c.Consequence("existing_plant_loss_mwh_per_yr"); !ok || q.Central != lost.X {
		t.Errorf("the consequence is %+v", q)
	}
	if s := near.said(c, "wakes_of_others"); !s {
		t.Errorf("notices: %v", c.Notices)
	}
	applied := study0()
	applied.add(neighbourRole, columns, machine(-1500, 0, "applied"))
	if got, _, _ := energy(applied); got != alone {
		t.Errorf("one that is applied for counts: %v, alone %v", got, alone)
	}
	applied.set("wind.count_applied", "yes")
	if got, _, _ := energy(applied); got >= alone {
		t.Errorf("one that is applied for does not count, though it is to: %v, alone %v", got, alone)
	}
	far := study0()
	far.add(neighbourRole, columns, machine(-30_000, 0, "existing"))
	if got, lost, _ := energy(far); got != alone || lost.State != scoring.Number || lost.X != 0 {
		t.Errorf("30 km off: %v MWh, alone %v; lost %+v", got, alone, lost)
	}
	bare := study0()
	bare.add(neighbourRole, columns, thing{dot(-1500, 0), map[string]string{"technology": "wind", "rated_power": "2000", "state": "existing"}})
	if got, lost, c := energy(bare); got != alone || lost.State != scoring.Unknown || !bare.said(c, "wakes_of_others_unknown") {
		t.Errorf("without hub and rotor: %v MWh, alone %v; lost %+v", got, alone, lost)
	}
	// On the site itself, masts keep their distance.
	_, _, plainFit := energy(study0())
	spot := plainFit.Fit.Turbines[0]
	at, err := study0().frame.Forward(spot)
	if err != nil {
		t.Fatal(err)
	}
	on := study0()
	on.add(neighbourRole, columns, machine(at.X, at.Y, "existing"))
	c = on.computed(nil)
	if c.Fit != nil {
		for _, ll := range c.Fit.Turbines {
			q, err := on.frame.Forward(ll)
			if err != nil {
				t.Fatal(err)
			}
			if d := math.Hypot(q.X-at.X, q.Y-at.Y); d < 3*90 {
				t.Errorf("a mast stands %v m from an existing one", d)
			}
		}
	} else if c.Reason != "existing_turbines_near" {
		t.Errorf("%s: %s", c.Status, c.Reason)
	}
}

// said reports whether a notice stands with a candidate.
func (p *plain) said(c *Candidate, code string) bool {
	for _, n := range c.Notices {
		if n == code {
			return true
		}
	}
	return false
}

// The spread of the wind follows where it was taken from, and is told by its parts.
func TestWindDoubtFollowsTheSource(t *testing.T) {
	of := func(set ...string) (*WindDoubt, float64) {
		p := windYield(t)
		p.set("wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
		p.set(set...)
		c := p.computed(nil)
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		course, err := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), nil).Course(t.Context(), c)
		if err != nil {
			t.Fatal(err)
		}
		return course.Wind, p.leaf(c, "wind_yield_sigma").X
	}
	said, sigma := of()
	if said == nil || said.Said || said.Source != "model" || math.Abs(said.OneYear-sigma) > 1e-7 {
		t.Fatalf("not said: %+v, sigma %v", said, sigma)
	}
	// Screening without a mast 15 to 20 %, with a year of one 8 to 12 %: common practice.
	if said.LongTerm < 0.15 || said.LongTerm > 0.2 || said.Band != [2]float64{0.15, 0.2} {
		t.Errorf("%+v", said)
	}
	sum := 0.0
	for _, p := range said.Parts {
		sum += p.Energy * p.Energy
	}
	// 0.06 of the speed, times 1 to 2 per cent of energy for each of speed at 7 m/s.
	if said.Sensitivity < 1 || said.Sensitivity > 2 || math.Abs(math.Sqrt(sum)-said.LongTerm) > 1e-12 || math.Abs(math.Hypot(said.LongTerm, 0.06*said.Sensitivity)-said.OneYear) > 1e-12 {
		t.Errorf("%+v, sigma %v", said, sigma)
	}
	// P90 of a normal distribution lies 1.2816 standard deviations below the middle.
	if e := said.Exceeded; len(e) != 5 || math.Abs(e[2].LongTermMWhPerYr/e[0].LongTermMWhPerYr-(1-1.2815515655*said.LongTerm)) > 1e-9 || e[2].SingleYearMWhPerYr >= e[2].LongTermMWhPerYr {
		t.Errorf("exceeded: %+v", e)
	}
	mast, less := of("wind.data_kind", "mast")
	if !mast.Said || mast.LongTerm < 0.08 || mast.LongTerm >= said.LongTerm || less >= sigma {
		t.Errorf("a mast: %+v, sigma %v", mast, less)
	}
	// Measured at hub height nothing is carried up; from 10 m it is the greatest part.
	at := func(m string) float64 {
		d, _ := of("wind.typed_height_m", m)
		for _, p := range d.Parts {
			if p.Title == "from its height to the hub" {
				return p.Energy / d.Sensitivity
			}
		}
		t.Fatal("no part for the height")
		return 0
	}
	hub := at("10") / math.Log(hubOf(t)/10)
	if got := at("40"); math.Abs(got-hub*math.Log(hubOf(t)/40)) > 1e-12 {
		t.Errorf("from 40 m %v, expected %v", got, hub*math.Log(hubOf(t)/40))
	}
}

// hubOf gives the hub height of the plain study's machine.
func hubOf(t *testing.T) float64 {
	snap, err := windYield(t).s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	m, ok := snap.Number("plant.wind.hub_height_m")
	if !ok {
		t.Fatal("no hub height")
	}
	return m
}

// The rose holds the whole year, and the energy comes from where the wind does.
func TestRose(t *testing.T) {
	p := windStudy(t)
	p.set("plant.wind.rated_kw", "2000", "plant.wind.fit_machines", "2", "wind.typed_mean_speed_m_per_s", "7", "wind.typed_height_m", "100")
	look := func() *WindRose {
		c := p.computed(nil)
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		course, err := NewSurveyor(snap, shipped(t), StoreLoader(p.s.Store()), nil).Course(t.Context(), c)
		if err != nil || course.Rose == nil || len(course.Rose.Sectors) != 12 {
			t.Fatalf("%+v, %v", course, err)
		}
		time, energy := 0.0, 0.0
		for _, s := range course.Rose.Sectors {
			time += s.Time
			energy += s.Energy
		}
		if math.Abs(time-1) > 1e-9 || math.Abs(energy-1) > 1e-9 {
			t.Errorf("all sectors hold %v of the time and %v of the energy", time, energy)
		}
		return course.Rose
	}
	even := look()
	if s := even.Sectors[3]; !even.Even || math.Abs(s.Time-1.0/12) > 1e-9 || math.Abs(s.SpeedMPerS-7) > 1e-9 {
		t.Errorf("an even spread at hub height of the data: %+v", s)
	}
	var rows []thing
	for i := range 12 {
		v := map[string]string{"height": "100", "weibull_a": "6", "weibull_k": "2", "sector_from": fmt.Sprint(30 * i), "sector_share": "0.05"}
		if i == 8 { // from 240 degrees
			v["weibull_a"], v["sector_share"] = "10", "0.45"
		}
		rows = append(rows, thing{dot(0, 0), v})
	}
	p.add("wind_resource", []string{"height", "weibull_a", "weibull_k", "sector_from", "sector_share"}, rows...)
	west := look()
	if s := west.Sectors[8]; west.Even || s.Time != 0.45 || s.Energy < 0.6 || s.SpeedMPerS < 8.8 || s.SpeedMPerS > 8.9 {
		t.Errorf("nearly half of the time from the south-west: %+v", s)
	}
	if n, o := west.Sectors[7].Energy, west.Sectors[9].Energy; math.Abs(n/o-1) > 0.15 {
		t.Errorf("beside it %v and %v of the energy", n, o)
	}
}
