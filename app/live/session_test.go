package live

import (
	"context"
	"errors"
	"reflect"
	"strconv"
	"sync/atomic"
	"testing"
	"time"

	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/geo"
)

var parts *program.Parts

func start(t *testing.T) *Session {
	t.Helper()
	if parts == nil {
		p, err := program.Load()
		if err != nil {
			t.Fatal(err)
		}
		parts = p
	}
	var calls atomic.Int64
	s, err := Start(context.Background(), studytest.New(), Config{Catalog: parts.Catalog, Params: parts.Params, Who: "Tester", Notify: func() { calls.Add(1) }})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = s.Close() })
	return s
}

// fill puts a few parcels, a plant option and a voice into the study.
func fill(t *testing.T, s *Session) {
	t.Helper()
	do(t, s, func(ctx context.Context, st *study.Study) error {
		tools, done := parts.Tools()
		defer done()
		l := &geo.Layer{Columns: []geo.Column{{Name: "parcel_id"}}}
		for i := range 40 {
			x, y := float64(i%8)*0.004, float64(i/8)*0.003
			ring := []geo.LonLat{{Lon: 10 + x, Lat: 50 + y}, {Lon: 10.0039 + x, Lat: 50 + y}, {Lon: 10.0039 + x, Lat: 50.0029 + y}, {Lon: 10 + x, Lat: 50.0029 + y}, {Lon: 10 + x, Lat: 50 + y}}
			id := "P-" + strconv.Itoa(i)
			l.Features = append(l.Features, geo.Feature{ID: id, Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring}}}, Values: []geo.Value{geo.TextValue(id)}})
		}
		if _, err := st.AddLayer(ctx, study.Import{File: "p.geojson", Base: "p.geojson", Layer: l, Role: "parcels", Name: "Parcels", CRS: "EPSG:4326", Match: map[string]string{"parcel_id": "parcel_id"}, Ledger: study.Ledger{Read: 40}}, tools); err != nil {
			return err
		}
		_, err := st.Set(ctx, "set", "", study.SettingEdit{Key: "plant.sun.technology", Value: "solar_fixed"}, study.SettingEdit{Key: "voice.us.weight.net_share", Value: "10"})
		return err
	})
}

// do edits and waits for it.
func do(t *testing.T, s *Session, edit func(context.Context, *study.Study) error) {
	t.Helper()
	if err := try(s, edit); err != nil {
		t.Fatal(err)
	}
}

func try(s *Session, edit func(context.Context, *study.Study) error) error {
	done := make(chan error, 1)
	s.Edit(edit, func(err error) { done <- err })
	return <-done
}

func set(key, value string) func(context.Context, *study.Study) error {
	return func(ctx context.Context, st *study.Study) error {
		_, err := st.Set(ctx, "set", "", study.SettingEdit{Key: key, Value: value})
		return err
	}
}

func until(t *testing.T, what string, holds func() bool) {
	t.Helper()
	for end := time.Now().Add(time.Minute); !holds(); time.Sleep(time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("waited in vain until %s", what)
		}
	}
}

func current(s *Session) func() bool { return func() bool { return s.View().Current } }

func TestEmptyStudySaysWhatIsMissing(t *testing.T) {
	s := start(t)
	until(t, "the problem is there", func() bool { return s.View().Problem != nil })
	if !errors.Is(s.View().Problem, run.ErrNoParcels) {
		t.Errorf("the problem is %v", s.View().Problem)
	}
	fill(t, s)
	until(t, "it is computed", current(s))
	if v := s.View(); v.Problem != nil || len(v.Index.Sites) != 40 || v.CanUndo == "" {
		t.Errorf("problem %v, %d sites", v.Problem, len(v.Index.Sites))
	}
}

// Whatever is edited in whatever haste, what is shown in the end are the results of the last state.
func TestNewestStateWins(t *testing.T) {
	s := start(t)
	fill(t, s)
	for i := range 30 {
		s.Edit(set("rule.setback.boundary.solar_m", strconv.Itoa(1+i)), nil)
		if i%7 == 0 {
			time.Sleep(3 * time.Millisecond)
		}
	}
	do(t, s, set("rule.setback.boundary.solar_m", "9"))
	until(t, "it is computed", current(s))
	got := s.View().Results.Code
	e := &run.Engine{Params: parts.Params, Load: run.StoreLoader(s.Study().Store())}
	snap, err := s.Study().Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	want, err := e.Compute(context.Background(), snap)
	if err != nil {
		t.Fatal(err)
	}
	if got != want.Code {
		t.Errorf("the view shows %v, the last state gives %v", got, want.Code)
	}
}

