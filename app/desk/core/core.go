package core

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/dialog"

	"groundtally/app/desk/mapview"
	"groundtally/app/desk/theme"
	"groundtally/app/draw"
	"groundtally/app/live"
	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// Change says what changed; several may come together.
type Change uint

// The changes.
const (
	StudyChanged     Change = 1 << iota // the View: settings, layers, journal, results
	RankingChanged                      // the order under the weights shown, saved or tried out
	SelectionChanged                    // the chosen candidates
	ShadeChanged                        // what the map shades by, or the voice
	WorkChanged                         // progress of what is under way
	LookChanged                         // light or dark
	Everything       = ^Change(0)
)

// Stage is one of the five stages of the window.
type Stage interface {
	// Title is the word on the rail.
	Title() string
	// State is what the rail says of the stage in a few words. Warn marks the second line as wanting
	// attention.
	State() (first, second string, warn bool)
	// Content makes the pane; it is called once, when the stage is first shown.
	Content() fyne.CanvasObject
	// Changed tells the stage what changed. It is called on the window's goroutine, also before Content was.
	Changed(Change)
}

// MostChosen is how many candidates can stand side by side.
const MostChosen = 4

// Core is shared by everything in one window on one study. It may be used on the window's goroutine alone,
// but for what is said to be free of it.
type Core struct {
	App     fyne.App
	Window  fyne.Window
	Parts   *program.Parts
	Session *live.Session
	Theme   *theme.Theme

	// Do runs something on the window's goroutine; the way back from any other. What comes after another
	// study was opened in the window falls away.
	Do func(func())
	// Always is Do for what must be said in any case, as that an edit was not saved.
	Always func(func())

	// Hooks that the window sets.
	ShowParcels func(ids []string)               // brings parcels into view on the map and marks them
	ShowPlace   func(at geo.LonLat)              // brings a place into view on the map
	ShowStage   func(title string)               // opens a stage
	ShowZones   func(zones []geo.LonLatGeometry) // draws land on the map, until other land or none is given
	Boxed       func() []string                  // parcels in the box last drawn on the map
	// Sketch asks for places on the map; done is told none when the user gave up, else with how many metres are a
	// hair's breadth there. From, which may be nil, is where a feature stood.
	Sketch func(kind geo.Kind, words string, from *geo.LonLat, done func(at []geo.LonLat, nearM float64))
	// MovePoints has points moved about on the map; end ends it, with what was done or as if nothing had been.
	MovePoints func(p mapview.Points) (end func(take bool))
	ParcelAt   func(at geo.LonLat) string                  // names the parcel at a place; empty where there is none
	Ask        func(title, words, yes string, then func()) // asks before something that takes much away
	Tell       func(words string)                          // a short word at the foot of the window, that something is done

	view      *live.View
	voice     string
	shade     string
	chosen    []string
	ranking   *live.Ranking
	weigher   *live.Weigher
	light     dialog.Dialog // that Escape closes
	met       bool          // a first candidate was chosen for the user
	trying    []float64     // raw weights tried out and not saved; nil when those of the study hold
	listeners []func(Change)
	info      map[string]run.KeyInfo
}

// Open shows a dialog that Escape closes.
func (c *Core) Open(d dialog.Dialog) {
	c.light = d
	d.Show()
}

// CloseLight closes the dialog that Open showed last, when it is still there; it tells whether it was.
func (c *Core) CloseLight() bool {
	d := c.light
	c.light = nil
	if d == nil || c.Window.Canvas().Overlays().Top() == nil {
		return false
	}
	d.Hide()
	return true
}

// New makes the core of a window. The session's Notify must lead to Update on the window's goroutine.
func New(a fyne.App, w fyne.Window, parts *program.Parts, th *theme.Theme) *Core {
	c := &Core{App: a, Window: w, Parts: parts, Theme: th, Do: fyne.Do, Always: fyne.Do, info: map[string]run.KeyInfo{}}
	for _, k := range parts.Params.Keys() {
		c.info[k.Key] = k
	}
	c.weigher = live.NewWeigher(func(r *live.Ranking) { c.Do(func() { c.ranked(r) }) })
	c.Boxed = func() []string { return nil }
	c.Tell = func(string) {}
	c.Ask = c.confirm
	c.ShowParcels, c.ShowPlace, c.ShowStage = func([]string) {}, func(geo.LonLat) {}, func(string) {}
	c.ShowZones = func([]geo.LonLatGeometry) {}
	c.Sketch = func(_ geo.Kind, _ string, _ *geo.LonLat, done func([]geo.LonLat, float64)) { done(nil, 0) }
	c.MovePoints = func(p mapview.Points) func(bool) { p.Done(nil); return func(bool) {} }
	c.ParcelAt = func(geo.LonLat) string { return "" }
	return c
}

