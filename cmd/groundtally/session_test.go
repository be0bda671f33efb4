package main

import (
	"bufio"
	"bytes"
	"database/sql"
	"encoding/json"
	"fmt"
	"image"
	"image/color"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	toolkit "fyne.io/fyne/v2/theme"
	_ "modernc.org/sqlite"

	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
)

// The window tells its state by this mark; see app/desk/probe.go.
const probeMark = "GROUNDTALLY_PROBE"

const (
	wholeSession = 3 * time.Minute  // at most, unless the machine is very busy
	answers      = 30 * time.Second // to a click or a key, at most
)

// Where things are on a screen of 1366 by 768 pixels, as the pictures session-*.png show. When the window
// is laid out anew, its pictures tell the new places.
var (
	atRest         = image.Pt(640, 757) // nothing is under the pointer here
	atLook         = image.Pt(62, 711)
	atVoice        = image.Pt(935, 19)
	atSea          = image.Pt(175, 110) // of the map, away from the island
	atFormAdd      = image.Pt(1029, 669)
	atRulesTab     = image.Pt(902, 114)
	atRulesMargin  = image.Pt(1334, 400) // wheels over a field are the field's
	atWeightsTab   = image.Pt(788, 146)
	atPairTab      = image.Pt(928, 146)
	atSecondWeight = image.Pt(1162, 255) // the knob, at 100 points
	atFolder       = image.Pt(1050, 272)
	atMake         = image.Pt(814, 307)
	atGoOn         = image.Pt(683, 300) // on the first page
)

// The form for one more distance stands somewhere in the rules. Its places are counted from the middle of its
// button, which is found by its colour in a column of pixels that no other button of the rules crosses.
var (
	ruleAddColumn = image.Rect(1240, 150, 1241, 470)
	fromAddToFrom = image.Pt(-310, -63)
	fromAddToSize = image.Pt(-123, -32)
	fromAddToFind = image.Pt(-345, -32) // the source
	fromAddToWhy  = image.Pt(-290, 0)
)

// Settings that the session changes.
const (
	weightKey = "voice.farmers.weight.footprint_direct_ha_per_gwh"
	ruleKey   = "rule.setback.substations.solar_agri_m"
)

// state is what the window tells.
type state struct {
	Stage   string               `json:"stage"`
	Study   string               `json:"study"`
	Voice   string               `json:"voice"`
	First   string               `json:"first"`
	Chosen  []string             `json:"chosen"`
	Trying  bool                 `json:"trying"`
	Current bool                 `json:"current"`
	Problem string               `json:"problem"`
	Layers  int                  `json:"layers"`
	Journal int                  `json:"journal"`
	Over    int                  `json:"over"`
	Map     bool                 `json:"map"`
	Stages  map[string][2]string `json:"stages"`
}

// desktop is a screen with a user's folders.
type desktop struct {
	*screen
	home string
	late time.Time // when the session must have ended
}

// allow gives the session time from now on.
func (d *desktop) allow(more time.Duration) { d.late = time.Now().Add(more) }

// window is the program on a desktop.
type window struct {
	*desktop
	cmd   *exec.Cmd
	stdin io.WriteCloser
	errs  bytes.Buffer
	ended chan struct{} // closed when the program has ended

	mu   sync.Mutex
	last state
	told string // the line of last
	news chan struct{}
}

// open starts the program and gives it the keyboard.
func (d *desktop) open(args ...string) *window {
	d.t.Helper()
	w := &window{desktop: d, ended: make(chan struct{}), news: make(chan struct{}, 1)}
	w.cmd = exec.Command(program(d.t), args...)
	w.cmd.Env = append(plainEnv(), "HOME="+d.home, "XDG_CONFIG_HOME="+filepath.Join(d.home, "config"), "XDG_CACHE_HOME="+filepath.Join(d.home, "cache"),
		"DISPLAY="+d.display, "FYNE_SCALE=1", "LIBGL_ALWAYS_SOFTWARE=1", probeMark+"=1")
	out, err := w.cmd.StdoutPipe()
	if err != nil {
		d.t.Fatal(err)
	}
	if w.stdin, err = w.cmd.StdinPipe(); err != nil {
		d.t.Fatal(err)
	}
	w.cmd.Stderr = &w.errs
	if err := w.cmd.Start(); err != nil {
		d.t.Fatal(err)
	}
	d.t.Cleanup(func() {
		_ = w.cmd.Process.Signal(syscall.SIGTERM) // passed on to the window
		select {
		case <-w.ended:
		case <-time.After(10 * time.Second):
			_ = w.cmd.Process.Kill()
		}
	})
	go func() {
		defer close(w.ended)
		lines := bufio.NewScanner(out)
		lines.Buffer(nil, 1<<20)
		for lines.Scan() {
			w.hear(lines.Text())
		}
		_ = w.cmd.Wait() // its code is looked at by who waits for ended
	}()
	w.until("the window tells its state", answers, func(state) bool { return true })
	w.wait("the window is on the screen", answers, func() bool {
		return w.do("search", "--onlyvisible", "--name", "Groundtally", "windowfocus") == nil
	})
	return w
}

