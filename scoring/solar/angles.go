package solar

import "math"

const radPerDeg = math.Pi / 180

func sind(deg float64) float64 { return math.Sin(deg * radPerDeg) }
func cosd(deg float64) float64 { return math.Cos(deg * radPerDeg) }
func tand(deg float64) float64 { return math.Tan(deg * radPerDeg) }

func clamp(x, low, high float64) float64 { return max(low, min(high, x)) }

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// cosFloor is cos 85 degrees: the ratio of beam on the plane to beam on the horizontal is not
// divided by less.
const cosFloor = 0.08715574274765817
