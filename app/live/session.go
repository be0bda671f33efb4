package live

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"slices"
	"sync"
	"time"

	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// View is what is known of a study at one moment. It is never changed after it was published.
type View struct {
	Path     string
	Snap     *study.Snapshot
	Journal  []study.Entry
	Frozen   []study.Frozen
	CanUndo  string // verb of the edit that undo takes back; empty when there is none
	CanRedo  string
	SavedAt  time.Time // of the last journal entry; zero for a new study
	Notices  []geo.Notice
	Results  *run.Results // nil until something was computed
	Of       *study.Snapshot
	Board    *run.Board // of Results, nil as long as they are
	Index    *Index     // of Results, nil as long as they are
	Current  bool       // Results are those of Snap
	Stopped  bool       // the user stopped the computing of Snap
	Problem  error      // why Snap cannot be computed; nil while it may be
	Contents string     // tells the contents of the layers, so that a picture is drawn anew only when they change
}

// Work is something long that is under way.
type Work struct {
	What        string // "start", then as run.Progress says
	Done, Total int    // Total is 0 when it is not known
	Left        time.Duration
	LeftKnown   bool
}

// Config is what a session stands on. Notify is called, from any goroutine, after a new View or Work can
// be had; calls are not parted by views, so it must look for itself.
type Config struct {
	Catalog *study.Catalog
	Params  *run.Params
	Who     string
	Clock   func() time.Time
	Cores   int // 0 takes all
	Notify  func()
	// Busy, which may be nil, is told when computing begins and when it ends.
	Busy func(bool)
	// Wait keeps the first computing back until Release is called, so that a window can show its map first.
	Wait bool
}

// Session is an open study that is kept computed.
type Session struct {
	cfg   Config
	study *study.Study
	ctx   context.Context
	stop  context.CancelFunc
	group sync.WaitGroup
	edits chan edit
	wake  chan struct{}

	asking sync.RWMutex
	closed bool
	edited chan struct{} // closed when the last edit is saved
	gone   chan struct{} // closed when the session is

	closeErr error

	mu        sync.Mutex
	view      *View
	work      *Work
	began     time.Time          // of the step of work
	begun     int                // how much of it was done then
	told      time.Time          // when progress was last told
	cancelRun context.CancelFunc // of the computing under way
	stopped   *study.Snapshot    // state that the user does not want computed
	surveyor  *run.Surveyor      // of the state surveyed
	surveyed  *study.Snapshot
	rest      *time.Timer // lets the surveyor go
	waiting   bool        // for Release
	released  chan struct{}

	// Of the computing goroutine alone: notices on data and settings, and the state that they are of.
	onData  []geo.Notice
	checked *study.Snapshot
}

type edit struct {
	do   func(ctx context.Context, s *study.Study) error
	done func(error)
}

// Start opens a session on a store, which it closes at its end.
func Start(ctx context.Context, store study.Store, cfg Config) (*Session, error) {
	s, err := study.Open(ctx, store, cfg.Catalog, study.Options{Who: cfg.Who, Clock: cfg.Clock})
	if err != nil {
		return nil, err
	}
	session := &Session{cfg: cfg, study: s, edits: make(chan edit, 1024), wake: make(chan struct{}, 1), edited: make(chan struct{}), gone: make(chan struct{}), released: make(chan struct{}), waiting: cfg.Wait}
	if !cfg.Wait {
		close(session.released)
	}
	session.ctx, session.stop = context.WithCancel(context.WithoutCancel(ctx))
	if err := session.refresh(); err != nil {
		return nil, err
	}
	session.group.Add(2)
	go session.editing()
	go session.computing()
	session.poke()
	return session, nil
}

// View gives what is known now.
func (s *Session) View() *View {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.view
}

// Work gives what is under way; ok is false when nothing is.
func (s *Session) Work() (w Work, ok bool) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.work == nil {
		return Work{}, false
	}
	return *s.work, true
}

