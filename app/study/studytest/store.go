// Package studytest keeps a study in memory for tests.
package studytest

import (
	"context"
	"fmt"
	"maps"
	"slices"
	"sort"
	"sync"

	"groundtally/app/study"
)

// Store is a study.Store in memory. Make one with New.
type Store struct {
	mu       sync.Mutex
	state    study.State
	records  map[study.RecordKind]map[string]study.Record
	versions map[string]study.Version
	results  map[string]map[string][]byte
}

// New gives an empty store.
func New() *Store {
	return &Store{records: map[study.RecordKind]map[string]study.Record{}, versions: map[string]study.Version{}, results: map[string]map[string][]byte{}}
}

// Clone gives a store with the same content, which changes by itself.
func (s *Store) Clone() *Store {
	s.mu.Lock()
	defer s.mu.Unlock()
	out := &Store{state: s.state, records: map[study.RecordKind]map[string]study.Record{}, versions: maps.Clone(s.versions), results: map[string]map[string][]byte{}}
	out.state.Journal = slices.Clone(s.state.Journal)
	out.state.Frozen = slices.Clone(s.state.Frozen)
	for k, m := range s.records {
		out.records[k] = maps.Clone(m)
	}
	for k, m := range s.results {
		out.results[k] = maps.Clone(m)
	}
	return out
}

// Path implements study.Store.
func (s *Store) Path() string { return "memory" }

// Load implements study.Store.
func (s *Store) Load(context.Context) (study.State, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	st := s.state
	st.Records = nil
	for _, m := range s.records {
		for _, r := range m {
			st.Records = append(st.Records, r)
		}
	}
	sort.Slice(st.Records, func(i, j int) bool {
		a, b := st.Records[i], st.Records[j]
		if a.Kind != b.Kind {
			return a.Kind < b.Kind
		}
		return a.Key < b.Key
	})
	return st, nil
}

// Commit implements study.Store.
func (s *Store) Commit(_ context.Context, e study.Entry, add []study.Version) (study.Entry, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	e.Seq = int64(len(s.state.Journal) + 1)
	for _, v := range add {
		s.versions[v.Digest] = v
	}
	for _, c := range e.Changes {
		if s.records[c.Kind] == nil {
			s.records[c.Kind] = map[string]study.Record{}
		}
		if c.New == nil {
			delete(s.records[c.Kind], c.Key)
		} else {
			s.records[c.Kind][c.Key] = study.Record{Kind: c.Kind, Key: c.Key, Value: c.New}
		}
	}
	s.state.Journal = append(s.state.Journal, e)
	return e, nil
}

// Version implements study.Store.
func (s *Store) Version(_ context.Context, digest string) (study.Version, bool, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	v, ok := s.versions[digest]
	if !ok {
		return v, false, fmt.Errorf("version %s: %w", digest, study.ErrNotThere)
	}
	return v, false, nil
}

// Freeze implements study.Store.
func (s *Store) Freeze(_ context.Context, f study.Frozen) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	for _, old := range s.state.Frozen {
		if old.Name == f.Name {
			return study.ErrNameInUse
		}
	}
	s.state.Frozen = append(s.state.Frozen, f)
	return nil
}

// PutResults implements study.Store.
func (s *Store) PutResults(_ context.Context, add []study.Result, keep map[string]map[string]bool) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	for step, wanted := range keep {
		for d := range s.results[step] {
			if !wanted[d] {
				delete(s.results[step], d)
			}
		}
	}
	for _, r := range add {
		if s.results[r.Step] == nil {
			s.results[r.Step] = map[string][]byte{}
		}
		s.results[r.Step][r.Digest] = r.Data
	}
	return nil
}

// Results implements study.Store.
func (s *Store) Results(_ context.Context, step string, digests []string) (map[string][]byte, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	out := map[string][]byte{}
	for _, d := range digests {
		if b, ok := s.results[step][d]; ok {
			out[d] = b
		}
	}
	return out, nil
}

// Check implements study.Store.
func (s *Store) Check(context.Context) error { return nil }

// Close implements study.Store.
func (s *Store) Close() error { return nil }
