package accounts

import (
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// movedKeys are the consequences of which it is shown what moves them.
var movedKeys = []string{"eroi_extended", "ghg_g_per_kwh", "energy_p50_mwh_per_yr", "carbon_payback_yr"}

// primaryKey is the setting that shows the energy return as primary equivalent too.
const primaryKey = "energy.primary_equivalent"

// part is a picture with its heading, and words in its place.
type part struct {
	picture *chartview.Picture
	words   *widget.Label
	wordsIn fyne.CanvasObject
	all     *fyne.Container
}

func (p *part) set(words string, do func(p draw.Palette, width float64) *draw.Scene) {
	p.words.SetText(words)
	shown(words != "", p.wordsIn)
	p.picture.Set(do)
}

// pictured shows the accounts of the first chosen candidate in pictures, and the first two side by side.
type pictured struct {
	core    *core.Core
	who     *widgets.Line
	said    *widget.Label
	saidBox fyne.CanvasObject

	ladder, primary, horizon, land, payback, moving, pair *part

	also    *widget.Check // whether the return is shown as primary equivalent too
	key     *widget.Select
	all     *fyne.Container
	body    fyne.CanvasObject
	ids     []string // of the shown candidates
	of      *run.Results
	round   int // of the newest question; older answers are dropped
	running bool
	syncing bool // controls are set by the program
}

// found is what is behind the pictures of a candidate.
type found struct {
	ladder   chart.Boundaries
	primary  *chart.Boundaries // nil while it is switched off
	horizon  chart.YearSum
	account  string // on the common horizon, in words
	ground   chart.Ground
	balances chart.Balances
	drivers  chart.Drivers
}

func newPictured(c *core.Core) *pictured {
	p := &pictured{core: c, who: widgets.NewLine(""), said: widgets.NewText("")}
	p.who.Bold = true
	p.saidBox = container.New(insets{-6, -4, -6, -2}, p.said)
	newPart := func(title, hint string, above ...fyne.CanvasObject) *part {
		one := &part{words: widgets.NewText("")}
		one.picture = chartview.New(c, func(do func()) { go do() }, func() { p.all.Refresh() })
		one.wordsIn = container.New(insets{-6, -4, -6, -2}, one.words)
		one.all = container.NewVBox(space(6), widgets.Part(title).Hinted(hint))
		for _, o := range append(above, one.wordsIn, one.picture) {
			one.all.Add(o)
		}
		return one
	}
	var titles []string
	for _, k := range movedKeys {
		titles = append(titles, c.Info(k).Title)
	}
	p.key = widget.NewSelect(titles, nil)
	p.key.SetSelectedIndex(0)
	p.key.OnChanged = func(string) {
		if len(p.ids) > 0 {
			p.moving.set("…", nil)
			p.ask()
		}
	}
	p.all = container.NewVBox(p.who, p.saidBox)
	p.ladder = newPart("Energy return by boundary", "What is given and what is spent, at each boundary, as electricity out over primary energy in. Each part of what is spent is counted once.")
	p.also = widget.NewCheck("Also as primary equivalent, on an axis of its own", func(on bool) {
		if !p.syncing {
			value := "off"
			if on {
				value = pictures.PrimaryEquivalent
			}
			c.Set("energy return as primary equivalent "+value, "", study.SettingEdit{Key: primaryKey, Value: value})
		}
	})
	p.ladder.all.Add(p.also)
	p.primary = newPart("Energy return as primary equivalent", "The same with the electricity counted as the primary energy that the grid would spend for it. It is not to be set beside the return above.")
	p.horizon = newPart("On a common horizon", "What comes back less what is spent, over years that all candidates share: what wears out before is built again.")
	p.land = newPart("Ground taken", "The ground that the plant takes, by kind, in hectares.")
	p.payback = newPart("Carbon payback", "Greenhouse gas displaced less that caused, year by year, under each grid factor that was entered.")
	p.moving = newPart("What moves it", "How strongly a consequence follows each group of factors over all trials, by rank.", p.key)
	p.pair = newPart("Side by side", "The first two of the chosen candidates.")
	for _, one := range p.parts() {
		p.all.Add(one.all)
	}
	p.body = container.NewVScroll(pad(p.all))
	p.update()
	return p
}

func (p *pictured) parts() []*part {
	return []*part{p.ladder, p.primary, p.horizon, p.land, p.payback, p.moving, p.pair}
}

func (p *pictured) repaint() {
	for _, one := range p.parts() {
		one.picture.Repaint()
	}
}

// clear shows words in place of all pictures.
func (p *pictured) clear(words string) {
	p.said.SetText(words)
	shown(words != "", p.saidBox)
	for _, one := range p.parts() {
		one.set("", nil)
		shown(false, one.all)
	}
	p.all.Refresh()
}

// update follows the chosen candidates and the results.
func (p *pictured) update() {
	chosen, v := p.core.Chosen(), p.core.View()
	chosen = chosen[:min(2, len(chosen))]
	var ids []string
	for _, c := range chosen {
		ids = append(ids, c.ID())
	}
	if v == nil || len(ids) == 0 {
		p.round++
		p.ids, p.of = nil, nil
		p.who.Set("")
		shown(false, p.who)
		p.clear("Choose a candidate in the table or on the map.")
		return
	}
	if slices.Equal(ids, p.ids) && p.of == v.Results {
		return
	}
	p.ids, p.of = ids, v.Results
	p.who.Set(core.Letter(0) + "  " + p.core.CandidateTitle(chosen[0]))
	shown(true, p.who)
	if c := chosen[0]; c.Status != run.Fitted {
		p.round++
		p.clear("Nothing to show: " + present.Reason(c.Status) + ".")
		return
	}
	p.clear("…")
	p.ask()
}

// ask finds what is behind the pictures on another goroutine; one question runs at a time, and the newest wins.
func (p *pictured) ask() {
	p.round++
	if p.running {
		return
	}
	v := p.core.View()
	i, ok := v.Index.ByID[p.ids[0]]
	if !ok || v.Results != p.of {
		return
	}
	p.running = true
	round, c, params, snap, key := p.round, &v.Results.Candidates[i], p.core.Parts.Params, v.Of, movedKeys[max(p.key.SelectedIndex(), 0)]
	what := p.core.Info(key).Title
	go func() {
		out, err := find(params, c, snap, key, what)
		p.core.Do(func() {
			p.running = false
			switch {
			case round == p.round && err != nil:
				p.clear("Unknown: " + present.Problem(err))
			case round == p.round:
				p.answered(c, key, out)
			case len(p.ids) > 0: // something else was asked for meanwhile
				if chosen := p.core.Chosen(); len(chosen) > 0 && chosen[0].Status == run.Fitted {
					p.ask()
				}
			}
		})
	}()
}

func (p *pictured) answered(c *run.Candidate, key string, f *found) {
	p.said.SetText("")
	shown(false, p.saidBox)
	for _, one := range p.parts() {
		shown(one != p.pair && (one != p.primary || f.primary != nil), one.all)
	}
	p.syncing = true
	p.also.SetChecked(f.primary != nil)
	p.syncing = false
	if f.primary != nil {
		p.primary.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.Ladder(*f.primary, pal, width) })
	}
	if len(f.horizon.Points) > 0 {
		p.horizon.set(f.account, func(pal draw.Palette, width float64) *draw.Scene { return chart.YearLine(f.horizon, pal, width) })
	} else {
		p.horizon.set(f.account, nil)
	}
	p.ladder.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.Ladder(f.ladder, pal, width) })
	p.land.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.LandBars(f.ground, pal, width) })
	p.payback.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.PaybackLine(f.balances, pal, width) })
	if q, _ := c.Consequence(key); len(f.drivers.Groups) > 0 {
		p.moving.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.Tornado(f.drivers, pal, width) })
	} else if words := present.WhyNot(q); words != "" {
		p.moving.set(p.core.Info(key).Title+" is "+words+".", nil)
	} else {
		p.moving.set("No factor moves it.", nil)
	}
	if chosen := p.core.Chosen(); len(chosen) > 1 {
		shown(true, p.pair.all)
		in := pictures.Accounts([2]*run.Candidate{chosen[0], chosen[1]}, [2]string{p.core.CandidateTitle(chosen[0]), p.core.CandidateTitle(chosen[1])}, p.core.Info, pictures.Better(p.core.Parts.Catalog), "Side by side", "accounts-pair")
		p.pair.set("", func(pal draw.Palette, width float64) *draw.Scene { return chart.SideBySide(in, pal, width) })
	}
	p.all.Refresh()
}

