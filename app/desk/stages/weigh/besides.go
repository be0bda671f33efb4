package weigh

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// besides is the part of the stage for what is weighed by no weight: what stands beside the candidates, what saving
// would spare, and the gates.
type besides struct {
	s *stage

	alternatives *widget.Label

	share   *slider
	percent *widgets.Line
	spared  *widget.Label
	plan    *run.SparePlan
	planOf  *shown // whose order the plan is of
	work    latest

	gates []*gateRow
	held  *widget.Label
	parts *fyne.Container
	all   *container.Scroll
}

// gateRow is a gate with what it does.
type gateRow struct {
	key    string
	choice *widget.Select
	box    *fyne.Container
}

// The ways in which a gate can be in force, as a person and as a setting says them.
var (
	gateModes = []string{"off", "not_no", "yes"}
	gateWords = []string{"off: weighed only", "hold back what touches it", "hold back unless it is known to be untouched"}
	ownWords  = []string{"off: all are in order", "hold back what is refused", "hold back all without a yes"}
)

func newBesides(s *stage) *besides {
	p := &besides{s: s, alternatives: widgets.NewText(""), spared: widgets.NewText(""), held: widgets.NewText(""), percent: widgets.NewLine("")}
	p.percent.Bold, p.percent.Align = true, fyne.TextAlignTrailing
	p.share = newSlider(func(float64) { p.tell() }, p.save, p.back)
	line := container.New(free{
		min: func() fyne.Size { return fyne.NewSize(300, 28) },
		place: func(size fyne.Size) {
			put(p.share, 0, 0, size.Width-64, 28)
			put(p.percent, size.Width-60, 4, 58, 20)
		},
	}, p.share, p.percent)
	p.parts = container.NewVBox(
		widgets.Part("Beside the candidates").Hinted("Other ways to the same end, at the place that each would take if it competed for one: it takes none, since what saves energy spares every burden."),
		flush(p.alternatives),
		widgets.Part("What saving would spare").Hinted("How much of the energy of the sites that this order would build is saved instead, after rebound. Arrow keys move the slider, return keeps the share in the study, escape goes back."),
		line, flush(p.spared),
		widgets.Part("Gates").Hinted("A condition that must hold before a candidate is ordered. No weight makes up for it. The order is shown with and without: the places without stand below and, for the rest, in the appendix."))
	add := func(title, key string, words []string) {
		g := &gateRow{key: key}
		g.choice = widget.NewSelect(words, nil)
		name := widgets.NewLine(title)
		g.box = container.New(free{
			min: func() fyne.Size { return fyne.NewSize(300, 36) },
			place: func(size fyne.Size) {
				put(name, 0, 8, size.Width*0.36-6, 20)
				put(g.choice, size.Width*0.36, 2, size.Width*0.64, 32)
			},
		}, name, g.choice)
		p.gates = append(p.gates, g)
		p.parts.Add(g.box)
	}
	add("Owner's consent", "gate.owner_consent", ownWords)
	for _, st := range run.Stocks {
		add(present.Upper(st.Title), "gate.critical."+st.Name, gateWords)
	}
	p.parts.Add(flush(p.held))
	p.all = container.NewVScroll(container.New(inset{right: 12, bottom: 8}, p.parts))
	return p
}

func (p *besides) object() fyne.CanvasObject { return p.all }

func (p *besides) changed(core.Change) {
	v := p.s.c.View()
	if v == nil {
		return
	}
	for i, g := range p.gates {
		words := gateWords
		if i == 0 {
			words = ownWords
		}
		mode := v.Snap.Text(g.key)
		g.choice.OnChanged = nil
		for k, m := range gateModes {
			if m == mode {
				g.choice.SetSelected(words[k])
			}
		}
		g.choice.OnChanged = func(string) {
			value := gateModes[max(g.choice.SelectedIndex(), 0)]
			p.s.c.Set("change a gate", "chosen in the window", study.SettingEdit{Key: g.key, Value: value, Reason: "chosen in the window"})
		}
	}
	p.tellBeside()
	p.tellHeld()
	share, _ := v.Snap.Number("saving.share")
	if !p.share.dragged {
		p.share.set(math.Round(100*share), nil)
	}
	sh := p.s.shown
	switch {
	case sh == nil || sh.Err != nil:
		p.plan, p.planOf = nil, nil
		p.tell()
	case p.planOf != nil && p.planOf.Ranking == sh.Ranking:
		p.tell()
	default:
		p.find(sh)
	}
	p.all.Refresh()
}

