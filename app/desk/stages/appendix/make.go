package appendix

import (
	"context"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	page "groundtally/app/appendix"
	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
)

// makePane makes the appendix, opens it, verifies results.
type makePane struct {
	s       *Stage
	content fyne.CanvasObject
	scroll  *container.Scroll

	rows     *fyne.Container
	heads    []*headEntry
	saveHead *widget.Button
	code     *widgets.Line
	folder   *widget.Entry
	choose   *widget.Button
	make     *widget.Button
	said     *widgets.Paragraph
	progress *progressLine
	where    *widgets.Paragraph
	look     *widget.Button
	show     *widget.Button
	with     *widget.Check
	verify   *widget.Button
	checking *progressLine
	verdict  *verdict

	path     string          // study that the folder belongs to
	verified *study.Snapshot // state that the verdict is of
}

// headEntry is one setting that stands at the head of the appendix.
type headEntry struct {
	key   string
	entry *widget.Entry
	saved string
}

func newMakePane(s *Stage) *makePane {
	p := &makePane{s: s, code: widgets.NewLine(""), folder: widget.NewEntry(), said: widgets.NewParagraph("", 1), where: widgets.NewParagraph("", 3), progress: newProgressLine(), checking: newProgressLine(), verdict: newVerdict()}
	c := s.c
	p.said.Colour = theme.Faint
	rows := container.New(pairs{label: 110})
	p.rows = rows
	for _, h := range [][2]string{{"study.name", "Title"}, {"study.author", "Author"}, {"study.place", "Place"}} {
		d, _ := c.Parts.Catalog.Definition(h[0])
		e := &headEntry{key: h[0], entry: widget.NewEntry()}
		e.entry.SetPlaceHolder("not given")
		e.entry.OnChanged = func(string) { p.changed() }
		e.entry.OnSubmitted = func(string) { p.keepHead() }
		p.heads = append(p.heads, e)
		rows.Add(widgets.NewLine(h[1]).Hinted(d.What))
		rows.Add(e.entry)
	}
	p.saveHead = widget.NewButton("Save title, author and place", p.keepHead)
	rows.Add(widgets.NewLine(""))
	rows.Add(container.NewHBox(p.saveHead))
	rows.Add(widgets.NewLine("Check code").Hinted("A digest over inputs, settings, editions and results. Who verifies the study later gets the same one."))
	rows.Add(p.code)
	rows.Add(widgets.NewLine("Folder").Hinted("The page and its check code are written into it."))
	p.choose = widget.NewButton("Choose…", p.chooseFolder)
	p.folder.SetPlaceHolder("where the appendix goes")
	p.folder.OnChanged = func(string) { p.changed() }
	rows.Add(container.NewBorder(nil, nil, nil, p.choose, p.folder))

	p.make = widget.NewButton("Make the appendix", p.doMake)
	p.make.Importance = widget.HighImportance
	p.look = widget.NewButton("Look at it", func() { p.openFile(filepath.Join(s.lastMade().Folder, page.PageFile)) })
	p.show = widget.NewButton("Show the folder", func() { p.openFile(s.lastMade().Folder) })

	p.with = widget.NewCheck("Compare with the appendix in the folder as well", nil)
	p.verify = widget.NewButton("Verify", p.doVerify)
	engines := container.NewVBox(widgets.Faint("Reckoned with " + program.Version + ", " + editions()))
	for _, e := range c.Parts.Engines {
		engines.Add(widgets.Faint(e))
	}

	cautions := container.NewVBox()
	for _, text := range page.Cautions() {
		cautions.Add(widgets.NewText(text))
	}
	missing := "Not assessed, whatever the data: " + strings.Join(page.NotAssessed(), "; ") + "."
	body := container.NewVBox(
		rows,
		container.NewHBox(p.make, p.look, p.show),
		p.said, p.progress.box, p.where,
		gap(2),
		widgets.Part("Verify").Hinted("The study is computed anew from its inputs, without any stored result, and compared."),
		widgets.NewParagraph("Computes everything anew and compares it with the stored results.", 1),
		p.with,
		container.NewHBox(p.verify),
		p.checking.box, p.verdict.box, engines,
		gap(8),
		widgets.Part("Printed with it"),
		cautions,
		widgets.NewText(missing),
	)
	p.scroll = container.NewVScroll(container.New(layout.NewCustomPaddedLayout(0, 8, 0, 14), body))
	p.content = padded(p.scroll)
	p.changed()
	return p
}

