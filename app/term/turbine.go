package term

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/study"
)

var verbTurbine = verb{
	name: "turbine", usage: "turbine STUDY.gpkg [FILE --id NAME --rated-kw N --rotor-m N [options] | --remove NAME]", summary: "power curves: lists them, adds one of your own, takes one out", places: [2]int{1, 2},
	more: `Without FILE: the machines that ship with the program and the study's own. FILE is a table (CSV or workbook) with a
wind speed, a power and, if it is known, a thrust coefficient in each row. Heads such as "v [m/s]", "P (kW)" and "Ct" are
understood in several languages; what they leave open is asked, above all the unit of the power and the density
of the air. A plant option takes the curve with: gtally set STUDY.gpkg plant.ID.turbine NAME
Exit 1: the file cannot serve as a power curve.`,
	options: []option{
		{name: "id", value: "NAME", help: "its name in settings: letters, digits, _ and -"},
		{name: "rated-kw", value: "N", help: "rated power in kW"},
		{name: "rotor-m", value: "N", help: "diameter of the rotor in metres"},
		{name: "title", value: "TEXT", help: "what people call it"},
		{name: "power-unit", value: "kW|W|MW", help: "unit of the power, where the head of its column says none"},
		{name: "density", value: "N", help: "air density in kg/m³ that the curve stands for; the standard is 1.225"},
		{name: "stall", help: "it is controlled by stall, so its power follows the air density; without it: by pitch"},
		{name: "cut-in", value: "N", help: "wind speed in m/s; without it the first one with power"},
		{name: "cut-out", value: "N", help: "wind speed in m/s; without it the last one with power"},
		{name: "speed", value: "COLUMN", help: "the column of the wind speed"},
		{name: "power", value: "COLUMN", help: "the column of the power"},
		{name: "thrust", value: "COLUMN", help: "the column of the thrust coefficient; none leaves it out"},
		{name: "table", value: "NAME", help: "which sheet or table of the file"},
		{name: "source", value: "TEXT", help: "edition of the curve, or who told it; the file's name is kept besides"},
		{name: "replace", help: "put the curve in the place of the study's own one of this name"},
		{name: "remove", value: "NAME", help: "take this one of the study's own out"},
		reasonOption,
	},
	run: func(c *call) (int, error) {
		given := ""
		for _, o := range c.verb.options {
			if given == "" && o.name != "remove" && o.name != "reason" && c.args.has(o.name) {
				given = o.name
			}
		}
		switch file := len(c.args.places) == 2; {
		case c.args.has("remove") && (file || given != ""):
			return 0, usagef("--remove takes a turbine out and cannot stand beside a file or --%s", orText(given, "id"))
		case c.args.has("remove"):
			return c.removeTurbine(c.args.get("remove"))
		case file:
			return c.addTurbine(c.args.places[1])
		case given != "" || c.args.has("reason"):
			return 0, usagef("usage: gtally %s", c.verb.usage)
		}
		return c.listTurbines()
	},
}

func orText(text, other string) string {
	if text == "" {
		return other
	}
	return text
}

// positive reads an option that is a number above zero; without the option it gives 0.
func (c *call) positive(name string) (float64, error) {
	if !c.args.has(name) {
		return 0, nil
	}
	x, err := strconv.ParseFloat(strings.TrimSpace(c.args.get(name)), 64)
	if err != nil || !(x > 0) || math.IsInf(x, 0) {
		return 0, usagef("--%s wants a number above zero, not %q", name, c.args.get(name))
	}
	return x, nil
}

