package run

import (
	"math"
	"testing"

	"groundtally/scoring"
)

// A track of 5 m runs 1 km straight south. It cuts a meadow of 400 by 200 m, 200 to 400 m away, in two, and lies 500
// to 600 m away within a heath that is 10 m wide, which it cuts in two as well. All by hand.
func TestHabitatByClassAndPieces(t *testing.T) {
	make := func(meadow string, set ...string) *Candidate {
		p := tracked(t)
		p.add("habitat", []string{"class", "condition", "irreplaceable"},
			thing{box(-200, -400, 200, -200), map[string]string{"class": "meadow", "condition": "good", "irreplaceable": meadow}},
			thing{box(-5, -600, 5, -500), map[string]string{"class": "heath", "condition": "fair", "irreplaceable": "no"}},
			thing{box(400, 400, 450, 450), map[string]string{"class": "pond", "irreplaceable": "yes"}})
		p.set(set...)
		return p.computed(nil)
	}
	c := make("yes")
	near := func(what string, got, want, tol float64) {
		t.Helper()
		if math.Abs(got-want) > tol {
			t.Errorf("%s: %v, by hand %v", what, got, want)
		}
	}
	if c.Habitat == nil || len(c.Habitat.Kinds) != 2 || c.Habitat.Pieces == nil {
		t.Fatalf("habitat %+v", c.Habitat)
	}
	meadow, heath := c.Habitat.Kinds[0], c.Habitat.Kinds[1]
	if meadow.Class != "meadow" || meadow.Condition != "good" || meadow.Irreplaceable != "yes" || heath.Class != "heath" || heath.Irreplaceable != "no" {
		t.Fatalf("classes %+v", c.Habitat.Kinds)
	}
	near("meadow lost, ha", meadow.LostHa, 5*200/1e4, 1e-3)
	near("heath lost, ha", heath.LostHa, 5*100/1e4, 1e-3)
	pieces := c.Habitat.Pieces
	if pieces.Before != 2 || pieces.After != 4 {
		t.Errorf("%d pieces before, %d after", pieces.Before, pieces.After)
	}
	near("largest before, ha", pieces.LargestBeforeHa, 8, 0.01)
	near("largest after, ha", pieces.LargestAfterHa, 197.5*200/1e4, 0.05)
	if q, _ := c.Consequence("habitat_fragments"); q.State != scoring.Number || q.Central != 2 {
		t.Errorf("pieces added %+v", q)
	}
	near("irreplaceable, ha", c.stateOf("habitat_irreplaceable_ha").X, 0.1, 1e-3)
	told := func(c *Candidate) (yes bool) {
		for _, n := range c.Notices {
			yes = yes || n == "old_habitat_touched"
		}
		return yes
	}
	if !told(c) || c.Gate("irreplaceable_habitat").State != "no" || c.Gate("habitat").State != "no" {
		t.Errorf("gates %v, %v, told %v", c.Gate("irreplaceable_habitat"), c.Gate("habitat"), told(c))
	}

	// With a disturbed edge of 20 m the meadow is touched on 40 m more, and nothing more is cut.
	c = make("yes", "land.habitat_edge_m", "20")
	near("meadow lost with an edge, ha", c.Habitat.Kinds[0].LostHa, 0.1, 1e-3)
	near("edge in the meadow, ha", c.Habitat.Kinds[0].EdgeHa, 40*200/1e4, 3e-3)
	if *c.Habitat.Pieces != *pieces {
		t.Errorf("with an edge %+v, without %+v", c.Habitat.Pieces, pieces)
	}

	// What the layer does not say is unknown; a layer that is complete tells of nothing.
	c = make("")
	if v := c.stateOf("habitat_irreplaceable_ha"); v.State != scoring.Unknown || c.Gate("irreplaceable_habitat").State != "unknown" || told(c) {
		t.Errorf("where nothing is said %+v", v)
	}
	c = make("no")
	if v := c.stateOf("habitat_irreplaceable_ha"); v.State != scoring.None || c.Gate("irreplaceable_habitat").State != "yes" || c.Gate("habitat").State != "no" {
		t.Errorf("where all can be replaced %+v", v)
	}
}