// editions names the formula editions.
func editions() string {
	e := run.Editions()
	var out []string
	for _, step := range []string{"ground", "fit", "candidate", "order"} {
		out = append(out, fmt.Sprintf("%s %d", step, e[step]))
	}
	return "formula editions: " + strings.Join(out, ", ")
}

// changed shows the present state.
func (p *makePane) changed() {
	s := p.s
	v := s.c.View()
	if p.make == nil || p.verify == nil {
		return // it is being built
	}
	if p.path != v.Path {
		p.path = v.Path
		p.folder.SetText(s.lastMade().Folder)
	}
	if p.verified != v.Snap {
		p.verified = v.Snap
		p.verdict.clear()
	}
	dirty := false
	for _, h := range p.heads {
		now := v.Snap.Text(h.key)
		untouched := h.entry.Text == h.saved
		h.saved = now
		if untouched && h.entry.Text != now {
			h.entry.SetText(now)
		}
		dirty = dirty || strings.TrimSpace(h.entry.Text) != now
	}
	able(p.saveHead, dirty)
	if p.saveHead.Visible() != dirty {
		visible(p.saveHead, dirty)
		p.rows.Refresh()
		p.scroll.Content.Refresh()
	}
	ready := v.Results != nil && v.Current
	said := ""
	switch {
	case v.Problem != nil:
		p.code.SetLook("none: the study cannot be computed yet", theme.Warm, false)
		said = present.Problem(v.Problem)
	case v.Stopped:
		p.code.SetLook("none: the computing was stopped", theme.Warm, false)
	case !ready:
		p.code.SetLook("being computed", theme.Faint, false)
	default:
		p.code.Hint = v.Results.Code.Check
		p.code.SetLook(short(v.Results.Code.Check), toolkit.ColorNameForeground, true)
		if dirty {
			said = "Save title, author and place first."
		} else if strings.TrimSpace(p.folder.Text) == "" {
			said = "Choose a folder first."
		}
	}
	p.said.Set(said)
	visible(p.said, said != "")
	idle := s.job == nil
	able(p.make, ready && idle && !dirty && strings.TrimSpace(p.folder.Text) != "")
	able(p.verify, ready && idle)

	m := s.lastMade()
	for _, o := range []fyne.CanvasObject{p.look, p.show, p.where} {
		visible(o, m.Code != "")
	}
	if m.Code != "" {
		text := fmt.Sprintf("Made at %s in %s: %s kB, check code %s.", core.Clock(m.At, s.now()), m.Folder, core.Count((m.Bytes+999)/1000), short(m.Code))
		colour := toolkit.ColorNameForeground
		if ready && v.Results.Code.Check != m.Code || !ready && v.Results != nil {
			text, colour = "Not made since the last change. "+text, theme.Warm
		}
		p.where.Colour = colour
		p.where.Text = text
		p.where.Refresh()
	}
}

// keepHead saves title, author and place.
func (p *makePane) keepHead() {
	var edits []study.SettingEdit
	for _, h := range p.heads {
		if text := strings.TrimSpace(h.entry.Text); text != h.saved {
			edits = append(edits, study.SettingEdit{Key: h.key, Value: text, Reason: "head of the appendix"})
		}
	}
	if len(edits) > 0 {
		p.s.c.Set("save title, author and place", "head of the appendix", edits...)
	}
}

