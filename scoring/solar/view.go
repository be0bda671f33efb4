package solar

import (
	"math"

	"groundtally/scoring/sun"
)

// face is what one side of a row sees of sky and ground, among rows.
type face struct {
	sky, ground        float64 // shares of view
	glassSky, glassGnd float64 // shares that pass the glass
}

// viewer knows what the rows of a plant see. Angles are kept as sines and cosines: with many moments,
// trigonometric functions would be most of the work.
type viewer struct {
	p         *Plant
	phi       float64 // what light on the rear counts
	rowShare  float64 // share of rows that stand behind another
	rearGnd   float64
	frame     Frame
	tanCross  float64
	sinMax    float64 // of the largest rotation
	cosMax    float64
	sinR      float64 // of the rotation in hand
	cosR      float64
	cosTilt   float64       // of the panels to the horizontal
	sky       float64       // share of the sky that an open plane sees past the horizon
	skyLeft   float64       // the same over what it sees without horizon
	flatSky   float64       // share of the sky that the horizontal sees
	views     []views       // of a tracker behind a horizon, every viewStepDeg from one end of its turn to the other
	glass     []glassShares // of a tracker, every glassStepDeg of tilt from 0 to 180
	straight  float64       // what Glass.Beam measures against
	groundSky float64       // that the ground among rows sees
	front     face
	rear      face
}

func newViewer(p *Plant, phi float64) *viewer {
	m := &p.Mount
	v := &viewer{p: p, phi: phi, rowShare: 1, rearGnd: 1, flatSky: 1}
	if m.Rows > 0 {
		v.rowShare = float64(m.Rows-1) / float64(m.Rows)
	}
	if m.GCR == 0 {
		v.rowShare = 0
	}
	if m.Kind != VerticalRows && p.Module.Bifaciality > 0 {
		v.rearGnd = min(1, m.ClearanceM/float64(0.5*m.WidthM))
	}
	axis, rotation := m.AzimuthDeg-90, m.TiltDeg
	switch m.Kind {
	case SingleAxis:
		axis, rotation = m.AxisAzimuthDeg, 0
	case VerticalRows:
		rotation = 90
	}
	v.frame = NewFrame(axis, m.SlopeDeg, m.AspectDeg)
	v.tanCross = tand(v.frame.CrossTiltDeg)
	v.sinMax, v.cosMax = math.Sincos(m.MaxAngleDeg * radPerDeg)
	v.straight = p.Module.Glass.straight()
	if m.Horizon != nil {
		v.flatSky = m.Horizon.SkyView(sun.Vec{Z: 1})
	}
	if m.Kind == SingleAxis {
		v.glass = make([]glassShares, glassSteps+1)
		for i := range v.glass {
			v.glass[i] = v.glassOf(float64(i) * glassStepDeg)
		}
	}
	if m.Kind == SingleAxis && m.Horizon != nil {
		for i := range int(math.Ceil(2*m.MaxAngleDeg/viewStepDeg)) + 1 {
			v.views = append(v.views, v.viewsOf(v.frame.Normal(float64(i)*viewStepDeg-m.MaxAngleDeg)))
		}
	}
	if m.Kind != SingleAxis {
		v.aim(math.Sincos(rotation * radPerDeg))
	}
	return v
}

// glassShares are the shares of sky and ground light that pass the glass.
type glassShares struct{ sky, ground float64 }

// glassStepDeg is the step of tilt in which they are kept for trackers, drawn straight between, which is true to 2e-4.
const (
	glassStepDeg = 0.5
	glassSteps   = 180 / glassStepDeg
)

func (v *viewer) glassOf(tiltDeg float64) glassShares {
	g := v.p.Module.Glass
	return glassShares{g.Sky(tiltDeg), g.Ground(tiltDeg)}
}

func (v *viewer) glassAt(tiltDeg float64) glassShares {
	if v.glass == nil {
		return v.glassOf(tiltDeg)
	}
	x := tiltDeg / glassStepDeg
	i := min(max(int(x), 0), len(v.glass)-2)
	a, b, part := v.glass[i], v.glass[i+1], x-float64(i)
	return glassShares{a.sky + float64(part*(b.sky-a.sky)), a.ground + float64(part*(b.ground-a.ground))}
}

// views are the shares of the sky that front and rear see past the horizon.
type views struct{ front, rear float64 }

// viewStepDeg is the step of rotation in which they are kept; they are drawn straight between, which is true to
// 0.001.
const viewStepDeg = 5

func (v *viewer) viewsOf(n sun.Vec) (out views) {
	h := v.p.Mount.Horizon
	out.front = min((1+n.Z)/2, h.SkyView(n))
	if v.phi > 0 {
		out.rear = min((1-n.Z)/2, h.SkyView(sun.Vec{X: -n.X, Y: -n.Y, Z: -n.Z}))
	}
	return out
}