// find reckons what the pictures of a fitted candidate show, off the window's goroutine.
func find(params *run.Params, c *run.Candidate, snap *study.Snapshot, key, what string) (*found, error) {
	a, err := run.NewAccounts(params, snap)
	if err != nil {
		return nil, err
	}
	value := a.Values(c)
	out := &found{
		ladder: pictures.Boundaries(c, value, "Energy return by boundary of "+c.Site, "accounts-ladder"),
		ground: pictures.GroundTaken(c, value, "Ground taken by "+c.Site, "accounts-land"),
	}
	if snap.Text(primaryKey) == pictures.PrimaryEquivalent {
		in := pictures.PrimaryBoundaries(c, value, "Energy return as primary equivalent of "+c.Site, "accounts-primary")
		out.primary = &in
	}
	l, why, err := a.Ledger(c)
	if err != nil {
		return nil, err
	}
	out.horizon, out.account = pictures.HorizonSum(l, why, value, "Net energy on a common horizon of "+c.Site, "accounts-horizon"), pictures.Ledger(l, why)
	lines, why, err := a.PaybackLines(c)
	if err != nil {
		return nil, err
	}
	out.balances = pictures.Paybacks(c, lines, why, value, "Carbon payback of "+c.Site, "accounts-payback")
	drivers, trials, err := a.Drivers(c, key)
	if err != nil {
		return nil, err
	}
	if trials > 0 {
		out.drivers = pictures.DriversOf(drivers, trials, what, "What moves "+what+" of "+c.Site, "accounts-moving")
	}
	return out, nil
}
