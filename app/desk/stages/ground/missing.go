package ground

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
	"unicode"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
)

// missingRole is a role without a layer.
type missingRole struct {
	role    study.Role
	without string // what is unknown, in words
	waiting int    // weighed consequences that wait for it
}

// missingPane lists the roles without a layer, those first for which most weighed consequences wait.
type missingPane struct {
	c       *core.Core
	content fyne.CanvasObject
	list    *widget.List
	head    *widgets.Line
	copy    *widget.Button

	of    *live.View // the view that rows were asked of
	roles []missingRole
}

func newMissingPane(c *core.Core) *missingPane {
	p := &missingPane{c: c, head: widgets.Faint("")}
	p.copy = widget.NewButton("Copy request list", func() {
		c.App.Clipboard().SetContent(requestList(c.View().Snap.Text("study.name"), p.roles))
		c.Tell("The request list was copied. Paste it into a letter or a mail.")
	})
	p.list = widget.NewList(func() int { return len(p.roles) }, func() fyne.CanvasObject { return newMissingCell() },
		func(i widget.ListItemID, o fyne.CanvasObject) { o.(*missingCell).show(p.roles[i]) })
	p.list.HideSeparators = true
	p.list.OnSelected = func(widget.ListItemID) { p.list.UnselectAll() }
	p.content = padded(container.NewBorder(container.NewVBox(container.NewHBox(p.copy), gap(2), p.head), nil, nil, nil, p.list))
	p.changed()
	return p
}

// changed asks anew what is missing; sorting looks at candidates and so happens in the background.
func (p *missingPane) changed() {
	v := p.c.View()
	if p.of != nil && p.of.Snap == v.Snap && p.of.Results == v.Results {
		return
	}
	p.of = v
	params := p.c.Parts.Params
	go func() {
		roles := missingRoles(v, params)
		p.c.Do(func() {
			if p.of != v {
				return
			}
			p.roles = roles
			if len(roles) == 0 {
				p.head.Set("Every role has a layer.")
				p.copy.Disable()
			} else {
				p.head.Set(fmt.Sprintf("%s without a layer, the most weighed first.", core.Counted(len(roles), "role", "roles")))
				p.copy.Enable()
			}
			p.list.Refresh()
		})
	}()
}

// looked is how many candidates of each plant option are looked at for what waits: a role that is missing
// is missing for all of them.
const looked = 100

// missingRoles gives the roles without a layer, those first for which most weighed consequences wait.
func missingRoles(v *live.View, params *run.Params) []missingRole {
	have := map[string]bool{}
	for _, l := range v.Snap.Layers {
		have[l.Role] = true
	}
	titles := map[string]string{}
	for _, k := range params.Keys() {
		titles[k.Key] = k.Title
	}
	weighed := weighedKeys(v.Snap)
	waits := map[string]map[string]bool{} // by role: weighed keys
	wait := func(role, key string) {
		if waits[role] == nil {
			waits[role] = map[string]bool{}
		}
		waits[role][key] = true
	}
	if v.Results != nil {
		seen := map[string]int{}
		for i := range v.Results.Candidates {
			c := &v.Results.Candidates[i]
			if c.Status != run.Fitted || seen[c.Plant] == looked {
				continue
			}
			seen[c.Plant]++
			for key := range weighed {
				q, ok := c.Consequence(key)
				if list, no := strings.CutPrefix(q.Why, "no_layer:"); ok && no && q.State == scoring.Unknown {
					for _, role := range strings.Split(list, "|") {
						wait(role, key)
					}
				}
			}
		}
	}
	var out []missingRole
	for _, r := range v.Snap.Catalog().Roles {
		if have[r.Name] {
			continue
		}
		for _, word := range words(r.WithoutIt) {
			if weighed[word] {
				wait(r.Name, word)
			}
		}
		out = append(out, missingRole{role: r, without: titled(r.WithoutIt, titles), waiting: len(waits[r.Name])})
	}
	slices.SortStableFunc(out, func(a, b missingRole) int { return cmp.Compare(b.waiting, a.waiting) })
	return out
}

