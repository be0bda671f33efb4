package ground

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
)

// Stage is the pane with layers, what is missing, sites of several parcels, values typed by hand.
type Stage struct {
	c    *core.Core
	tabs *widgets.Tabs

	layers  *layersPane
	missing *missingPane
	sites   *sitesPane
	typed   *typedPane
	left    *leftPane

	noted *noted

	queue []job // files that wait to be read
	busy  bool  // one of them is being read or asked about
	form  *form // the questions that are shown; nil when none are
}

// New makes the stage.
func New(c *core.Core) *Stage { return &Stage{c: c} }

// Title implements core.Stage.
func (s *Stage) Title() string { return "Ground" }

// State implements core.Stage.
func (s *Stage) State() (first, second string, warn bool) {
	v := s.c.View()
	if v == nil {
		return "", "", false
	}
	n := s.notices().warm
	first = core.Counted(len(v.Snap.Layers), "layer", "layers")
	if n == 0 {
		return first, "", false
	}
	return first, core.Counted(n, "thing to look at", "things to look at"), true
}

// notices gives the notices of the present view, sorted once.
func (s *Stage) notices() *noted {
	if v := s.c.View(); s.noted == nil || s.noted.view != v {
		s.noted = sortNotices(v)
	}
	return s.noted
}

// Content implements core.Stage.
func (s *Stage) Content() fyne.CanvasObject {
	s.tabs = widgets.NewTabs(
		widgets.Tab{Text: "Layers", Make: func() fyne.CanvasObject { s.layers = newLayersPane(s); return s.layers.content }},
		widgets.Tab{Text: "Missing", Make: func() fyne.CanvasObject { s.missing = newMissingPane(s.c); return s.missing.content }},
		widgets.Tab{Text: "Sites", Make: func() fyne.CanvasObject { s.sites = newSitesPane(s.c); return s.sites.content }},
		widgets.Tab{Text: "Typed values", Make: func() fyne.CanvasObject { s.typed = newTypedPane(s.c); return s.typed.content }},
		widgets.Tab{Text: "Land left", Make: func() fyne.CanvasObject { s.left = newLeftPane(s.c); return s.left.content }},
	)
	return container.New(layout.NewCustomPaddedLayout(12, 4, 12, 8), container.NewBorder(widgets.Heading(s.Title()), nil, nil, nil, s.tabs))
}

// Changed implements core.Stage.
func (s *Stage) Changed(ch core.Change) {
	if ch&(core.StudyChanged|core.SelectionChanged) == 0 || s.c.View() == nil {
		return
	}
	if s.sites != nil {
		s.sites.changed(ch)
	}
	if ch&core.StudyChanged == 0 {
		return
	}
	if s.layers != nil {
		s.layers.changed()
	}
	if s.missing != nil {
		s.missing.changed()
	}
	if s.typed != nil {
		s.typed.changed()
	}
	if s.left != nil {
		s.left.changed()
	}
}

// dialogSize fits a dialog into the window.
func dialogSize(c *core.Core, width, height float32) fyne.Size {
	s := c.Window.Canvas().Size()
	return fyne.NewSize(min(width, s.Width-32), min(height, s.Height-32))
}

// padded gives a pane room at its edges.
func padded(o fyne.CanvasObject) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedLayout(6, 0, 0, 0), o)
}

// gap is a calm distance between parts.
func gap(height float32) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedLayout(height, 0, 0, 0))
}
