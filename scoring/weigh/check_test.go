package weigh

import (
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"groundtally/assets/citedtable"
)

func numbers(t *testing.T, s string) []float64 {
	t.Helper()
	var out []float64
	for f := range strings.FieldsSeq(s) {
		if f == "?" { // an unknown value
			out = append(out, math.NaN())
			continue
		}
		a, b, frac := strings.Cut(f, "/")
		x, err := strconv.ParseFloat(a, 64)
		if err != nil {
			t.Fatal(err)
		}
		if frac {
			y, err := strconv.ParseFloat(b, 64)
			if err != nil {
				t.Fatal(err)
			}
			x /= y
		}
		out = append(out, x)
	}
	return out
}

func table(t *testing.T, s string) [][]float64 {
	t.Helper()
	var out [][]float64
	for row := range strings.SplitSeq(s, "|") {
		out = append(out, numbers(t, row))
	}
	return out
}

// plainInput makes an input of point values with the ids A, B, C, …; NaN is an unknown part.
func plainInput(rows [][]float64, w []float64) Input {
	in := Input{Seed: 1}
	for k, u := range w {
		in.Keys = append(in.Keys, Key{fmt.Sprintf("k%d", k+1), "a", u})
	}
	for i, row := range rows {
		it := Item{ID: string(rune('A' + i))}
		for _, v := range row {
			p := Part{Known: true, Low: v, Mid: v, High: v}
			if math.IsNaN(v) {
				p = Part{}
			}
			it.Values = append(it.Values, p)
		}
		in.Items = append(in.Items, it)
	}
	return in
}

func lineOf(t *testing.T, r Result, id string) Line {
	t.Helper()
	for _, l := range r.Lines {
		if l.ID == id {
			return l
		}
	}
	t.Fatalf("no line %q", id)
	return Line{}
}

// columnSums is the local scaling that the package does not offer: each column divided by its sum.
func columnSums(rows [][]float64) []float64 {
	out := make([]float64, len(rows))
	for k := range rows[0] {
		s := 0.0
		for _, r := range rows {
			s += r[k]
		}
		for i, r := range rows {
			out[i] += r[k] / s / float64(len(rows[0]))
		}
	}
	return out
}