// weighedKeys gives the consequences to which some voice gives weight.
func weighedKeys(snap *study.Snapshot) map[string]bool {
	out := map[string]bool{}
	for key := range snap.Explicit {
		if parts := strings.Split(key, "."); len(parts) == 4 && parts[0] == "voice" && parts[2] == "weight" {
			if x, ok := snap.Number(key); ok && x > 0 {
				out[parts[3]] = true
			}
		}
	}
	return out
}

func noKey(r rune) bool { return r != '_' && !unicode.IsLetter(r) && !unicode.IsDigit(r) }

func words(text string) []string { return strings.FieldsFunc(text, noKey) }

// titled puts titles in place of the keys of consequences.
func titled(text string, titles map[string]string) string {
	var b strings.Builder
	for text != "" {
		n := strings.IndexFunc(text, noKey)
		if n < 0 {
			n = len(text)
		}
		word := text[:n]
		if t, ok := titles[word]; ok && strings.Contains(word, "_") {
			word = strings.ToLower(t[:1]) + t[1:]
		}
		b.WriteString(word)
		text = text[n:]
		m := strings.IndexFunc(text, func(r rune) bool { return !noKey(r) })
		if m < 0 {
			m = len(text)
		}
		b.WriteString(text[:m])
		text = text[m:]
	}
	return b.String()
}

// requestList writes what is missing as a plain text, to be sent to those who hold it.
func requestList(name string, roles []missingRole) string {
	var b strings.Builder
	fmt.Fprintf(&b, "Data wanted for the study %s\n", cmp.Or(name, "(without a name)"))
	for i, r := range roles {
		fmt.Fprintf(&b, "\n%d. %s\n", i+1, r.role.Title)
		fmt.Fprintf(&b, "   What it is: %s\n", r.role.Purpose)
		fmt.Fprintf(&b, "   Usual holder: %s\n", r.role.Holder)
		fmt.Fprintf(&b, "   Wanted as: %s\n", geometryWords(r.role))
		var fields []string
		for _, f := range r.role.Fields {
			if f.Personal {
				continue
			}
			text := strings.ReplaceAll(f.Name, "_", " ")
			if f.Physical() {
				text += " (" + f.Unit + ")"
			}
			if f.Required {
				text += ", needed"
			}
			fields = append(fields, text)
		}
		fmt.Fprintf(&b, "   With: %s\n", strings.Join(fields, "; "))
		fmt.Fprintf(&b, "   Without it: %s\n", r.without)
	}
	return b.String()
}

// geometryWords says of what a layer of a role may be made.
func geometryWords(r study.Role) string {
	var out []string
	for _, g := range r.Geometry {
		if k, ok := kinds[g]; ok {
			out = append(out, k[1])
		}
	}
	return strings.Join(out, " or ")
}

// missingCell is one row of the list.
type missingCell struct {
	widget.BaseWidget
	all, head       *fyne.Container
	rule            *canvas.Rectangle
	title, waiting  *widgets.Line
	without, holder *widgets.Paragraph
}

func newMissingCell() *missingCell {
	c := &missingCell{rule: canvas.NewRectangle(widgets.Colour(theme.Rule)), title: widgets.Part(""), waiting: widgets.Faint("").Wide(), without: widgets.NewParagraph("", 2), holder: widgets.NewParagraph("", 1)}
	c.rule.SetMinSize(fyne.NewSize(1, 1))
	c.holder.Colour = theme.Faint
	c.head = container.NewBorder(nil, nil, nil, c.waiting, c.title)
	c.all = container.New(layout.NewCustomPaddedLayout(0, 6, 0, 14), container.NewVBox(c.rule, c.head, c.holder, c.without))
	c.ExtendBaseWidget(c)
	return c
}

// CreateRenderer implements fyne.Widget.
func (c *missingCell) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(c.all) }

func (c *missingCell) show(r missingRole) {
	c.rule.FillColor = widgets.Colour(theme.Rule)
	c.title.Hint = r.role.Purpose
	c.title.Set(r.role.Title)
	if r.waiting > 0 {
		c.waiting.SetLook(core.Counted(r.waiting, "weighed consequence waits", "weighed consequences wait"), theme.Warm, false)
	} else {
		c.waiting.SetLook("nothing weighed waits", theme.Faint, false)
	}
	c.without.Set("Without it: " + r.without)
	c.holder.Set("Usually held by: " + r.role.Holder)
	c.head.Refresh()
}
