package run

import (
	"fmt"
	"math"

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
		for j, b := range v.Beside {
			if c := u.Beside[j]; b.Why != c.Why || !near(b.Score, c.Score) || b.Place != c.Place {
				return &Difference{Where: fmt.Sprintf("voice %s, %s", v.Voice, b.Title), Old: fmt.Sprint(b.Why, " ", b.Score, ", place ", b.Place), New: fmt.Sprint(c.Why, " ", c.Score, ", place ", c.Place)}
			}
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
	if x, y := a.Habitat.roughly(), b.Habitat.roughly(); x != y {
		return &Difference{Where: at + ", habitat", Old: x, New: y}
	}
	return nil
}

// roughly writes the habitat touched, to a square metre.
func (h *Habitat) roughly() string {
	if h == nil {
		return "none"
	}
	text := ""
	for _, k := range h.Kinds {
		text += fmt.Sprintf("%s %s %s %.4f ha lost, %.4f ha in the edge; ", k.Class, k.Condition, k.Irreplaceable, k.LostHa, k.EdgeHa)
	}
	if h.Pieces != nil {
		text += fmt.Sprintf("%d pieces before, %d after", h.Pieces.Before, h.Pieces.After)
	}
	return text
}
