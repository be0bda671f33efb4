package term

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// layoutOptions are the ways to place turbines by hand; one of them is taken at a time.
var layoutOptions = []option{
	{name: "turbines", value: "LON,LAT ...", help: "of a site: where all turbines of the plant option stand, in degrees"},
	{name: "add", value: "LON,LAT", many: true, help: "of a site: one turbine more"},
	{name: "move", value: "N=LON,LAT", many: true, help: "of a site: turbine N (from 1) stands there"},
	{name: "take", value: "N", many: true, help: "of a site: turbine N (from 1) is taken out"},
	{name: "own", help: "of a site: the program's own layout holds again"},
}

// layoutWay gives the one option of these that is given; empty without one.
func (c *call) layoutWay() (string, error) {
	way := ""
	for _, o := range layoutOptions {
		switch {
		case !c.args.has(o.name):
		case way != "":
			return "", usagef("--%s and --%s exclude each other: one change at a time", way, o.name)
		default:
			way = o.name
		}
	}
	for _, o := range []string{"shape", "set", "remove"} {
		if way != "" && c.args.has(o) {
			return "", usagef("--%s is for a feature of a layer, --%s for the turbines of a site", o, way)
		}
	}
	return way, nil
}

// placeTurbines changes where the turbines of a plant option stand on a site.
func (c *call) placeTurbines(way string) (int, error) {
	if len(c.args.places) < 3 || len(c.args.places) > 3 && way != "turbines" {
		return 0, usagef("usage: gtally %s", c.verb.usage)
	}
	h := study.HandLayout{Site: c.args.places[1], Plant: c.args.places[2], Reason: c.args.get("reason")}
	if way != "own" && strings.TrimSpace(h.Reason) == "" {
		return 0, usagef("a change by hand needs --reason TEXT; it goes into the appendix")
	}
	return c.with(func(s *study.Study) (int, error) {
		if way == "own" {
			if err := s.DropLayout(c.ctx, h.Site, h.Plant, h.Reason); err != nil {
				return 0, err
			}
			c.done(fmt.Sprintf("%s with %s: the program's own layout holds again; gtally undo brings back the one by hand.", h.Site, h.Plant))
			return ExitDone, nil
		}
		begun := false
		if way == "turbines" {
			for _, word := range append(strings.Fields(c.args.get(way)), c.args.places[3:]...) {
				p, err := positionOf(way, word)
				if err != nil {
					return 0, err
				}
				h.At = append(h.At, p)
			}
		} else {
			changes, err := c.layoutChanges(way)
			if err != nil {
				return 0, err
			}
			snap, err := s.Snapshot()
			if err != nil {
				return 0, err
			}
			before, ok := snap.Layout(h.Site, h.Plant)
			if before.At = slices.Clone(before.At); !ok {
				begun = true
				if before.At, err = c.ownLayout(s, h.Site, h.Plant); err != nil {
					return 0, err
				}
			}
			if h.At, err = changed(before.At, way, changes); err != nil {
				return 0, err
			}
			if len(h.At) == 0 {
				return 0, usagef("that would take the last turbine out; for the program's own layout say --own")
			}
		}
		if err := s.PutLayout(c.ctx, h); err != nil {
			return 0, &inputError{err}
		}
		snap, err := s.Snapshot()
		if err != nil {
			return 0, err
		}
		h, _ = snap.Layout(h.Site, h.Plant)
		c.answer(map[string]any{"study": c.args.places[0], "layout": h, "begun_from_own": begun}, "%s with %s: %s placed by hand.", h.Site, h.Plant, counted(len(h.At), "turbine"))
		c.sayLayout(h)
		return ExitDone, nil
	})
}

// layoutChange is one change of a layout: a turbine by its number, 0 for a new one, and its new place.
type layoutChange struct {
	n  int
	at geo.LonLat
}

func (c *call) layoutChanges(way string) ([]layoutChange, error) {
	var out []layoutChange
	for _, text := range c.args.values[way] {
		var ch layoutChange
		var err error
		number, place, ok := text, text, true
		if way == "move" {
			number, place, ok = strings.Cut(text, "=")
		}
		if way != "add" {
			if ch.n, err = strconv.Atoi(strings.TrimSpace(number)); err != nil || ch.n < 1 || !ok {
				return nil, usagef("--%s wants %s with the turbine's number from 1, not %q", way, map[string]string{"move": "N=LON,LAT", "take": "N"}[way], text)
			}
			if slices.ContainsFunc(out, func(o layoutChange) bool { return o.n == ch.n }) {
				return nil, usagef("--%s names turbine %d twice", way, ch.n)
			}
		}
		if way != "take" {
			if ch.at, err = positionOf(way, place); err != nil {
				return nil, err
			}
		}
		out = append(out, ch)
	}
	return out, nil
}

