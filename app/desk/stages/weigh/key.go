package weigh

import (
	"errors"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring/criteria"
)

// criterion finds how a consequence is weighed; ok is false for one that is not scored. The quotient of a
// burden stands on the burden, and the ends of its scale are its own.
func criterion(cat *study.Catalog, key string) (c criteria.Criterion, ok bool) {
	c, ok = cat.Criterion(key)
	if !ok {
		if c, ok = cat.Criterion(strings.TrimSuffix(key, criteria.BurdenSuffix)); ok {
			c.Worst, c.Best = criteria.Anchor{Ask: true}, criteria.Anchor{}
		}
	}
	return c, ok && c.Better != criteria.Neither
}

// ends gives the ends of a key's value scale in force, as typed; empty for one that is not set.
func ends(snap *study.Snapshot, key string) (worst, best string) {
	c, _ := criterion(snap.Catalog(), key)
	one := func(side string, a criteria.Anchor) string {
		if x, ok := snap.Number("anchor." + key + "." + side); ok {
			return strconv.FormatFloat(x, 'g', -1, 64)
		}
		if a.Ask {
			return ""
		}
		return strconv.FormatFloat(a.X, 'g', -1, 64)
	}
	return one("worst", c.Worst), one("best", c.Best)
}

// addable lists what can be scored and that no voice weighs yet.
func addable(s *stage) []run.KeyInfo {
	v := s.c.View()
	taken := map[string]bool{}
	if v.Board != nil {
		for _, k := range v.Board.Keys {
			taken[k.Info.Key] = true
		}
		for k := range v.Board.Unready {
			taken[k] = true
		}
	}
	var out []run.KeyInfo
	for _, k := range s.c.Parts.Params.Keys() {
		if _, ok := criterion(s.c.Parts.Catalog, k.Key); ok && !taken[k.Key] {
			out = append(out, k)
		}
	}
	return out
}

// keyChoice is a list of consequences with a filter.
type keyChoice struct {
	all, shown []run.KeyInfo
	at         int // chosen, -1 for none
	filter     *widget.Entry
	list       *widget.List
	sentence   *widget.Label
	box        *fyne.Container
}

func newKeyChoice(all []run.KeyInfo) *keyChoice {
	k := &keyChoice{all: all, shown: all, at: -1, filter: widget.NewEntry(), sentence: widgets.NewText("Choose a consequence.")}
	k.filter.SetPlaceHolder("Find by a word")
	k.list = widget.NewList(func() int { return len(k.shown) },
		func() fyne.CanvasObject {
			return container.New(inset{right: 12}, container.NewBorder(nil, nil, nil, widgets.Faint("neighbours").Wide(), widgets.NewLine("")))
		},
		func(i int, o fyne.CanvasObject) {
			row := o.(*fyne.Container).Objects[0].(*fyne.Container)
			row.Objects[0].(*widgets.Line).Set(k.shown[i].Title)
			row.Objects[1].(*widgets.Line).Set(string(k.shown[i].Account))
		})
	k.list.OnSelected = func(i int) {
		k.at = i
		k.sentence.SetText(k.shown[i].Sentence + " It is given " + unitPhrase(k.shown[i].Unit) + ".")
	}
	k.filter.OnChanged = func(text string) {
		k.shown, k.at = nil, -1
		for _, info := range k.all {
			if strings.Contains(strings.ToLower(info.Title+" "+string(info.Account)+" "+info.Key), strings.ToLower(strings.TrimSpace(text))) {
				k.shown = append(k.shown, info)
			}
		}
		k.list.UnselectAll()
		k.list.Refresh()
		if len(k.shown) == 1 {
			k.list.Select(0)
		}
	}
	k.box = container.NewBorder(k.filter, k.sentence, nil, nil, k.list)
	return k
}

// askKey lets the user choose what else to weigh.
func askKey(s *stage) {
	if s.c.Voice() == "" {
		s.c.Fail("weigh a consequence", errors.New("there is no voice yet; add one first"))
		return
	}
	choice := newKeyChoice(addable(s))
	d := dialog.NewCustomConfirm("Weigh another consequence", "Weigh it", "Cancel", choice.box, func(ok bool) {
		if ok && choice.at >= 0 {
			addKey(s, choice.shown[choice.at].Key)
		}
	}, s.c.Window)
	d.Resize(fyne.NewSize(520, 430))
	d.Show()
	s.c.Window.Canvas().Focus(choice.filter)
}

// addKey weighs a consequence with 50 points, after asking for the ends of its scale where they are not
// set.
func addKey(s *stage, key string) {
	title := s.c.Info(key).Title
	weight := study.SettingEdit{Key: "voice." + s.c.Voice() + ".weight." + key, Value: "50", Reason: "weighed in the window"}
	if worst, best := ends(s.c.View().Snap, key); worst != "" && best != "" {
		s.c.Set("weigh "+title, "weigh "+title, weight)
		return
	}
	newScaleForm(s, key, weight).show("Weigh it", false)
}

// askScale asks for the ends of the value scale of a key that is weighed.
func askScale(s *stage, key string) { newScaleForm(s, key).show("Set the ends", true) }