// Attach gives the core its session. A core has one session for all its life.
func (c *Core) Attach(s *live.Session) {
	c.Session = s
	c.Update()
}

// OnChange asks to be told of changes.
func (c *Core) OnChange(f func(Change)) { c.listeners = append(c.listeners, f) }

// Emit tells everybody of a change.
func (c *Core) Emit(ch Change) {
	for _, f := range c.listeners {
		f(ch)
	}
}

// View gives what is known of the study; never nil once a session is attached.
func (c *Core) View() *live.View { return c.view }

// Update takes over what the session found since the last call.
func (c *Core) Update() {
	if c.Session == nil {
		return
	}
	ch := WorkChanged
	if v := c.Session.View(); v != c.view {
		old := c.view
		c.view = v
		ch |= StudyChanged
		if voices := v.Snap.Voices(); !slices.Contains(voices, c.voice) {
			c.voice, c.trying = "", nil
			if len(voices) > 0 {
				c.voice = voices[0]
			}
			ch |= ShadeChanged
		}
		if old == nil || old.Board != v.Board || old.Snap != v.Snap {
			if c.trying != nil && (old == nil || old.Board == nil || v.Board == nil || !slices.EqualFunc(old.Board.Keys, v.Board.Keys, func(a, b run.BoardKey) bool { return a.Info.Key == b.Info.Key })) {
				c.trying = nil // they are weights of other consequences
			}
			c.rank()
		}
		if v.Index != nil {
			kept := slices.DeleteFunc(slices.Clone(c.chosen), func(id string) bool { _, ok := v.Index.ByID[id]; return !ok })
			if len(kept) != len(c.chosen) {
				c.chosen = kept
				ch |= SelectionChanged
			}
		}
	}
	c.Emit(ch)
}

// rank asks for the order under the weights shown.
func (c *Core) rank() {
	b := c.view.Board
	if b == nil || len(b.Keys) == 0 || c.voice == "" {
		c.ranking = nil
		return
	}
	raw := c.trying
	if raw == nil {
		raw = b.Raw(c.view.Snap, c.voice)
	}
	c.weigher.Ask(b, c.view.Index, c.voice, raw)
}

func (c *Core) ranked(r *live.Ranking) {
	if c.view == nil || r.Board != c.view.Board || r.Voice != c.voice {
		return // out of date
	}
	c.ranking = r
	ch := RankingChanged
	if !c.met && r.Err == nil { // the first of the order is what a user wants to see first
		c.met = true
		for _, item := range r.Standing.Order {
			if at := r.Board.At[item]; at >= 0 {
				c.chosen = []string{r.Board.IDs[item]}
				ch |= SelectionChanged
				break
			}
		}
	}
	c.Emit(ch)
}

// Ranking gives the order under the weights shown; nil as long as there is none.
func (c *Core) Ranking() *live.Ranking {
	if c.ranking == nil || c.view == nil || c.ranking.Board != c.view.Board || c.ranking.Voice != c.voice {
		return nil // of results that are no longer the present ones, or of another voice
	}
	return c.ranking
}

// Ordering reports whether an order of the present results is on its way.
func (c *Core) Ordering() bool {
	return c.view != nil && c.view.Board != nil && len(c.view.Board.Keys) > 0 && c.voice != "" && c.Ranking() == nil
}

// Voice gives the name of the chosen voice; empty when the study has none.
func (c *Core) Voice() string { return c.voice }

// VoiceTitle gives a voice's title, or its name.
func (c *Core) VoiceTitle(voice string) string {
	if t := c.view.Snap.Text("voice." + voice + ".title"); t != "" {
		return t
	}
	return voice
}

// SetVoice chooses a voice. Weights tried out and not saved are dropped.
func (c *Core) SetVoice(voice string) {
	if voice == c.voice || !slices.Contains(c.view.Snap.Voices(), voice) {
		return
	}
	c.voice, c.trying = voice, nil
	c.rank()
	c.Emit(ShadeChanged)
}