// Study gives the open study, for reading. Edits go through Edit.
func (s *Session) Study() *study.Study { return s.study }

// Edit runs a change of the study after those asked for before. done, which may be nil, is called on
// another goroutine when the change is saved, or with what kept it from being saved.
func (s *Session) Edit(do func(ctx context.Context, s *study.Study) error, done func(error)) {
	if done == nil {
		done = func(error) {}
	}
	s.asking.RLock() // so that none is asked for after the last one that Close waits for
	defer s.asking.RUnlock()
	if s.closed {
		go done(ErrClosed)
		return
	}
	s.edits <- edit{do, done}
}

// Set changes settings as one journal entry; see study.Set.
func (s *Session) Set(reason string, done func(error), edits ...study.SettingEdit) {
	s.Edit(func(ctx context.Context, st *study.Study) error {
		_, err := st.Set(ctx, "set", reason, edits...)
		return err
	}, done)
}

// StopComputing stops the computing of the present state, until it changes or Compute is called. What was
// found so far is kept.
func (s *Session) StopComputing() {
	s.mu.Lock()
	if s.view.Current { // it was done a moment before
		s.mu.Unlock()
		return
	}
	s.stopped = s.view.Snap
	v := *s.view
	v.Stopped = true
	s.view = &v
	cancel := s.cancelRun
	s.mu.Unlock()
	if cancel != nil {
		cancel()
	}
	s.cfg.Notify()
}

// Compute takes the computing up again after a stop or a problem.
func (s *Session) Compute() {
	s.mu.Lock()
	s.stopped = nil
	v := *s.view
	v.Stopped, v.Problem = false, nil
	s.view = &v
	s.mu.Unlock()
	s.poke()
	s.cfg.Notify()
}

// Release lets the computing begin that Config.Wait kept back.
func (s *Session) Release() {
	s.mu.Lock()
	if s.waiting {
		s.waiting = false
		close(s.released)
	}
	s.mu.Unlock()
	s.poke()
}

// Released is closed once computing may begin.
func (s *Session) Released() <-chan struct{} { return s.released }

// Close stops everything, waits for it, and closes the study's file. Edits asked for before are saved; later
// ones are not done. Closing again waits for the first.
func (s *Session) Close() error {
	s.asking.Lock()
	if s.closed {
		s.asking.Unlock()
		<-s.gone
		return s.closeErr
	}
	s.closed = true
	defer close(s.gone)
	close(s.edits)
	s.asking.Unlock()
	s.Release() // no edit waits for it any longer
	s.mu.Lock()
	cancel := s.cancelRun
	s.stopped = s.view.Snap
	s.mu.Unlock()
	if cancel != nil {
		cancel()
	}
	<-s.edited
	s.mu.Lock()
	s.stop() // under the lock, so that nothing is begun afterwards
	s.mu.Unlock()
	s.group.Wait()
	s.closeErr = s.study.Close()
	return s.closeErr
}

func (s *Session) poke() {
	select {
	case s.wake <- struct{}{}:
	default:
	}
}

// guarded runs something and turns a panic into an error that carries its stack.
func guarded(do func() error) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = &FaultError{What: fmt.Sprint(p), Details: string(debug.Stack())}
		}
	}()
	return do()
}

// ErrClosed says that an edit came after the study was closed. It was not done.
var ErrClosed = errors.New("the study is being closed; this change was not made")

// FaultError says that the program itself is at fault.
type FaultError struct{ What, Details string }

func (e *FaultError) Error() string {
	return "a fault of the program: " + e.What + ". The study is unharmed; what was changed before is saved."
}

func (s *Session) editing() {
	defer s.group.Done()
	defer close(s.edited)
	for e := range s.edits {
		err := guarded(func() error { return e.do(s.ctx, s.study) })
		// What an edit did before it failed is in the study, so the view follows in either case.
		if rerr := s.refresh(); err == nil {
			err = rerr
		}
		s.poke()
		s.cfg.Notify()
		e.done(err)
	}
}