func (p *makePane) chooseFolder() {
	d := dialog.NewFolderOpen(func(u fyne.ListableURI, err error) {
		switch {
		case err != nil:
			p.s.c.Fail("open the folder", err)
		case u != nil:
			p.folder.SetText(u.Path())
		}
	}, p.s.c.Window)
	size := p.s.c.Window.Canvas().Size()
	d.Resize(fyne.NewSize(min(820, size.Width-32), min(600, size.Height-32)))
	d.Show()
}

// doMake writes the appendix of the results that are shown.
func (p *makePane) doMake() {
	s := p.s
	v := s.c.View()
	folder := strings.TrimSpace(p.folder.Text)
	if v.Results == nil || !v.Current || folder == "" || s.job != nil {
		return
	}
	store, parts := s.c.Session.Study().Store(), s.c.Parts
	in := page.Input{Snapshot: v.Snap, Results: v.Results, Params: parts.Params, Notices: v.Notices, Engines: parts.Engines, Version: program.Version, Journal: v.Journal, Frozen: v.Frozen}
	var out page.Made
	s.making = true
	s.start(p.progress, "Making the appendix", func(ctx context.Context, told func(string, int, int)) (err error) {
		if folder, err = filepath.Abs(folder); err != nil {
			return err
		}
		out, err = page.Make(ctx, in, store, folder, parts.Write, told)
		return err
	}, func(err error) {
		if err != nil {
			s.c.Fail("make the appendix", err)
			if stopped(err) {
				s.c.Tell("Stopped. The appendix was not made.")
			}
			return
		}
		s.remember(made{Code: out.Code.Check, At: s.now(), Folder: folder, Bytes: out.Bytes})
		s.c.Tell("The appendix was made. Check code " + short(out.Code.Check) + ".")
	})
}

// openFile opens a file or folder with what the system has for it.
func (p *makePane) openFile(path string) {
	if _, err := os.Stat(path); err != nil {
		p.s.c.Fail("open the appendix", err)
		return
	}
	p.s.c.Fail("open the appendix", p.s.c.App.OpenURL(fileURL(path)))
}

// fileURL names a file for the system's browser.
func fileURL(path string) *url.URL {
	path = filepath.ToSlash(path)
	if !strings.HasPrefix(path, "/") {
		path = "/" + path // as of a drive
	}
	return &url.URL{Scheme: "file", Path: path}
}

// doVerify computes the study anew and compares.
func (p *makePane) doVerify() {
	s := p.s
	v := s.c.View()
	if v.Results == nil || !v.Current || s.job != nil {
		return
	}
	store := s.c.Session.Study().Store()
	folder := ""
	if p.with.Checked {
		if folder = strings.TrimSpace(p.folder.Text); folder == "" {
			s.c.Fail("verify", &study.FileError{File: "the appendix", What: "no folder is chosen", Cure: "Choose the folder of an appendix, or take the tick away"})
			return
		}
	}
	p.verdict.clear()
	var found []finding
	s.start(p.checking, "Computing anew", func(ctx context.Context, told func(string, int, int)) error {
		var stamp *page.Stamp
		if folder != "" {
			var err error
			if stamp, err = page.ReadStamp(folder); err != nil {
				return err
			}
		}
		fresh, err := s.anew(ctx, v.Snap, store, told)
		if err != nil {
			return err
		}
		verdict, diff := run.Compare(v.Results, fresh)
		if diff == nil && verdict == "identical" && v.Results.Code.Inputs != fresh.Code.Inputs {
			verdict, diff = "", &run.Difference{Where: "inputs or settings", Old: v.Results.Code.Inputs, New: fresh.Code.Inputs}
		}
		found = append(found, finding{"the stored results", verdict, diff, fresh.Code.Check})
		if stamp != nil {
			verdict, diff = stamp.Compare(fresh, program.Version)
			found = append(found, finding{"the appendix", verdict, diff, fresh.Code.Check})
		}
		return nil
	}, func(err error) {
		if err != nil {
			s.c.Fail("verify the study", err)
			if stopped(err) {
				s.c.Tell("Stopped. Nothing was verified.")
			}
			return
		}
		if s.c.View().Snap != v.Snap {
			s.c.Tell("The study was changed meanwhile, so the verdict is not on the present state. Verify again.")
			return
		}
		p.verdict.show(s.c, found)
	})
}