// changed gives the layout after the changes. Numbers are those before all of them.
func changed(at []geo.LonLat, way string, changes []layoutChange) ([]geo.LonLat, error) {
	taken := map[int]bool{}
	for _, ch := range changes {
		switch {
		case way == "add":
			at = append(at, ch.at)
			continue
		case ch.n > len(at):
			return nil, usagef("--%s: there is no turbine %d; the layout has %d", way, ch.n, len(at))
		case way == "move":
			at[ch.n-1] = ch.at
		}
		taken[ch.n] = way == "take"
	}
	var out []geo.LonLat
	for i, p := range at {
		if !taken[i+1] {
			out = append(out, p)
		}
	}
	return out, nil
}

// ownLayout gives where the program itself places the turbines.
func (c *call) ownLayout(s *study.Study, site, plant string) ([]geo.LonLat, error) {
	c.note("No turbines are placed by hand there yet, so the change begins from the program's own layout. With --turbines all places are given at once, and nothing is computed.")
	r, err := c.compute(s)
	if err != nil {
		return nil, err
	}
	c.tell(r)
	if err := c.knownNames(r, site, plant); err != nil {
		return nil, err
	}
	cand, err := r.Find(site, plant)
	if err != nil {
		return nil, err
	}
	if cand.Status != run.Fitted || cand.Fit == nil || len(cand.Fit.Turbines) == 0 {
		why := present.Named(cand.Status)
		if cand.Status == run.Fitted {
			why = "the option has no turbines here"
		} else if cand.Reason != "" {
			why += ": " + present.Reason(cand.Reason)
		}
		return nil, usagef("%s with %s: the program places no turbines there (%s), so there is nothing to begin from. Place them with: gtally place STUDY.gpkg %s %s --turbines 'LON,LAT LON,LAT' --reason TEXT", site, plant, why, shellWord(site), shellWord(plant))
	}
	return slices.Clone(cand.Fit.Turbines), nil
}

// positionOf reads one position in degrees.
func positionOf(option, word string) (geo.LonLat, error) {
	a, b, ok := strings.Cut(word, ",")
	lon, errA := strconv.ParseFloat(strings.TrimSpace(a), 64)
	lat, errB := strconv.ParseFloat(strings.TrimSpace(b), 64)
	if !ok || errA != nil || errB != nil || math.IsNaN(lon+lat) || math.IsInf(lon+lat, 0) {
		return geo.LonLat{}, usagef("--%s: %q is no LON,LAT in degrees", option, word)
	}
	return geo.LonLat{Lon: lon, Lat: lat}, nil
}

// sayLayout lists a layout by the numbers that --move and --take mean.
func (c *call) sayLayout(h study.HandLayout) {
	for i, p := range h.At {
		c.say("  %3d  %.7f,%.7f", i+1, p.Lon, p.Lat)
	}
}

// listLayouts tells the layouts by hand: all, or that of one site and plant option.
func (c *call) listLayouts() (int, error) {
	return c.with(func(s *study.Study) (int, error) {
		snap, err := s.Snapshot()
		if err != nil {
			return 0, err
		}
		list := snap.Layouts()
		if len(c.args.places) == 3 {
			site, plant := c.args.places[1], c.args.places[2]
			h, ok := snap.Layout(site, plant)
			switch {
			case ok:
				list = []study.HandLayout{h}
			case hasLayer(snap, site) || !slices.Contains(snap.Plants(), plant):
				return 0, usagef("usage: gtally %s", c.verb.usage)
			default:
				list = nil
			}
		}
		if c.json {
			if list == nil {
				list = []study.HandLayout{}
			}
			c.printJSON(map[string]any{"study": c.args.places[0], "layouts": list})
			return ExitDone, nil
		}
		for _, h := range list {
			c.say("%s with %s: %s placed by hand (%s)", h.Site, h.Plant, counted(len(h.At), "turbine"), h.Reason)
			c.sayLayout(h)
		}
		if len(list) == 0 {
			c.say("No turbines are placed by hand; the program places them.")
		}
		return ExitDone, nil
	})
}