// refresh publishes the present state of the study, and stops the computing of one that is out of date.
func (s *Session) refresh() error {
	snap, err := s.study.Snapshot()
	if err != nil {
		return err
	}
	v := View{Path: s.study.Store().Path(), Snap: snap, Journal: s.study.Journal(), Frozen: s.study.FrozenStates(), Contents: contents(snap)}
	v.CanUndo, v.CanRedo = s.study.Undoable()
	if n := len(v.Journal); n > 0 {
		v.SavedAt = v.Journal[n-1].At
	}
	// The state is changed here alone, so that comparing needs no lock that the window waits for.
	var before *study.Snapshot
	s.mu.Lock()
	if s.view != nil {
		before = s.view.Snap
	}
	s.mu.Unlock()
	same := before != nil && study.SameInputs(before, snap)
	s.mu.Lock()
	defer s.mu.Unlock()
	if old := s.view; old != nil {
		if same {
			v.Snap = old.Snap // so that what was computed of it stays current
			v.Stopped, v.Problem, v.Notices = old.Stopped, old.Problem, old.Notices
		} else {
			v.Notices = old.Notices
			if s.cancelRun != nil {
				s.cancelRun()
			}
		}
		v.Results, v.Of, v.Board, v.Index = old.Results, old.Of, old.Board, old.Index
		v.Current = v.Of == v.Snap && v.Of != nil
	}
	s.view = &v
	return nil
}

// contents names what is drawn of a state.
func contents(snap *study.Snapshot) string {
	out := ""
	for _, l := range snap.Layers {
		out += fmt.Sprint(l.Role, " ", l.Digest, " ", l.Match, " ", l.Personal, "\n") // maps are printed in the order of their keys
	}
	return out
}

// afterwards is when whoever shows results has looked at them.
const afterwards = 4 * time.Second

func (s *Session) computing() {
	defer s.group.Done()
	for {
		select {
		case <-s.ctx.Done():
			return
		case <-s.wake:
		}
		s.mu.Lock()
		v := s.view
		if v.Current || v.Problem != nil || s.stopped == v.Snap || s.waiting {
			s.mu.Unlock()
			continue
		}
		ctx, cancel := context.WithCancel(s.ctx)
		s.cancelRun, s.work, s.began = cancel, &Work{What: "start"}, time.Time{}
		s.mu.Unlock()
		s.cfg.Notify()
		var found found
		s.busy(true)
		err := guarded(func() error { return s.compute(ctx, v, &found) })
		s.busy(false)
		cancel()
		s.mu.Lock()
		s.cancelRun, s.work = nil, nil
		now := *s.view
		if found.notices != nil && now.Snap == v.Snap {
			now.Notices = found.notices
		}
		switch {
		case err == nil:
			now.Results, now.Of, now.Board, now.Index = found.results, v.Snap, found.board, found.index
			now.Current = now.Snap == v.Snap
		case errors.Is(err, context.Canceled):
		case now.Snap == v.Snap:
			now.Problem = err
		}
		s.view = &now
		s.mu.Unlock()
		s.poke() // the state may have changed meanwhile
		s.cfg.Notify()
		if found.computed {
			// Computing leaves several times the memory that its results need, and so does showing them first.
			debug.FreeOSMemory()
			time.AfterFunc(afterwards, debug.FreeOSMemory)
		}
	}
}

func (s *Session) busy(yes bool) {
	if s.cfg.Busy != nil {
		s.cfg.Busy(yes)
	}
}

type found struct {
	computed bool // and not only ordered
	notices  []geo.Notice
	results  *run.Results
	board    *run.Board
	index    *Index
}

