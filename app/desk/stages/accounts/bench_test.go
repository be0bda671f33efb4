package accounts

import (
	"fmt"
	"testing"

	"fyne.io/fyne/v2"

	"groundtally/app/live"
	"groundtally/app/run"
)

// many repeats the sample's candidates until there are as many as asked.
func many(b *testing.B, s *stage, n int) request {
	b.Helper()
	from := s.list.results.Candidates
	r := &run.Results{Candidates: make([]run.Candidate, n)}
	x := &live.Index{ByID: map[string]int{}, SiteOf: make([]int, n)}
	for i := range r.Candidates {
		r.Candidates[i] = from[i%len(from)]
		r.Candidates[i].Site = fmt.Sprintf("M-%06d", i)
		x.Sites, x.Candidates = append(x.Sites, r.Candidates[i].Site), append(x.Candidates, []int{i})
		x.SiteOf[i] = i
	}
	q := s.list.request
	q.results, q.index, q.filter = r, x, filter{}
	return q
}

func BenchmarkSort(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	col := newColumn(q.results, "delivered_mwh_per_yr")
	rows := make([]int32, len(q.results.Candidates))
	for b.Loop() {
		for i := range rows {
			rows[i] = int32(i)
		}
		sortRows(rows, col, better(q.catalog, "delivered_mwh_per_yr"), bestFirst)
	}
}

// What a tap on a header costs off the window's goroutine, its columns known.
func BenchmarkSortedList(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	q.sortBy, q.dir = "delivered_mwh_per_yr", bestFirst
	l := &lister{}
	l.list(q)
	for b.Loop() {
		l.list(q)
	}
}

func BenchmarkColumn(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	for b.Loop() {
		newColumn(q.results, "delivered_mwh_per_yr")
	}
}

func BenchmarkFilterByWord(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	q.filter.words = "99 wind"
	l := &lister{}
	l.list(q)
	for b.Loop() {
		l.list(q)
	}
}

// What the window's goroutine does when other rows come into the visible cells.
func BenchmarkRefreshOfVisibleCells(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	s.grid.setList((&lister{}).list(q))
	at := float32(0)
	n := len(cells(s))
	for b.Loop() {
		at += 400
		if at > 4_000_000 {
			at = 0
		}
		s.grid.ScrollToOffset(fyne.NewPos(0, at))
	}
	b.ReportMetric(float64(n), "cells")
}

func BenchmarkRefreshUnchanged(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	q := many(b, s, 100_000)
	s.grid.setList((&lister{}).list(q))
	for b.Loop() {
		s.grid.Refresh()
	}
}
