package rig

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// Vector is one order of a velocity.
type Vector struct {
	// RMS is the amplitude, mm/s rms.
	RMS float64
	// Lag is the phase lag from the leading edge of the phase reference,
	// degrees of the order's own cycle, 0 <= Lag < 360.
	Lag float64
}

// Point is what a sensor's housing does in the machine's positive direction,
// whatever the sensor's polarity.
type Point struct {
	Name      string
	End       End
	Direction Direction
	// Order holds the vectors of 1x, 2x and 3x.
	Order [maxOrder]Vector
}

// Steady returns the exact steady response of the housings at a speed, r/min, in
// the order of the sensors: the solution of the same linear equations that the
// machine integrates. What is not linear or not of whole order (looseness, flow,
// neighbours, half orders) is left out; a creeping unbalance counts where it is now.
func (m *Machine) Steady(rpmNow float64) ([]Point, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	l := *m.system.loads
	for i := range l.loose {
		l.loose[i] *= m.system.creep
	}
	return steady(&m.config, &l, rpmNow)
}

// Steady returns the exact steady response of a machine as Machine.Steady does.
func (c Config) Steady(rpmNow float64) ([]Point, error) {
	return steady(&c, newLoads(&c), rpmNow)
}

// steady solves for each order.
func steady(c *Config, l *loads, rpmNow float64) ([]Point, error) {
	if !(rpmNow > 0) {
		return nil, fmt.Errorf("rig: steady response at %g r/min: the speed must be above 0", rpmNow)
	}
	m := assemble(c)
	points := make([]Point, len(c.Sensors))
	for i, s := range c.Sensors {
		points[i] = Point{Name: s.Name, End: s.End, Direction: s.Direction}
	}
	omega := rpmNow * rpm
	for n := 1; n <= maxOrder; n++ {
		w := float64(n) * omega
		q, err := respond(m, l.at(n, omega), w, omega)
		if err != nil {
			return nil, err
		}
		for i, s := range c.Sensors {
			points[i].Order[n-1] = velocityVector(q[housing(s.End, s.Direction)], w)
		}
	}
	return points, nil
}

// velocityVector turns the complex displacement (m) at w rad/s into a vector.
func velocityVector(q complex128, w float64) Vector {
	v := complex(0, w) * q
	return Vector{RMS: cmplx.Abs(v) * 1000 / math.Sqrt2, Lag: lagDegrees(-cmplx.Phase(v))}
}

// lagDegrees brings an angle in rad to degrees in 0 <= lag < 360.
func lagDegrees(rad float64) float64 {
	d := math.Mod(rad*180/math.Pi, 360)
	if d < 0 {
		d += 360
	}
	if d >= 360 {
		d = 0
	}
	return d
}

// respond solves (K - w^2 M + j w (C + omega G)) q = f as a real system of twice
// the size.
func respond(m *matrices, f phasor, w, omega float64) (phasor, error) {
	a := mat.NewDense(2*dofs, 2*dofs, nil)
	b := mat.NewVecDense(2*dofs, nil)
	for i := range dofs {
		if m.held[i] {
			a.Set(i, i, 1)
			a.Set(dofs+i, dofs+i, 1)
			continue
		}
		for j := range dofs {
			if m.held[j] {
				continue
			}
			re, im := m.k[i][j], w*(m.c[i][j]+omega*m.gyroscopic(i, j))
			if i == j {
				re -= w * w * m.mass[i]
			}
			a.Set(i, j, re)
			a.Set(i, dofs+j, -im)
			a.Set(dofs+i, j, im)
			a.Set(dofs+i, dofs+j, re)
		}
		b.SetVec(i, real(f[i]))
		b.SetVec(dofs+i, imag(f[i]))
	}
	var x mat.VecDense
	err := x.SolveVec(a, b)
	// Metres beside radians condition the system badly; only a singular one is
	// without an answer.
	var condition mat.Condition
	if err != nil && !(errors.As(err, &condition) && !math.IsInf(float64(condition), 1)) {
		return phasor{}, fmt.Errorf("rig: no steady response at %.4g rad/s: %v", w, err)
	}
	var q phasor
	for i := range q {
		q[i] = complex(x.AtVec(i), x.AtVec(dofs+i))
	}
	return q, nil
}

// gyroscopic returns an element of G.
func (m *matrices) gyroscopic(i, j int) float64 {
	switch {
	case i == tiltV && j == tiltH:
		return m.polar
	case i == tiltH && j == tiltV:
		return -m.polar
	}
	return 0
}

// lagBetween returns the phase between two vectors, 0 to 180 degrees.
func lagBetween(a, b Vector) float64 {
	return math.Abs(math.Remainder(a.Lag-b.Lag, 360))
}
