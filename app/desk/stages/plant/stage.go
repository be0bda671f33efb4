package plant

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// The parts of the pane.
const (
	tabOptions = iota
	tabSizes
	tabRules
	tabFitted
	tabOut
)

// stage is the pane of the plant options.
type stage struct {
	core    *core.Core
	id      string // the chosen option; empty without any
	wanted  string // an option that is being made and shall be chosen
	ids     []string
	tallies map[string]tally
	of      *run.Results // of tallies
	counter *counter
	asked   counting
	who     map[string]string // by setting: who changed it last
	read    int               // journal entries that who knows
	stated  *study.Snapshot   // what unset was counted in
	unset   int               // legal values that are not set
	content fyne.CanvasObject
	syncing bool

	background func(func()) // runs what takes longer than the window's goroutine may

	option   *widget.Select
	tabs     *widgets.Tabs
	list     *widget.List
	none     *fyne.Container
	settings *settings
	rules    *rules
	fitted   *fitted
	out      *out
}

// New makes the stage.
func New(c *core.Core) core.Stage { return newStage(c) }

func newStage(c *core.Core) *stage {
	s := &stage{core: c, tallies: map[string]tally{}, who: map[string]string{}, background: func(f func()) { go f() }}
	s.counter = &counter{done: func(of counting, t map[string]tally) { c.Do(func() { s.counted(of, t) }) }}
	s.follow()
	return s
}

// Title implements core.Stage.
func (s *stage) Title() string { return "Plant" }

// State implements core.Stage.
func (s *stage) State() (first, second string, warn bool) {
	v := s.core.View()
	if v == nil {
		return "no study", "", false
	}
	n := len(v.Snap.Plants())
	first = core.Count(n) + " options"
	if n == 1 {
		first = "1 option"
	}
	if s.stated != v.Snap { // the rail asks at every change; most leave the settings as they are
		s.stated, s.unset = v.Snap, len(legalNotSet(v.Snap))
	}
	switch missing := s.unset; {
	case n == 0:
		return "no option yet", "make one", true
	case missing == 1:
		return first, "1 legal value not set", true
	case missing > 1:
		return first, strconv.Itoa(missing) + " legal values not set", true
	}
	switch own := ownRules(v.Snap); own {
	case 0:
		return first, "no own rule", false
	case 1:
		return first, "1 own rule", false
	default:
		return first, core.Count(own) + " own rules", false
	}
}

// Changed implements core.Stage.
func (s *stage) Changed(ch core.Change) {
	if ch&(core.StudyChanged|core.RankingChanged) != 0 {
		s.follow()
	}
	if s.content == nil {
		return
	}
	if ch&core.StudyChanged != 0 {
		s.show()
	}
	if ch&(core.SelectionChanged|core.LookChanged) != 0 && s.tabs.Chosen() == tabFitted {
		s.fitted.update()
	}
	if ch&core.LookChanged != 0 { // what is found once for a candidate has the colours of before, shown or not
		for _, p := range []*chartview.Picture{s.fitted.month, s.fitted.hour, s.fitted.turbines.curve, s.fitted.turbines.lee} {
			p.Repaint()
		}
	}
}

// follow takes over options and journal, and counts anew when results or order changed.
func (s *stage) follow() {
	v := s.core.View()
	if v == nil {
		return
	}
	s.ids = v.Snap.Plants()
	if slices.Contains(s.ids, s.wanted) {
		s.id, s.wanted = s.wanted, ""
	}
	if !slices.Contains(s.ids, s.id) {
		s.id = ""
		if len(s.ids) > 0 {
			s.id = s.ids[0]
		}
	}
	if len(v.Journal) < s.read {
		s.read, s.who = 0, map[string]string{}
	}
	for _, e := range v.Journal[s.read:] {
		for _, c := range e.Changes {
			if c.Kind == study.SettingRecord {
				s.who[c.Key] = e.Who
			}
		}
	}
	s.read = len(v.Journal)
	if now := (counting{v.Results, orderOf(s.core, v)}); v.Results != nil && now != s.asked {
		s.asked = now
		s.counter.ask(now)
	}
}

