package rules

import (
	"math"
	"math/cmplx"

	"heavyspot/dsp"
)

// The bearings, as indices.
const (
	driveEnd = iota
	nonDriveEnd
)

// bearingNames are the bearings' names in tests and advice.
var bearingNames = [2]string{"drive-end", "non-drive-end"}

// place is what one point showed in a minute.
type place struct {
	good bool
	// z holds the phasors of 1x, 2x and 3x, mm/s rms: arg = -lag, so that the
	// velocity is sqrt(2)*Re(z*exp(j*n*theta)).
	z [dsp.Orders]complex128
	// lagSD (degrees) and rmsSD (mm/s) belong to 1x.
	lagSD, rmsSD float64
	// overall is mm/s rms, wander degrees.
	overall, wander float64
}

// harmonics returns the amplitude of 2x and 3x together, mm/s rms.
func (p *place) harmonics() float64 { return math.Hypot(cmplx.Abs(p.z[1]), cmplx.Abs(p.z[2])) }

// amplitude returns the 1x amplitude, mm/s rms; 0 when the point is not good.
func (p *place) amplitude() float64 { return cmplx.Abs(p.z[0]) }

// picture is a minute laid out on the machine: bearing by direction.
type picture struct {
	at [2][3]place
	// sense is +1 for a clockwise rotor, -1 for a counter-clockwise one.
	sense float64
}

// newPicture lays the readings out. Of several points at one place the first
// good one counts.
func newPicture(cfg *Config, m *dsp.Minute) picture {
	p := picture{sense: 1}
	if cfg.CounterClockwise {
		p.sense = -1
	}
	for i, c := range cfg.Points {
		at := &p.at[bearingOf(c)][c.Direction]
		if i < len(m.Points) && !at.good {
			*at = newPlace(&m.Points[i])
		}
	}
	return p
}

func bearingOf(p Point) int {
	if p.NonDriveEnd {
		return nonDriveEnd
	}
	return driveEnd
}

// still is the 1x amplitude, mm/s rms, below which a point stands still and has
// no phase; absurd is a value that no machine reaches, in any unit used here.
const still, absurd = 1e-6, 1e6

// newPlace takes a reading; one that cannot be judged leaves an empty place.
func newPlace(r *dsp.PointReading) place {
	if !usable(r) {
		return place{}
	}
	p := place{
		good: true, overall: r.Overall, wander: r.Wander,
		lagSD: r.Order[0].LagSD, rmsSD: r.Order[0].RMSSD,
	}
	for n, v := range r.Order {
		if v.RMS >= still {
			p.z[n] = cmplx.Rect(v.RMS, -radians(v.Lag))
		}
	}
	return p
}

// usable says whether a reading is good and holds numbers that can be judged.
func usable(r *dsp.PointReading) bool {
	ok := r.State == dsp.PointGood && sound(r.Overall) && sound(r.Wander)
	for _, v := range r.Order {
		ok = ok && sound(v.RMS) && sound(v.RMSSD) && sound(v.LagSD) && math.Abs(v.Lag) <= absurd
	}
	return ok
}

// sound says whether x is a number from 0 to absurd.
func sound(x float64) bool { return x >= 0 && x <= absurd }

// angle is a phase difference, -180 < deg <= 180, with its standard deviation;
// ok is false when a point is missing.
type angle struct {
	deg, sd float64
	ok      bool
}

// size returns the angle without its sign, 0 to 180.
func (a angle) size() angle { return angle{math.Abs(a.deg), a.sd, a.ok} }

// lagBehind returns by how much a lags b at 1x.
func lagBehind(a, b *place) angle {
	if a.amplitude() == 0 || b.amplitude() == 0 {
		return angle{}
	}
	return angle{-degrees(cmplx.Phase(a.z[0] * cmplx.Conj(b.z[0]))), math.Hypot(a.lagSD, b.lagSD), true}
}

// turning returns by how much horizontal lags vertical at a bearing, counted in
// the sense of rotation: +90 for a housing that circles with the rotor.
func (p *picture) turning(bearing int) angle {
	a := lagBehind(&p.at[bearing][Horizontal], &p.at[bearing][Vertical])
	a.deg *= p.sense
	return a
}

// circles splits the radial motion of a bearing into its circular parts, mm/s
// rms: forward turns with the rotor, backward against it (the two circles of an
// elliptical orbit). Unequal supports make a backward part, but unbalance on
// supports that are not too unequal leaves the forward part the larger.
func (p *picture) circles(bearing int) (forward, backward complex128) {
	v, h := p.at[bearing][Vertical].z[0], p.at[bearing][Horizontal].z[0]
	jh := complex(0, p.sense) * h
	return (v + jh) / 2, (v - jh) / 2
}

// ends returns by how much the drive end lags the non-drive end in one
// direction.
func (p *picture) ends(d Direction) angle {
	return lagBehind(&p.at[driveEnd][d], &p.at[nonDriveEnd][d])
}

// bothWays returns the phase difference of the ends over vertical and
// horizontal together, each weighed with its amplitudes. It equals the one of
// the circular parts together, so it does not depend on how the radial axes lie.
func (p *picture) bothWays() angle {
	var sum complex128
	var weight, variance float64
	for d := Vertical; d <= Horizontal; d++ {
		a := p.ends(d)
		if !a.ok {
			continue
		}
		product := p.at[driveEnd][d].z[0] * cmplx.Conj(p.at[nonDriveEnd][d].z[0])
		w := cmplx.Abs(product)
		sum += product
		weight += w
		variance += w * w * a.sd * a.sd
	}
	if weight == 0 || sum == 0 {
		return angle{}
	}
	return angle{-degrees(cmplx.Phase(sum)), math.Sqrt(variance) / weight, true}
}

// inPhase returns the share of the power of the radial motion in which both
// ends move together, 0 to 1; the rest is opposed. ok is false when the ends
// cannot be compared in a direction.
func (p *picture) inPhase() (share float64, ok bool) {
	var together, opposed float64
	for d := Vertical; d <= Horizontal; d++ {
		if !p.ends(d).ok {
			return 0, false
		}
		a, b := p.at[driveEnd][d].z[0], p.at[nonDriveEnd][d].z[0]
		together += sq(cmplx.Abs(a + b))
		opposed += sq(cmplx.Abs(a - b))
	}
	return together / (together + opposed), true
}

// power sums the squared amplitudes of an order over the good points of the
// given directions, (mm/s)^2, and counts them.
func (p *picture) power(order int, directions ...Direction) (sum float64, n int) {
	for b := range p.at {
		for _, d := range directions {
			if at := &p.at[b][d]; at.good {
				sum += sq(cmplx.Abs(at.z[order-1]))
				n++
			}
		}
	}
	return sum, n
}

func sq(x float64) float64      { return x * x }
func radians(d float64) float64 { return d * math.Pi / 180 }
func degrees(r float64) float64 { return r * 180 / math.Pi }
