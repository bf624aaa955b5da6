package rig

import (
	"fmt"
	"math"
	"slices"
)

// Update changes the machine's faults while it runs. It returns an error, and
// changes nothing, when the new faults make no sense.
func (m *Machine) Update(change func(*Faults)) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	next := m.config.clone()
	change(&next.Faults)
	return m.replace(next)
}

// SetUnbalance replaces the masses on the rotor while it runs.
func (m *Machine) SetUnbalance(u ...Unbalance) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	next := m.config.clone()
	next.Unbalances = slices.Clone(u)
	return m.replace(next)
}

// replace goes on with another configuration of the same machine.
func (m *Machine) replace(next Config) error {
	if err := next.check(); err != nil {
		return err
	}
	old := m.system
	m.config = next
	m.system = newSystem(&m.config)
	m.system.random, m.system.creep = old.random, old.creep
	if err := m.applyFaults(); err != nil {
		return err
	}
	// The next step starts with the forces that hold now.
	m.system.acceleration(&m.a1, &m.now, m.drive.alpha(m.now.omega))
	return nil
}

// applyFaults hands the faults to the random processes and the front.
func (m *Machine) applyFaults() error {
	f := &m.config.Faults
	corner := f.Flow.CornerHz
	if corner == 0 {
		corner = 100
	}
	for i := range m.flow {
		m.flow[i].sd, m.flow[i].seconds = f.Flow.ForceN, 1/(2*math.Pi*corner)
	}
	// The loose foot works its way within a few turns.
	m.lift.sd, m.lift.seconds = f.Looseness.Unsteady, 1
	return m.front.setNeighbours(f.Neighbours)
}

// SetSensor changes the chain of sensor i, for instance its failure, while the
// machine runs. Bearing, direction and channel stay as they are.
func (m *Machine) SetSensor(i int, change func(*Sensor)) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if i < 0 || i >= len(m.front.chains) {
		return fmt.Errorf("rig: there is no sensor %d, allowed are 0 to %d", i, len(m.front.chains)-1)
	}
	old := m.front.chains[i]
	next := old.Sensor
	change(&next)
	next.End, next.Direction, next.Channel = old.End, old.Direction, old.Channel
	c, err := newChain(next, m.config.StepHz)
	if err != nil {
		return err
	}
	c.x1, c.y1, c.drift.value = old.x1, old.y1, old.drift.value
	m.front.chains[i] = c
	m.config.Sensors[i] = next
	return nil
}

// SetReference changes the phase reference while the machine runs; its channel and
// place stay as they are. A machine without one returns an error.
func (m *Machine) SetReference(change func(*Reference)) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.front.pulses == nil {
		return fmt.Errorf("rig: the machine has no phase reference")
	}
	next := m.front.pulses.Reference
	change(&next)
	next.Channel, next.PickupDeg = m.config.Reference.Channel, m.config.Reference.PickupDeg
	if err := next.check(); err != nil {
		return err
	}
	*m.config.Reference = next
	m.front.pulses = newPulses(next, m.config.StepHz, m.angle(), m.random)
	return nil
}

// Trip switches the drive off; the machine runs down.
func (m *Machine) Trip() {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.drive.on = false
}

// Start switches the drive on; the machine runs up.
func (m *Machine) Start() {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.drive.on = true
}

// SetSpeed sets the speed under full load that the drive goes to, r/min.
func (m *Machine) SetSpeed(rpmSet float64) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if !(rpmSet > 0) || rpmSet > 1.2*m.config.Drive.RPM {
		return fmt.Errorf("rig: speed is %g r/min, allowed are above 0 to %g", rpmSet, 1.2*m.config.Drive.RPM)
	}
	m.drive.synchronous = rpmSet * rpm / (1 - m.drive.slip)
	return nil
}

// RPM returns the shaft's present speed, r/min.
func (m *Machine) RPM() float64 {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.now.omega / rpm
}

// Seconds returns the simulated time since New, s.
func (m *Machine) Seconds() float64 {
	m.mu.Lock()
	defer m.mu.Unlock()
	return float64(m.count) / m.config.StepHz
}

// Config returns the machine as it is now.
func (m *Machine) Config() Config {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.config.clone()
}