// viewsAt gives the views of panels with the normal n.
func (v *viewer) viewsAt(n sun.Vec) views {
	if len(v.views) < 2 {
		return v.viewsOf(n)
	}
	x := (math.Atan2(v.sinR, v.cosR)/radPerDeg + v.p.Mount.MaxAngleDeg) / viewStepDeg
	i := min(max(int(x), 0), len(v.views)-2)
	a, b, part := v.views[i], v.views[i+1], x-float64(i)
	return views{a.front + float64(part*(b.front-a.front)), a.rear + float64(part*(b.rear-a.rear))}
}

// aim turns the panels.
func (v *viewer) aim(sinR, cosR float64) {
	v.sinR, v.cosR = sinR, cosR
	f := &v.frame
	n := sun.Vec{
		X: float64(sinR*f.X.X) + float64(cosR*f.Z.X),
		Y: float64(sinR*f.X.Y) + float64(cosR*f.Z.Y),
		Z: float64(sinR*f.X.Z) + float64(cosR*f.Z.Z),
	}
	v.cosTilt = clamp(n.Z, -1, 1)
	cr := math.Abs(cosR)
	view := ViewOfRows(cr, v.p.Mount.GCR)
	v.groundSky = float64(view.GroundSky * v.flatSky)
	openSky, openGnd := (1+v.cosTilt)/2, (1-v.cosTilt)/2
	v.sky, v.skyLeft = openSky, 1
	var past views
	if v.p.Mount.Horizon != nil {
		past = v.viewsAt(n)
		v.sky = past.front
		v.skyLeft = left(v.sky, openSky)
		openSky, openGnd = v.sky, 1-v.sky
	}
	// What rows take away is reckoned on flat ground and applied to the view of the true tilt.
	skyLeft, gndLeft := left(view.FrontSky, (1+cr)/2), left(view.FrontGround, (1-cr)/2)
	tilt := math.Acos(v.cosTilt) / radPerDeg
	v.front.sky = float64(openSky * mix(skyLeft, 1, v.rowShare))
	v.front.ground = float64(openGnd * mix(gndLeft, 1, v.rowShare))
	passes := v.glassAt(tilt)
	v.front.glassSky, v.front.glassGnd = passes.sky, passes.ground
	if v.phi > 0 {
		rearSky, rearGnd := (1-v.cosTilt)/2, (1+v.cosTilt)/2
		if v.p.Mount.Horizon != nil {
			rearSky, rearGnd = past.rear, 1-past.rear
		}
		v.rear.sky = float64(rearSky * mix(gndLeft, 1, v.rowShare))
		v.rear.ground = float64(rearGnd*mix(skyLeft, 1, v.rowShare)) * v.rearGnd
		passes := v.glassAt(180 - tilt)
		v.rear.glassSky, v.rear.glassGnd = passes.sky, passes.ground
	}
}

// over gives the sun in the plane across the rows, and its height over the ground line between them times the
// length of that. The sun stands over the ground plane where up is positive (see SunOverGround).
func (v *viewer) over(s sun.Vec) (x, z, up float64) {
	x, z = s.Dot(v.frame.X), s.Dot(v.frame.Z)
	return x, z, z - float64(v.tanCross*x)
}

// turn gives the rotation of a tracker, as TrackerAngleDeg does.
func (v *viewer) turn(x, z, up float64, backtrack bool) (sinR, cosR float64) {
	m := &v.p.Mount
	if up <= 0 {
		return v.within(math.Sincos(-v.frame.CrossTiltDeg * radPerDeg))
	}
	h := math.Sqrt(float64(x*x) + float64(z*z))
	sinT, cosT := x/h, z/h
	if backtrack && m.GCR > 0 {
		if c := up / float64(m.GCR*h); c < 1 {
			s := math.Copysign(math.Sqrt(1-float64(c*c)), x)
			sinT, cosT = float64(sinT*c)-float64(cosT*s), float64(cosT*c)+float64(sinT*s)
		}
	}
	return v.within(sinT, cosT)
}

// within draws a rotation into its limits.
func (v *viewer) within(sinR, cosR float64) (float64, float64) {
	if cosR < v.cosMax || cosR < 0 {
		return math.Copysign(v.sinMax, sinR), v.cosMax
	}
	return sinR, cosR
}

// follow aims a tracker at the sun.
func (v *viewer) follow(s sun.Vec) {
	x, z, up := v.over(s)
	v.aim(v.turn(x, z, up, v.p.Mount.Backtrack))
}

