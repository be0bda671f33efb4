package plant

import (
	"errors"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// rules shows the rules that bear on the chosen option.
type rules struct {
	s    *stage
	body *container.Scroll
	box  *fyne.Container
	rows map[string]*row    // by the key that a change is written under
	adds map[string]*adding // by the name of the part
	more *choiceField       // roles that may be excluded too

	others  []string // behind the options of more
	exclude *fyne.Container
	except  *exception
	laid    string // what the rows were laid out for
}

func newRules(s *stage) *rules {
	r := &rules{s: s, box: container.NewVBox(), rows: map[string]*row{}, adds: map[string]*adding{}}
	r.more = newChoiceField(nil, nil, s.reached)
	r.more.PlaceHolder = "Exclude ground of another kind"
	r.except = newException(s)
	r.exclude = widgets.Fields(8, []float32{0, 96}, r.more, widget.NewButton("Exclude", r.addExclusion))
	r.body = container.NewVScroll(container.New(insets{2, 6, 16, 8}, r.box))
	return r
}

// update lays the rules out anew when there are others, and brings their values up to date.
func (r *rules) update() {
	s := r.s
	if s.id == "" {
		r.laid, r.box.Objects = "", []fyne.CanvasObject{widgets.Faint("No option is chosen.")}
		r.body.Refresh()
		return
	}
	snap := s.core.View().Snap
	technology := snap.Text("plant." + s.id + ".technology")
	var objects []fyne.CanvasObject
	var keys []string
	moved := false
	add := func(o fyne.CanvasObject) { objects = append(objects, o) }
	put := func(key, label, take string, choices []choice, held inForce) *row {
		x := r.rows[key]
		if x == nil {
			x = newRow(s, key, label, take, choices)
			r.rows[key] = x
		}
		keys = append(keys, key)
		add(x.all)
		moved = x.update(held) || moved
		return x
	}
	for _, p := range partsOf(s.id, technology) {
		head := ""
		if p.words != "" {
			head = p.words + ": "
		}
		add(widgets.Part(present.Upper(head + "distances kept")))
		tip, rotor := reach(snap, s.id, p)
		for _, d := range distances(snap, p) {
			x := r.rows[d.prefix+p.names[0]+d.suffix]
			if x == nil {
				x = newRow(s, d.prefix+p.names[0]+d.suffix, d.label, "Take out", nil)
				r.rows[x.key] = x
			}
			x.more = inMetres(d, tip, rotor)
			put(x.key, d.label, "Take out", nil, d.held)
			warning := ""
			if number, ok := d.held.value.Number(); ok && number > 0 && d.role != boundary && len(snap.LayersOf(d.role)) == 0 {
				warning = "no layer of this in the study: the distance takes no land yet"
			}
			moved = x.warn(warning) || moved
		}
		if r.adds[p.names[0]] == nil {
			r.adds[p.names[0]] = newAdding(s, p)
		}
		add(r.adds[p.names[0]].all)
		add(widgets.Part(present.Upper(head + "slope and shape")))
		for _, d := range shapes(snap, p) {
			put(d.prefix+p.names[0]+d.suffix, d.label, "Take out", nil, d.held)
		}
		if p.wind {
			key := "rule.measured_to." + p.names[0]
			put(key, "Distances end at", "Use default", []choice{{"mast", "the mast"}, {"blade tip", "the tip of a blade"}}, cascade(snap, "rule.measured_to.", p, ""))
		}
	}
	r.common(snap, add, func(key, label string, choices []choice) {
		held, byUser, ok := snap.Lookup(key)
		put(key, label, "Take out", choices, inForce{key, held, byUser, ok})
	})
	add(widgets.Part("Excluded ground, for every option"))
	yesno := []choice{{"true", "taken out"}, {"false", "may be built on"}}
	var others, titles []string
	for _, role := range snap.Catalog().Roles {
		key := "rule.exclude." + role.Name
		if !role.Accepts("polygon") || role.Name == "parcels" || role.Name == "district" {
			continue
		}
		held, byUser, ok := snap.Lookup(key)
		if !byUser && !snap.Yes(key) {
			others, titles = append(others, role.Name), append(titles, role.Title)
			continue
		}
		x := put(key, role.Title, "Use default", yesno, inForce{key, held, byUser, ok})
		warning := ""
		if snap.Yes(key) && len(snap.LayersOf(role.Name)) == 0 && byUser {
			warning = "no layer of this in the study: nothing is taken out yet"
		}
		moved = x.warn(warning) || moved
		if class, own, in := snap.Lookup(key + ".class"); in {
			put(key+".class", role.Title+", classes", "Take out", nil, inForce{key + ".class", class, own, in})
		}
	}
	if !slices.Equal(r.more.Options, titles) {
		r.more.SetOptions(titles)
	}
	r.others = others
	add(r.exclude)
	if hasWind(technology) {
		add(space(4))
		add(widgets.Part("Limits by law, for every option"))
		for _, key := range legalLimits(snap.Catalog()) {
			held, byUser, ok := snap.Lookup(key)
			put(key, limitTitle(key), "Take out", nil, inForce{key, held, byUser, ok})
		}
	}
	add(space(4))
	add(flush(caption(caution)))
	if now := s.id + "\n" + strings.Join(keys, "\n"); now != r.laid {
		if !strings.HasPrefix(r.laid, s.id+"\n") {
			r.body.ScrollToTop()
		}
		r.laid, r.box.Objects, moved = now, objects, true
	}
	if moved {
		r.body.Refresh()
	}
}

// common shows what holds for every option: where distances from dwellings begin, how true positions are,
// and the user's exceptions.
func (r *rules) common(snap *study.Snapshot, add func(fyne.CanvasObject), put func(key, label string, choices []choice)) {
	add(widgets.Part("Distances and places, for every option"))
	put("rule.measured_from.dwellings", "From dwellings", []choice{{"facade", "at their outline"}, {"centroid", "at their centre"}, {"plot", "at their parcel's edge"}})
	for _, role := range snap.Catalog().Roles {
		if key := "layer.tolerance." + role.Name + "_m"; len(snap.LayersOf(role.Name)) > 0 && (role.Accepts("point") || role.Accepts("line") || role.Accepts("polygon")) && role.Name != "district" && role.Name != "place_names" {
			put(key, role.Title+" lie within", nil)
		}
	}
	var excepted []string
	for key := range snap.Explicit {
		if strings.HasPrefix(key, study.ExceptPrefix) {
			excepted = append(excepted, key)
		}
	}
	slices.Sort(excepted)
	offered := r.except.offer()
	if len(excepted) == 0 && !offered {
		return
	}
	add(widgets.Part("Your exceptions"))
	if offered {
		add(r.except.all)
	}
	for _, key := range excepted {
		name, site, _ := strings.Cut(strings.TrimPrefix(key, study.ExceptPrefix), ".")
		put(key, site+": "+present.Rule(name), []choice{{"true", "does not hold"}, {"false", "holds"}})
	}
}

// exception is the form by which the user lets a rule not hold on the chosen site.
type exception struct {
	s     *stage
	site  string
	names []string // of the rules, behind the options of pick
	pick  *choiceField
	why   *field
	all   *fyne.Container
}

func newException(s *stage) *exception {
	x := &exception{s: s, pick: newChoiceField(nil, nil, s.reached), why: newField("why (needed; it goes into the appendix)", s.reached)}
	x.why.OnSubmitted = func(string) { x.commit() }
	x.all = container.NewVBox(x.pick, widgets.Fields(6, []float32{0, 96}, x.why, widget.NewButton("Except", x.commit)))
	return x
}

// offer fills in the rules that take land of the chosen site; it gives false when there is none.
func (x *exception) offer() bool {
	x.site, x.names = "", nil
	var titles []string
	for _, c := range x.s.core.Chosen() {
		if c == nil {
			continue
		}
		x.site = c.Site
		for _, t := range c.Taken {
			x.names = append(x.names, t.Rule)
			titles = append(titles, present.Rule(t.Rule))
		}
		break
	}
	x.pick.PlaceHolder = "A rule that shall not hold on " + x.site
	if !slices.Equal(x.pick.Options, titles) {
		x.pick.ClearSelected()
		x.pick.SetOptions(titles)
	}
	return len(x.names) > 0
}

func (x *exception) commit() {
	i, why := x.pick.SelectedIndex(), strings.TrimSpace(x.why.Text)
	switch {
	case i < 0 || i >= len(x.names):
		x.s.core.Tell("Choose the rule that shall not hold on " + x.site + ".")
		return
	case why == "":
		x.s.core.Tell("An exception needs a reason; everyone who reads the appendix will see it.")
		return
	}
	x.s.core.Set("except a rule", why, study.SettingEdit{Key: study.ExceptPrefix + x.names[i] + "." + x.site, Value: "true", Source: "user", Reason: why})
	x.pick.ClearSelected()
	x.why.SetText("")
}

// addExclusion takes ground of one more kind out, for every option.
func (r *rules) addExclusion() {
	if i := r.more.SelectedIndex(); i >= 0 && i < len(r.others) {
		title := r.more.Selected
		r.more.ClearSelected()
		r.s.core.Set("exclude ground", "excluded "+title, study.SettingEdit{Key: "rule.exclude." + r.others[i], Value: "true"})
	}
}

func limitTitle(key string) string {
	switch key {
	case "limit.noise_night_dba":
		return "Noise at dwellings by night"
	case "limit.noise_day_dba":
		return "Noise at dwellings by day"
	case "limit.flicker_h_per_yr":
		return "Shadow flicker at dwellings"
	}
	return strings.ReplaceAll(strings.TrimPrefix(key, "limit."), "_", " ")
}

// reach gives tip height and rotor diameter of the machines of a part; zero without any.
func reach(snap *study.Snapshot, id string, p part) (tipM, rotorM float64) {
	hub, okHub := snap.Number("plant." + id + ".hub_height_m")
	rotor, okRotor := snap.Number("plant." + id + ".rotor_diameter_m")
	if !p.wind || !okHub || !okRotor {
		return 0, 0
	}
	return hub + rotor/2, rotor
}

// inMetres says what a distance in heights or diameters is in metres.
func inMetres(d rule, tipM, rotorM float64) string {
	by := map[string]float64{"_tip": tipM, "_rotor": rotorM}[d.suffix]
	x, ok := d.held.value.Number()
	if !ok || by == 0 {
		return ""
	}
	m := x * by
	return "Here that is " + present.Figure(m, m, m) + " m."
}

// adding is the form for one more distance of a part.
type adding struct {
	s           *stage
	part        part
	roles       []string
	role, unit  *choiceField
	only        *field // which features: all, a class, from a voltage
	number      *field
	source, why *field
	fault       *widget.Label
	all         *fyne.Container
}

func newAdding(s *stage, p part) *adding {
	a := &adding{s: s, part: p, roles: distanceRoles(s.core.Parts.Catalog), only: newField("all; a class; 110 kV", s.reached), number: newField("number", s.reached), source: newField("source", s.reached), why: newField("why", s.reached), fault: caption("")}
	titles := make([]string, len(a.roles))
	for i, role := range a.roles {
		titles[i] = roleTitle(s.core.Parts.Catalog, role)
	}
	a.role = newChoiceField(titles, nil, s.reached)
	a.role.PlaceHolder = "Keep a distance from"
	var units []string
	for _, u := range distanceUnits {
		if p.wind || u.suffix == "_m" { // panels have neither tip nor rotor
			units = append(units, u.words)
		}
	}
	a.unit = newChoiceField(units, nil, s.reached)
	a.unit.SetSelectedIndex(0)
	a.fault.Importance = widget.WarningImportance
	a.fault.Hide()
	for _, e := range []*field{a.only, a.number, a.source, a.why} {
		e.OnSubmitted = func(string) { a.commit() }
	}
	a.all = container.NewVBox(
		widgets.Fields(6, []float32{0, 150}, a.role, a.only),
		widgets.Fields(6, []float32{0, 76, 126}, a.source, a.number, a.unit),
		widgets.Fields(6, []float32{0, 96}, a.why, widget.NewButton("Add", a.commit)),
		a.fault, space(8))
	return a
}

// commit adds the distance as one edit, or says in the form why it cannot be.
func (a *adding) commit() {
	refuse := func(err error) {
		a.fault.SetText(refusal(err))
		a.fault.Show()
		a.s.grown()
	}
	i, j := a.role.SelectedIndex(), a.unit.SelectedIndex()
	text := strings.ReplaceAll(strings.TrimSpace(a.number.Text), ",", ".")
	switch {
	case i < 0:
		refuse(errors.New("say what the distance is kept from"))
		return
	case text == "" || text == study.NotSetText:
		refuse(errors.New("give the distance as a number"))
		return
	}
	only, err := special(a.only.Text)
	if err != nil {
		refuse(err)
		return
	}
	key := "rule.setback." + a.roles[i] + "." + only + a.part.names[0] + distanceUnits[max(j, 0)].suffix
	if err := run.CheckSetting(a.s.core.Parts.Catalog, a.s.core.Parts.Params, key, text); err != nil {
		refuse(err)
		return
	}
	why := strings.TrimSpace(a.why.Text)
	a.s.core.Set("add the distance", why, study.SettingEdit{Key: key, Value: text, Source: strings.TrimSpace(a.source.Text), Reason: why})
	a.fault.Hide()
	a.role.ClearSelected()
	a.only.SetText("")
	a.number.SetText("")
	a.source.SetText("")
	a.why.SetText("")
}

// fitted shows how the option was fitted for the chosen candidate.
type fitted struct {
	s           *stage
	body        *container.Scroll
	box         *fyne.Container
	title       *widgets.Line
	words       *widget.Label
	lines       *fyne.Container
	lossHead    *widgets.Line
	loss, taken *chartview.Picture
	takenHead   *widgets.Line
	monthHead   *widgets.Line
	monthWords  *widgets.Line
	month, hour *chartview.Picture
	turbines    *turbines
	crowding    *crowding
	mover       *mover
	sky         *widget.Label
	months      *run.Candidate // whose months are shown or asked for
}

func newFitted(s *stage) *fitted {
	f := &fitted{s: s, title: widgets.Part(""), words: widgets.NewText(""), lines: container.NewVBox(), lossHead: widgets.Part("What is lost on the way"), takenHead: widgets.Part("What the rules take of the site"),
		monthHead: widgets.Part("Energy at the plant by month"), monthWords: widgets.Faint("")}
	background := func(do func()) { s.background(do) }
	grew := func() { f.body.Refresh() }
	f.loss, f.taken = chartview.New(s.core, background, grew), chartview.New(s.core, background, grew)
	f.month, f.hour = chartview.New(s.core, background, grew), chartview.New(s.core, background, grew)
	f.sky = widgets.NewText("")
	f.mover, f.turbines, f.crowding = newMover(s), newTurbines(f), newCrowding(f)
	f.box = container.NewVBox(f.title, flush(f.words), f.mover.all, f.lines, f.turbines.words, space(6), f.takenHead, f.taken, space(6), f.lossHead, f.loss, space(6), f.monthHead, f.monthWords, f.month, f.hour, f.turbines.all, flush(f.sky), space(6), f.crowding.all, space(6), flush(caption(caution)))
	f.body = container.NewVScroll(container.New(insets{2, 6, 16, 8}, f.box))
	return f
}

// candidate finds the candidate that is shown: the chosen one with this option, else the one of the first
// chosen site.
func (f *fitted) candidate() *run.Candidate {
	chosen := f.s.core.Chosen()
	for _, c := range chosen {
		if c.Plant == f.s.id {
			return c
		}
	}
	v := f.s.core.View()
	if len(chosen) == 0 || v.Index == nil {
		return nil
	}
	if site, ok := v.Index.Site(chosen[0].Site); ok {
		for _, i := range v.Index.Candidates[site] {
			if v.Results.Candidates[i].Plant == f.s.id {
				return &v.Results.Candidates[i]
			}
		}
	}
	return nil
}

func (f *fitted) update() {
	s := f.s
	c := f.candidate()
	f.lines.Objects = nil
	visible(f.takenHead, c != nil)
	visible(f.taken, c != nil)
	visible(f.lossHead, c != nil && len(c.Chain) > 0)
	visible(f.loss, c != nil && len(c.Chain) > 0)
	withPlant := c != nil && c.Status == run.Fitted
	visible(f.monthHead, withPlant)
	visible(f.monthWords, withPlant)
	visible(f.month, withPlant)
	visible(f.hour, withPlant)
	f.mover.update(c)
	f.turbines.update(c)
	f.crowding.update(c)
	if c == nil {
		f.title.Set("No candidate of this option is chosen")
		f.words.SetText("Choose a site on the map or in the table of Accounts, then come back.")
		f.loss.Set(nil)
		f.taken.Set(nil)
		f.body.Refresh()
		return
	}
	f.title.Set(s.core.CandidateTitle(c))
	text := present.Upper(present.Named(c.Status))
	if c.Reason != "" {
		text += ": " + present.Reason(c.Reason)
	}
	if c.Fit != nil {
		text += "; " + present.Named(c.Fit.Mode)
	}
	if !s.core.View().Current {
		text += " (of the state before; being computed)"
	}
	f.words.SetText(text + ".")
	f.fill(c)
	f.taken.Set(landOf(c))
	f.loss.Set(lossOf(c))
	f.askMonths(c)
	f.body.Refresh()
}

// askMonths finds the months of a candidate, once, off the window's goroutine.
func (f *fitted) askMonths(c *run.Candidate) {
	if f.months == c {
		return
	}
	f.months = c
	f.month.Set(nil)
	f.hour.Set(nil)
	f.turbines.course(c, nil)
	visible(f.sky, false)
	f.monthWords.Set("")
	if c.Status != run.Fitted {
		return
	}
	f.s.core.Session.Course(c, func(course *run.Course, err error) {
		f.s.core.Do(func() {
			switch {
			case f.months != c:
				return
			case err != nil:
				f.monthWords.Set(present.Problem(err))
				return
			}
			do, why := monthsOf(c, course)
			if why != "" {
				f.monthWords.Set("Unknown: " + why + ".")
			} else {
				f.monthWords.Set("Of the year that the yield rests on; before the bias of forecasts and the losses of the connection.")
			}
			if course.Rose != nil && why != "" {
				do = nil // the wind's months are all unknown, and its directions say more
			}
			f.month.Set(do)
			f.hour.Set(hoursOf(c, course))
			f.turbines.course(c, course)
			f.sky.SetText(strings.TrimSpace(pictures.SkySpread(course.Sky) + "\n\n" + pictures.Spread(course.Doubt) + pictures.WindSpread(course.Wind) + "\n\n" + pictures.Together(c.Connection)))
			visible(f.sky, f.sky.Text != "")
			f.body.Refresh()
		})
	})
}

func (f *fitted) fill(c *run.Candidate) {
	line := func(label, value string) {
		l := widgets.NewLine(value)
		l.Align = fyne.TextAlignTrailing
		f.lines.Add(widgets.Fields(8, []float32{0, 170}, widgets.NewLine(label), l))
	}
	figure := func(label string, x float64, unit string) {
		if x != 0 {
			line(label, strings.TrimSpace(present.Figure(x, x, x)+" "+unit))
		}
	}
	if c.Fit != nil {
		if n := len(c.Fit.Turbines); n > 0 {
			line("Machines", strconv.Itoa(n))
		}
		figure("Power of the machines", c.Fit.WindKW, "kW")
		figure("Power of the panels, direct current", c.Fit.SolarKW, "kW")
		figure("Power at the terminals", c.Fit.ACKW, "kW")
		figure("Ground inside the fence", c.Fit.FencedHa, "ha")
		if n := c.Fit.Modules; n > 0 {
			line("Modules", strconv.Itoa(n))
			figure("Distance between rows, horizontally", c.Fit.RowPitchM, "m")
			figure("Tilt of the panels", c.Fit.TiltDeg, "degrees")
			line("Panels on the fenced ground", present.Density(c.Fit.SolarKW, c.Fit.FencedHa))
			if words := present.PublishedDensity(c.Technology); words != "" {
				f.lines.Add(widgets.Faint(words))
			}
		}
		figure("Ground inside the spacing", c.Fit.SpacingHa, "ha")
		figure(map[bool]string{true: "New track", false: "New track, by rule of thumb"}[c.Fit.TracksLaid], c.Fit.TrackKm, "km")
	}
	if m := c.Miss; m != nil {
		line("Buildable", present.Figure(m.BuildableHa, m.BuildableHa, m.BuildableHa)+" ha")
		line("Largest patch", present.Figure(m.LargestPatchHa, m.LargestPatchHa, m.LargestPatchHa)+" ha")
		figure("Smallest patch that counts", m.NeedsPatchHa, "ha")
		if m.LargestTaker != "" {
			figure("Taken most by "+present.Rule(m.LargestTaker), m.TakesHa, "ha")
		}
	}
	for _, rule := range c.Incomplete {
		if strings.Contains(rule, ":") {
			f.lines.Add(widgets.Warm("incomplete: " + present.Rule(rule) + " is not set, or its layer is missing"))
		} else {
			f.lines.Add(widgets.Warm("incomplete: " + strings.ToLower(limitTitle(rule)) + ", limit not set"))
		}
	}
}