// orderOf gives the order shown, if it is one of the results.
func orderOf(c *core.Core, v *live.View) *live.Ranking {
	if r := c.Ranking(); r != nil && r.Index == v.Index {
		return r
	}
	return nil
}

func (s *stage) counted(of counting, t map[string]tally) {
	if v := s.core.View(); v == nil || v.Results != of.results {
		return
	}
	s.tallies, s.of = t, of.results
	if s.content != nil {
		s.list.Refresh()
	}
}

// Content implements core.Stage.
func (s *stage) Content() fyne.CanvasObject {
	s.settings, s.rules, s.fitted, s.out = newSettings(s), newRules(s), newFitted(s), newOut(s)
	s.option = widget.NewSelect(nil, func(string) {
		if i := s.option.SelectedIndex(); !s.syncing && i >= 0 && i < len(s.ids) {
			s.choose(s.ids[i])
		}
	})
	s.option.PlaceHolder = "No option yet"
	s.tabs = widgets.NewTabs(
		widgets.Tab{Text: "Options", Make: s.options},
		widgets.Tab{Text: "Sizes", Make: func() fyne.CanvasObject { return s.settings.body }},
		widgets.Tab{Text: "Rules", Make: func() fyne.CanvasObject { return s.rules.body }},
		widgets.Tab{Text: "Fitted", Make: func() fyne.CanvasObject { return s.fitted.body }},
		widgets.Tab{Text: "Out", Make: func() fyne.CanvasObject { return s.out.body }},
	)
	s.tabs.OnChosen = func(int) { s.showTab() }
	head := container.NewVBox(widgets.Fields(12, []float32{60, 0}, widgets.Heading("Plant"), s.option), space(0))
	s.content = container.New(insets{12, 8, 12, 6}, container.NewBorder(head, nil, nil, nil, s.tabs))
	s.show()
	return s.content
}

// choose makes an option the chosen one.
func (s *stage) choose(id string) {
	if id != s.id {
		s.id = id
		s.show()
	}
}

// show brings the pane up to date.
func (s *stage) show() {
	v := s.core.View()
	if v == nil {
		return
	}
	titles := make([]string, len(s.ids))
	seen := map[string]bool{}
	for i, id := range s.ids {
		titles[i] = s.core.PlantTitle(id)
		if seen[titles[i]] {
			titles[i] += " (" + id + ")"
		}
		seen[titles[i]] = true
	}
	s.syncing = true
	at := slices.Index(s.ids, s.id)
	if !slices.Equal(titles, s.option.Options) {
		s.option.SetOptions(titles)
	}
	if at < 0 {
		s.option.ClearSelected()
	} else if s.option.SelectedIndex() != at {
		s.option.SetSelectedIndex(at)
	}
	if at >= 0 {
		s.list.Select(at)
	}
	s.syncing = false
	visible(s.none, len(s.ids) == 0)
	s.showTab()
}

// showTab brings the part of the pane up to date that is seen.
func (s *stage) showTab() {
	switch s.tabs.Chosen() {
	case tabOptions:
		s.list.Refresh()
	case tabSizes:
		s.settings.update()
	case tabRules:
		s.rules.update()
	case tabFitted:
		s.fitted.update()
	case tabOut:
		s.out.update()
	}
}

// grown lays the part of the pane that is shown out anew, after something in it took another height.
func (s *stage) grown() {
	switch s.tabs.Chosen() {
	case tabSizes:
		s.settings.body.Refresh()
	case tabRules:
		s.rules.body.Refresh()
	}
}

