package solar

// Losses are shares of energy that do not depend on the moment, applied in the order of the fields. Dirt and snow
// go by month, January first.
type Losses struct {
	SoilingFrac      [12]float64 // dirt on the glass, of the light
	SnowFrac         [12]float64 // snow on the panels, of the month's energy
	LIDFrac          float64     // light-induced loss of the first days
	NameplateFrac    float64     // rating below the label; negative when above
	MismatchFrac     float64     // panels that differ within a string
	DCWiringFrac     float64
	ACWiringFrac     float64
	TransformerFrac  float64
	AuxiliaryFrac    float64 // own use
	CurtailmentFrac  float64 // energy that the grid does not take, given by the user
	AvailabilityFrac float64 // time out of order
}

// behindInverter is the share of the inverters' energy that leaves the plant, snow not counted.
func (l *Losses) behindInverter() float64 {
	return (1 - l.ACWiringFrac) * (1 - l.TransformerFrac) * (1 - l.AuxiliaryFrac) * (1 - l.CurtailmentFrac) * (1 - l.AvailabilityFrac)
}

// The names of the steps of a loss chain, in their order.
const (
	StepHorizon     = "far_horizon" // only where a horizon is given
	StepRowShade    = "row_shade_beam"
	StepShadePower  = "row_shade_electrical"
	StepRowDiffuse  = "row_shade_diffuse"
	StepIncidence   = "incidence_angle"
	StepRear        = "rear_light"
	StepSoiling     = "soiling"
	StepSnow        = "snow"
	StepTemperature = "temperature"
	StepLID         = "light_induced"
	StepNameplate   = "nameplate"
	StepMismatch    = "mismatch"
	StepDCWiring    = "dc_wiring"
	StepInverter    = "inverter"
	StepClipping    = "clipping"
	StepACWiring    = "ac_wiring"
	StepTransformer = "transformer"
	StepAuxiliary   = "auxiliary"
	StepCurtailment = "curtailment"
	StepAvailable   = "availability"
)

// Step is one link of the loss chain, from light on the plane at nominal efficiency to energy at the
// plant's terminals. After = Before (1 + Share); a Share below 0 is a loss, above 0 a gain. The Before of
// a step is the After of the step before it, bit for bit.
type Step struct {
	Name            string  `json:"name"`
	BeforeKWhPerKWp float64 `json:"before_kwh_per_kwp"`
	Share           float64 `json:"share"`
	AfterKWhPerKWp  float64 `json:"after_kwh_per_kwp"`
}

// chain builds steps one after another.
type chain struct {
	at    float64
	steps []Step
}

func (c *chain) to(name string, after float64) {
	share := 0.0
	if c.at != 0 {
		share = after/c.at - 1
	}
	c.steps = append(c.steps, Step{Name: name, BeforeKWhPerKWp: c.at, Share: share, AfterKWhPerKWp: after})
	c.at = after
}

func (c *chain) lose(name string, frac float64) {
	after := float64(c.at * (1 - frac))
	c.steps = append(c.steps, Step{Name: name, BeforeKWhPerKWp: c.at, Share: -frac, AfterKWhPerKWp: after})
	c.at = after
}