// scaleForm asks for worst and best.
type scaleForm struct {
	s           *stage
	key         string
	better      criteria.Better
	worst, best *widget.Entry
	also        []study.SettingEdit
}

func newScaleForm(s *stage, key string, also ...study.SettingEdit) *scaleForm {
	c, _ := criterion(s.c.Parts.Catalog, key)
	f := &scaleForm{s: s, key: key, better: c.Better, worst: widget.NewEntry(), best: widget.NewEntry(), also: also}
	worst, best := ends(s.c.View().Snap, key)
	f.worst.SetText(worst)
	f.best.SetText(best)
	f.worst.Validator = func(text string) error { _, err := readEnd(text); return err }
	f.best.Validator = func(text string) error {
		b, err := readEnd(text)
		if err != nil {
			return err
		}
		if w, err := readEnd(f.worst.Text); err == nil {
			return checkEnds(w, b, f.better)
		}
		return nil
	}
	f.worst.OnChanged = func(string) { _ = f.best.Validate() } // shows its complaint itself
	return f
}

func readEnd(text string) (float64, error) {
	x, err := strconv.ParseFloat(strings.Replace(strings.TrimSpace(text), ",", ".", 1), 64)
	if err != nil {
		return 0, errors.New("type a number")
	}
	return x, nil
}

// checkEnds reports ends that are equal or stand the wrong way round.
func checkEnds(worst, best float64, better criteria.Better) error {
	switch {
	case worst == best:
		return errors.New("worst and best must differ")
	case better == criteria.Less && best > worst, better == criteria.More && best < worst:
		return errors.New("the wrong way round: " + betterWords(better))
	}
	return nil
}

var workNote = regexp.MustCompile(`\s*\[[^\]]*\]`)

// endsSource writes where the shipped ends of a scale come from. Notes in brackets point into the working
// papers of the program; what of them counts for a reader is whether a source was read.
func endsSource(text string) string {
	out := workNote.ReplaceAllString(text, "")
	for _, unread := range []string{"[memory]", "MEM", "no source read"} {
		if strings.Contains(text, unread) {
			return out + "; " + present.Provenance("memory")
		}
	}
	return out
}

func (f *scaleForm) show(yes string, removable bool) {
	info := f.s.c.Info(f.key)
	c, _ := criterion(f.s.c.Parts.Catalog, f.key)
	sentence := info.Sentence + " Fix the ends beforehand, from what could happen here, not from the candidates at hand: the change from worst to best is what the weight stands for."
	if c.AnchorSource != "" && !c.Worst.Ask && !c.Best.Ask {
		sentence += fmt.Sprintf(" As shipped: %s to %s (%s).", present.Figure(c.Worst.X, 0, 0), amount(c.Best.X, info.Unit), endsSource(c.AnchorSource))
	}
	unit := unitPhrase(info.Unit)
	form := widget.NewForm(widget.NewFormItem("Worst", f.worst), widget.NewFormItem("Best", f.best))
	form.Items[0].HintText = unit
	form.Items[1].HintText = unit + "; " + betterWords(f.better)
	body := container.NewVBox(widgets.NewText(sentence), form)
	var d *dialog.ConfirmDialog
	if removable {
		stop := widget.NewButton("Stop weighing it, for every voice", func() {
			d.Dismiss()
			f.stop()
		})
		body.Add(container.NewHBox(stop))
	}
	d = dialog.NewCustomConfirm(info.Title+": value scale", yes, "Cancel", body, func(ok bool) {
		if ok {
			f.save()
		}
	}, f.s.c.Window)
	d.Resize(fyne.NewSize(480, 330))
	d.Show()
	f.s.c.Window.Canvas().Focus(f.worst)
}

func (f *scaleForm) save() {
	info := f.s.c.Info(f.key)
	worst, err := readEnd(f.worst.Text)
	best, err2 := readEnd(f.best.Text)
	if err = errors.Join(err, err2); err == nil {
		err = checkEnds(worst, best, f.better)
	}
	if err != nil {
		f.s.c.Fail("set the value scale of "+info.Title, err)
		return
	}
	form := func(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
	edits := append([]study.SettingEdit{
		{Key: "anchor." + f.key + ".worst", Value: form(worst), Reason: "set in the window"},
		{Key: "anchor." + f.key + ".best", Value: form(best), Reason: "set in the window"},
	}, f.also...)
	f.s.c.Set("set the value scale of "+info.Title, "value scale of "+info.Title, edits...)
}

// stop takes the weights of the key out of every voice.
func (f *scaleForm) stop() {
	var edits []study.SettingEdit
	for key := range f.s.c.View().Snap.Explicit {
		if strings.HasPrefix(key, "voice.") && strings.HasSuffix(key, ".weight."+f.key) {
			edits = append(edits, study.SettingEdit{Key: key, Reason: "no longer weighed"})
		}
	}
	slices.SortFunc(edits, func(a, b study.SettingEdit) int { return strings.Compare(a.Key, b.Key) })
	title := f.s.c.Info(f.key).Title
	f.s.c.Set("stop weighing "+title, "stop weighing "+title, edits...)
}