// options lays the first tab out.
func (s *stage) options() fyne.CanvasObject {
	s.list = widget.NewList(func() int { return len(s.ids) }, func() fyne.CanvasObject {
		title, fits, technology, best := widgets.NewLine(""), widgets.Faint(""), widgets.Faint(""), widgets.Faint("")
		title.Bold = true
		fits.Align = fyne.TextAlignTrailing
		return container.New(insets{6, 5, 16, 5}, container.NewVBox(widgets.Fields(8, []float32{0, 150}, title, fits), technology, best))
	}, func(i widget.ListItemID, o fyne.CanvasObject) {
		all := o.(*fyne.Container).Objects[0].(*fyne.Container).Objects
		head := all[0].(*fyne.Container).Objects
		s.line(s.ids[i], head[0].(*widgets.Line), head[1].(*widgets.Line), all[1].(*widgets.Line), all[2].(*widgets.Line))
	})
	s.list.OnSelected = func(i int) {
		if !s.syncing && i >= 0 && i < len(s.ids) {
			s.choose(s.ids[i])
		}
	}
	s.none = container.NewCenter(widgets.Faint("No plant option yet. Make one to see where it fits.").Wide())
	buttons := container.NewHBox(
		widget.NewButton("New option", func() { s.ask("") }),
		widget.NewButton("Copy and vary", func() {
			if s.id != "" {
				s.ask(s.id)
			}
		}),
		widget.NewButton("Take out", s.takeOut),
		widget.NewButton("Choose its best", s.chooseBest),
	)
	foot := widgets.Faint(brief).Hinted(caution)
	return container.NewBorder(buttons, foot, nil, nil, container.NewStack(s.list, s.none))
}

// brief stands under the options.
const brief = "Distances are for screening; local codes and licensed practice prevail."

// caution is the whole of it.
const caution = "Distances and sizes here are for screening: they show where to look closer. Local codes and licensed practice prevail. Noise, ice throw and structure need qualified assessments under local law; only the network operator's study can offer a connection; power lines are live."

func (s *stage) line(id string, title, fits, technology, best *widgets.Line) {
	snap := s.core.View().Snap
	title.Set(s.core.PlantTitle(id))
	title.Hint = s.core.PlantTitle(id) + ", called " + id + " in the study's settings."
	what := technologyWords(snap.Text("plant." + id + ".technology"))
	technology.Set(what + ": " + sizes(snap, id))
	t, known := s.tallies[id]
	switch {
	case !known || s.of == nil:
		fits.Set("not computed yet")
		best.Set("")
	default:
		fits.Set(fmt.Sprintf("fits on %s of %s sites", core.Count(t.fitted), core.Count(t.sites)))
		switch {
		case t.best >= 0:
			best.Set("Highest in the order of " + s.core.VoiceTitle(s.core.Voice()) + ": " + s.of.Candidates[t.best].Site)
		case t.fitted == 0:
			best.Set("No candidate stands in the order")
		default:
			best.Set("No order yet")
		}
	}
}

func (s *stage) chooseBest() {
	if t, ok := s.tallies[s.id]; ok && t.best >= 0 && s.of != nil {
		s.core.Choose(s.of.Candidates[t.best].ID())
		return
	}
	s.core.Tell("This option has no candidate in the order yet")
}

// takeOut empties all settings of the chosen option, after asking.
func (s *stage) takeOut() {
	if s.id == "" {
		return
	}
	id, title := s.id, s.core.PlantTitle(s.id)
	do := func() {
		if edits := emptied(s.core.View().Snap, id); len(edits) > 0 {
			s.core.Set("take "+title+" out", "took "+title+" out", edits...)
		}
	}
	words := title + " goes out with its sizes and its own rules. Undo brings it back."
	s.core.Ask("Take the option out?", words, "Take out", do)
}

// origin says in words what a setting is and where its value is from.
func (s *stage) origin(r *row) string {
	text := r.def.What
	if r.more != "" {
		text += " " + r.more
	}
	f := r.held
	switch {
	case !f.ok:
		return text + " Not in force."
	case f.byUser:
		text += " Own value"
		if f.key != r.key {
			text += ", entered for " + generalName(f.key)
		}
		who := f.value.AcceptedBy
		if who == "" {
			who = s.who[f.key]
		}
		if who != "" {
			text += ", by " + who
		}
		if f.value.Source != "" {
			text += "; source: " + f.value.Source
		}
		if f.value.Reason != "" {
			text += "; why: " + f.value.Reason
		}
	case f.notSet() && strings.HasSuffix(r.key, ".turbine"):
		text += " Not set: the generic curve for power and rotor is taken"
	case f.notSet() && r.optional:
		text += " Not set: not held to any"
	case f.notSet():
		text += " Not set; you must enter it"
		if r.def.Source != "" && r.def.Source != "user" {
			text += ", from: " + r.def.Source
		}
	case f.value.Source == "user": // a start that nobody claims a source for
		text += " Default"
	default:
		text += " Default, " + present.Provenance(string(f.value.Provenance))
		if f.value.Source != "" {
			text += "; source: " + f.value.Source
		}
	}
	return strings.TrimSuffix(text, ".") + "."
}

