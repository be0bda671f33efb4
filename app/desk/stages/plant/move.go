package plant

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/mapview"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw/tiles"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/measure"
)

// mover has the turbines of the shown candidate moved on the map, and shows where they stand by hand.
type mover struct {
	s    *stage
	all  *fyne.Container
	said *widget.Label   // how the turbines came to stand where they do, when by hand
	room *fyne.Container // of said, hidden with it so that no gap stays

	move, own, done, leave *widget.Button

	site, plant string // shown
	under       *underWay
}

// underWay is the moving that goes on, on the map or in its form.
type underWay struct {
	site, plant string
	from, at    []geo.LonLat
	end         func(take bool) // nil while it is not on the map
	check       func([]geo.LonLat) []string
}

func newMover(s *stage) *mover {
	m := &mover{s: s, said: widgets.NewText("")}
	m.move = widget.NewButton("", m.begin)
	m.own = widget.NewButton("Back to the program's own places", m.back)
	m.done = widget.NewButton("Done moving", func() { m.end(true) })
	m.done.Importance = widget.HighImportance
	m.leave = widget.NewButton("Leave all as it was", func() { m.end(false) })
	m.room = container.NewStack(flush(m.said))
	m.all = container.NewVBox(m.room, container.NewHBox(m.move, m.own, m.done, m.leave))
	return m
}

// update shows what can be done for a candidate, which may be nil.
func (m *mover) update(c *run.Candidate) {
	here := m.under != nil && m.under.end != nil
	hand, byHand := study.HandLayout{}, false
	if c != nil {
		hand, byHand = m.s.core.View().Snap.Layout(c.Site, c.Plant)
	}
	// Places by hand can be what keeps it from being computed.
	able := c != nil && hasWind(c.Technology) && (byHand || c.Status != run.NotComputed)
	visible(m.all, able || here)
	said := ""
	if m.site, m.plant = "", ""; able {
		m.site, m.plant = c.Site, c.Plant
		if byHand {
			said = "Placed by hand: " + hand.Reason
		}
		words := "Move turbines on the map"
		if len(m.start(c)) == 0 {
			words = "Place turbines on the map"
		}
		if m.move.Text != words {
			m.move.SetText(words)
		}
	}
	if here {
		said = "The turbines of " + m.under.site + " are being moved on the map."
	}
	visible(m.room, said != "")
	m.said.SetText(said)
	visible(m.move, !here)
	visible(m.own, !here && byHand)
	visible(m.done, here)
	visible(m.leave, here)
}

// start gives where the turbines of a candidate stand now.
func (m *mover) start(c *run.Candidate) []geo.LonLat {
	if hand, ok := m.s.core.View().Snap.Layout(c.Site, c.Plant); ok {
		return hand.At // as the results may be of the state before
	}
	if c.Fit != nil {
		return c.Fit.Turbines
	}
	return nil
}

// begin has the turbines moved once the ground that may be built on is known.
func (m *mover) begin() {
	core, c := m.s.core, m.s.fitted.candidate()
	if c == nil || m.under != nil {
		return
	}
	u := &underWay{site: c.Site, plant: c.Plant, from: slices.Clone(m.start(c))}
	u.at = u.from
	m.under = u
	parcels := slices.Clone(c.Parcels)
	if !slices.Contains(core.ChosenIDs(), c.ID()) { // so that its ground and the distances kept are on the map
		core.Choose(c.ID())
	}
	core.Session.Around(c, func(a *run.Surroundings, err error) {
		core.Do(func() {
			if m.under != u {
				return
			}
			if err != nil { // the rest can be told without it
				core.Tell("The buildable ground of " + c.Site + " is unknown here: " + present.Problem(err))
				a = nil
			}
			core.ShowParcels(parcels)
			m.onMap(u, a, parcels)
		})
	})
}

// onMap lets the user move the turbines.
func (m *mover) onMap(u *underWay, a *run.Surroundings, parcels []string) {
	snap := m.s.core.View().Snap
	rotor, _ := snap.Number("plant." + u.plant + ".rotor_diameter_m") // zero where it is not set: metres alone
	spacing := leastSpacing(snap, u.plant)
	if u.check == nil && snap.Frame != nil {
		u.check = newChecker(*snap.Frame, spacing, rotor, a, func(at geo.LonLat) bool {
			return slices.Contains(parcels, m.s.core.ParcelAt(at))
		}).check
	}
	words := "Move the turbines of " + u.site + ", " + m.s.core.PlantTitle(u.plant)
	u.end = m.s.core.MovePoints(mapview.Points{
		Words: words, One: "turbine", Start: u.at, Least: 1, Most: study.MostHandTurbines,
		RingM: spacing, UnitM: rotor, Unit: "rotor diameters", Check: u.check,
		Done: func(at []geo.LonLat) { m.moved(u, at) },
	})
	if m.under != u { // there is no map
		u.end = nil
	}
	m.s.fitted.update()
}

