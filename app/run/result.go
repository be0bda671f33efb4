package run

import (
	"encoding/json"

	"groundtally/geo"
	"groundtally/scoring"
)

// The states of a candidate.
const (
	Fitted      = "fitted"
	NoRoom      = "no_room"
	NotComputed = "not_computed"
)

// Taken is what one rule takes of a site: alone (only this rule takes it) and shared.
type Taken struct {
	Rule     string  `json:"rule"`
	AloneHa  float64 `json:"alone_ha"`
	SharedHa float64 `json:"shared_ha"`
	TakesAll bool    `json:"takes_all,omitempty"`
}

// Gate is a condition that must hold before a candidate is ordered; it is never a weight.
type Gate struct {
	State string `json:"state"` // as delivered, or "unknown"
}

// ChainStep is one step of a loss chain.
type ChainStep struct {
	Name   string  `json:"name"`
	Unit   string  `json:"unit"`
	Before float64 `json:"before"`
	Share  float64 `json:"share"` // lost when positive, gained when negative
	After  float64 `json:"after"`
}

// Fit is the plant as fitted.
type Fit struct {
	Mode      string             `json:"mode"`
	RatedKW   float64            `json:"rated_kw"`
	WindKW    float64            `json:"wind_kw,omitempty"`
	SolarKW   float64            `json:"solar_kw,omitempty"` // direct current at test conditions
	ACKW      float64            `json:"ac_kw"`
	Turbines  []geo.LonLat       `json:"turbines,omitempty"`
	Layout    *Layout            `json:"layout,omitempty"` // nil without turbines
	Panels    geo.LonLatGeometry `json:"panels"`           // ground inside the fence
	FencedHa  float64            `json:"fenced_ha,omitempty"`
	Modules   int                `json:"modules,omitempty"`
	TiltDeg   float64            `json:"tilt_deg,omitempty"`    // of fixed panels, found or set
	RowPitchM float64            `json:"row_pitch_m,omitempty"` // between rows of panels, on the ground plan
	SpacingHa float64            `json:"spacing_ha,omitempty"`
	TrackKm   float64            `json:"track_km"`
	// TracksLaid tells that a way was found for the new tracks; otherwise their length is a rule of thumb.
	TracksLaid bool               `json:"tracks_laid"`
	Tracks     geo.LonLatGeometry `json:"tracks"`
}

// Nearest is the nearest miss of a candidate without room.
type Nearest struct {
	LargestPatchHa float64 `json:"largest_patch_ha"`
	NeedsPatchHa   float64 `json:"needs_patch_ha,omitempty"`
	BuildableHa    float64 `json:"buildable_ha"`
	LargestTaker   string  `json:"largest_taker,omitempty"` // the rule that takes most
	TakesHa        float64 `json:"takes_ha,omitempty"`
}

// Connection is the line or substation that takes the power.
type Connection struct {
	Asset      string     `json:"asset"`
	Kind       string     `json:"kind"`
	VoltageKV  float64    `json:"voltage_kv"`
	Assumed    bool       `json:"voltage_assumed,omitempty"` // the asset's voltage is not known
	Status     string     `json:"status"`
	Reason     string     `json:"reason,omitempty"`
	Conductor  string     `json:"conductor"`
	Circuits   int        `json:"circuits"`
	StraightKm float64    `json:"straight_km"`
	RouteKm    float64    `json:"route_km"`
	From       geo.LonLat `json:"from"`
	To         geo.LonLat `json:"to"`
	SpareKW    *float64   `json:"spare_kw,omitempty"` // nil when unknown
	ToldBy     string     `json:"told_by,omitempty"`
	ToldOn     string     `json:"told_on,omitempty"`
	Beside     string     `json:"beside,omitempty"`   // an asset of unknown capacity that might be cheaper
	Together   *Together  `json:"together,omitempty"` // of a plant of wind and sun; nil where no hours tell of both
}

// Leaf is an input of the reckoning as it stood for one candidate.
type Leaf struct {
	Name       string        `json:"name"`
	State      scoring.State `json:"state"`
	X          float64       `json:"x"`
	Why        string        `json:"why,omitempty"`
	Low        float64       `json:"low,omitempty"`
	High       float64       `json:"high,omitempty"`
	Source     string        `json:"source,omitempty"`
	Provenance string        `json:"provenance,omitempty"`
}