// generalName writes for whom a rule of a general name holds.
func generalName(key string) string {
	last := key[strings.LastIndexByte(key, '.')+1:]
	for _, end := range endings {
		last = strings.TrimSuffix(last, "_"+end)
	}
	switch last {
	case "wind":
		return "everything named wind"
	case "solar":
		return "all solar plant"
	}
	for _, t := range technologies {
		if t.name == last {
			return "all options of " + t.words
		}
	}
	return last
}

// settings is the form of the chosen option's sizes.
type settings struct {
	s      *stage
	body   *container.Scroll
	box    *fyne.Container
	rows   map[string]*row // by key
	shown  []string
	choice string // technology and fit that the rows were laid out for
}

func newSettings(s *stage) *settings {
	f := &settings{s: s, box: container.NewVBox(), rows: map[string]*row{}}
	f.body = container.NewVScroll(container.New(insets{2, 6, 16, 8}, f.box))
	return f
}

func (f *settings) update() {
	s := f.s
	if s.id == "" {
		f.choice, f.box.Objects = "", []fyne.CanvasObject{widgets.Faint("No option is chosen.")}
		f.body.Refresh()
		return
	}
	snap, moved := s.core.View().Snap, false
	technology, fit := snap.Text("plant."+s.id+".technology"), snap.Text("plant."+s.id+".fit")
	if now := s.id + " " + technology + " " + fit; now != f.choice {
		f.choice, f.shown, f.box.Objects = now, nil, nil
		for _, l := range labels {
			if !reads(technology, fit, l.name) {
				continue
			}
			key := "plant." + s.id + "." + l.name
			if f.rows[key] == nil {
				f.rows[key] = newRow(s, key, l.words, "Use default", f.choices(l.name, technology))
			}
			f.shown = append(f.shown, key)
			f.box.Add(f.rows[key].all)
		}
		f.box.Add(space(4))
		f.box.Add(flush(caption(caution)))
		f.body.ScrollToTop()
		moved = true
	}
	for _, key := range f.shown {
		held, byUser, ok := snap.Lookup(key)
		r := f.rows[key]
		r.optional = !needed(snap, s.id, key)
		r.more = ""
		if strings.HasSuffix(key, ".fit") && fit == "spare_capacity" {
			r.more = "The spare capacity is that of the nearest line or substation for which it is known; without one the option is not computed there. Only the network operator's study can offer it."
		}
		r.keeps = strings.HasSuffix(key, ".technology") || strings.HasSuffix(key, ".title") // without them there is no option
		moved = r.update(inForce{key, held, byUser, ok}) || moved
	}
	if moved {
		f.body.Refresh()
	}
}

// needed reports whether the option cannot be fitted without a value that is not set.
func needed(snap *study.Snapshot, id, key string) bool {
	name := strings.TrimPrefix(key, "plant."+id+".")
	fit := snap.Text("plant." + id + ".fit")
	switch name {
	case "hub_height_m", "rotor_diameter_m", "rated_kw":
		return true
	case "fit_power_kw":
		return fit == "power"
	case "fit_machines":
		return fit == "machines"
	case "fit_energy_mwh_per_yr":
		return fit == "yearly_energy"
	}
	return false
}

func (f *settings) choices(name, technology string) []choice {
	var out []choice
	switch name {
	case "technology":
		for _, t := range technologies {
			out = append(out, choice{t.name, t.words})
		}
	case "fit":
		for _, m := range fits(technology) {
			out = append(out, choice{m, present.Named(m)})
		}
	case "tilt_rule":
		out = []choice{{"set", "tilt and direction as set"}, {"most energy", "found: most energy"}}
	case "turbine":
		out = append(out, choice{study.NotSetText, "generic curve"})
		for _, t := range f.s.core.Parts.Params.Turbines {
			out = append(out, choice{t.ID, t.Name})
		}
		for _, t := range f.s.core.View().Snap.Turbines() {
			out = append(out, choice{t.ID, t.Called() + " (of this study)"})
		}
	}
	return out
}