func (w *window) hear(line string) {
	text, ok := strings.CutPrefix(line, "state ")
	if !ok {
		return
	}
	var s state
	if json.Unmarshal([]byte(text), &s) != nil {
		return // the line stays away from told, so that what waits for it fails
	}
	w.mu.Lock()
	w.last, w.told = s, text
	w.mu.Unlock()
	select {
	case w.news <- struct{}{}:
	default:
	}
}

func (w *window) now() (state, string) {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.last, w.told
}

// fatal ends the test with what can be seen.
func (w *window) fatal(format string, args ...any) {
	w.t.Helper()
	desktest.Save(w.t, "session-failed.png", w.frame())
	_, told := w.now()
	w.t.Fatalf("%s\nthe window tells %s\nit looks as in session-failed.png", fmt.Sprintf(format, args...), told)
}

// until waits for a state.
func (w *window) until(what string, within time.Duration, holds func(state) bool) state {
	w.t.Helper()
	late := time.NewTimer(min(within, time.Until(w.late)))
	defer late.Stop()
	for {
		if s, told := w.now(); told != "" && holds(s) {
			return s
		}
		select {
		case <-w.news:
		case <-w.ended:
			w.fatal("the program ended before %s: %s", what, w.errs.String())
		case <-late.C:
			w.fatal("waited in vain until %s, for %v or to the end of the session", what, within)
		}
	}
}

// wait waits for something that the window does not tell.
func (w *window) wait(what string, within time.Duration, holds func() bool) {
	w.t.Helper()
	for end := time.Now().Add(within); !holds(); time.Sleep(50 * time.Millisecond) {
		if now := time.Now(); now.After(end) || now.After(w.late) {
			w.fatal("waited in vain until %s", what)
		}
	}
}

// hands does something with mouse and keyboard.
func (w *window) hands(words ...string) {
	w.t.Helper()
	if err := w.do(words...); err != nil {
		w.fatal("%v", err)
	}
}

func to(p image.Point) []string {
	return []string{"mousemove", strconv.Itoa(p.X), strconv.Itoa(p.Y), "sleep", "0.06"}
}

var press = []string{"mousedown", "1", "sleep", "0.1", "mouseup", "1"}

func (w *window) click(p image.Point) {
	w.t.Helper()
	w.hands(append(to(p), press...)...)
}

func (w *window) write(p image.Point, text string) {
	w.t.Helper()
	w.click(p)
	w.hands("sleep", "0.4", "type", "--delay", "15", text) // an entry waits whether a click becomes a double one
}

// stage goes to a stage by its key.
func (w *window) stage(number int, title string) {
	w.t.Helper()
	w.hands("key", "ctrl+"+strconv.Itoa(number))
	w.until("the stage "+title+" is open", answers, func(s state) bool { return s.Stage == title })
}

// shoot keeps a picture of the window once everything is drawn.
func (w *window) shoot(name string) {
	w.t.Helper()
	w.hands(to(atRest)...)
	w.drawn()
	desktest.Save(w.t, "session-"+name+".png", w.still())
}

// glimpse keeps a picture of the window as it is.
func (w *window) glimpse(name string) {
	w.t.Helper()
	desktest.Save(w.t, "session-"+name+".png", w.still())
}

func (w *window) drawn() {
	w.t.Helper()
	w.until("everything is drawn", answers, func(s state) bool { return s.Map || s.Study == "" })
}

// dark reports whether both the window and its map are in dark colours; mixed says that they differ.
func (w *window) dark() (dark, mixed bool) {
	img := w.frame()
	is := func(p image.Point) bool {
		c := img.RGBAAt(p.X, p.Y)
		return int(c.R)+int(c.G)+int(c.B) < 3*128
	}
	return is(atRest), is(atRest) != is(atSea)
}

