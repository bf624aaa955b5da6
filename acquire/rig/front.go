package rig

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// front is all that stands between the moving housings and the converter:
// sensor chains, neighbouring machines and the phase reference.
type front struct {
	stepHz   float64
	channels int
	chains   []*chain
	pulses   *pulses
	// velocity is each sensor's housing velocity at the end of the step, m/s;
	// before is the same at its start.
	velocity, before []float64
	neighbours       []neighbour
	random           *rand.Rand
}

// neighbour is a neighbouring machine's state.
type neighbour struct {
	phase, speed float64 // rad, rad/s
	wander       wander
	// inPhase and quadrature are the peak velocities at each sensor, m/s;
	// before is its velocity at the start of the step.
	inPhase, quadrature, before []float64
}

// newFront builds the sensor chains of a machine whose shaft stands at theta.
func newFront(sensors []Sensor, ref *Reference, channels int, stepHz, theta float64, r *rand.Rand) (*front, error) {
	if channels == 0 {
		channels = 8
	}
	f := &front{stepHz: stepHz, channels: channels, random: r}
	f.velocity, f.before = make([]float64, len(sensors)), make([]float64, len(sensors))
	used := make([]bool, channels)
	claim := func(name string, ch int) error {
		if ch < 0 || ch >= channels || used[ch] {
			return fmt.Errorf("rig: %s: channel %d is taken or outside 0 to %d", name, ch, channels-1)
		}
		used[ch] = true
		return nil
	}
	for _, s := range sensors {
		if err := claim(fmt.Sprintf("sensor %q", s.Name), s.Channel); err != nil {
			return nil, err
		}
		if s.End > NonDriveEnd || s.Direction > Axial {
			return nil, fmt.Errorf("rig: sensor %q: no such bearing or direction", s.Name)
		}
		c, err := newChain(s, stepHz)
		if err != nil {
			return nil, err
		}
		f.chains = append(f.chains, c)
	}
	if ref == nil {
		return f, nil
	}
	if err := claim("phase reference", ref.Channel); err != nil {
		return nil, err
	}
	if err := ref.check(); err != nil {
		return nil, err
	}
	f.pulses = newPulses(*ref, stepHz, theta, r)
	return f, nil
}

// setNeighbours replaces the neighbouring machines without a jump.
func (f *front) setNeighbours(list []Neighbour) error {
	next := make([]neighbour, len(list))
	for i, n := range list {
		if len(n.Velocity) != len(f.chains) {
			return fmt.Errorf("rig: neighbour %d: %d velocities for %d sensors", i, len(n.Velocity), len(f.chains))
		}
		s := neighbour{speed: n.RPM * rpm, wander: wander{sd: n.WanderRPM * rpm, seconds: 20}}
		if i < len(f.neighbours) {
			s.phase, s.wander.value = f.neighbours[i].phase, f.neighbours[i].wander.value
		}
		sinP, cosP := math.Sincos(s.phase)
		for _, v := range n.Velocity {
			sin, cos := math.Sincos(radians(v.Lag))
			peak := v.RMS * 1e-3 * math.Sqrt2
			s.inPhase = append(s.inPhase, peak*cos)
			s.quadrature = append(s.quadrature, peak*sin)
			s.before = append(s.before, peak*(cos*cosP+sin*sinP))
		}
		next[i] = s
	}
	f.neighbours = next
	return nil
}

// step writes the volts of one step in which the shaft turns from a to b (rad);
// f.velocity holds the housings' velocities at its end.
func (f *front) step(dst []float32, a, b float64) {
	clear(dst[:f.channels])
	for i := range f.neighbours {
		n := &f.neighbours[i]
		n.wander.step(1/f.stepHz, f.random)
		n.phase = math.Mod(n.phase+(n.speed+n.wander.value)/f.stepHz, 2*math.Pi)
	}
	for i, c := range f.chains {
		// The mean acceleration of the step is exact: the velocity's change.
		rate := (f.velocity[i] - f.before[i]) * f.stepHz
		f.before[i] = f.velocity[i]
		for k := range f.neighbours {
			rate += f.neighbours[k].change(i) * f.stepHz
		}
		if c.drift.sd > 0 {
			c.drift.step(1/f.stepHz, f.random)
		}
		dst[c.Channel] = float32(c.output(rate, f.random))
	}
	if f.pulses != nil {
		dst[f.pulses.Channel] = float32(f.pulses.mean(a, b, f.random))
	}
}

// change returns the change of velocity at sensor i since the last step.
func (n *neighbour) change(i int) float64 {
	sin, cos := math.Sincos(n.phase)
	v := n.inPhase[i]*cos + n.quadrature[i]*sin
	d := v - n.before[i]
	n.before[i] = v
	return d
}
