package rig

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// SpeedLaw is an exactly known course of the speed:
// rpm(t) = RPM + RPMPerS*t + SwingRPM*sin(2 pi t/SwingS).
type SpeedLaw struct {
	// RPM is the speed at the start, r/min, and RPMPerS its steady change per second.
	RPM, RPMPerS float64
	// SwingRPM and SwingS are amplitude (r/min) and period (s) of a slow swing;
	// zero means none.
	SwingRPM, SwingS float64
	// AngleDeg is the shaft angle at the start.
	AngleDeg float64
}

// Angle returns the shaft angle at t seconds, rad, not wrapped.
func (l SpeedLaw) Angle(t float64) float64 {
	a := radians(l.AngleDeg) + rpm*(l.RPM*t+l.RPMPerS*t*t/2)
	if l.SwingS > 0 {
		a += rpm * l.SwingRPM * l.SwingS / (2 * math.Pi) * (1 - math.Cos(2*math.Pi*t/l.SwingS))
	}
	return a
}

// At returns the speed at t seconds, r/min.
func (l SpeedLaw) At(t float64) float64 {
	v := l.RPM + l.RPMPerS*t
	if l.SwingS > 0 {
		v += l.SwingRPM * math.Sin(2*math.Pi*t/l.SwingS)
	}
	return v
}

// PhasorConfig prescribes a signal: the velocity of each sensor's housing is the sum of
// sqrt(2) A_n cos(n theta(t) - lag_n) over the orders, whatever the speed.
type PhasorConfig struct {
	Law SpeedLaw
	// Sensors are the accelerometers and Orders the vectors of 1x, 2x and 3x at
	// each, in the same order, in the machine's positive directions.
	Sensors []Sensor
	Orders  [][maxOrder]Vector
	// Neighbours, Reference, Channels and StepHz are as in Config.
	Neighbours []Neighbour
	Reference  *Reference
	Channels   int
	StepHz     float64
}

// Phasors is a signal with exactly prescribed vectors and shaft angle.
type Phasors struct {
	law    SpeedLaw
	stepHz float64
	count  int64
	theta  float64
	// inPhase and quadrature are the peak velocities of each sensor, m/s.
	inPhase, quadrature [][maxOrder]float64
	front               *front
}

// NewPhasors returns the prescribed signal; seed sets its noise.
func NewPhasors(c PhasorConfig, seed uint64) (*Phasors, error) {
	if c.StepHz == 0 {
		c.StepHz = 8000
	}
	if len(c.Orders) != len(c.Sensors) {
		return nil, fmt.Errorf("rig: %d sets of orders for %d sensors", len(c.Orders), len(c.Sensors))
	}
	if !(c.StepHz > 0) || c.Law.RPM < 0 {
		return nil, fmt.Errorf("rig: steps per second %g must be above 0 and the speed %g not negative", c.StepHz, c.Law.RPM)
	}
	p := &Phasors{law: c.Law, stepHz: c.StepHz, theta: c.Law.Angle(0)}
	for _, o := range c.Orders {
		var in, qu [maxOrder]float64
		for i, v := range o {
			sin, cos := math.Sincos(radians(v.Lag))
			peak := v.RMS * 1e-3 * math.Sqrt2
			in[i], qu[i] = peak*cos, peak*sin
		}
		p.inPhase, p.quadrature = append(p.inPhase, in), append(p.quadrature, qu)
	}
	var err error
	r := rand.New(rand.NewPCG(seed, 0x9e3779b97f4a7c15))
	p.front, err = newFront(c.Sensors, c.Reference, c.Channels, c.StepHz, p.theta, r)
	if err != nil {
		return nil, err
	}
	p.velocities(p.front.before)
	return p, p.front.setNeighbours(c.Neighbours)
}

// velocities writes the housings' velocities at the present angle, m/s.
func (p *Phasors) velocities(dst []float64) {
	sin, cos := math.Sincos(p.theta)
	e, turn := complex(cos, sin), complex(cos, sin)
	clear(dst)
	for n := range maxOrder {
		for i := range dst {
			dst[i] += p.inPhase[i][n]*real(e) + p.quadrature[i][n]*imag(e)
		}
		e *= turn
	}
}

// Channels returns the number of inputs.
func (p *Phasors) Channels() int { return p.front.channels }

// StepHz returns the number of steps of signal per second.
func (p *Phasors) StepHz() float64 { return p.stepHz }

// Next writes the mean volts of every input over the next 1/StepHz seconds.
func (p *Phasors) Next(dst []float32) {
	p.count++
	a := p.theta
	p.theta = p.law.Angle(float64(p.count) / p.stepHz)
	p.velocities(p.front.velocity)
	p.front.step(dst, a, p.theta)
}

// Seconds returns the time since the start, s.
func (p *Phasors) Seconds() float64 { return float64(p.count) / p.stepHz }