// ruleAdd finds the button of the form for one more distance.
func ruleAdd(img *image.RGBA) (at image.Point, ok bool) {
	red, green, blue, _ := theme.New(theme.Light).Color(toolkit.ColorNameButton, toolkit.VariantLight).RGBA()
	button := color.RGBA{uint8(red >> 8), uint8(green >> 8), uint8(blue >> 8), 255}
	r, high := ruleAddColumn, 0
	for y := r.Min.Y; y < r.Max.Y; y++ {
		if img.RGBAAt(r.Min.X, y) == button {
			high++
			continue
		}
		if high >= 20 && high < 32 {
			return image.Pt(r.Min.X+40, y-high/2), true
		}
		high = 0
	}
	return image.Point{}, false
}

// findRuleAdd wheels through the rules until the form for one more distance is there, and stays where it is.
func (w *window) findRuleAdd() image.Point {
	w.t.Helper()
	for range 40 {
		at, ok := ruleAdd(w.still())
		if ok {
			// On a busy machine the picture may lag behind the wheel.
			time.Sleep(time.Second)
			if again, still := ruleAdd(w.still()); still && again == at {
				return at
			}
			continue
		}
		before := w.frame()
		w.hands("click", "--repeat", "4", "--delay", "10", "5")
		w.wait("the rules move", answers, func() bool { return !bytes.Equal(before.Pix, w.frame().Pix) })
	}
	w.fatal("the rules have no form for one more distance")
	return image.Point{}
}

// parcelWithCandidate finds a spot on the map well inside a parcel with a high score, east of the middle: the
// dark colours are the high ones, and the parcel that leads lies west of it.
func parcelWithCandidate(img *image.RGBA) (at image.Point, ok bool) {
	const around = 5 // pixels
	for y := 130; y < 450; y++ {
		for x := 660; x > 440; x-- {
			c := img.RGBAAt(x, y)
			same := int(c.R)+int(c.G)+int(c.B) < 300
			for dy := -around; same && dy <= around; dy++ {
				for dx := -around; same && dx <= around; dx++ {
					same = alike(img.RGBAAt(x+dx, y+dy), c)
				}
			}
			if same {
				return image.Pt(x, y), true
			}
		}
	}
	return image.Point{}, false
}

// alike reports whether two colours differ by no more than the relief under a parcel makes.
func alike(a, b color.RGBA) bool {
	near := func(x, y uint8) bool { return max(x, y)-min(x, y) <= 10 }
	return near(a.R, b.R) && near(a.G, b.G) && near(a.B, b.B)
}

// query asks the study file.
func query[T any](w *window, ask string, args ...any) T {
	w.t.Helper()
	s, _ := w.now()
	db, err := sql.Open("sqlite", "file:"+s.Study+"?mode=ro&_pragma=busy_timeout(10000)")
	if err != nil {
		w.t.Fatal(err)
	}
	defer db.Close()
	var x T
	if err := db.QueryRow(ask, args...).Scan(&x); err != nil {
		w.fatal("%s: %v", ask, err)
	}
	return x
}

// value gives a setting as it is in the study file.
func (w *window) value(key string) string {
	w.t.Helper()
	return query[string](w, `SELECT value ->> '$.value' FROM gt_record WHERE kind = 'setting' AND key = ?`, key)
}

// journal gives all entries as they are in the study file.
func (w *window) journal() string {
	w.t.Helper()
	return query[string](w, `SELECT group_concat(seq || ' ' || verb || ' ' || reason, char(10) ORDER BY seq) FROM gt_journal`)
}

