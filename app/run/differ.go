package run

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/scoring"
)

// agreeRel is how near two values must be to agree.
const agreeRel = 1e-6

func near(a, b float64) bool {
	return a == b || math.Abs(a-b) <= agreeRel*math.Max(math.Abs(a), math.Abs(b))
}

// differ finds the first difference between two results, by candidate and then by voice.
func differ(a, b *Results) *Difference {
	x, y := sortCandidates(a.Candidates), sortCandidates(b.Candidates)
	if len(x) != len(y) {
		return &Difference{Where: "number of candidates", Old: fmt.Sprint(len(x)), New: fmt.Sprint(len(y))}
	}
	for i := range x {
		if d := differCandidate(x[i], y[i]); d != nil {
			return d
		}
	}
	if len(a.Voices) != len(b.Voices) {
		return &Difference{Where: "number of voices", Old: fmt.Sprint(len(a.Voices)), New: fmt.Sprint(len(b.Voices))}
	}
	for i := range a.Voices {
		v, u := a.Voices[i], b.Voices[i]
		if v.Voice != u.Voice || len(v.Order) != len(u.Order) {
			return &Difference{Where: "voice " + v.Voice, Old: fmt.Sprint(len(v.Order), " places"), New: fmt.Sprint(u.Voice, ", ", len(u.Order), " places")}
		}
		tier := map[string]Row{}
		for _, r := range u.Order {
			tier[r.Site+"/"+r.Plant] = r
		}
		for _, r := range v.Order {
			other := tier[r.Site+"/"+r.Plant]
			if other.Tier != r.Tier {
				return &Difference{Where: fmt.Sprintf("voice %s, %s with %s, tier", v.Voice, r.Site, r.Plant), Old: fmt.Sprint(r.Tier), New: fmt.Sprint(other.Tier)}
			}
			if !near(r.Score, other.Score) {
				return &Difference{Where: fmt.Sprintf("voice %s, %s with %s, score", v.Voice, r.Site, r.Plant), Old: fmt.Sprint(r.Score), New: fmt.Sprint(other.Score)}
			}
		}
		if d := differHeld(v, u); d != nil {
			return d
		}
		if d := differBeside(v, u); d != nil {
			return d
		}
	}
	return nil
}

func differHeld(a, b VoiceOrder) *Difference {
	if len(a.HeldBack) != len(b.HeldBack) {
		return &Difference{Where: "voice " + a.Voice + ", held back", Old: fmt.Sprint(len(a.HeldBack)), New: fmt.Sprint(len(b.HeldBack))}
	}
	for i, h := range a.HeldBack {
		if g := b.HeldBack[i]; h.ID() != g.ID() || h.Place != g.Place {
			return &Difference{Where: fmt.Sprintf("voice %s, held back, number %d", a.Voice, i+1), Old: fmt.Sprint(h.ID(), ", place ", h.Place), New: fmt.Sprint(g.ID(), ", place ", g.Place)}
		}
	}
	return nil
}

func differBeside(a, b VoiceOrder) *Difference {
	if len(a.Beside) != len(b.Beside) {
		return &Difference{Where: "voice " + a.Voice + ", alternatives", Old: fmt.Sprint(len(a.Beside)), New: fmt.Sprint(len(b.Beside))}
	}
	for i, x := range a.Beside {
		if y := b.Beside[i]; x.ID != y.ID || x.Why != y.Why || !near(x.Score, y.Score) || x.Place != y.Place {
			return &Difference{Where: fmt.Sprintf("voice %s, alternative %s", a.Voice, x.ID), Old: fmt.Sprint(x.Why, " ", x.Score, ", place ", x.Place), New: fmt.Sprint(y.ID, " ", y.Why, " ", y.Score, ", place ", y.Place)}
		}
	}
	return nil
}

func differCandidate(a, b *Candidate) *Difference {
	at := fmt.Sprintf("%s with %s", a.Site, a.Plant)
	if a.ID() != b.ID() {
		return &Difference{Where: "candidate", Old: a.ID(), New: b.ID()}
	}
	if a.Status != b.Status {
		return &Difference{Where: at + ", status", Old: a.Status, New: b.Status}
	}
	if a.Fit != nil && b.Fit != nil && len(a.Fit.Turbines) != len(b.Fit.Turbines) {
		return &Difference{Where: at + ", number of turbines", Old: fmt.Sprint(len(a.Fit.Turbines)), New: fmt.Sprint(len(b.Fit.Turbines))}
	}
	as, bs := a.All(), b.All()
	if len(as) != len(bs) {
		return &Difference{Where: at + ", number of consequences", Old: fmt.Sprint(len(as)), New: fmt.Sprint(len(bs))}
	}
	for i, q := range as {
		p := bs[i]
		if q.Key != p.Key || q.State != p.State || q.Why != p.Why {
			return &Difference{Where: at + ", " + q.Key, Old: q.State.String() + " " + q.Why, New: p.Key + " " + p.State.String() + " " + p.Why}
		}
		if q.State == scoring.Number && !(near(q.Low, p.Low) && near(q.Central, p.Central) && near(q.High, p.High)) {
			return &Difference{Where: at + ", " + q.Key, Old: fmt.Sprint(q.Low, " ", q.Central, " ", q.High), New: fmt.Sprint(p.Low, " ", p.Central, " ", p.High)}
		}
	}
	if !sameHabitat(a.Habitat, b.Habitat) {
		return &Difference{Where: at + ", habitat", Old: a.Habitat.String(), New: b.Habitat.String()}
	}
	return nil
}

// sameHabitat compares the habitat touched, which may be nil for none.
func sameHabitat(a, b *Habitat) bool {
	if a == nil || b == nil {
		return a == b
	}
	same := func(x, y HabitatKind) bool {
		ok := near(x.LostHa, y.LostHa) && near(x.EdgeHa, y.EdgeHa)
		x.LostHa, x.EdgeHa, y.LostHa, y.EdgeHa = 0, 0, 0, 0
		return ok && x == y
	}
	if !slices.EqualFunc(a.Kinds, b.Kinds, same) || (a.Pieces == nil) != (b.Pieces == nil) {
		return false
	}
	p, q := a.Pieces, b.Pieces
	return p == nil || p.Before == q.Before && p.After == q.After && near(p.LargestBeforeHa, q.LargestBeforeHa) && near(p.LargestAfterHa, q.LargestAfterHa)
}

// String writes the habitat touched for one who compares it.
func (h *Habitat) String() string {
	if h == nil {
		return "none"
	}
	var parts []string
	for _, k := range h.Kinds {
		parts = append(parts, fmt.Sprintf("%s %s %s %v ha lost, %v ha in the edge", k.Class, k.Condition, k.Irreplaceable, k.LostHa, k.EdgeHa))
	}
	if p := h.Pieces; p != nil {
		parts = append(parts, fmt.Sprintf("%d pieces before, %d after, the largest %v and %v ha", p.Before, p.After, p.LargestBeforeHa, p.LargestAfterHa))
	}
	return strings.Join(parts, "; ")
}