func (c *call) addTurbine(file string) (int, error) {
	t := study.OwnTurbine{ID: c.args.get("id"), Title: c.args.get("title"), Stall: c.args.has("stall")}
	for _, n := range []struct {
		option string
		to     *float64
	}{{"rated-kw", &t.RatedKW}, {"rotor-m", &t.RotorDiameterM}, {"density", &t.AirKgPerM3}, {"cut-in", &t.CutInMPerS}, {"cut-out", &t.CutOutMPerS}} {
		var err error
		if *n.to, err = c.positive(n.option); err != nil {
			return 0, err
		}
	}
	return c.with(func(s *study.Study) (int, error) {
		in, err := c.ReadFile(c.ctx, file, study.ReadOptions{CRSGiven: true, Table: c.args.get("table")})
		if err != nil {
			return 0, err
		}
		if in.Layer == nil {
			return 0, &study.FileError{File: file, What: "it is no table", Cure: "Give a CSV or a workbook with a wind speed and a power in each row"}
		}
		var qs []study.Question
		if t.ID == "" {
			qs = append(qs, study.Question{Text: "by which name shall settings call the turbine?", Option: "--id NAME"})
		}
		if t.RatedKW == 0 {
			qs = append(qs, study.Question{Text: "what is its rated power in kW?", Option: "--rated-kw NUMBER"})
		}
		if t.RotorDiameterM == 0 {
			qs = append(qs, study.Question{Text: "what is the diameter of its rotor in metres?", Option: "--rotor-m NUMBER"})
		}
		curve, err := study.ReadCurve(in, study.CurveOptions{Speed: c.args.get("speed"), Power: c.args.get("power"), Thrust: c.args.get("thrust"), PowerUnit: powerUnit(c.args.get("power-unit"))})
		var open *study.QuestionError
		switch {
		case errors.As(err, &open):
			qs = append(qs, open.Questions...)
		case err != nil:
			return 0, err
		}
		if t.AirKgPerM3 == 0 {
			t.AirKgPerM3 = curve.AirKgPerM3
		}
		if t.AirKgPerM3 == 0 {
			qs = append(qs, study.Question{Text: "for which air density does the curve stand, in kg/m³? Most sheets give the standard one, and some give several curves.", Option: fmt.Sprintf("--density %g", study.StandardAirKgPerM3)})
		}
		snap, err := s.Snapshot()
		if err != nil {
			return 0, err
		}
		if _, own := snap.Turbine(t.ID); own && !c.args.has("replace") {
			qs = append(qs, study.Question{Text: fmt.Sprintf("the study has a turbine %q of its own already; shall the curve stand in its place?", t.ID), Option: "--replace, or --id with another name"})
		} else if !own && c.args.has("replace") && t.ID != "" {
			return 0, usagef("--replace: the study has no turbine %q of its own", t.ID)
		}
		if len(qs) > 0 {
			return 0, &study.QuestionError{File: file, Questions: qs}
		}
		t.Points = curve.Points
		t.Source = in.Base
		if in.Table != "" {
			t.Source += ", " + in.Table
		}
		if told := strings.TrimSpace(c.args.get("source")); told != "" {
			t.Source = told + " (" + t.Source + ")"
		}
		err = s.PutTurbine(c.ctx, t, c.args.get("reason"))
		var bad *study.TurbineError
		switch {
		case errors.As(err, &bad) && bad.Curve:
			where := ""
			if bad.Point > 0 {
				where = study.CurveRow(curve.Rows[bad.Point-1])
			}
			return 0, &study.FileError{File: file, Where: where, What: bad.What, Cure: bad.Cure}
		case errors.As(err, &bad):
			return 0, &inputError{err}
		case err != nil:
			return 0, err
		}
		if snap, err = s.Snapshot(); err != nil {
			return 0, err
		}
		t, _ = snap.Turbine(t.ID)
		notices := t.Notices()
		c.answer(map[string]any{"study": c.args.places[0], "turbine": ownTurbineJSON(t, snap), "notices": c.noticeList(notices)}, "%s: %s from %s to %s m/s; %s kW, rotor %s m, air density %s kg/m³.",
			t.ID, counted(len(t.Points), "speed"), figure(t.Points[0].SpeedMPerS), figure(t.Points[len(t.Points)-1].SpeedMPerS), figure(t.RatedKW), figure(t.RotorDiameterM), figure(t.AirKgPerM3))
		c.say("  wind speed is column %s in %s", curve.Speed, curve.SpeedUnit)
		c.say("  power is column %s in %s", curve.Power, curve.PowerUnit)
		if curve.Thrust != "" {
			c.say("  thrust coefficient is column %s", curve.Thrust)
		}
		c.notices(notices)
		return ExitDone, nil
	})
}