// One session with the real window, by mouse and keyboard: the sample study, a file dropped, a rule added,
// a weight dragged, two candidates compared, a change taken back, the appendix made; then the program is
// killed, started again, and everything is found.
func TestSession(t *testing.T) {
	onLinux(t)
	tool(t, "xdotool")
	program(t) // building is not part of the session
	d := &desktop{screen: newScreen(t), home: t.TempDir()}
	d.allow(wholeSession)
	_ = os.Remove(filepath.Join("..", "..", ".build", "shots", "session-failed.png")) // of a session before
	for _, sub := range []string{"config", "cache"} {
		if err := os.Mkdir(filepath.Join(d.home, sub), 0o755); err != nil {
			t.Fatal(err)
		}
	}

	start := time.Now()
	step := func(words string) { t.Logf("%5.1f s: %s", time.Since(start).Seconds(), words) }

	step("a first start opens the sample study and computes it")
	w := d.open()
	begun := time.Now()
	w.until("the sample is open and its map drawn", time.Minute, func(s state) bool {
		return filepath.Base(s.Study) == "marram.gpkg" && s.Layers == 27 && s.Map
	})
	computed := w.until("it is computed", wholeSession, func(s state) bool { return s.Current && s.First != "" && s.Map })
	cold := time.Since(begun)
	w.allow(max(wholeSession-cold, 3*cold)) // a busy machine gets time in proportion
	if dark, mixed := w.dark(); dark || mixed {
		t.Errorf("a first start: dark %v, window and map differ %v", dark, mixed)
	}

	step("a dropped file becomes a layer")
	file := filepath.Join(t.TempDir(), "heritage sites.geojson")
	text := `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":"Old mill","class":"monument"},"geometry":{"type":"Point","coordinates":[-26.95,47.5]}}]}`
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := fmt.Fprintln(w.stdin, "drop "+file); err != nil {
		t.Fatal(err)
	}
	w.until("the form is open", answers, func(s state) bool { return s.Over == 1 && s.Stage == "Ground" })
	w.glimpse("import-light")
	w.click(atFormAdd)
	added := w.until("the layer is there", answers, func(s state) bool { return s.Over == 0 && s.Layers == computed.Layers+1 })
	if added.Journal != computed.Journal+1 {
		t.Errorf("the journal grew from %d to %d entries by one layer", computed.Journal, added.Journal)
	}

	step("a rule is added while the study is being computed")
	w.stage(2, "Plant")
	w.click(atRulesTab)
	w.hands(to(atRulesMargin)...)
	add := w.findRuleAdd()
	w.click(add.Add(fromAddToFrom))
	w.until("the list of what a distance is kept from is open", answers, func(s state) bool { return s.Over == 1 })
	keys := []string{"key", "--delay", "40"}
	for range 8 { // the eighth are substations
		keys = append(keys, "Down")
	}
	w.hands(append(keys, "Return")...)
	w.until("the list is closed", answers, func(s state) bool { return s.Over == 0 })
	w.write(add.Add(fromAddToSize), "60")
	w.write(add.Add(fromAddToFind), "Plan 2031")
	w.write(add.Add(fromAddToWhy), "room for the fire brigade")
	w.glimpse("rule-light")
	w.click(add)
	w.until("the rule is in the journal", answers, func(s state) bool { return s.Journal == added.Journal+1 })
	ruled := w.until("it is computed again", wholeSession, func(s state) bool { return s.Current && s.First != "" && s.Map })
	if got := w.value(ruleKey); got != "60" {
		t.Errorf("%s is %q, want 60", ruleKey, got)
	}

	step("a weight is dragged")
	w.stage(4, "Weigh")
	w.drawn()
	w.hands(append(to(atSecondWeight), "mousedown", "1", "sleep", "0.1")...)
	for x := atSecondWeight.X - 20; x >= atSecondWeight.X-160; x -= 20 {
		w.hands(to(image.Pt(x, atSecondWeight.Y))...)
	}
	dragged := w.until("the order follows the drag", answers, func(s state) bool { return s.Trying && s.First != ruled.First })
	if dragged.Journal != ruled.Journal {
		t.Errorf("while dragging the journal grew from %d to %d", ruled.Journal, dragged.Journal)
	}
	w.glimpse("drag-light")
	w.hands("mouseup", "1")
	weighed := w.until("the weight is saved and weighed", time.Minute, func(s state) bool {
		return !s.Trying && s.Journal == ruled.Journal+1 && s.Current && s.First != ruled.First
	})
	if x, err := strconv.ParseFloat(w.value(weightKey), 64); err != nil || x <= 0 || x >= 50 {
		t.Errorf("%s is %v after the drag: %v", weightKey, x, err)
	}

	step("two candidates are compared")
	w.drawn()
	parcel, ok := parcelWithCandidate(w.still())
	if !ok {
		w.fatal("the map shows no parcel with a candidate")
	}
	w.hands(slices.Concat(to(parcel), []string{"keydown", "ctrl", "sleep", "0.1"}, press, []string{"sleep", "0.1", "keyup", "ctrl"})...)
	w.until("a second candidate is chosen", answers, func(s state) bool { return len(s.Chosen) == 2 })
	w.click(atPairTab)
	w.shoot("pair-light")

	step("the weight is taken back")
	w.hands("key", "ctrl+z")
	undone := w.until("the weight is as before", time.Minute, func(s state) bool {
		return s.Journal == weighed.Journal+1 && s.Current && s.First == ruled.First
	})
	if got := w.value(weightKey); got != "100" {
		t.Errorf("%s is %q after undo, want 100", weightKey, got)
	}
	if got := query[string](w, `SELECT verb FROM gt_journal ORDER BY seq DESC LIMIT 1`); got != "undo" {
		t.Errorf("the last entry of the journal is %q, want undo", got)
	}

	step("the appendix is made")
	w.stage(5, "Appendix")
	folder := filepath.Join(t.TempDir(), "appendix")
	w.write(atFolder, folder)
	w.click(atMake)
	w.until("the appendix is made", time.Minute, func(s state) bool { return strings.HasPrefix(s.Stages["Appendix"][0], "made at") })
	for _, name := range []string{"appendix.html", "check-code.json"} {
		if st, err := os.Stat(filepath.Join(folder, name)); err != nil || st.Size() == 0 {
			t.Errorf("%s: %v", name, err)
		}
	}

	step("all stages are looked at in both themes")
	titles := []string{"Ground", "Plant", "Accounts", "Weigh", "Appendix"}
	look := func(theme string) {
		for i, title := range titles {
			w.stage(i+1, title)
			if title == "Weigh" {
				w.click(atPairTab)
				w.shoot("pair-" + theme)
				w.click(atWeightsTab)
			}
			w.shoot(strings.ToLower(title) + "-" + theme)
		}
	}
	look("light")
	w.click(atLook)
	w.wait("window and map are dark", answers, func() bool {
		dark, mixed := w.dark()
		return dark && !mixed
	})
	look("dark")

	step("another voice is chosen")
	w.click(atVoice)
	w.until("the voices are listed", answers, func(s state) bool { return s.Over == 1 })
	w.hands("key", "--delay", "40", "Down", "Down", "Return")
	before := w.until("the order is another voice's", answers, func(s state) bool {
		return s.Over == 0 && s.Voice != "" && s.Voice != undone.Voice && s.First != "" && s.First != undone.First && s.Map
	})
	w.wait("the choice is kept", answers, func() bool {
		kept, err := os.ReadFile(filepath.Join(d.home, "config", "fyne", "groundtally", "preferences.json"))
		return err == nil && strings.Contains(string(kept), strconv.Quote(before.Voice))
	})
	entries := w.journal()

	step("the window is killed")
	if err := childOf(t, w.cmd.Process.Pid).Kill(); err != nil {
		t.Fatal(err)
	}
	if code := w.end(); code != 5 {
		t.Errorf("after the kill: exit code %d, want 5", code)
	}
	if got := w.errs.String(); !strings.Contains(got, "Every change made before is saved; start the program again") || strings.Contains(got, "goroutine") {
		t.Errorf("after the kill it says: %s", got)
	}

	step("started again, everything is found")
	w = d.open()
	w.until("the first page is open", answers, func(s state) bool { return s.Study == "" && s.Over == 0 })
	w.wait("the first page is in dark colours", answers, func() bool { dark, _ := w.dark(); return dark })
	w.shoot("again-dark")
	begun = time.Now()
	w.click(atGoOn)
	found := w.until("the study is open with its results and in its order", max(cold, answers), func(s state) bool {
		return s.Current && s.First == before.First && s.Map
	})
	if took := time.Since(begun); took > cold/2 {
		t.Errorf("opened again the study was there after %v, at first after %v; were its results not kept?", took, cold)
	}
	if found.Study != before.Study || found.Layers != before.Layers || found.Journal != before.Journal || found.Voice != before.Voice || found.Stage != before.Stage {
		t.Errorf("before it was killed the window told %+v, now it tells %+v", before, found)
	}
	if got := found.Stages["Appendix"]; !strings.HasPrefix(got[0], "made at") {
		t.Errorf("the results are not those of the appendix any more: %q", got)
	}
	if got := w.journal(); got != entries {
		t.Errorf("the journal was\n%s\nnow it is\n%s", entries, got)
	}
	if a, b := w.value(ruleKey), w.value(weightKey); a != "60" || b != "100" {
		t.Errorf("rule %q, weight %q; want 60 and 100", a, b)
	}
	w.shoot("found-dark")

	step("the program is ended in good order")
	if err := w.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	if code := w.end(); code != 0 {
		t.Errorf("exit code %d, want 0; it says: %s", code, w.errs.String())
	}
}

// end waits until the program has ended and gives its code.
func (w *window) end() int {
	w.t.Helper()
	select {
	case <-w.ended:
	case <-time.After(answers):
		w.fatal("the program has not ended after %v", answers)
	}
	return w.cmd.ProcessState.ExitCode()
}