// Order gives the saved order of the chosen voice with everything that belongs to it: tiers, first in N
// of 100, tipping weights. It is nil while it is computed anew, and while other weights are tried out.
func (c *Core) Order() *run.VoiceOrder {
	if c.view == nil || c.view.Results == nil || !c.view.Current || c.trying != nil {
		return nil
	}
	for i := range c.view.Results.Voices {
		if v := &c.view.Results.Voices[i]; v.Voice == c.voice {
			return v
		}
	}
	return nil
}

// Trying reports whether weights are tried out that are not saved.
func (c *Core) Trying() bool { return c.trying != nil }

// Raw gives the weights shown, by key of the board: those tried out, else those of the study.
func (c *Core) Raw() []float64 {
	if c.view == nil || c.view.Board == nil {
		return nil
	}
	if c.trying != nil {
		return slices.Clone(c.trying)
	}
	return c.view.Board.Raw(c.view.Snap, c.voice)
}

// Try shows the order under other weights without saving them. The newest call wins.
func (c *Core) Try(raw []float64) {
	if c.view == nil || c.view.Board == nil || len(raw) != len(c.view.Board.Keys) {
		return
	}
	c.trying = slices.Clone(raw)
	c.rank()
}

// Back drops weights that are tried out and shows the order under those of the study.
func (c *Core) Back() {
	if c.trying != nil {
		c.trying = nil
		c.rank()
	}
}

// SaveWeights puts the weights tried out into the study as one edit.
func (c *Core) SaveWeights() {
	if c.trying == nil {
		return
	}
	// What differs is found where the edits are made: those asked for before may not be in the view yet.
	tried, voice, keys := slices.Clone(c.trying), c.voice, c.view.Board.Keys
	c.Session.Edit(func(ctx context.Context, st *study.Study) error {
		snap, err := st.Snapshot()
		if err != nil {
			return err
		}
		var edits []study.SettingEdit
		for i, k := range keys {
			key := "voice." + voice + ".weight." + k.Info.Key
			if x, _ := snap.Number(key); x != tried[i] {
				edits = append(edits, study.SettingEdit{Key: key, Value: fmt.Sprintf("%g", tried[i]), Reason: "set in the window"})
			}
		}
		if len(edits) == 0 {
			return nil
		}
		title := snap.Text("voice." + voice + ".title")
		_, err = st.Set(ctx, "set", "weights of "+cmp.Or(title, voice), edits...)
		return err
	}, func(err error) {
		c.Do(func() {
			c.Update()
			if err == nil && slices.Equal(c.trying, tried) { // the user may drag on meanwhile
				c.Back()
			} // weights that could not be saved stay what they are: tried out
		})
		if err != nil {
			c.Always(func() { c.Fail("save the weights", err) })
		}
	})
}

// Shade gives the consequence that shades the map; empty for the score.
func (c *Core) Shade() string { return c.shade }

// SetShade chooses what shades the map: a consequence, or nothing for the score.
func (c *Core) SetShade(key string) {
	if key != c.shade {
		c.shade = key
		c.Emit(ShadeChanged)
	}
}

// Chosen gives the chosen candidates in the order of choosing, A first. It is empty without results.
func (c *Core) Chosen() []*run.Candidate {
	if c.view == nil || c.view.Index == nil {
		return nil
	}
	var out []*run.Candidate
	for _, id := range c.chosen {
		if i, ok := c.view.Index.ByID[id]; ok {
			out = append(out, &c.view.Results.Candidates[i])
		}
	}
	return out
}

// ChosenIDs names the chosen candidates.
func (c *Core) ChosenIDs() []string { return slices.Clone(c.chosen) }

// Choose makes candidates the chosen ones, at most MostChosen.
func (c *Core) Choose(ids ...string) {
	ids = ids[:min(len(ids), MostChosen)]
	if !slices.Equal(ids, c.chosen) {
		c.chosen = slices.Clone(ids)
		c.Emit(SelectionChanged)
	}
}

// Toggle adds a candidate to the chosen ones or takes it out. When there is no room the oldest but the
// first gives way.
func (c *Core) Toggle(id string) {
	if i := slices.Index(c.chosen, id); i >= 0 {
		c.Choose(slices.Delete(slices.Clone(c.chosen), i, i+1)...)
		return
	}
	ids := slices.Clone(c.chosen)
	if len(ids) == MostChosen {
		ids = slices.Delete(ids, 1, 2)
	}
	c.Choose(append(ids, id)...)
}

// Letter gives the letter under which a chosen candidate stands on map, strip and charts.
func Letter(i int) string { return string(rune('A' + i)) }