// powerUnit lets the case of a unit be written as one likes; no two of them differ by it.
func powerUnit(text string) string {
	for _, u := range study.PowerUnits() {
		if strings.EqualFold(u, text) {
			return u
		}
	}
	return text
}

func (c *call) removeTurbine(id string) (int, error) {
	return c.with(func(s *study.Study) (int, error) {
		err := s.RemoveTurbine(c.ctx, id, c.args.get("reason"))
		var bad *study.TurbineError
		if errors.As(err, &bad) {
			err = &inputError{err}
		}
		if err != nil {
			return 0, err
		}
		c.done("Took out the turbine " + id + "; gtally undo brings it back.")
		return ExitDone, nil
	})
}

func ownTurbineJSON(t study.OwnTurbine, snap *study.Snapshot) map[string]any {
	m := turbineJSON(t.ID, t.Called(), t.RatedKW, t.RotorDiameterM, t.HasCt(), t.Source, snap)
	m["shipped"], m["cut_in_m_per_s"], m["cut_out_m_per_s"], m["stall"], m["air_kg_per_m3"], m["reason"], m["points"] = false, t.CutInMPerS, t.CutOutMPerS, t.Stall, t.AirKgPerM3, t.Reason, t.Points
	return m
}

func turbineJSON(id, title string, ratedKW, rotorM float64, thrust bool, source string, snap *study.Snapshot) map[string]any {
	users := snap.TurbineUsers(id)
	if users == nil {
		users = []string{}
	}
	return map[string]any{"id": id, "title": title, "rated_kw": ratedKW, "rotor_diameter_m": rotorM, "thrust": thrust, "source": source, "shipped": true, "plants": users}
}

func (c *call) listTurbines() (int, error) {
	return c.with(func(s *study.Study) (int, error) {
		snap, err := s.Snapshot()
		if err != nil {
			return 0, err
		}
		list := []map[string]any{}
		for _, t := range snap.Turbines() {
			list = append(list, ownTurbineJSON(t, snap))
		}
		own := len(list)
		for _, t := range c.Params.Turbines {
			m := turbineJSON(t.ID, t.Name, t.RatedKW, t.RotorDiameterM, t.Curve.HasCt(), t.Source, snap)
			m["cut_in_m_per_s"], m["cut_out_m_per_s"], m["stall"], m["air_kg_per_m3"] = t.CutInMPerS, t.CutOutMPerS, t.Stall, study.StandardAirKgPerM3
			list = append(list, m)
		}
		notices := snap.TurbineNotices()
		if c.json {
			c.printJSON(map[string]any{"study": c.args.places[0], "turbines": list, "notices": c.noticeList(notices)})
			return ExitDone, nil
		}
		rows := [][]string{{"turbine", "title", "rated", "rotor", "thrust", "from", "plant options", "source"}, {"", "", "kW", "m", "", "", "", ""}}
		for _, m := range list {
			thrust, from := "estimated", "the study"
			if m["thrust"] == true {
				thrust = "published"
			}
			if m["shipped"] == true {
				from = "the program"
			}
			rows = append(rows, []string{fmt.Sprint(m["id"]), fmt.Sprint(m["title"]), figure(m["rated_kw"].(float64)), figure(m["rotor_diameter_m"].(float64)), thrust, from,
				strings.Join(m["plants"].([]string), ", "), fmt.Sprint(m["source"])})
		}
		columns(c.out, rows, map[int]bool{2: true, 3: true})
		c.say("%s with the program, %d of the study's own. Curves of the program stand for an air density of %g kg/m³.", counted(len(list)-own, "turbine"), own, study.StandardAirKgPerM3)
		for _, n := range notices {
			c.say("notice: %s", present.Notice(n))
		}
		return ExitDone, nil
	})
}