// end ends the moving on the map by a button.
func (m *mover) end(take bool) {
	if m.under != nil && m.under.end != nil {
		m.under.end(take)
	}
}

// moved takes over what the map tells; nil when the user gave up.
func (m *mover) moved(u *underWay, at []geo.LonLat) {
	u.end = nil
	if at == nil || slices.Equal(at, u.from) {
		m.under = nil
		m.s.core.Tell("No turbine was moved.")
		m.s.fitted.update()
		return
	}
	u.at = at
	m.s.fitted.update()
	m.askWhy(u)
}

// handForm asks why the turbines stand where the user put them.
type handForm struct {
	m      *mover
	u      *underWay
	reason *widget.Entry
	said   *widget.Label
	keep   *widget.Button
	dialog *dialog.CustomDialog
}

func (m *mover) askWhy(u *underWay) *handForm {
	f := &handForm{m: m, u: u, reason: widget.NewEntry(), said: widgets.NewText("")}
	f.reason.SetPlaceHolder("needed; it goes into the appendix")
	if hand, ok := m.s.core.View().Snap.Layout(u.site, u.plant); ok {
		f.reason.SetText(hand.Reason)
	}
	f.reason.OnSubmitted = func(string) { f.commit() }
	f.said.Importance = widget.WarningImportance
	f.said.Hide()
	body := container.NewVBox(flush(widgets.NewText(changeWords(u.from, u.at) + " The places are kept with the reason, undone like any other change, and hold until others are given or the program's own are taken again.")))
	var wrong []string
	if u.check != nil {
		for i, w := range u.check(u.at) {
			if w != "" {
				wrong = append(wrong, fmt.Sprintf("Turbine %d: %s.", i+1, strings.ReplaceAll(w, "\n", "; ")))
			}
		}
	}
	for i, w := range wrong {
		if i == mostWrong && len(wrong) > mostWrong+1 {
			body.Add(widgets.Warm(fmt.Sprintf("and %d more", len(wrong)-mostWrong)))
			break
		}
		line := caption(w)
		line.Importance = widget.WarningImportance
		body.Add(flush(line))
	}
	if len(wrong) > 0 {
		body.Add(widgets.Faint("They may be kept so; the results say which rules are broken."))
	}
	body.Add(widgets.Fields(8, []float32{40, 0}, widgets.NewLine("Why"), f.reason))
	body.Add(flush(f.said))
	f.dialog = dialog.NewCustomWithoutButtons("Turbines of "+u.site+" placed by hand", body, m.s.core.Window)
	f.keep = widget.NewButton("Keep these places", f.commit)
	f.keep.Importance = widget.HighImportance
	f.dialog.SetButtons([]fyne.CanvasObject{widget.NewButton("Leave all as it was", f.drop), widget.NewButton("Go on moving", f.again), f.keep})
	size := m.s.core.Window.Canvas().Size()
	f.dialog.Resize(fyne.NewSize(min(size.Width-30, 560), min(size.Height-30, 260)))
	f.dialog.Show()
	m.s.core.Window.Canvas().Focus(f.reason)
	return f
}

// mostWrong is how many turbines with something wrong the form lists.
const mostWrong = 4

// changeWords says what was done to a layout.
func changeWords(from, at []geo.LonLat) string {
	n := 0
	for i := range min(len(at), len(from)) {
		if at[i] != from[i] {
			n++
		}
	}
	switch {
	case len(from) == 0:
		return "Placed: " + soMany(len(at)) + "."
	case len(from) != len(at):
		return fmt.Sprintf("Placed: %s; before, %d.", soMany(len(at)), len(from))
	case len(at) == 1:
		return "The turbine was moved."
	}
	return fmt.Sprintf("Of %d turbines, %d moved.", len(at), n)
}

func (f *handForm) drop() {
	f.dialog.Hide()
	f.m.under = nil
	f.m.s.core.Tell("The turbines stand where they stood.")
	f.m.s.fitted.update()
}

// again goes back to the map with the turbines where they were put.
func (f *handForm) again() {
	f.dialog.Hide()
	f.m.onMap(f.u, nil, nil) // the check stays what it was
}

