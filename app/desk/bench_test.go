package desk

import (
	"context"
	"fmt"
	"image"
	"math"
	"testing"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/draw/tiles"
	"groundtally/app/live"
	"groundtally/app/run"
	"groundtally/geo"
)

// district makes n candidates out of the fitted ones of a small study, each on a parcel of its own, with
// the ground that shows them.
func district(b *testing.B, v *live.View, n int) (*live.View, *tiles.Ground) {
	b.Helper()
	parts, err := desktest.Parts()
	if err != nil {
		b.Fatal(err)
	}
	out := *v
	results := *v.Results
	results.Candidates = nil
	layer := tiles.Layer{Role: "parcels"}
	side := int(math.Ceil(math.Sqrt(float64(n))))
	for round := 0; len(results.Candidates) < n; round++ {
		for _, c := range v.Results.Candidates {
			if c.Status != run.Fitted || len(results.Candidates) == n {
				continue
			}
			i := len(results.Candidates)
			c.Site = fmt.Sprintf("P-%06d", i)
			c.Parcels = []string{c.Site}
			results.Candidates = append(results.Candidates, c)
			const step = 0.003
			x, y := 10+float64(i%side)*step*1.5, 50+float64(i/side)*step
			ring := []geo.LonLat{{Lon: x, Lat: y}, {Lon: x + step*1.45, Lat: y}, {Lon: x + step*1.45, Lat: y + step*0.95}, {Lon: x, Lat: y + step*0.95}, {Lon: x, Lat: y}}
			layer.Features = append(layer.Features, tiles.Feature{ID: c.Site, Geometry: geo.LonLatGeometry{Kind: geo.Polygons, Parts: [][][]geo.LonLat{{ring}}}})
		}
	}
	out.Results = &results
	if out.Board, err = run.NewBoard(v.Snap, parts.Params, &results); err != nil {
		b.Fatal(err)
	}
	out.Index = live.NewIndex(&results)
	g, err := tiles.NewGround(context.Background(), []tiles.Layer{layer})
	if err != nil {
		b.Fatal(err)
	}
	return &out, g
}

// From a moved weight to the new order, the colours of the parcels, the pictures of all tiles in view, and
// the strip: all our own work, on every goroutine.
func BenchmarkDrag(b *testing.B) {
	s := openFor(b, 60)
	for _, n := range []int{1_000, 10_000, 100_000} {
		v, g := district(b, s.w.core.View(), n)
		ready := make(chan struct{}, 1)
		p := tiles.NewPainter(tiles.Options{Ready: func() {
			select {
			case ready <- struct{}{}:
			default:
			}
		}})
		p.SetStyle(tiles.Style{Look: tiles.LightLook()})
		p.SetGround(g)
		box := g.Extent()
		level := int(math.Ceil(4 * math.Log2((box.MaxX-box.MinX)/570)))
		m := tiles.MPerPx(level)
		mid := box.Centre()
		keys := tiles.Keys(level, image.Rect(int(mid.X/m)-285, int(-mid.Y/m)-205, int(mid.X/m)+285, int(-mid.Y/m)+205))
		p.Want(keys)
		drawn := func() {
			for _, k := range keys {
				for {
					if _, fresh := p.Picture(k); fresh {
						break
					}
					<-ready
				}
			}
		}
		raw := v.Board.Raw(v.Snap, s.w.core.Voice())
		job := shadeJob{view: v, ground: g, palette: s.w.core.Palette(), voice: "x"}
		drawn()
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			step := 0
			for b.Loop() {
				step++
				raw[0] = float64(1 + (step*37)%100)
				job.ranking = &live.Ranking{Board: v.Board, Index: v.Index, Voice: s.w.core.Voice(), Raw: raw}
				job.ranking.Rank()
				p.SetShading(job.do().shading)
				s.w.core.Emit(core.RankingChanged) // strip, rail, panes
				drawn()
			}
			b.ReportMetric(float64(len(keys)), "tiles")
		})
		p.Close()
	}
}
