package ground

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/study"
)

// sitesPane makes sites of several parcels and parts them again.
type sitesPane struct {
	c       *core.Core
	content fyne.CanvasObject

	parcels []string // gathered for a site
	said    *widgets.Line
	number  *widget.Entry
	name    *widget.Entry
	reason  *widget.Entry
	chosen  *widget.Button
	clear   *widget.Button
	make    *widget.Button
	column  *widget.Select
	byValue *widget.Button
	list    *widget.List
	head    *widgets.Line

	groups []study.Group
	ofCols string // parcel layers that the columns were read of
}

func newSitesPane(c *core.Core) *sitesPane {
	p := &sitesPane{c: c, said: widgets.NewLine(""), number: widget.NewEntry(), name: widget.NewEntry(), reason: widget.NewEntry(), head: widgets.Part("")}
	box := widget.NewButton("Take the box of the map", func() {
		if ids := c.Boxed(); len(ids) > 0 {
			p.gather(ids)
		} else {
			c.Tell("There is no box yet. Hold Shift and drag on the map to draw one.")
		}
	})
	p.chosen = widget.NewButton("Take the chosen sites", func() {
		var ids []string
		for _, cand := range c.Chosen() {
			ids = append(ids, cand.Parcels...)
		}
		p.gather(ids)
	})
	p.clear = widget.NewButton("Clear", func() { p.parcels = nil; p.tell() })
	p.clear.Importance = widget.LowImportance
	p.number.SetPlaceHolder("Parcel numbers, parted by commas")
	p.number.OnSubmitted = func(text string) {
		var ids []string
		for _, s := range strings.Split(text, ",") {
			if s = strings.TrimSpace(s); s != "" {
				ids = append(ids, s)
			}
		}
		p.number.SetText("")
		p.gather(ids)
	}
	add := widget.NewButton("Add", func() { p.number.OnSubmitted(p.number.Text) })
	p.name.SetPlaceHolder("Name of the site")
	p.name.OnChanged = func(string) { p.tell() }
	p.reason.SetPlaceHolder("Reason, for the journal")
	p.make = widget.NewButton("Make one site", p.makeSite)
	p.make.Importance = widget.HighImportance
	p.column = widget.NewSelect(nil, func(string) { p.byValue.Enable() })
	p.column.PlaceHolder = "Column of the parcels"
	p.byValue = widget.NewButton("Group by it", p.groupBy)
	p.byValue.Disable()
	p.list = widget.NewList(func() int { return len(p.groups) }, func() fyne.CanvasObject { return newGroupCell(p) },
		func(i widget.ListItemID, o fyne.CanvasObject) { o.(*groupCell).show(p.groups[i]) })
	p.list.HideSeparators = true
	p.list.OnSelected = func(i widget.ListItemID) {
		p.list.UnselectAll()
		c.ShowParcels(p.groups[i].Parcels)
	}
	head := container.NewVBox(
		widgets.Part("One site of several parcels").Hinted("By default each parcel is a site. Grouped parcels are fitted and weighed as one."),
		container.NewBorder(nil, nil, container.NewHBox(box, p.chosen), p.clear),
		container.NewBorder(nil, nil, nil, add, p.number),
		p.said,
		gap(2),
		container.NewGridWithColumns(2, p.name, p.reason),
		container.NewHBox(p.make),
		gap(12),
		widgets.Part("Sites by the value of a column").Hinted("Parcels with the same value become one site; parcels without a value stay alone. Personal columns are not offered, since their values would become names of sites."),
		container.NewBorder(nil, nil, nil, p.byValue, p.column),
		gap(12),
		p.head,
	)
	p.content = padded(container.NewBorder(head, nil, nil, nil, p.list))
	p.changed(core.StudyChanged | core.SelectionChanged)
	return p
}

func (p *sitesPane) changed(ch core.Change) {
	v := p.c.View()
	if ch&core.SelectionChanged != 0 {
		if len(p.c.Chosen()) > 0 {
			p.chosen.Enable()
		} else {
			p.chosen.Disable()
		}
	}
	if ch&core.StudyChanged != 0 {
		p.groups = v.Snap.Groups
		switch n := len(p.groups); n {
		case 0:
			p.head.Set("No site of several parcels yet")
		default:
			p.head.Set(core.Counted(n, "site of several parcels", "sites of several parcels"))
		}
		p.list.Refresh()
		p.readColumns(v.Snap)
	}
	p.tell()
}