// Candidate is a site with one plant option fitted, and all that follows.
type Candidate struct {
	Site          string                `json:"site"`
	Parcels       []string              `json:"parcels"`
	Plant         string                `json:"plant"`
	Technology    string                `json:"technology"`
	Status        string                `json:"status"`
	Reason        string                `json:"reason,omitempty"`
	Consequences  []scoring.Consequence `json:"consequences"`
	Gates         map[string]Gate       `json:"gates"`
	Incomplete    []string              `json:"incomplete"`
	Taken         []Taken               `json:"taken"`
	TakenSharedHa float64               `json:"taken_shared_ha"`
	ShapeHa       float64               `json:"shape_ha"`
	Fit           *Fit                  `json:"fit,omitempty"`
	Miss          *Nearest              `json:"nearest_miss,omitempty"`
	Headroom      *Headroom             `json:"headroom,omitempty"` // of a plant with turbines where height limits hold
	Connection    *Connection           `json:"connection,omitempty"`
	Chain         []ChainStep           `json:"chain,omitempty"`
	Habitat       *Habitat              `json:"habitat,omitempty"` // nil where none is touched or known
	Facts         []Leaf                `json:"leaves,omitempty"`
	OverLimit     []string              `json:"over_limit,omitempty"`
	Excepted      []string              `json:"excepted,omitempty"` // rules that do not hold here by the user's word
	Notices       []string              `json:"notices"`            // codes

	columns *Columns // once among results, consequences and facts lie in columns; see All and Leaves
	row     int
}

// toColumns moves the consequences and facts into columns, and makes the rest as small as it can be.
func (c *Candidate) toColumns(cols *Columns) {
	row := cols.add()
	cols.put(row, c.All(), c.Leaves())
	taken := c.columns != nil // from other results, whose parts are not touched
	c.columns, c.row, c.Consequences, c.Facts = cols, row, nil, nil
	if taken {
		return
	}
	c.Parcels, c.Incomplete, c.Taken, c.Chain, c.Notices = exact(c.Parcels), exact(c.Incomplete), exact(c.Taken), exact(c.Chain), exact(c.Notices)
	if c.Fit != nil {
		c.Fit.Turbines = exact(c.Fit.Turbines)
		for _, rings := range c.Fit.Panels.Parts {
			for i := range rings {
				rings[i] = exact(rings[i])
			}
		}
	}
}

// exact gives a slice with the same elements and no room beyond them.
func exact[T any](s []T) []T {
	if len(s) == cap(s) {
		return s
	}
	return append(make([]T, 0, len(s)), s...)
}

// All gives every consequence, in the order of the keys.
func (c *Candidate) All() []scoring.Consequence {
	if c.columns == nil {
		return c.Consequences
	}
	var out []scoring.Consequence
	for k := range c.columns.keys {
		if q, ok := c.columns.consequence(c.row, k); ok {
			out = append(out, q)
		}
	}
	return out
}

// Leaves gives the facts that the reckoning of the candidate stands on; none without a fitted plant.
func (c *Candidate) Leaves() []Leaf {
	if c.columns == nil {
		return c.Facts
	}
	return c.columns.leaves(c.row)
}

// MarshalJSON writes the candidate with its consequences and facts, wherever they lie.
func (c Candidate) MarshalJSON() ([]byte, error) {
	type plain Candidate
	p := plain(c)
	p.Consequences, p.Facts = c.All(), c.Leaves()
	return json.Marshal(p)
}

// ID names a candidate.
func (c *Candidate) ID() string { return c.Site + "/" + c.Plant }

// Consequence finds a consequence by key.
func (c *Candidate) Consequence(key string) (scoring.Consequence, bool) {
	if c.columns != nil {
		if k, ok := c.columns.at[key]; ok {
			return c.columns.consequence(c.row, k)
		}
		return scoring.Consequence{}, false
	}
	for _, q := range c.Consequences {
		if q.Key == key {
			return q, true
		}
	}
	return scoring.Consequence{}, false
}

