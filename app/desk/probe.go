package desk

import (
	"bufio"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/storage"
)

// probeMark in the environment has the program tell its state on the standard output, a line of JSON at
// every change, and take files to drop from the standard input. It serves programs that work the window by
// mouse and keyboard, as tests and aids do.
const probeMark = "GROUNDTALLY_PROBE"

// probed is what a probe is told.
type probed struct {
	Stage   string               `json:"stage"`
	Study   string               `json:"study"`
	Voice   string               `json:"voice"`
	First   string               `json:"first"` // of the order shown
	Chosen  []string             `json:"chosen"`
	Trying  bool                 `json:"trying"`
	Current bool                 `json:"current"`
	Problem string               `json:"problem"`
	Layers  int                  `json:"layers"`
	Journal int                  `json:"journal"`
	Over    int                  `json:"over"`   // dialogs and menus that are open
	Map     bool                 `json:"map"`    // everything in view is drawn
	Stages  map[string][2]string `json:"stages"` // what the rail says
}

// probe tells the state while it changes.
type probe struct {
	w    *Window
	out  io.Writer
	mu   sync.Mutex
	last string
}

// watch starts a probe when the environment asks for one.
func (w *Window) watch(in io.Reader, out io.Writer) {
	if os.Getenv(probeMark) == "" {
		return
	}
	p := &probe{w: w, out: out}
	go func() { // some changes are the toolkit's own, as a dialog that opens
		told := make(chan struct{}, 1)
		for range time.Tick(50 * time.Millisecond) {
			w.do(func() {
				p.tell()
				told <- struct{}{}
			})
			<-told // a busy window is not asked again before it has answered
		}
	}()
	go func() {
		lines := bufio.NewScanner(in)
		for lines.Scan() {
			if path, ok := strings.CutPrefix(lines.Text(), "drop "); ok {
				w.do(func() { w.dropped(fyne.Position{}, []fyne.URI{storage.NewFileURI(path)}) })
			}
		}
	}()
}

func (p *probe) tell() {
	s := p.w.state()
	b, err := json.Marshal(s)
	if err != nil {
		return // a state is plain data; there is nothing that could be told
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	if line := string(b); line != p.last {
		p.last = line
		fmt.Fprintln(p.out, "state "+line)
	}
}

// state gives what the window shows.
func (w *Window) state() probed {
	s := probed{Over: len(w.window.Canvas().Overlays().List()), Stages: map[string][2]string{}, Chosen: []string{}}
	if w.core == nil || w.core.Session == nil {
		return s
	}
	c := w.core
	v := c.View()
	s.Stage, s.Study, s.Voice, s.Chosen, s.Trying = w.stages[w.at].Title(), v.Path, c.Voice(), append(s.Chosen, c.ChosenIDs()...), c.Trying()
	s.Current, s.Layers, s.Journal = v.Current, len(v.Snap.Layers), len(v.Journal)
	if v.Problem != nil {
		s.Problem = v.Problem.Error()
	}
	if r := c.Ranking(); r != nil && r.Err == nil {
		s.First = r.Board.IDs[r.Standing.Order[0]]
	}
	s.Map = w.picture.ground != nil && w.picture.m.Settled()
	for _, st := range w.stages {
		first, second, _ := st.State()
		s.Stages[st.Title()] = [2]string{first, second}
	}
	return s
}