// readColumns reads which columns the parcels have, when the parcels are others than before.
func (p *sitesPane) readColumns(snap *study.Snapshot) {
	layers := snap.LayersOf("parcels")
	key := ""
	for _, l := range layers {
		key += l.Digest + " " + strings.Join(l.Personal, ",") + "\n"
	}
	if key == p.ofCols {
		return
	}
	p.ofCols = key
	store := p.c.Session.Study().Store()
	go func() {
		var names []string
		personal := map[string]bool{}
		var failed error
		for _, l := range layers {
			v, _, err := store.Version(context.Background(), l.Digest)
			if err != nil {
				failed = err
				continue
			}
			for _, c := range v.Layer.Columns {
				if c.Personal || slices.Contains(l.Personal, c.Name) {
					personal[c.Name] = true
				}
				if !slices.Contains(names, c.Name) && c.Name != l.Match["parcel_id"] {
					names = append(names, c.Name)
				}
			}
		}
		names = slices.DeleteFunc(names, func(n string) bool { return personal[n] })
		p.c.Do(func() {
			if p.ofCols != key {
				return
			}
			p.c.Fail("read the columns of the parcels", failed)
			p.column.SetOptions(names)
			if !slices.Contains(names, p.column.Selected) {
				p.column.ClearSelected()
				p.byValue.Disable()
			}
		})
	}()
}

// gather adds parcels to those of the site to be; unknown ones are named.
func (p *sitesPane) gather(ids []string) {
	x := p.c.View().Index
	seen := make(map[string]bool, len(p.parcels)+len(ids))
	for _, id := range p.parcels {
		seen[id] = true
	}
	var unknown []string
	for _, id := range ids {
		if x != nil {
			if _, ok := x.SiteOfParcel(id); !ok {
				unknown = append(unknown, id)
				continue
			}
		}
		if !seen[id] {
			seen[id] = true
			p.parcels = append(p.parcels, id)
		}
	}
	if len(unknown) > 0 {
		p.c.Tell("There is no parcel " + some(unknown, 5) + ".")
	}
	if len(p.parcels) > 0 {
		p.c.ShowParcels(slices.Clone(p.parcels))
	}
	p.tell()
}

// some lists the first few names, and how many more there are.
func some(names []string, most int) string {
	if len(names) <= most {
		return strings.Join(names, ", ")
	}
	return strings.Join(names[:most], ", ") + " and " + core.Count(len(names)-most) + " more"
}

// tell says which parcels are gathered.
func (p *sitesPane) tell() {
	switch {
	case len(p.parcels) == 0:
		p.said.Set("No parcel gathered yet. Shift-drag on the map draws a box.")
		p.clear.Disable()
	default:
		p.said.Set(fmt.Sprintf("%s: %s", core.Counted(len(p.parcels), "parcel", "parcels"), some(p.parcels, 12)))
		p.clear.Enable()
	}
	if len(p.parcels) > 1 && strings.TrimSpace(p.name.Text) != "" {
		p.make.Enable()
	} else {
		p.make.Disable()
	}
}

func (p *sitesPane) makeSite() {
	name, ids, reason := strings.TrimSpace(p.name.Text), slices.Clone(p.parcels), strings.TrimSpace(p.reason.Text)
	p.c.Edit("make one site", func(ctx context.Context, s *study.Study) error {
		_, err := s.GroupParcels(ctx, name, ids, reason)
		return err
	}, func() {
		p.parcels = nil
		p.name.SetText("")
		p.reason.SetText("")
		p.tell()
		p.c.Tell(fmt.Sprintf("%s is one site of %s.", name, core.Counted(len(ids), "parcel", "parcels")))
	})
}

func (p *sitesPane) groupBy() {
	column, made := p.column.Selected, 0
	p.c.Edit("group the parcels", func(ctx context.Context, s *study.Study) error {
		groups, err := s.GroupBy(ctx, column, "grouped by "+column)
		made = len(groups)
		return err
	}, func() {
		if made == 0 {
			p.c.Tell("No two parcels have the same value in " + column + ", so there is nothing to group.")
			return
		}
		p.c.Tell(core.Counted(made, "site was", "sites were") + " made by " + column + ".")
	})
}

func (p *sitesPane) part(site string) {
	p.c.Edit("part the site", func(ctx context.Context, s *study.Study) error {
		return s.Ungroup(ctx, site, "parted in the window")
	}, func() { p.c.Tell("The parcels of " + site + " stand alone again.") })
}

// groupCell is one row of the list of groups.
type groupCell struct {
	widget.BaseWidget
	all     *fyne.Container
	name    *widgets.Line
	parcels *widgets.Line
	group   study.Group
}

func newGroupCell(p *sitesPane) *groupCell {
	g := &groupCell{name: widgets.NewLine(""), parcels: widgets.Faint("")}
	g.name.Bold = true
	show := widget.NewButton("Show on the map", func() { p.c.ShowParcels(g.group.Parcels) })
	part := widget.NewButton("Part again", func() { p.part(g.group.Site) })
	show.Importance, part.Importance = widget.LowImportance, widget.LowImportance
	g.all = container.New(layout.NewCustomPaddedLayout(0, 0, 0, 14), container.NewBorder(nil, nil, nil, container.NewHBox(container.NewCenter(show), container.NewCenter(part)), container.NewVBox(g.name, g.parcels)))
	g.ExtendBaseWidget(g)
	return g
}

// CreateRenderer implements fyne.Widget.
func (g *groupCell) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(g.all) }

func (g *groupCell) show(group study.Group) {
	g.group = group
	g.name.Set(group.Site)
	g.parcels.Set(core.Counted(len(group.Parcels), "parcel", "parcels") + ": " + some(group.Parcels, 12))
}