// BestAt gives the candidate of a site that stands highest in the order shown, else the first fitted one,
// else the first; nil for a site that is not there.
func (c *Core) BestAt(site int) *run.Candidate {
	v := c.view
	if v == nil || v.Index == nil || site < 0 || site >= len(v.Index.Candidates) {
		return nil
	}
	at := v.Best(c.Ranking(), site)
	if at < 0 {
		at = v.Index.Candidates[site][0] // a site is there because it has a candidate
	}
	return &v.Results.Candidates[at]
}

// ChooseParcel chooses the best candidate of the site that a parcel belongs to, or adds it.
func (c *Core) ChooseParcel(parcel string, add bool) {
	if c.view == nil || c.view.Index == nil {
		return
	}
	site, ok := c.view.Index.SiteOfParcel(parcel)
	if !ok {
		return
	}
	cand := c.BestAt(site)
	switch {
	case cand == nil:
	case add:
		c.Toggle(cand.ID())
	default:
		c.Choose(cand.ID())
	}
}

// Info gives title, sentence, unit and account of a consequence.
func (c *Core) Info(key string) run.KeyInfo {
	k, ok := c.info[key]
	if !ok {
		k.Key, k.Title = key, strings.ReplaceAll(key, "_", " ")
	}
	return k
}

// PlantTitle gives a plant option's title, or its name.
func (c *Core) PlantTitle(id string) string {
	if t := c.view.Snap.Text("plant." + id + ".title"); t != "" {
		return t
	}
	return id
}

// CandidateTitle names a candidate in words.
func (c *Core) CandidateTitle(cand *run.Candidate) string {
	return cand.Site + ", " + c.PlantTitle(cand.Plant)
}

// IDTitle names a candidate, or doing nothing, by its id in words.
func (c *Core) IDTitle(id string) string {
	if id == run.NoSite {
		return "Doing nothing"
	}
	if c.view != nil && c.view.Index != nil {
		if i, ok := c.view.Index.ByID[id]; ok {
			return c.CandidateTitle(&c.view.Results.Candidates[i])
		}
	}
	return id
}

// Palette gives the colours of pictures.
func (c *Core) Palette() draw.Palette { return c.Theme.Palette(c.App.Settings().ThemeVariant()) }

// Edit changes the study; what fails is shown. Then, which may be nil, is called on the window's
// goroutine after it was saved.
func (c *Core) Edit(what string, do func(ctx context.Context, s *study.Study) error, then func()) {
	c.Session.Edit(do, func(err error) {
		if err != nil {
			c.Always(func() { c.Fail(what, err) })
		}
		c.Do(func() {
			c.Update()
			if err == nil && then != nil {
				then()
			}
		})
	})
}

// Set changes settings as one edit, after the checks that a form needs; what fails is shown.
func (c *Core) Set(what, reason string, edits ...study.SettingEdit) {
	for _, e := range edits {
		if e.Value == "" {
			continue
		}
		if err := run.CheckSetting(c.Parts.Catalog, c.Parts.Params, e.Key, e.Value, c.view.Snap.Turbines()...); err != nil {
			c.Fail(what, err)
			return
		}
	}
	c.Edit(what, func(ctx context.Context, s *study.Study) error {
		_, err := s.Set(ctx, "set", reason, edits...)
		return err
	}, nil)
}

// Undo takes back the last edit.
func (c *Core) Undo() {
	verb := c.view.CanUndo
	c.Back()
	c.Edit("take back", func(ctx context.Context, s *study.Study) error {
		_, err := s.Undo(ctx)
		return ignoreNothing(err)
	}, func() {
		if verb != "" {
			c.Tell("Taken back: " + verb)
		}
	})
}

// Redo brings back what was taken back last.
func (c *Core) Redo() {
	verb := c.view.CanRedo
	c.Back()
	c.Edit("bring back", func(ctx context.Context, s *study.Study) error {
		_, err := s.Redo(ctx)
		return ignoreNothing(err)
	}, func() {
		if verb != "" {
			c.Tell("Brought back: " + verb)
		}
	})
}

func ignoreNothing(err error) error {
	if errors.Is(err, study.ErrNothingToDo) {
		return nil
	}
	return err
}

// Clock writes a moment of the journal for people: the time of today, else the date with it.
func Clock(t, now time.Time) string {
	t, now = t.Local(), now.Local()
	if t.Year() == now.Year() && t.YearDay() == now.YearDay() {
		return t.Format("15:04")
	}
	return t.Format("2006-01-02 15:04")
}
