package overlaytest

import (
	"context"
	"encoding/binary"
	"fmt"
	"hash/fnv"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"groundtally/geo"
	"groundtally/geo/index"
	"groundtally/geo/overlay"
)

// Layers are the rules of a set, widened.
type Layers [][]*overlay.Layer

// Widen widens the features of all rules on so many workers.
func Widen(ctx context.Context, s Set, cores int) (Layers, error) {
	out := make(Layers, len(s.Rules))
	for i, r := range s.Rules {
		for _, src := range r.Sources {
			l, err := overlay.NewLayer(ctx, cores, src.Features, src.SetbackM)
			if err != nil {
				return nil, fmt.Errorf("rule %s: %w", r.Name, err)
			}
			out[i] = append(out[i], l)
		}
	}
	return out, nil
}

// Found is what the overlay found in all parcels. Areas are sums in m².
type Found struct {
	GrossM2       float64     `json:"grossM2"`
	BuildableM2   float64     `json:"buildableM2"`
	TakenSharedM2 float64     `json:"takenSharedM2"`
	Rules         []FoundRule `json:"rules"`      // in the order of the set
	Candidates    int         `json:"candidates"` // regions whose extent met that of a parcel
	Retried       int         `json:"retried"`    // operations done again on a coarser grid
	Digest        string      `json:"digest"`     // of every bit of every result in the order of the parcels
}

// FoundRule is what one rule took from all parcels.
type FoundRule struct {
	Name     string  `json:"name"`
	AloneM2  float64 `json:"aloneM2"`
	SharedM2 float64 `json:"sharedM2"`
	TakesAll int     `json:"takesAll"` // parcels that the rule takes whole
}

// chunk is how many parcels, neighbours in the spatial order, a worker takes at a time.
const chunk = 100

// Overlay finds what the rules leave of the parcels, on so many workers. The result does not depend on
// their number.
func Overlay(ctx context.Context, s Set, layers Layers, cores int) (Found, error) {
	extents := make([]geo.Extent, len(s.Parcels))
	for i, g := range s.Parcels {
		extents[i] = geo.ExtentOf(g)
	}
	order := index.Curve(extents)
	results := make([]overlay.BuildableResult, len(s.Parcels))
	digests := make([]uint64, len(s.Parcels))
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	var next, candidates atomic.Int64
	var wg sync.WaitGroup
	for range max(cores, 1) {
		wg.Go(func() {
			// The library's allocator keeps memory by thread.
			runtime.LockOSThread()
			defer runtime.UnlockOSThread()
			e := overlay.New()
			defer func() { _ = e.Close() }() // nobody else uses it
			for ctx.Err() == nil {
				from := int(next.Add(chunk)) - chunk
				if from >= len(order) {
					return
				}
				for _, i := range order[from:min(from+chunk, len(order))] {
					in := overlay.BuildableInput{Site: s.Parcels[i]}
					for k, r := range s.Rules {
						in.Rules = append(in.Rules, overlay.RuleOf(r.Name, extents[i], layers[k]...))
						candidates.Add(int64(len(in.Rules[k].Features)))
					}
					b, err := e.Buildable(in)
					if err != nil {
						cancel(fmt.Errorf("parcel %d: %w", i+1, err))
						return
					}
					digests[i] = digest(b)
					b.Buildable = geo.XYGeometry{}
					results[i] = b
				}
			}
		})
	}
	wg.Wait()
	if err := context.Cause(ctx); err != nil {
		return Found{}, err
	}

	out := Found{Candidates: int(candidates.Load()), Rules: make([]FoundRule, len(s.Rules))}
	h := fnv.New64a()
	for i, b := range results {
		out.GrossM2 += b.GrossM2
		out.BuildableM2 += b.BuildableM2
		out.TakenSharedM2 += b.TakenSharedM2
		out.Retried += b.Retried
		for k, r := range b.Rules {
			o := &out.Rules[k]
			o.Name = r.Name
			o.AloneM2 += r.AloneM2
			o.SharedM2 += r.SharedM2
			if r.TakesAll {
				o.TakesAll++
			}
		}
		_ = binary.Write(h, binary.LittleEndian, digests[i]) // a hash takes everything
	}
	out.Digest = fmt.Sprintf("%016x", h.Sum64())
	return out, nil
}

// digest takes in every bit of a result.
func digest(b overlay.BuildableResult) uint64 {
	h := fnv.New64a()
	var buf []byte
	num := func(v float64) { buf = binary.LittleEndian.AppendUint64(buf, math.Float64bits(v)) }
	num(b.GrossM2)
	num(b.BuildableM2)
	num(b.TakenSharedM2)
	num(b.ShapeM2)
	for _, r := range b.Rules {
		num(r.AloneM2)
		num(r.SharedM2)
	}
	buf = binary.LittleEndian.AppendUint64(buf, uint64(b.Repaired)<<32|uint64(b.Retried))
	for _, part := range b.Buildable.Parts {
		for _, ring := range part {
			for _, p := range ring {
				num(p.X)
				num(p.Y)
			}
		}
	}
	_, _ = h.Write(buf) // a hash takes everything
	return h.Sum64()
}