func TestChecks(t *testing.T) {
	tab, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "weigh.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			i := int(c.In["i"]) - 1
			n := int(c.In["n"])
			must := func(err error) {
				t.Helper()
				if err != nil {
					t.Fatal(err)
				}
			}
			list := func(k string) []float64 { return numbers(t, c.Text[k]) }
			var judged Judgements
			if s, ok := c.Text["upper"]; ok {
				judged, err = NewJudgements(n, numbers(t, s))
				must(err)
			}
			eigen := func() ([]float64, float64) {
				w, lambda, err := judged.Eigenvector()
				must(err)
				return w, lambda
			}
			order := func() Result {
				r, err := Order(plainInput(table(t, c.Text["rows"]), list("w")))
				must(err)
				return r
			}
			// Differences of the named rival to the first row.
			rival := func() (w, delta []float64) {
				rows := table(t, c.Text["rows"])
				b := rows[int(c.In["rival"])-1]
				for k := range b {
					delta = append(delta, b[k]-rows[0][k])
				}
				return list("w"), delta
			}
			fixed := func() float64 {
				rows := table(t, c.Text["rows"])
				curve, err := NewLinear(0, 10)
				must(err)
				for _, row := range rows {
					for k := range row {
						row[k], _, err = curve.Value(row[k])
						must(err)
					}
				}
				r, err := Order(plainInput(rows, []float64{1, 1, 1}))
				must(err)
				return lineOf(t, r, string(rune('A'+i))).Score
			}
			var got float64
			switch c.Quantity {
			case "random_index":
				ri, ok := RandomIndexSaaty(n)
				if !ok {
					t.Fatal("no random index")
				}
				got = ri
			case "random_index_fit":
				got = RandomIndexFit(n)
			case "eigenvector":
				w, _ := eigen()
				got = w[i]
			case "lambda":
				_, got = eigen()
			case "ci":
				_, lambda := eigen()
				got = ConsistencyIndex(lambda, n)
			case "consistency_ratio":
				_, lambda := eigen()
				ri, _ := RandomIndexSaaty(n)
				got = ConsistencyRatio(lambda, n, ri)
			case "geometric_mean":
				got = judged.GeometricMean()[i]
			case "gci":
				got = judged.GeometricConsistency()
			case "roc":
				got = RankOrderCentroid(n)[i]
			case "rank_sum":
				got = RankSum(n)[i]
			case "rank_reciprocal":
				got = RankReciprocal(n)[i]
			case "swing":
				w, err := Swing(list("points"))
				must(err)
				got = w[i]
			case "column_sum_score":
				got = columnSums(table(t, c.Text["rows"]))[i]
			case "fixed_score_without", "fixed_score_with":
				got = fixed()
			case "draws":
				d, err := DrawsFor(c.In["half_width"], c.In["z"])
				must(err)
				got = float64(d)
			case "score":
				got = lineOf(t, order(), string(rune('A'+i))).Score
			case "score_low":
				got = lineOf(t, order(), string(rune('A'+i))).ScoreLow
			case "score_high":
				got = lineOf(t, order(), string(rune('A'+i))).ScoreHigh
			case "tipping_from":
				got = order().Tipping[int(c.In["k"])-1].From
			case "tipping_to":
				got = order().Tipping[int(c.In["k"])-1].To
			case "closest_weights":
				w, delta := rival()
				x, _, err := ClosestReversal(w, delta)
				must(err)
				got = x[i]
			case "closest_distance":
				w, delta := rival()
				_, got, err = ClosestReversal(w, delta)
				must(err)
			case "reversal_factor":
				w, delta := rival()
				rho, ok := ReversalFactor(w, delta)
				if !ok {
					t.Fatal("no reversal")
				}
				got = rho
			case "weight_to_move", "weight_to_move_after":
				w, delta := rival()
				mass, after, err := WeightToMove(w, delta, make([]float64, len(w)), []float64{1, 1, 1})
				must(err)
				if got = mass; c.Quantity == "weight_to_move_after" {
					got = after[i]
				}
			case "largest_shift":
				w, delta := rival()
				got, err = LargestShift(w, delta)
				must(err)
			case "box_max", "box_max_weight":
				v, w, err := BoxMax(list("l"), list("h"), list("c"))
				must(err)
				if got = v; c.Quantity == "box_max_weight" {
					got = w[i]
				}
			case "box_min", "box_min_weight":
				v, w, err := BoxMin(list("l"), list("h"), list("c"))
				must(err)
				if got = v; c.Quantity == "box_min_weight" {
					got = w[i]
				}
			case "dominates":
				rows, dir := table(t, c.Text["rows"]), list("directions")
				for _, row := range rows {
					for k := range row {
						row[k] *= dir[k]
					}
				}
				if Dominates(rows[int(c.In["a"])-1], rows[int(c.In["b"])-1]) {
					got = 1
				}
			case "max_regret", "lowest_score":
				byGroup := table(t, c.Text["scores"])
				byItem := make([][]float64, len(byGroup[0]))
				for j := range byItem {
					for _, g := range byGroup {
						byItem[j] = append(byItem[j], g[j])
					}
				}
				r, m, err := Regret(byItem)
				must(err)
				if got = r[i]; c.Quantity == "lowest_score" {
					got = m[i]
				}
			case "group_geometric":
				w, err := GroupGeometric(table(t, c.Text["groups"]), []float64{1, 1, 1})
				must(err)
				got = w[i]
			case "group_arithmetic":
				w, err := GroupArithmetic(table(t, c.Text["groups"]), []float64{1, 1, 1})
				must(err)
				got = w[i]
			case "disagreement", "disagreement_share":
				d, s, err := Disagreement(table(t, c.Text["groups"]), list("delta"))
				must(err)
				if got = d[i]; c.Quantity == "disagreement_share" {
					got = s[i]
				}
			case "expected_front":
				got, err = ExpectedFront(n, int(c.In["d"]))
				must(err)
			case "rank_best", "rank_worst":
				best, worst, err := RankIntervals(list("low"), list("high"))
				must(err)
				if got = float64(best[i]); c.Quantity == "rank_worst" {
					got = float64(worst[i])
				}
			default:
				t.Fatalf("no function for the quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("got %.12g, want %.12g within %g", got, c.Expected, c.Tolerance)
			}
		})
	}
}
