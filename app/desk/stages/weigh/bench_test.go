package weigh

import (
	"fmt"
	"testing"
	"time"

	"groundtally/app/desk/core"
	"groundtally/app/live"
	"groundtally/app/run"
)

// many gives the sample's candidates again under other site names until there are n, with their board.
func many(b *testing.B, s *stage, n int) (*run.Results, *run.Board, *live.Index) {
	b.Helper()
	v := s.c.View()
	results := *v.Results
	results.Candidates = make([]run.Candidate, 0, n)
	x := &live.Index{ByID: make(map[string]int, n)}
	for round := 0; len(results.Candidates) < n; round++ {
		for _, c := range v.Results.Candidates {
			if c.Status != run.Fitted || len(results.Candidates) == n {
				continue
			}
			c.Site = fmt.Sprintf("%s-%d", c.Site, round)
			at := len(results.Candidates)
			x.Sites, x.Candidates, x.SiteOf = append(x.Sites, c.Site), append(x.Candidates, []int{at}), append(x.SiteOf, at)
			x.ByID[c.ID()] = at
			results.Candidates = append(results.Candidates, c)
		}
	}
	board, err := run.NewBoard(v.Snap, s.c.Parts.Params, &results)
	if err != nil {
		b.Fatal(err)
	}
	return &results, board, x
}

// From a step of a slider to the refreshed pane, ranking included; window-ms is what of it the window's
// goroutine bears.
func BenchmarkSliderStep(b *testing.B) {
	bench, s := open(b, 60, 760, 560)
	for _, n := range []int{10_000, 100_000} {
		results, board, index := many(b, s, n)
		itemOf := make([]int32, n)
		for item, at := range board.At {
			if at >= 0 {
				itemOf[at] = int32(item)
			}
		}
		for name, tab := range map[string]int{"weights": weightsTab, "order": orderTab} {
			b.Run(fmt.Sprintf("%s/%d", name, n), func(b *testing.B) {
				s.tabs.Choose(tab)
				ranked := make(chan *live.Ranking)
				weigher := live.NewWeigher(func(r *live.Ranking) { ranked <- r })
				raw := s.c.Raw()
				window := time.Duration(0)
				for i := range b.N {
					raw[4] = float64(1 + 7*i%99)
					began := time.Now()
					weigher.Ask(board, index, s.c.Voice(), raw)
					window += time.Since(began)
					r := <-ranked
					began = time.Now()
					s.shown, s.facts = &shown{r, s.c.View().Snap, results, itemOf, s.c.View().Of}, nil
					s.tell(core.RankingChanged)
					window += time.Since(began)
				}
				b.ReportMetric(float64(window.Microseconds())/float64(b.N)/1000, "window-ms/op")
			})
		}
	}
	bench.Pump()
}