// finding is how fresh results agree with others.
type finding struct {
	with    string
	verdict string
	diff    *run.Difference
	code    string
}

// verdict shows findings.
type verdict struct{ box *fyne.Container }

func newVerdict() *verdict { return &verdict{box: container.NewVBox()} }

func (d *verdict) clear() { d.box.RemoveAll() }

func (d *verdict) show(c *core.Core, found []finding) {
	d.clear()
	for _, f := range found {
		line := widgets.NewLine("")
		line.Bold = true
		d.box.Add(line)
		if f.diff == nil {
			text := "Identical to " + f.with + ", to the last digit."
			if f.verdict == "agrees" {
				text = "Agrees with " + f.with + ": every value within a millionth, the same tiers."
			}
			line.Text = text
			continue
		}
		line.Text, line.Colour = "Differs from "+f.with+".", theme.Warm
		where, unit := inWords(c, f.diff.Where)
		for _, part := range [][2]string{{"First at", where}, {"Expected", measured(f.diff.Old, unit)}, {"Found", measured(f.diff.New, unit)}} {
			text := widgets.NewLine(part[1])
			text.TextSize = 12
			d.box.Add(container.New(pairs{label: 110}, widgets.Faint(part[0]), text))
		}
	}
	if len(found) > 0 {
		d.box.Add(widgets.Faint("Check code " + found[0].code).Hinted(found[0].code))
	}
	d.box.Refresh()
}

// inWords puts the title of a consequence in place of its key at the end of a place, and gives its unit.
func inWords(c *core.Core, where string) (words, unit string) {
	i := strings.LastIndex(where, ", ")
	if i < 0 {
		return where, ""
	}
	if k := c.Info(where[i+2:]); k.Sentence != "" {
		return where[:i+2] + k.Title, present.Unit(k.Unit)
	}
	return where, ""
}

// measured gives low, central and high of a consequence their unit; what are no three numbers stays.
func measured(text, unit string) string {
	parts := strings.Fields(text)
	if len(parts) != 3 {
		return text
	}
	for _, p := range parts {
		if _, err := strconv.ParseFloat(p, 64); err != nil {
			return text
		}
	}
	return strings.TrimSpace(fmt.Sprintf("%s (%s to %s) %s", parts[1], parts[0], parts[2], unit))
}

// pairs lays out labels of fixed width, each with what takes the rest.
type pairs struct{ label float32 }

// shown tells whether a pair is shown; one of a single hidden object takes no room.
func (pairs) shown(o fyne.CanvasObject) bool {
	if box, ok := o.(*fyne.Container); ok && len(box.Objects) == 1 {
		o = box.Objects[0]
	}
	return o.Visible()
}

// MinSize implements fyne.Layout.
func (l pairs) MinSize(objects []fyne.CanvasObject) fyne.Size {
	h := float32(0)
	for i := 0; i+1 < len(objects); i += 2 {
		if l.shown(objects[i+1]) {
			h += max(objects[i].MinSize().Height, objects[i+1].MinSize().Height) + 4
		}
	}
	return fyne.NewSize(l.label+120, h)
}

// Layout implements fyne.Layout.
func (l pairs) Layout(objects []fyne.CanvasObject, s fyne.Size) {
	y := float32(0)
	for i := 0; i+1 < len(objects); i += 2 {
		a, b := objects[i], objects[i+1]
		if !l.shown(b) {
			continue
		}
		h := max(a.MinSize().Height, b.MinSize().Height)
		a.Move(fyne.NewPos(0, y+(h-a.MinSize().Height)/2))
		a.Resize(fyne.NewSize(l.label-8, a.MinSize().Height))
		bh := b.MinSize().Height
		b.Move(fyne.NewPos(l.label, y+(h-bh)/2))
		b.Resize(fyne.NewSize(s.Width-l.label, bh))
		y += h + 4
	}
}