// reach is ShadedShare before it is drawn into [0, 1]: negative while the shadow's edge falls short of the
// row, not below -3.
func (v *viewer) reach(x, z, up float64) float64 {
	if up <= 0 {
		return 1
	}
	sinR, cosR := v.sinR, v.cosR
	if v.p.Mount.Kind == SingleAxis {
		sinR, cosR = v.turn(x, z, up, false)
	}
	w := v.p.Mount.GCR * math.Abs(float64(x*sinR)+float64(z*cosR))
	if up >= 4*w {
		return -3
	}
	return 1 - up/w
}

// side is how the sun lights one side of a row.
type side struct {
	cosIncidence float64 // mean over the moment
	ratio        float64 // to the light on the horizontal
	seen         float64 // share of the beam that passes the horizon
	glass        float64 // share of the rest that passes the glass
}

// looks is how the sun stands to a plant over a moment.
type looks struct {
	front, rear   side
	shaded, power float64 // of the beam on the front: what rows shade, what that costs
	seenSin       float64 // mean of the sine of the height of the sun where it is over the horizon
	groundSin     float64 // the same of ground that no row shades
}

// look takes the means over the suns of a moment. With edges, which a single sun has, the shadow's edge and the
// horizon's move evenly from one to the other.
func (v *viewer) look(suns, edges []sunAt, sinE float64) (out looks) {
	m := &v.p.Mount
	var front, rear, frontSeen, rearSeen, frontGlass, rearGlass, shadedBy, powerBy float64
	for i := range suns {
		s := &suns[i]
		x, z, up := v.over(s.v)
		if m.Kind == SingleAxis && len(suns) > 1 {
			v.sinR, v.cosR = v.turn(x, z, up, m.Backtrack)
		}
		cosi := float64(x*v.sinR) + float64(z*v.cosR)
		lower := max(0, s.v.Z)
		groundShade := 0.0
		if m.GCR > 0 {
			groundShade = 1.0
			if w, h := m.GCR*math.Abs(cosi), math.Abs(up); w < h {
				groundShade = w / h
			}
		}
		if up <= 0 || s.v.Z <= 0 {
			cosi = 0
		}
		seen := 1.0
		if m.Horizon != nil {
			if edges != nil {
				seen = m.Horizon.seenBetween(&edges[0], &edges[1])
			} else {
				seen = m.Horizon.seen(s)
			}
		}
		out.seenSin += float64(lower * seen)
		out.groundSin += float64(lower * seen * (1 - groundShade))
		shaded, power := 0.0, 0.0
		if v.rowShare > 0 {
			switch {
			case m.Kind == SingleAxis && m.Backtrack:
				if w := m.GCR * math.Abs(float64(x*v.sinR)+float64(z*v.cosR)); up <= 0 {
					shaded = 1
				} else if w > 0 {
					if shaded = clamp(1-up/w, 0, 1); shaded < shadeNoise {
						shaded = 0
					}
				}
				power = ShadePowerLoss(shaded, v.p.Module.ShadeBlocks)
			case edges != nil:
				shaded, power = meanShade(v.reach(v.over(edges[0].v)), v.reach(v.over(edges[1].v)), v.p.Module.ShadeBlocks)
			default:
				if shaded = clamp(v.reach(x, z, up), 0, 1); shaded < shadeNoise {
					shaded = 0
				}
				power = ShadePowerLoss(shaded, v.p.Module.ShadeBlocks)
			}
			shaded, power = float64(shaded*v.rowShare), float64(power*v.rowShare)
		}
		switch {
		case cosi > 0:
			front += cosi
			w := float64(cosi * seen)
			frontSeen += w
			shadedBy += float64(w * shaded)
			powerBy += float64(w * power)
			frontGlass += float64(w * (1 - power) * v.p.Module.Glass.beam(cosi, v.straight))
		case cosi < 0 && v.phi > 0:
			rear -= cosi
			w := float64(-cosi * seen)
			rearSeen += w
			shadedBy += float64(w * shaded)
			powerBy += float64(w * power)
			rearGlass += float64(w * (1 - power) * v.p.Module.Glass.beam(-cosi, v.straight))
		}
	}
	n := float64(len(suns))
	out.seenSin /= n
	out.groundSin /= n
	if lit := frontSeen + rearSeen; lit > 0 {
		out.shaded, out.power = shadedBy/lit, powerBy/lit
	}
	out.front = sideOf(front, frontSeen, frontGlass, out.power, n, sinE)
	out.rear = sideOf(rear, rearSeen, rearGlass, out.power, n, sinE)
	return out
}

func sideOf(cos, seen, glass, power, n, sinE float64) side {
	out := side{cosIncidence: cos / n, ratio: BeamRatio(cos/n, sinE)}
	if cos > 0 {
		out.seen = seen / cos
	}
	if live := seen * (1 - power); live > 0 {
		out.glass = glass / live
	}
	return out
}