// ConsequenceJSON gives the public form of a consequence: exactly one of numbers, unknown, not_set,
// none, never, class.
func ConsequenceJSON(c scoring.Consequence) map[string]any {
	m := map[string]any{"unit": c.Unit, "account": string(c.Account), "notices": c.Notices}
	if c.Notices == nil {
		m["notices"] = []string{}
	}
	if c.Quality != "" {
		m["quality"] = c.Quality
	}
	switch c.State {
	case scoring.Number:
		m["low"], m["central"], m["high"], m["range"] = c.Low, c.Central, c.High, string(c.Range)
		if c.Range == scoring.P10P90 {
			m["median"] = c.Median
		}
	case scoring.Unknown:
		m["unknown"] = c.Why
	case scoring.NotAssessed:
		m["unknown"] = "not_assessed"
	case scoring.NotSet:
		m["not_set"] = c.Why
	case scoring.None:
		m["none"] = c.Why
	case scoring.Never:
		m["never"] = true
	case scoring.Class:
		m["class"] = c.Why
	}
	return m
}

// PublicJSON gives the candidate as terminal and appendix write it.
func (c *Candidate) PublicJSON() map[string]any {
	all := c.All()
	cons := make(map[string]any, len(all))
	for _, q := range all {
		cons[q.Key] = ConsequenceJSON(q)
	}
	m := map[string]any{
		"site": c.Site, "parcels": c.Parcels, "plant": c.Plant, "technology": c.Technology, "status": c.Status,
		"consequences": cons, "gates": c.AllGates(), "incomplete": orEmpty(c.Incomplete), "taken": c.Taken,
		"taken_shared_ha": c.TakenSharedHa, "shape_ha": c.ShapeHa, "notices": orEmpty(c.Notices), "over_limit": orEmpty(c.OverLimit),
	}
	if c.Taken == nil {
		m["taken"] = []Taken{}
	}
	if len(c.Excepted) > 0 {
		m["excepted"] = c.Excepted
	}
	if c.Reason != "" {
		m["reason"] = c.Reason
	}
	if c.Fit != nil {
		fit := map[string]any{"mode": c.Fit.Mode, "rated_kw": c.Fit.RatedKW, "ac_kw": c.Fit.ACKW, "track_km": c.Fit.TrackKm}
		turbines := make([]map[string]float64, len(c.Fit.Turbines))
		for i, p := range c.Fit.Turbines {
			turbines[i] = map[string]float64{"lon": p.Lon, "lat": p.Lat}
		}
		fit["turbines"] = turbines
		if c.Fit.Layout != nil {
			fit["layout"] = c.Fit.Layout
		}
		m["fit"] = fit
	}
	if c.Miss != nil {
		m["nearest_miss"] = c.Miss
	}
	if c.Headroom != nil {
		m["headroom"] = c.Headroom
	}
	if c.Connection != nil {
		m["connection"] = c.Connection
	}
	if c.Chain != nil {
		m["chain"] = c.Chain
	}
	if c.Habitat != nil {
		m["habitat"] = c.Habitat
	}
	return m
}

func orEmpty(s []string) []string {
	if s == nil {
		return []string{}
	}
	return s
}

// StepCount says how much of a step was computed and how much was still valid.
type StepCount struct {
	Step     string `json:"step"`
	Computed int    `json:"computed"`
	Valid    int    `json:"valid"`
}

// Results is all that follows from a study.
type Results struct {
	Candidates   []Candidate
	Alternatives []Alternative // saving the same, and sealed ground
	Voices       []VoiceOrder
	Unready      map[string]error // voices that cannot order anything yet, with the reason
	Steps        []StepCount
	Notices      []geo.Notice
	Code         Code

	made     []geo.Notice  // notices of the steps before weighing
	digests  []digest      // of the candidates
	keys     []digest      // of the inputs of each candidate
	contents []contentKeys // of what its last steps read
	draws    *draws        // for the next results
	terrain  *keptTerrain  // for the next results; nil when no step read it
	years    *sunYears     // for the next results
	sealed   Alternative
	reckoner *reckoner
}