// tellBeside shows where the alternatives would stand under the weights shown.
func (p *besides) tellBeside() {
	sh := p.s.shown
	words := "There is no order yet; give weights first."
	if sh != nil && sh.Err == nil {
		list, err := sh.Board.Beside(sh.Raw, &sh.Standing)
		if err != nil {
			words = err.Error()
		} else {
			n := len(sh.Board.IDs) - 1
			lines := []string{fmt.Sprintf("Doing nothing stands at place %d of %d with a score of %s.", sh.Standing.Place[n], len(sh.Board.IDs), scoreWords(sh.Standing.Score[n]))}
			for _, b := range list {
				lines = append(lines, pictures.Beside(b, func(key string) string { return p.s.c.Info(key).Title }))
			}
			words = strings.Join(lines, "\n")
		}
	}
	setText(p.alternatives, words)
}

func setText(l *widget.Label, words string) {
	if l.Text != words {
		l.SetText(words)
	}
}

// heldShown is how many candidates that a gate holds back are named.
const heldShown = 8

// tellHeld shows the first of what gates hold back, with the places of an order without gates.
func (p *besides) tellHeld() {
	o := p.s.c.Order()
	words := ""
	switch {
	case o == nil:
	case len(o.HeldBack) == 0:
		words = "No gate holds anything back from this order."
	default:
		lines := []string{fmt.Sprintf("%s held back. Without gates:", plural(len(o.HeldBack), "candidate"))}
		for i, h := range o.HeldBack {
			if i == heldShown {
				lines = append(lines, fmt.Sprintf("and %d more", len(o.HeldBack)-i))
				break
			}
			lines = append(lines, fmt.Sprintf("place %d: %s (%s)", h.Place, p.s.c.IDTitle(h.ID()), h.By()))
		}
		if len(o.Order) > 0 {
			if first := o.Order[0]; first.PlaceWithout > 1 {
				lines = append(lines, fmt.Sprintf("%s, first now, would be at place %d.", p.s.c.IDTitle(first.ID()), first.PlaceWithout))
			}
		}
		words = strings.Join(lines, "\n")
	}
	setText(p.held, words)
}

// find has the sites found that the order shown would build.
func (p *besides) find(sh *shown) {
	var order []int
	for _, item := range sh.Standing.Order {
		if at := sh.Board.At[item]; at >= 0 {
			order = append(order, at)
		}
	}
	params := p.s.c.Parts.Params
	p.work.ask(p.s.c, sh, func() func() {
		a, err := run.NewAccounts(params, sh.of)
		var plan *run.SparePlan
		if err == nil {
			plan, err = a.SparePlan(sh.results, order)
		}
		return func() {
			if err != nil {
				setText(p.spared, "Unknown: "+err.Error())
				return
			}
			p.plan, p.planOf = plan, sh
			p.tell()
			p.all.Refresh()
		}
	})
}

// tell says what the share at the slider spares.
func (p *besides) tell() {
	p.percent.Set(fmt.Sprintf("%.0f %%", p.share.points))
	words := "There is no order yet; give weights first."
	if p.plan != nil {
		share := p.share.points / mostPoints
		s, e, err := p.plan.At(share)
		if err != nil {
			words = err.Error()
		} else {
			words = pictures.Spared(p.plan, share, s, e)
		}
	}
	if p.spared.Text != words {
		p.spared.SetText(words)
		p.parts.Refresh()
	}
}

// save keeps the share in the study.
func (p *besides) save() {
	v := p.s.c.View()
	if v == nil {
		return
	}
	share := p.share.points / mostPoints
	if now, _ := v.Snap.Number("saving.share"); now == share {
		return
	}
	p.s.c.Set("save a share of the energy", "chosen in the window", study.SettingEdit{Key: "saving.share", Value: strconv.FormatFloat(share, 'g', -1, 64), Reason: "chosen in the window"})
}

// back shows the share of the study again.
func (p *besides) back() {
	share, _ := p.s.c.View().Snap.Number("saving.share")
	p.share.set(math.Round(100*share), nil)
	p.tell()
}

// askReason asks why a voice weighs two consequences that count one event; without a reason it orders nothing.
func askReason(s *stage, e *run.FamilyError) {
	reason := widget.NewEntry()
	reason.SetPlaceHolder("why both count")
	words := widgets.NewText(fmt.Sprintf("%s and %s count the same event (%s). If both shall count, say why; the reason stands in the appendix. Else take the weight off one.", s.c.Info(e.Other).Title, s.c.Info(e.Key).Title, e.Family))
	d := dialog.NewCustomConfirm("One event, weighed twice", "Weigh both", "Cancel", container.NewVBox(words, reason), func(ok bool) {
		switch text := strings.TrimSpace(reason.Text); {
		case !ok:
		case text == "":
			s.c.Fail("weigh both", errors.New("no reason was given"))
		default:
			s.c.Set("weigh both", text, study.SettingEdit{Key: "voice." + e.Voice + ".both." + e.Family, Value: text, Reason: text})
		}
	}, s.c.Window)
	d.Resize(fyne.NewSize(480, 240))
	d.Show()
	s.c.Window.Canvas().Focus(reason)
}
