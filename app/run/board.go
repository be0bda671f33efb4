package run

import (
	"errors"
	"fmt"
	"slices"

	"groundtally/app/study"
	"groundtally/scoring/criteria"
	"groundtally/scoring/weigh"
)

// BoardKey is a consequence that can be weighed, with its value scale.
type BoardKey struct {
	Info        KeyInfo
	Worst, Best float64 // ends of the value scale, in the unit of the consequence
	Better      criteria.Better
}

// Board holds the values of everything that is ordered on every key that some voice of the study weighs,
// laid out so that other weights give the order anew while a person drags one.
type Board struct {
	Keys    []BoardKey
	Unready map[string]error // keys that voices weigh but that have no usable scale, with the reason
	IDs     []string         // by item: Candidate.ID, or NoSite for doing nothing
	At      []int            // by item: candidate in the results, -1 for doing nothing
	ItemOf  []int32          // by candidate: its item, -1 for one that is not ordered
	Held    []Held           // candidates that a gate holds back; their places are those of a saved order alone

	board        *weigh.Board
	scales       []scale
	alternatives []Alternative
}

// NewBoard lays out results for the voices of a state of the study. A study whose voices weigh nothing
// gives a board without keys, which cannot be weighed.
func NewBoard(snap *study.Snapshot, p *Params, r *Results) (*Board, error) {
	b := &Board{}
	var sc []scale
	sc, b.Unready = scaled(snap, p)
	for _, one := range sc {
		b.Keys = append(b.Keys, BoardKey{Info: one.info, Worst: one.curve.Worst, Best: one.curve.Best, Better: one.better})
	}
	if len(sc) == 0 {
		return b, nil
	}
	f, err := weighed(snap, sc, r.Candidates)
	if err != nil {
		return nil, err
	}
	items, at := f.items, f.at
	b.At, b.Held, b.scales, b.alternatives = at, f.held, sc, r.Alternatives
	b.ItemOf = make([]int32, len(r.Candidates))
	for i := range b.ItemOf {
		b.ItemOf[i] = -1
	}
	for item, c := range at {
		if c >= 0 {
			b.ItemOf[c] = int32(item)
		}
	}
	b.IDs = make([]string, len(items))
	for i := range items {
		b.IDs[i] = items[i].ID
	}
	keys := make([]weigh.Key, len(sc))
	for i, s := range sc {
		keys[i] = weigh.Key{Name: s.key, Account: string(s.info.Account)}
	}
	if b.board, err = weigh.NewBoard(keys, items); err != nil {
		return nil, err
	}
	return b, nil
}

// scaled gives the value scales of all keys that some voice has a weight for, and the keys that have none
// that can be used, with the reason.
func scaled(snap *study.Snapshot, p *Params) ([]scale, map[string]error) {
	var out []scale
	unready := map[string]error{}
	voices := snap.Voices()
	for _, k := range p.Keys() {
		weighs := slices.ContainsFunc(voices, func(v string) bool {
			_, byUser := snap.Explicit["voice."+v+".weight."+k.Key]
			return byUser
		})
		if !weighs {
			continue
		}
		s, c, err := scaleOf(snap, "", k)
		var anchors *AnchorError
		switch {
		case errors.As(err, &anchors):
			unready[k.Key] = fmt.Errorf("the ends of its value scale are not set: anchor.%s.worst, anchor.%s.best", k.Key, k.Key)
		case err != nil:
			unready[k.Key] = err
		case c != nil:
			out = append(out, s)
		}
	}
	return out, unready
}

// Categories numbers the keys that voices weigh, so that each has the same colour under every voice, in
// window and appendix.
func Categories(snap *study.Snapshot, p *Params) map[string]int {
	out := map[string]int{}
	list, _ := scaled(snap, p)
	for i, s := range list {
		out[s.key] = i
	}
	return out
}

// Raw gives the raw weights of a voice, one for each key of the board.
func (b *Board) Raw(snap *study.Snapshot, voice string) []float64 {
	raw := make([]float64, len(b.Keys))
	for i, k := range b.Keys {
		if _, unready := b.Unready[k.Info.Key]; !unready {
			raw[i], _ = snap.Number("voice." + voice + ".weight." + k.Info.Key)
		}
	}
	return raw
}

// Weigh puts everything in order under raw weights (swing points), one for each key; see weigh.Board.
func (b *Board) Weigh(raw []float64, s *weigh.Standing) error {
	if b.board == nil {
		return errors.New("no voice of the study weighs anything that has a value scale")
	}
	return b.board.Weigh(raw, s)
}

// Part gives the value of an item on a key.
func (b *Board) Part(item, key int) weigh.Part { return b.board.Part(item, key) }

// Share gives what a key adds to the score of an item under a standing, with the ends of its interval.
func (b *Board) Share(s *weigh.Standing, item, key int) (low, mid, high float64) {
	return b.board.Share(s, item, key)
}

// Beside gives the alternatives under raw weights and the standing that came of them.
func (b *Board) Beside(raw []float64, s *weigh.Standing) ([]Beside, error) {
	return besides(b.alternatives, b.scales, raw, s.Score)
}
