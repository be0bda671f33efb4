package accounts

import (
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/methods"
	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/scoring"
)

// methodsPane tells what of the three accounts the literature disputes, and by which formulas they are reckoned.
type methodsPane struct {
	core  *core.Core
	of    *study.Snapshot // of what is told
	pages []*methodsPage  // those shown so far
	tabs  *widgets.Tabs
	body  fyne.CanvasObject
}

// methodsPage is one account.
type methodsPage struct {
	account scoring.Account
	prose   *prose
	scroll  *container.Scroll
}

func newMethodsPane(c *core.Core) *methodsPane {
	m := &methodsPane{core: c}
	var tabs []widgets.Tab
	for _, a := range methods.Accounts {
		tabs = append(tabs, widgets.Tab{Text: accountTitle(a), Make: func() fyne.CanvasObject { return m.page(a) }})
	}
	if v := c.View(); v != nil {
		m.of = v.Snap
	}
	m.tabs = widgets.NewTabs(tabs...)
	m.body = container.New(insets{0, 6, 0, 0}, m.tabs)
	return m
}

func (m *methodsPane) page(a scoring.Account) fyne.CanvasObject {
	p := &methodsPage{account: a}
	p.prose = newProse(func() {
		if p.scroll != nil {
			p.scroll.Refresh()
		}
	})
	p.scroll = container.NewVScroll(pad(p.prose))
	p.prose.set(m.told(a))
	m.pages = append(m.pages, p)
	return p.scroll
}

// update follows the study: what settings and rows stand at is told too.
func (m *methodsPane) update() {
	v := m.core.View()
	if v == nil || v.Snap == m.of {
		return
	}
	m.of = v.Snap
	for _, p := range m.pages {
		p.prose.set(m.told(p.account))
	}
}

func (m *methodsPane) repaint() {
	for _, p := range m.pages {
		p.prose.Refresh()
	}
}

// told writes the page of an account.
func (m *methodsPane) told(a scoring.Account) []block {
	params := m.core.Parts.Params
	list, err := methods.Shipped()
	if err != nil {
		return []block{textBlock(present.Problem(err))}
	}
	out := []block{partBlock("What is disputed"), faintBlock("Where the literature disagrees, and what this program does about it. Settings and rows of the tables are named as they are.")}
	for _, d := range methods.Of(list, a) {
		out = append(out, topicBlock(d.Topic), textBlock(d.Disputed), textBlock("Here: "+d.HereWords(params)))
		if m.of != nil {
			now, err := methods.InForce(params, m.of, d)
			if err != nil {
				now = present.Problem(err)
			}
			if now != "" {
				out = append(out, faintBlock("In this study: "+now+"."))
			}
		}
		out = append(out, faintBlock("Source: "+d.SourceWords()))
	}
	formulas, measured := methods.Formulas(params, a)
	out = append(out, partBlock("Formulas in force"), faintBlock("Consequences and what goes into them stand in quotation marks. How a figure of one candidate came about, down to its sources, unfolds in the strip on a click."))
	for _, f := range formulas {
		source := "Source: " + f.Source + "."
		if f.Source == "identity" {
			source = "Follows by arithmetic."
		}
		title := f.Title
		if u := present.Unit(f.Unit); u != "" {
			title += ", " + u
		}
		out = append(out, topicBlock(title), textBlock(f.Text), faintBlock(source))
	}
	if signs := methods.Signs(params, formulas); len(signs) > 0 {
		out = append(out, partBlock("Signs in the formulas"))
		for _, s := range signs {
			out = append(out, textBlock(s.Sign+": "+s.Words))
		}
	}
	if len(measured) > 0 {
		var titles []string
		for _, k := range measured {
			titles = append(titles, k.Title)
		}
		out = append(out, partBlock("Without a formula"), textBlock("Measured on the layers or found by fitting: "+strings.Join(titles, "; ")+"."))
	}
	return out
}
