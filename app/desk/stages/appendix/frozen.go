package appendix

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/app/study"
)

// frozenPane keeps named states and compares them with their check codes.
type frozenPane struct {
	s       *Stage
	content fyne.CanvasObject
	name    *widget.Entry
	freeze  *widget.Button
	said    *widgets.Line
	list    *widget.List
	head    *widgets.Line
	line    *progressLine
	title   *widgets.Line
	verdict *verdict

	waiting string // name under which the present state is frozen once it is computed
	wanted  *study.Snapshot
	shown   []study.Frozen
}

func newFrozenPane(s *Stage) *frozenPane {
	p := &frozenPane{s: s, name: widget.NewEntry(), said: widgets.Faint(""), head: widgets.Part(""), line: newProgressLine(), title: widgets.NewLine(""), verdict: newVerdict()}
	p.name.SetPlaceHolder("Name, as: shown on 3 May")
	p.name.OnChanged = func(string) { p.changed() }
	p.name.OnSubmitted = func(string) { p.ask() }
	p.freeze = widget.NewButton("Freeze the present state", p.ask)
	p.freeze.Importance = widget.HighImportance
	p.list = widget.NewList(func() int { return len(p.shown) }, func() fyne.CanvasObject { return newFrozenCell(p) },
		func(i widget.ListItemID, o fyne.CanvasObject) { o.(*frozenCell).show(p.shown[len(p.shown)-1-i]) })
	p.list.HideSeparators = true
	p.list.OnSelected = func(widget.ListItemID) { p.list.UnselectAll() }
	p.title.Bold = true
	top := container.NewVBox(
		widgets.NewParagraph("A frozen state is a named moment of the study that cannot be changed any more. It can be verified against its check code at any time.", 2),
		gap(2),
		container.NewBorder(nil, nil, nil, p.freeze, p.name),
		p.said, gap(8), p.head)
	foot := container.NewVBox(p.line.box, p.title, p.verdict.box)
	p.content = padded(container.NewBorder(top, foot, nil, nil, p.list))
	p.changed()
	return p
}

func (p *frozenPane) changed() {
	v := p.s.c.View()
	if p.head == nil || p.list == nil {
		return
	}
	p.shown = v.Frozen
	if len(p.shown) == 0 {
		p.head.Set("No frozen state yet")
	} else {
		p.head.Set(core.Counted(len(p.shown), "frozen state", "frozen states"))
	}
	p.list.Refresh()
	if p.waiting != "" && p.wanted != v.Snap {
		p.s.c.Tell("The study was changed, so the state that was to be frozen is gone. Freeze it again.")
		p.waiting = ""
	}
	switch {
	case p.waiting != "" && v.Results != nil && v.Current:
		name := p.waiting
		p.waiting = ""
		p.keep(name)
	case p.waiting != "" && v.Problem != nil:
		p.waiting = ""
	}
	switch {
	case p.waiting != "":
		p.said.SetLook("Waits until the state is computed, then freezes it as "+p.waiting+".", theme.Faint, false)
	case v.Problem != nil:
		p.said.SetLook("The present state cannot be computed yet, so it has no check code.", theme.Warm, false)
	case v.Results != nil && v.Current:
		p.said.SetLook("The present state has the check code "+short(v.Results.Code.Check)+".", theme.Faint, false)
	default:
		p.said.SetLook("The present state is being computed.", theme.Faint, false)
	}
	able(p.freeze, strings.TrimSpace(p.name.Text) != "" && p.waiting == "" && v.Problem == nil)
}

// ask freezes the present state, at once or when it is computed.
func (p *frozenPane) ask() {
	name := strings.TrimSpace(p.name.Text)
	if name == "" || p.waiting != "" {
		return
	}
	p.waiting, p.wanted = name, p.s.c.View().Snap
	if p.s.c.View().Stopped {
		p.s.c.Session.Compute()
	}
	p.changed()
}

// keep freezes the state that is shown, with its check code.
func (p *frozenPane) keep(name string) {
	v := p.s.c.View()
	code := v.Results.Code.Check
	p.s.c.Edit("freeze the state", func(ctx context.Context, s *study.Study) error {
		now, err := s.Snapshot()
		if err != nil {
			return err
		}
		if !study.SameInputs(now, v.Snap) {
			return errors.New("the study was changed meanwhile, and the check code is not that of the present state any more. Freeze it again")
		}
		_, err = s.Freeze(ctx, name, code)
		return err
	}, func() {
		p.name.SetText("")
		p.s.c.Tell(fmt.Sprintf("Frozen: %q, with check code %s.", name, short(code)))
	})
}

// verify computes a frozen state anew and compares it with its check code.
func (p *frozenPane) verify(f study.Frozen) {
	s := p.s
	if s.job != nil {
		return
	}
	store, cat := s.c.Session.Study().Store(), s.c.Parts.Catalog
	p.verdict.clear()
	p.title.Set("")
	var found finding
	s.start(p.line, "Computing "+f.Name+" anew", func(ctx context.Context, told func(string, int, int)) error {
		snap, err := study.NewSnapshot(cat, f.Records)
		if err != nil {
			return err
		}
		fresh, err := s.anew(ctx, snap, store, told)
		if err != nil {
			return err
		}
		found = finding{with: "the frozen state", verdict: "identical", code: fresh.Code.Check}
		if f.Code != fresh.Code.Check {
			found.diff = &run.Difference{Where: "check code", Old: cmp.Or(f.Code, "none: it was frozen before it was computed"), New: fresh.Code.Check}
		}
		return nil
	}, func(err error) {
		if err != nil {
			s.c.Fail("verify the frozen state", err)
			return
		}
		p.title.Set(f.Name)
		p.verdict.show(s.c, []finding{found})
	})
}

// frozenCell is one row of the list.
type frozenCell struct {
	widget.BaseWidget
	all    *fyne.Container
	name   *widgets.Line
	detail *widgets.Line
	verify *widget.Button
	frozen study.Frozen
	p      *frozenPane
}

func newFrozenCell(p *frozenPane) *frozenCell {
	c := &frozenCell{p: p, name: widgets.NewLine(""), detail: widgets.Faint("")}
	c.name.Bold = true
	c.verify = widget.NewButton("Verify", func() { p.verify(c.frozen) })
	c.verify.Importance = widget.LowImportance
	c.all = container.New(layout.NewCustomPaddedLayout(2, 2, 0, 14), container.NewBorder(nil, nil, nil, container.NewCenter(c.verify), container.NewVBox(c.name, c.detail)))
	c.ExtendBaseWidget(c)
	return c
}

// CreateRenderer implements fyne.Widget.
func (c *frozenCell) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(c.all) }

func (c *frozenCell) show(f study.Frozen) {
	c.frozen = f
	c.name.Set(f.Name)
	code := "no check code"
	if f.Code != "" {
		code = "check code " + short(f.Code)
	}
	c.detail.Hint = f.Code
	c.detail.Set(fmt.Sprintf("%s · after change %d · %s", core.Clock(f.At, c.p.s.now()), f.Seq, code))
	able(c.verify, c.p.s.job == nil)
}
