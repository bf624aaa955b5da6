package dsp

import (
	"math"
	"math/cmplx"
)

// series is the sequence of parts of one minute: when each part was, and the
// vectors of every point in it.
type series struct {
	centre []float64 // s from the series' origin
	length []float64 // s
	turns  []float64
	// tracked says which parts have their angle from the vibration.
	tracked []bool
	// velocity[p][n] is the sequence of complex velocities of order n+1 at
	// point p, mm/s rms, arg = -lag.
	velocity [][Orders][]complex128
	level    [][]float64 // volts
}

func newSeries(points int) *series {
	s := &series{velocity: make([][Orders][]complex128, points), level: make([][]float64, points)}
	const usual = 60/partSeconds + 8
	s.centre = make([]float64, 0, usual)
	s.length = make([]float64, 0, usual)
	s.turns = make([]float64, 0, usual)
	s.tracked = make([]bool, 0, usual)
	for p := range s.velocity {
		s.level[p] = make([]float64, 0, usual)
		for n := range s.velocity[p] {
			s.velocity[p][n] = make([]complex128, 0, usual)
		}
	}
	return s
}

func (s *series) clear() { s.cut(0) }

// add appends a part, turned from volts into velocity at the part's own speed.
func (s *series) add(cfg *Config, origin int64, p *part, tracked bool) {
	s.centre = append(s.centre, (p.centre-float64(origin))/cfg.RateHz)
	s.length = append(s.length, p.length/cfg.RateHz)
	s.turns = append(s.turns, float64(p.turns))
	s.tracked = append(s.tracked, tracked)
	hz := float64(p.turns) / p.length * cfg.RateHz
	for i := range s.velocity {
		s.level[i] = append(s.level[i], p.level[i])
		for n := range Orders {
			v := p.vector[i][n]
			if v != 0 {
				v *= toVelocity(cfg, i, float64(n+1)*hz)
			}
			s.velocity[i][n] = append(s.velocity[i][n], v)
		}
	}
}

// gravity is standard gravity, m/s2 (ISO 80000-3).
const gravity = 9.80665

// toVelocity returns the factor from a point's signal (volts peak) at hz to
// velocity of the housing (mm/s rms): sensitivity, polarity and the division by
// j*omega, with the chain's high pass H = 1/(1 - j*fc/f) and the converter's
// amplitude response taken off.
func toVelocity(cfg *Config, point int, hz float64) complex128 {
	p := &cfg.Points[point]
	scale := gravity * 1000 / p.VoltsPerG / math.Sqrt2
	if p.Inverted {
		scale = -scale
	}
	if cfg.Gain != nil {
		scale /= cfg.Gain(hz)
	}
	return complex(scale, 0) * complex(1, -p.HighpassHz/hz) / complex(0, 2*math.Pi*hz)
}

// keepOneKind drops the parts of the rarer kind when the angle came partly from
// the reference and partly from the vibration, and says which was kept.
func (s *series) keepOneKind() (tracked bool) {
	n := 0
	for _, t := range s.tracked {
		if t {
			n++
		}
	}
	tracked = 2*n > len(s.tracked)
	to := 0
	for k, t := range s.tracked {
		if t != tracked {
			continue
		}
		s.centre[to], s.length[to], s.turns[to], s.tracked[to] = s.centre[k], s.length[k], s.turns[k], t
		for p := range s.velocity {
			s.level[p][to] = s.level[p][k]
			for o := range Orders {
				s.velocity[p][o][to] = s.velocity[p][o][k]
			}
		}
		to++
	}
	s.cut(to)
	return tracked
}

// cut keeps the first n parts.
func (s *series) cut(n int) {
	s.centre, s.length, s.turns, s.tracked = s.centre[:n], s.length[:n], s.turns[:n], s.tracked[:n]
	for p := range s.velocity {
		s.level[p] = s.level[p][:n]
		for o := range Orders {
			s.velocity[p][o] = s.velocity[p][o][:n]
		}
	}
}

// speeds returns the mean, least and greatest turn rate, Hz, and the change
// over the minute by a straight line through the parts' rates, Hz.
func (s *series) speeds() (mean, low, high, change float64) {
	var turns, time, sx, sy, sxx, sxy float64
	low = math.Inf(1)
	for k, n := range s.turns {
		hz := n / s.length[k]
		low, high = min(low, hz), max(high, hz)
		turns += n
		time += s.length[k]
		sx += s.centre[k]
		sy += hz
		sxx += s.centre[k] * s.centre[k]
		sxy += s.centre[k] * hz
	}
	n := float64(len(s.turns))
	mean = turns / time
	if d := n*sxx - sx*sx; d > 0 {
		change = (n*sxy - sx*sy) / d * (s.centre[len(s.centre)-1] - s.centre[0])
	}
	return mean, low, high, change
}

// relativeTo turns all vectors so that the lag of the given point is zero in
// every part, and returns the mean turn rate corrected by the drift of that
// point's phase (Hz): without a reference pulse the shaft angle is only as good
// as the tracked frequency.
func (s *series) relativeTo(point int) (correction float64) {
	z := s.velocity[point][0]
	var drift, time float64
	for k := range z {
		if k > 0 {
			drift += cmplx.Phase(z[k] * cmplx.Conj(z[k-1]))
			time += s.centre[k] - s.centre[k-1]
		}
	}
	for k := range z {
		turn := cmplx.Rect(1, -cmplx.Phase(z[k]))
		for p := range s.velocity {
			f := turn
			for n := range Orders {
				s.velocity[p][n][k] *= f
				f *= turn
			}
		}
	}
	if time == 0 {
		return 0
	}
	return drift / (2 * math.Pi) / time
}
