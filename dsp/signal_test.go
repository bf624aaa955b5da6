package dsp_test

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"heavyspot/dsp"
)

// signal is a prescribed recording: the shaft angle is an exact function of
// time, every point has the same exact vectors, and the reference pulse goes
// through a filter like the converter's.
type signal struct {
	rate, seconds float64
	hz            float64 // turn rate in the middle
	ramp          float64 // change of the turn rate over the minute, share
	wander        float64 // slow sine of the turn rate, share
	points        int
	mms, lag      [dsp.Orders]float64
	noise         float64 // volts, one standard deviation
	neighbour     float64 // amplitude against 1x
	away          float64 // share of the turn rate
	strays        float64 // wander of the neighbour's speed, share
	creep         float64 // how far the own lag wanders within the minute, degrees
	swells        float64 // how much the own amplitude swells and shrinks, share
	width         float64 // of the pulse, turns
	falling       bool
	jitter        float64 // of the pulse, rows
	missing       float64 // probability
	extra         float64
	filter        int // boxes of one row the pulse goes through, 0 to 3
	seed          uint64
}

const sensitivity = 0.1 // volts per g

// angle returns the shaft angle in turns at t seconds.
func (s *signal) angle(t float64) float64 {
	x := t - s.seconds/2
	a := s.hz * (x + s.ramp*x*x/2/s.seconds)
	if s.wander != 0 {
		a += s.hz * s.wander * 7 / (2 * math.Pi) * math.Sin(2*math.Pi*x/7)
	}
	return a + 1000.3
}

func (s *signal) turnRate(t float64) float64 {
	x := t - s.seconds/2
	return s.hz * (1 + s.ramp*x/s.seconds + s.wander*math.Cos(2*math.Pi*x/7))
}

// when returns the time at which the shaft angle is a, by Newton's method.
func (s *signal) when(a float64) float64 {
	t := s.seconds/2 + (a-1000.3)/s.hz
	for range 20 {
		t -= (s.angle(t) - a) / s.turnRate(t)
	}
	return t
}

// render returns the rows: the points first, the reference last.
func (s *signal) render() []float32 {
	r := rand.New(rand.NewPCG(s.seed, 1))
	n := int(s.rate * s.seconds)
	stride := s.points + 1
	out := make([]float32, n*stride)
	// The neighbour is felt in another way at each point.
	nphase := make([]float64, s.points)
	for p := range nphase {
		nphase[p] = r.Float64() * 2 * math.Pi
	}
	for i := range n {
		t := (float64(i) + 0.5) / s.rate
		theta, hz := 2*math.Pi*s.angle(t), s.turnRate(t)
		creep := s.creep * math.Pi / 180 * (math.Sin(2*math.Pi*t/23) + 0.6*math.Sin(2*math.Pi*t/9+1)) / 1.2
		swell := 1 + s.swells*math.Sin(2*math.Pi*t/11)
		x := 0.0
		for o := range dsp.Orders {
			w := 2 * math.Pi * hz * float64(o+1)
			// Acceleration leads velocity by 90 degrees.
			x += math.Sqrt2 * s.mms[o] * w / gravityMM * sensitivity * -math.Sin(float64(o+1)*theta-s.lag[o]*math.Pi/180-creep) * swell
		}
		beside := s.neighbour * math.Sqrt2 * s.mms[0] * 2 * math.Pi * s.hz / gravityMM * sensitivity
		for p := range s.points {
			y := x + s.noise*r.NormFloat64()
			if beside != 0 {
				y += beside * math.Cos(2*math.Pi*s.hz*((1+s.away)*t+s.strays*5*math.Sin(t/5))+nphase[p])
			}
			out[i*stride+p] = float32(y)
		}
	}
	s.pulses(out, r, n, stride)
	return out
}

const gravityMM = 9806.65

// pulses adds the reference: each pulse as the difference of two filtered
// steps. Sample i covers the time around (i+0.5)/rate.
func (s *signal) pulses(out []float32, r *rand.Rand, n, stride int) {
	ref := make([]float64, n)
	put := func(a, b float64) { // rows
		for i := max(0, int(a)-4); i < min(n, int(b)+5); i++ {
			ref[i] += s.step(float64(i)+0.5-a) - s.step(float64(i)+0.5-b)
		}
	}
	for k := math.Ceil(s.angle(0)) - 1; k < s.angle(s.seconds)+1; k++ {
		start, end := s.when(k)*s.rate, s.when(k+s.width)*s.rate
		if r.Float64() < s.missing {
			continue
		}
		if s.jitter > 0 {
			start += s.jitter * r.NormFloat64()
		}
		if s.falling { // the leading edge is the fall, at k
			start, end = end-(s.when(k+s.width)-s.when(k))*s.rate, s.when(k+s.width)*s.rate
		}
		put(start, end)
		if r.Float64() < s.extra {
			at := s.when(k+0.3+0.5*r.Float64()) * s.rate
			put(at, at+3)
		}
	}
	for i := range ref {
		v := 0.02 + 0.96*ref[i]
		if s.falling {
			v = 0.98 - 0.96*ref[i]
		}
		out[i*stride+s.points] = float32(v + 1e-4*r.NormFloat64())
	}
}

// step is the response to a unit step at 0 of boxes one row wide (a B-spline's
// integral), or of none.
func (s *signal) step(x float64) float64 {
	c := func(x float64) float64 { return max(0, x) }
	switch s.filter {
	case 1:
		return min(1, c(x+0.5))
	case 3:
		x += 1.5
		if x >= 3 {
			return 1
		}
		return (cube(c(x)) - 3*cube(c(x-1)) + 3*cube(c(x-2))) / 6
	}
	if x >= 0 {
		return 1
	}
	return 0
}

func cube(x float64) float64 { return x * x * x }

func (s *signal) config() dsp.Config {
	c := dsp.Config{RateHz: s.rate, Channels: s.points + 1, RatedRPM: 60 * s.hz,
		Reference: &dsp.Reference{Channel: s.points, Falling: s.falling, ThresholdV: 0.5, HysteresisV: 0.2}}
	for p := range s.points {
		c.Points = append(c.Points, dsp.Point{Name: string(rune('a' + p)), Channel: p, VoltsPerG: sensitivity})
	}
	return c
}

// read runs the signal path over the whole signal as one minute.
func (s *signal) read(t testing.TB) dsp.Minute {
	t.Helper()
	e, err := dsp.NewEngine(s.config())
	if err != nil {
		t.Fatal(err)
	}
	v := s.render()
	e.Push(0, v)
	return e.Close(int64(len(v)/(s.points+1)), time.Time{}, false)
}