func (s *Session) compute(ctx context.Context, v *View, out *found) error {
	if s.checked == nil || !run.OnlyWeighing(s.checked, v.Snap) {
		all, err := run.Check(ctx, s.study.Store(), v.Snap, s.cfg.Params)
		if err != nil {
			return err
		}
		s.checked, s.onData = v.Snap, all[:len(all)-len(run.VoiceNotices(v.Snap, s.cfg.Params))]
	}
	out.notices = append(slices.Clip(s.onData), run.VoiceNotices(v.Snap, s.cfg.Params)...)
	s.mu.Lock()
	if s.view.Snap == v.Snap { // notices are of one state, and a newer one has its own
		now := *s.view
		now.Notices = out.notices
		s.view = &now
	}
	s.mu.Unlock()
	s.cfg.Notify()
	e := &run.Engine{Params: s.cfg.Params, Cache: &keeping{store: s.study.Store()}, Cores: s.cfg.Cores, Progress: s.progress, Load: run.StoreLoader(s.study.Store())}
	var err error
	if v.Of != nil && v.Results != nil && run.OnlyWeighing(v.Of, v.Snap) {
		out.results, err = e.Reweigh(ctx, v.Snap, v.Results)
	} else {
		out.computed, e.Before = true, v.Results
		out.results, err = e.Compute(ctx, v.Snap)
	}
	if err != nil {
		return err
	}
	if out.board, err = run.NewBoard(v.Snap, s.cfg.Params, out.results); err != nil {
		return err
	}
	out.index = NewIndex(out.results)
	return nil
}

// tellEvery is how often progress is told.
const tellEvery = 60 * time.Millisecond

// progress is told by the engine how far it is.
func (s *Session) progress(step string, done, total int) {
	s.mu.Lock()
	w := Work{What: step, Done: done, Total: total}
	now := s.cfg.now()
	if s.work != nil && s.work.What == step && done < total && now.Sub(s.told) < tellEvery {
		s.mu.Unlock()
		return
	}
	s.told = now
	if s.work == nil || s.work.What != step || done < s.begun {
		s.began, s.begun = now, done
	}
	if spent := now.Sub(s.began); step == "sites" && done > s.begun && spent > time.Second {
		w.Left, w.LeftKnown = time.Duration(float64(spent)/float64(done-s.begun)*float64(total-done)), true
	}
	s.work = &w
	s.mu.Unlock()
	s.cfg.Notify()
}

func (c Config) now() time.Time {
	if c.Clock != nil {
		return c.Clock()
	}
	return time.Now()
}

// keeping keeps step results in the study. They can always be made again, so a study that cannot be
// written still gives its answers.
type keeping struct{ store study.Store }

func (k *keeping) Results(ctx context.Context, step string, digests []string) (map[string][]byte, error) {
	return k.store.Results(ctx, step, digests)
}

func (k *keeping) PutResults(ctx context.Context, add []study.Result, keep map[string]map[string]bool) error {
	err := k.store.PutResults(ctx, add, keep)
	for _, only := range []error{study.ErrReadOnly, study.ErrDiskFull, study.ErrBusy} {
		if errors.Is(err, only) {
			return nil
		}
	}
	return err
}

// Around finds what a map shows around a candidate of the present results, on another goroutine. done is
// called there; an answer that comes late may be of results that are no longer the present ones.
func (s *Session) Around(c *run.Candidate, done func(*run.Surroundings, error)) {
	survey(s, func(sv *run.Surveyor) (*run.Surroundings, error) { return sv.Around(s.ctx, c) }, done)
}

// Course finds how the energy of a candidate comes over the year, as Around does; see run.Surveyor.
func (s *Session) Course(c *run.Candidate, done func(*run.Course, error)) {
	survey(s, func(sv *run.Surveyor) (*run.Course, error) { return sv.Course(s.ctx, c) }, done)
}

// Crowding sweeps the spacing or ground cover of a candidate, or of a part of it, as Around does; see run.Surveyor.
func (s *Session) Crowding(c *run.Candidate, part string, done func(*run.Crowded, error)) {
	survey(s, func(sv *run.Surveyor) (*run.Crowded, error) { return sv.Crowding(s.ctx, c, part) }, done)
}