// commit keeps the places as one edit. What keeps it from being done is said in the form, so that nothing is lost.
func (f *handForm) commit() {
	say := func(err error) {
		words := present.Problem(err)
		f.said.SetText(strings.ToUpper(words[:1]) + words[1:])
		f.said.Show()
		f.dialog.Refresh()
	}
	h := study.HandLayout{Site: f.u.site, Plant: f.u.plant, At: f.u.at, Reason: strings.TrimSpace(f.reason.Text)}
	if h.Reason == "" {
		f.said.SetText("Places by hand need a reason; everyone who reads the appendix will see it.")
		f.said.Show()
		f.dialog.Refresh()
		return
	}
	c := f.m.s.core
	f.keep.Disable()
	c.Session.Edit(func(ctx context.Context, s *study.Study) error { return s.PutLayout(ctx, h) }, func(err error) {
		c.Do(func() {
			f.keep.Enable()
			if err != nil {
				c.Update()
				say(err)
				return
			}
			f.dialog.Hide()
			f.m.under = nil
			c.Update()
			c.Tell("The turbines of " + h.Site + " are placed by hand. Undo takes it back.")
		})
	})
}

// back lets the program place the turbines again.
func (m *mover) back() {
	site, plant := m.site, m.plant
	m.s.core.Edit("take the program's own places", func(ctx context.Context, s *study.Study) error {
		err := s.DropLayout(ctx, site, plant, "the program's own places again")
		var gone *study.NoSuchError
		if errors.As(err, &gone) {
			return nil // it was taken out just before
		}
		return err
	}, func() {
		m.s.core.Tell("The program places the turbines of " + site + " again. Undo brings yours back.")
	})
}

// leastSpacing gives the least distance of two turbines that the spacing can allow, whatever the wind's direction; 0
// where it is not known.
func leastSpacing(snap *study.Snapshot, id string) float64 {
	across, okA := snap.Number("plant." + id + ".spacing_across_d")
	along, okB := snap.Number("plant." + id + ".spacing_along_d")
	rotor, okC := snap.Number("plant." + id + ".rotor_diameter_m")
	if !okA || !okB || !okC {
		return 0
	}
	return min(across, along) * rotor
}

// checker finds what is wrong with places for turbines, as far as can be told while they are dragged. The results
// tell the whole of it.
type checker struct {
	plane    tiles.Plane
	spacingM float64 // 0 for not known
	rotorM   float64
	ground   geo.XYGeometry // that may be built on
	known    bool           // the ground is
	inSite   func(geo.LonLat) bool
	of       map[geo.LonLat]string // what was found of the ground, by place: in a drag all places but one stay
}

func newChecker(frame geo.LonLat, spacingM, rotorM float64, a *run.Surroundings, inSite func(geo.LonLat) bool) *checker {
	c := &checker{plane: tiles.NewPlane(frame), spacingM: spacingM, rotorM: rotorM, inSite: inSite, of: map[geo.LonLat]string{}}
	if a != nil {
		c.ground, c.known = geo.Map(a.Buildable, c.plane.To), true
	}
	return c
}

// slackM is how far a turbine may be on the wrong side before it is told: places are rounded, and the map's plane is
// not that of the computation.
const slackM = 0.5

// mostPlaces bounds the memory of a long drag.
const mostPlaces = 10_000

func (c *checker) check(at []geo.LonLat) []string {
	out, xy := make([]string, len(at)), make([]geo.XY, len(at))
	for i, p := range at {
		xy[i] = c.plane.To(p)
	}
	if len(c.of) > mostPlaces {
		clear(c.of)
	}
	for i, p := range at {
		words, ok := c.of[p]
		if !ok {
			words = c.onGround(p, xy[i])
			c.of[p] = words
		}
		out[i] = words
		other, least := -1, max(c.spacingM-slackM, c.rotorM)
		for j := range xy {
			if d := xy[i].Dist(xy[j]); j != i && d < least {
				other, least = j, d
			}
		}
		switch {
		case other < 0:
			continue
		case least < c.rotorM: // without the line of the ground there is room for what matters more
			out[i] = fmt.Sprintf("its rotor could touch that of turbine %d; so nothing can be computed", other+1)
		default:
			near := fmt.Sprintf("%.0f m from turbine %d, and the spacing is %.0f m or more", math.Floor(least), other+1, c.spacingM)
			out[i] = strings.TrimPrefix(words+"\n"+near, "\n")
		}
	}
	return out
}

// onGround tells what is wrong with the ground at a place.
func (c *checker) onGround(p geo.LonLat, xy geo.XY) string {
	outside := !c.inSite(p)
	d, some := 0.0, false
	if c.known {
		d, some = measure.PointToM(xy, c.ground)
	}
	switch {
	case c.known && !some && outside:
		return "outside the site, which has no buildable ground"
	case c.known && !some:
		return "the site has no buildable ground"
	case outside && d > slackM:
		return fmt.Sprintf("outside the site, %.0f m from its buildable ground", math.Ceil(d))
	case outside:
		return "outside the site"
	case d > slackM:
		return fmt.Sprintf("%.0f m outside the buildable ground", math.Ceil(d))
	}
	return ""
}
