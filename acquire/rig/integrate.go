package rig

import "math"

// system is a machine's equations of motion made ready for stepping: rows
// divided by their mass, zeros left out.
type system struct {
	first  [dofs + 1]int32
	column []uint8
	k, c   []float64
	// inverse is 1/mass, zero where held.
	inverse vector
	// gyro is the signed polar inertia over the transverse one.
	gyro  float64
	loads *loads
	// orders lists the orders above 1 that have a load.
	orders []int
	loose  looseSupport
	// random is the force of the flow on rotorV, rotorH and rotorA, held over a step.
	random [3]float64
	// creep turns the loose part of the unbalance, 1 at the start.
	creep complex128
}

// looseSupport is a pedestal whose vertical spring weakens above lift.
type looseSupport struct {
	form vector
	loss float64 // N/m
	lift float64 // m
}

// newSystem prepares the equations of a machine.
func newSystem(c *Config) *system {
	m := assemble(c)
	s := &system{loads: newLoads(c), creep: 1}
	for i := range dofs {
		if !m.held[i] {
			s.inverse[i] = 1 / m.mass[i]
			for j := range dofs {
				if m.held[j] || m.k[i][j] == 0 && m.c[i][j] == 0 {
					continue
				}
				s.column = append(s.column, uint8(j))
				s.k = append(s.k, m.k[i][j]*s.inverse[i])
				s.c = append(s.c, m.c[i][j]*s.inverse[i])
			}
		}
		s.first[i+1] = int32(len(s.column))
	}
	s.gyro = m.polar * s.inverse[tiltV]
	for n := 2; n <= maxOrder; n++ {
		if s.loads.still[n] != (phasor{}) {
			s.orders = append(s.orders, n)
		}
	}
	if l := c.Faults.Looseness; l.Loss > 0 {
		k := c.Supports[l.End].V.K * (1 - c.Faults.Softening.V)
		s.loose = looseSupport{form: supportForm(c, l.End, Vertical), loss: l.Loss * k, lift: l.LiftM}
	}
	return s
}

// motion is the state: coordinates, velocities, shaft angle (rad) and speed (rad/s).
type motion struct {
	q, v         vector
	theta, omega float64
}

// torque gives the angular acceleration of the shaft, rad/s2, at a speed, rad/s.
type torque interface{ alpha(omega float64) float64 }

// acceleration fills a with the second derivative of the coordinates.
func (s *system) acceleration(a *vector, y *motion, alpha float64) {
	s.force(a, y.theta, y.omega, alpha)
	if s.loose.loss > 0 {
		s.lift(a, &y.q)
	}
	for i := range a {
		sum := 0.0
		for p := s.first[i]; p < s.first[i+1]; p++ {
			j := s.column[p] & (dofs - 1)
			sum += s.k[p]*y.q[j] + s.c[p]*y.v[j]
		}
		a[i] = a[i]*s.inverse[i] - sum
	}
	g := s.gyro * y.omega
	a[tiltV] -= g * y.v[tiltH]
	a[tiltH] += g * y.v[tiltV]
}

// force fills f with the loads at a shaft angle.
func (s *system) force(f *vector, theta, omega, alpha float64) {
	l := s.loads
	sin, cos := math.Sincos(theta)
	turn := complex(cos, sin)
	u := complex(omega*omega, -alpha) * turn
	d := complex(0, omega) * turn
	uLoose := u * s.creep
	for i := range f {
		f[i] = real(u*l.unbalance[i]) + real(uLoose*l.loose[i]) + real(turn*l.still[1][i]) + real(d*l.bowDamping[i])
	}
	for _, n := range s.orders {
		sin, cos := math.Sincos(float64(n) * theta)
		e := complex(cos, sin)
		for i, b := range l.still[n] {
			f[i] += real(e * b)
		}
	}
	if l.half != 0 {
		f[rotorV] += l.half * math.Cos(theta/2)
	}
	for i, r := range s.random {
		f[rotorV+i] += r
	}
}

// lift takes back the part of the pedestal's force that is lost when it lifts.
func (s *system) lift(f, q *vector) {
	x := -s.loose.lift
	for i, a := range s.loose.form {
		x += a * q[i]
	}
	if x <= 0 {
		return
	}
	for i, a := range s.loose.form {
		f[i] += s.loose.loss * x * a
	}
}

// step advances y by h seconds with the classical fourth-order Runge-Kutta rule.
// a0 is the acceleration at y, as left by the previous step in a1.
func (s *system) step(y *motion, h float64, t torque, a0, a1 *vector) {
	al1 := t.alpha(y.omega)
	var m motion
	var a2, a3, a4 vector

	advance(&m, y, &y.v, a0, h/2)
	m.theta, m.omega = y.theta+h/2*y.omega, y.omega+h/2*al1
	al2 := t.alpha(m.omega)
	s.acceleration(&a2, &m, al2)
	v2, w2 := m.v, m.omega

	advance(&m, y, &v2, &a2, h/2)
	m.theta, m.omega = y.theta+h/2*w2, y.omega+h/2*al2
	al3 := t.alpha(m.omega)
	s.acceleration(&a3, &m, al3)
	v3, w3 := m.v, m.omega

	advance(&m, y, &v3, &a3, h)
	m.theta, m.omega = y.theta+h*w3, y.omega+h*al3
	al4 := t.alpha(m.omega)
	s.acceleration(&a4, &m, al4)

	for i := range y.q {
		y.q[i] += h / 6 * (y.v[i] + 2*(v2[i]+v3[i]) + m.v[i])
		y.v[i] += h / 6 * (a0[i] + 2*(a2[i]+a3[i]) + a4[i])
	}
	y.theta += h / 6 * (y.omega + 2*(w2+w3) + m.omega)
	y.omega += h / 6 * (al1 + 2*(al2+al3) + al4)
	s.acceleration(a1, y, t.alpha(y.omega))
}

// advance sets m's coordinates to those of y moved on by h at the rates v and a.
func advance(m, y *motion, v, a *vector, h float64) {
	for i := range m.q {
		m.q[i] = y.q[i] + h*v[i]
		m.v[i] = y.v[i] + h*a[i]
	}
}