// Relief finds the terrain of a candidate's site and of its buildable patches, as Around does; see run.Surveyor.
func (s *Session) Relief(c *run.Candidate, done func([]run.Relief, error)) {
	survey(s, func(sv *run.Surveyor) ([]run.Relief, error) { return sv.Relief(s.ctx, c.Site, c.Plant) }, done)
}

// NearestMiss finds which change of one rule would bring a candidate back, as Around does; see run.Surveyor.
func (s *Session) NearestMiss(c *run.Candidate, done func([]run.Relaxed, error)) {
	survey(s, func(sv *run.Surveyor) ([]run.Relaxed, error) { return sv.NearestMiss(s.ctx, c) }, done)
}

// LandLeft finds the land that the rules of a plant option leave in the district, on another goroutine, where
// progress and done are called. Stop ends it early.
func (s *Session) LandLeft(plant string, progress run.Progress, done func([]run.Left, error)) (stop func()) {
	return s.beside(progress, func(ctx context.Context, e *run.Engine, snap *study.Snapshot) func(error) {
		list, err := e.LandLeft(ctx, snap, plant)
		return func(other error) { done(list, errors.Join(err, other)) }
	}, func(err error) { done(nil, err) })
}

// Sweep finds the land left, and the candidates, at each value of one rule; see run.Engine. Each and done are
// called on another goroutine.
func (s *Session) Sweep(plant, key string, values []float64, progress run.Progress, each func(run.Step), done func(error)) (stop func()) {
	return s.beside(progress, func(ctx context.Context, e *run.Engine, snap *study.Snapshot) func(error) {
		err := e.Sweep(ctx, snap, plant, key, values, func(st run.Step) error {
			each(st)
			return nil
		})
		return func(other error) { done(errors.Join(err, other)) }
	}, done)
}

// beside does something with an engine of its own beside the session's computing. Fault is told what keeps it
// from being done at all.
func (s *Session) beside(progress run.Progress, do func(context.Context, *run.Engine, *study.Snapshot) func(error), fault func(error)) (stop func()) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.ctx.Err() != nil {
		return func() {}
	}
	ctx, stop := context.WithCancel(s.ctx)
	snap := s.view.Snap
	e := &run.Engine{Params: s.cfg.Params, Cache: &keeping{store: s.study.Store()}, Progress: progress, Load: run.StoreLoader(s.study.Store())}
	s.group.Add(1)
	go func() {
		defer s.group.Done()
		defer stop()
		var told func(error)
		err := guarded(func() error {
			told = do(ctx, e, snap)
			return nil
		})
		if told == nil {
			fault(err)
			return
		}
		told(err)
	}()
	return stop
}

// surveyRest is how long the layers that a surveyor has read are kept after it was last asked.
const surveyRest = 20 * time.Second

func (s *Session) release() {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.surveyor, s.surveyed = nil, nil
}

// survey asks the surveyor of the present results something on another goroutine. Nothing happens without
// results.
func survey[T any](s *Session, ask func(*run.Surveyor) (T, error), done func(T, error)) {
	s.mu.Lock()
	defer s.mu.Unlock()
	of := s.view.Of
	if of == nil || s.ctx.Err() != nil {
		return
	}
	if s.surveyor == nil || s.surveyed != of && !run.OnlyWeighing(s.surveyed, of) {
		s.surveyor = run.NewSurveyor(of, s.cfg.Params, run.StoreLoader(s.study.Store()), &keeping{store: s.study.Store()})
		s.surveyed = of
	}
	surveyor := s.surveyor
	if s.rest == nil {
		s.rest = time.AfterFunc(surveyRest, s.release)
	}
	s.rest.Reset(surveyRest)
	s.group.Add(1)
	go func() {
		defer s.group.Done()
		var found T
		err := guarded(func() (err error) {
			found, err = ask(surveyor)
			return err
		})
		done(found, err)
	}()
}

// Refresh publishes what an edit that is still at work has saved so far.
func (s *Session) Refresh() error {
	err := s.refresh()
	s.cfg.Notify()
	return err
}
