package dsp

import "math"

// Directions gathers angles. The zero value holds none.
type Directions struct {
	n        float64
	cos, sin float64
}

// Add takes an angle in degrees with a weight; 1 for a plain count.
func (d *Directions) Add(deg, weight float64) {
	s, c := math.Sincos(deg * math.Pi / 180)
	d.n += weight
	d.cos += weight * c
	d.sin += weight * s
}

// Mean returns the mean direction, degrees, 0 <= mean < 360.
func (d *Directions) Mean() float64 {
	return wrap(math.Atan2(d.sin, d.cos) * 180 / math.Pi)
}

// Length returns the mean resultant length r, 0 to 1; 0 when empty.
func (d *Directions) Length() float64 {
	if d.n == 0 {
		return 0
	}
	return math.Hypot(d.cos, d.sin) / d.n
}

// Deviation returns the angular deviation sqrt(2*(1-r)), degrees (Zar,
// Biostatistical Analysis, 5th edition, equation 26.20).
func (d *Directions) Deviation() float64 {
	return math.Sqrt(2*max(0, 1-d.Length())) * 180 / math.Pi
}

// SD returns the circular standard deviation sqrt(-2*ln r), degrees (Zar,
// equation 26.21).
func (d *Directions) SD() float64 {
	return math.Sqrt(max(0, -2*math.Log(d.Length()))) * 180 / math.Pi
}

// wrap returns the angle in degrees that is in the range 0 <= angle < 360.
func wrap(deg float64) float64 {
	deg = math.Mod(deg, 360)
	if deg < 0 {
		deg += 360
	}
	if deg >= 360 { // -1e-15 + 360 rounds to 360
		return 0
	}
	return deg
}
