package rig

import (
	"fmt"
	"math"
	"math/rand/v2"
	"sync"
)

// Machine is a running simulation. Its methods may be called from several goroutines.
type Machine struct {
	mu     sync.Mutex
	config Config
	random *rand.Rand
	system *system
	drive  driveState
	front  *front

	// The last step of integration led from (v0, a0, start) to (now, a1).
	now, start motion
	a0, a1     vector
	step       float64 // s
	// Each step of integration serves perStep steps of signal, or each step of
	// signal takes subSteps of integration; the other is 1.
	perStep, subSteps int
	// part counts the steps of signal served of the last integration step.
	part  int
	basis []hermite
	// dof maps sensors to degrees of freedom.
	dof   []int
	flow  [3]wander
	lift  wander
	walk  float64 // rad, creep of the loose part
	count int64   // steps of signal written
}

// hermite holds the weights of value and slope at both ends of a step.
type hermite struct{ v0, d0, v1, d1 float64 }

// newHermite returns the cubic weights at a share s of a step of h seconds.
func newHermite(s, h float64) hermite {
	s2, s3 := s*s, s*s*s
	return hermite{v0: 1 - 3*s2 + 2*s3, d0: h * (s - 2*s2 + s3), v1: 3*s2 - 2*s3, d1: h * (s3 - s2)}
}

// at interpolates.
func (b *hermite) at(v0, d0, v1, d1 float64) float64 {
	return b.v0*v0 + b.d0*d0 + b.v1*v1 + b.d1*d1
}

// New starts the simulation of a machine, running in its steady response, or at
// standstill when the drive says so. The same seed gives the same signal.
func New(c Config, seed uint64) (*Machine, error) {
	if c.StepHz == 0 {
		c.StepHz = 8000
	}
	if err := c.check(); err != nil {
		return nil, err
	}
	c = c.clone()
	m := &Machine{config: c, random: rand.New(rand.NewPCG(seed, 0x9e3779b97f4a7c15))}
	m.system, m.drive = newSystem(&c), newDrive(c.Drive)
	if err := m.chooseStep(); err != nil {
		return nil, err
	}
	if m.drive.on {
		if err := m.settle(c.Drive.RPM * rpm); err != nil {
			return nil, err
		}
	}
	m.system.acceleration(&m.a1, &m.now, 0)
	m.start, m.a0 = m.now, m.a1
	var err error
	m.front, err = newFront(c.Sensors, c.Reference, c.Channels, c.StepHz, 0, m.random)
	if err != nil {
		return nil, err
	}
	for i, s := range c.Sensors {
		m.dof = append(m.dof, housing(s.End, s.Direction))
		m.front.before[i] = m.now.v[m.dof[i]]
	}
	m.part = m.perStep
	return m, m.applyFaults()
}

// chooseStep sets the step of integration: short enough for the stiffest mode
// and for smooth interpolation, and in a whole ratio to the step of signal.
func (m *Machine) chooseStep() error {
	const (
		longest   = 1.0 / 4000 // s; resolves 500 Hz to 1e-3 by cubic interpolation
		stability = 1.2        // |eigenvalue|*step; the rule's own bound is 2.78
		shortest  = 1.0 / 64000
	)
	stiffest, err := spectralRadius(assemble(&m.config), 1.2*m.config.Drive.RPM*rpm)
	if err != nil {
		return err
	}
	h := min(longest, stability/stiffest)
	if !(h >= shortest) {
		return fmt.Errorf("rig: the stiffest mode has %.0f rad/s, the integration can follow up to %.0f", stiffest, stability/shortest)
	}
	m.perStep, m.subSteps = 1, 1
	if r := h * m.config.StepHz; r >= 1 {
		m.perStep = int(r)
	} else {
		m.subSteps = int(math.Ceil(1 / r))
	}
	m.step = float64(m.perStep) / float64(m.subSteps) / m.config.StepHz
	for i := range m.perStep {
		m.basis = append(m.basis, newHermite(float64(i+1)/float64(m.perStep), m.step))
	}
	return nil
}

// settle puts the machine into its steady response at a speed, rad/s, and angle zero.
func (m *Machine) settle(omega float64) error {
	m.now = motion{omega: omega}
	for n := 1; n <= maxOrder; n++ {
		q, err := respond(assemble(&m.config), m.system.loads.at(n, omega), float64(n)*omega, omega)
		if err != nil {
			return err
		}
		for i, a := range q {
			m.now.q[i] += real(a)
			m.now.v[i] += real(complex(0, float64(n)*omega) * a)
		}
	}
	return nil
}

// Channels returns the number of inputs.
func (m *Machine) Channels() int { return m.front.channels }

// StepHz returns the number of steps of signal per second.
func (m *Machine) StepHz() float64 {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.config.StepHz
}

// Next writes the mean volts of every input over the next 1/StepHz seconds to
// dst, which must hold Channels values.
func (m *Machine) Next(dst []float32) {
	m.mu.Lock()
	defer m.mu.Unlock()
	a := m.angle()
	if m.part >= m.perStep {
		a = m.integrate(a)
	}
	b := &m.basis[m.part]
	m.part++
	for i, d := range m.dof {
		m.front.velocity[i] = b.at(m.start.v[d], m.a0[d], m.now.v[d], m.a1[d])
	}
	m.front.step(dst, a, m.angle())
	m.count++
}

// angle returns the shaft angle at the end of the last step of signal, rad.
func (m *Machine) angle() float64 {
	if m.part >= m.perStep || m.part == 0 {
		return m.now.theta
	}
	b := &m.basis[m.part-1]
	return b.at(m.start.theta, m.start.omega, m.now.theta, m.now.omega)
}

// integrate takes the next step of integration. It returns the shaft angle at its
// start, which is given by theta, after the origin has been moved on.
func (m *Machine) integrate(theta float64) float64 {
	// Two turns at a time, so that half orders keep their phase.
	const turns = 4 * math.Pi
	if m.now.theta >= turns {
		m.now.theta -= turns
		theta -= turns
		if m.front.pulses != nil {
			m.front.pulses.rebase(turns)
		}
	}
	for range m.subSteps {
		m.disturb()
		m.start, m.a0 = m.now, m.a1
		m.system.step(&m.now, m.step, &m.drive, &m.a0, &m.a1)
		if m.now.omega < 0 {
			m.now.omega = 0
		}
	}
	m.part = 0
	return theta
}

// disturb draws what changes at random from one step of integration to the next.
func (m *Machine) disturb() {
	m.drive.wander.step(m.step, m.random)
	for i := range m.flow {
		m.flow[i].step(m.step, m.random)
		m.system.random[i] = m.flow[i].value
	}
	f := &m.config.Faults
	if f.Looseness.Loss > 0 {
		m.lift.step(m.step, m.random)
		m.system.loose.lift = f.Looseness.LiftM * (1 + m.lift.value)
	}
	if l := f.LooseRotor; l.DegPerMinute != 0 || l.WalkDeg != 0 {
		m.walk += radians(l.DegPerMinute)*m.step/60 + radians(l.WalkDeg)*math.Sqrt(m.step/60)*m.random.NormFloat64()
		sin, cos := math.Sincos(m.walk)
		m.system.creep = complex(cos, -sin)
	}
}
