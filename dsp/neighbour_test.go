package dsp_test

import (
	"fmt"
	"math"
	"testing"
)

// six is a machine seen by six points at 1 kSPS.
func six(seed uint64) signal {
	s := base(seed)
	s.points, s.noise = 6, 5e-4
	return s
}

// TestNeighbourTold: another machine's frequency and velocity are told, and the
// machine's own vector stays right beside it.
func TestNeighbourTold(t *testing.T) {
	for _, away := range []float64{-0.04, -0.012, -0.005, 0.003, 0.012, 0.03} {
		for _, size := range []float64{0.1, 0.5, 2} {
			t.Run(fmt.Sprintf("%v away, %v times", away, size), func(t *testing.T) {
				s := six(4)
				s.away, s.neighbour, s.ramp = away, size, 0.002
				m := s.read(t)
				nearTruth(t, &s, m, 0.3, 0.2)
				if len(m.Lines) != 1 {
					t.Fatalf("lines %+v, want one", m.Lines)
				}
				l := m.Lines[0]
				if rpm := 60 * s.hz * (1 + away); math.Abs(l.RPM/rpm-1) > 1e-4 {
					t.Errorf("line at %.2f r/min, true %.2f", l.RPM, rpm)
				}
				for p, a := range l.RMS {
					// Prescribed as acceleration at the own frequency.
					if want := size * s.mms[0] / (1 + away); math.Abs(a/want-1) > 0.03 {
						t.Errorf("point %d: %.3f mm/s, true %.3f", p, a, want)
					}
				}
			})
		}
	}
}

// TestStrayingNeighbour: a neighbour whose own speed wanders does not get into
// the machine's vector.
func TestStrayingNeighbour(t *testing.T) {
	for _, strays := range []float64{0.0002, 0.001, 0.003} {
		s := six(5)
		s.away, s.neighbour, s.strays = 0.012, 0.5, strays
		nearTruth(t, &s, s.read(t), 0.5, 0.4)
	}
}

// TestOwnChangeIsNoNeighbour: a part that creeps round the shaft, or an
// amplitude that swells, is the machine's own and shows in the wander.
func TestOwnChangeIsNoNeighbour(t *testing.T) {
	for _, c := range []struct{ creep, swells, low, high float64 }{{0, 0, 0, 0.3}, {20, 0, 6, 25}, {60, 0, 20, 70}, {0, 0.3, 0, 1}} {
		s := six(6)
		s.creep, s.swells = c.creep, c.swells
		m := s.read(t)
		if len(m.Lines) != 0 {
			t.Errorf("%+v: lines %+v", c, m.Lines)
		}
		for _, p := range m.Points {
			if p.Wander < c.low || p.Wander > c.high {
				t.Errorf("%+v: wander of %s %.2f degrees, want %v to %v", c, p.Name, p.Wander, c.low, c.high)
			}
		}
	}
}