func TestStopAndGoOn(t *testing.T) {
	s := start(t)
	fill(t, s)
	until(t, "it is at work", func() bool { _, busy := s.Work(); return busy })
	s.StopComputing()
	until(t, "nothing is at work", func() bool { _, busy := s.Work(); return !busy })
	if v := s.View(); !v.Current && (!v.Stopped || v.Results != nil) {
		t.Errorf("after a stop: stopped %v, results %v", v.Stopped, v.Results != nil)
	}
	s.Compute()
	until(t, "it is computed", current(s))
	s.StopComputing()
	do(t, s, set("rule.setback.boundary.solar_m", "3")) // another state is computed again
	until(t, "it is computed", current(s))
}

// A fault in an edit is told, and neither ends the session nor changes the study.
func TestFaultIsTold(t *testing.T) {
	s := start(t)
	fill(t, s)
	before := len(s.View().Journal)
	err := try(s, func(context.Context, *study.Study) error { panic("broken") })
	var fault *FaultError
	if !errors.As(err, &fault) || fault.Details == "" {
		t.Fatalf("the fault is told as %v", err)
	}
	if len(s.View().Journal) != before {
		t.Error("a broken edit was saved")
	}
	do(t, s, set("study.name", "After"))
}

// Closing saves what was asked for before.
func TestCloseSaves(t *testing.T) {
	s := start(t)
	store := s.Study().Store()
	for i := range 20 {
		s.Edit(set("study.name", "Name "+strconv.Itoa(i)), nil)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	st, err := store.Load(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if len(st.Journal) != 20 {
		t.Errorf("%d of 20 edits were saved", len(st.Journal))
	}
}

// Of many weights asked for the last ones count, and they come to rest there.
func TestWeigherNewestWins(t *testing.T) {
	s := start(t)
	fill(t, s)
	until(t, "it is computed", current(s))
	v := s.View()
	last := make(chan *Ranking, 1000)
	w := NewWeigher(func(r *Ranking) { last <- r })
	raw := v.Board.Raw(v.Snap, "us")
	for i := range 500 {
		raw[0] = float64(i + 1)
		w.Ask(v.Board, v.Index, "us", raw)
	}
	for {
		r := <-last
		if r.Err != nil {
			t.Fatal(r.Err)
		}
		if r.Raw[0] == 500 {
			break
		}
	}
	select {
	case r := <-last:
		t.Errorf("after the last weights came %v", r.Raw)
	case <-time.After(20 * time.Millisecond):
	}
}

// Notices are those of the state shown, also when only voices changed since, and after an undo.
func TestNoticesFollowTheState(t *testing.T) {
	s := start(t)
	fill(t, s)
	do(t, s, set("voice.idle.title", "Idle"))
	until(t, "it is computed", current(s))
	has := func(code string) bool {
		for _, n := range s.View().Notices {
			if n.Code == code {
				return true
			}
		}
		return false
	}
	until(t, "the idle voice is noticed", func() bool { return has("voice_unusable") })
	do(t, s, set("voice.idle.weight.net_share", "5"))
	until(t, "it is computed", current(s))
	if has("voice_unusable") {
		t.Error("a voice that weighs something is still said to weigh nothing")
	}
	do(t, s, func(ctx context.Context, st *study.Study) error { return st.RemoveLayer(ctx, "Parcels", "") })
	do(t, s, func(ctx context.Context, st *study.Study) error { _, err := st.Undo(ctx); return err })
	until(t, "it is computed", current(s))
	snap, err := s.Study().Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	want, err := run.Check(context.Background(), s.Study().Store(), snap, parts.Params)
	if err != nil {
		t.Fatal(err)
	}
	if got := s.View().Notices; !reflect.DeepEqual(got, want) {
		t.Errorf("%d notices are shown, the state has %d", len(got), len(want))
	}
}

// An edit that comes too late is refused and says so; closing again waits for the first closing.
func TestAfterClosing(t *testing.T) {
	s := start(t)
	fill(t, s)
	done := make(chan error, 2)
	for range 2 {
		go func() { done <- s.Close() }()
	}
	for range 2 {
		if err := <-done; err != nil {
			t.Error(err)
		}
	}
	if err := try(s, set("study.name", "late")); !errors.Is(err, ErrClosed) {
		t.Errorf("a late edit gives %v", err)
	}
}
