package rig

import (
	"math"
	"testing"
)

// edge is a change of a recorded pulse, at s seconds.
type edge struct {
	s      float64
	rising bool
}

// edges finds the edges of a noiseless pulse between 0 and 1 V exactly: the mean
// of the step in which it changes tells where.
func edges(sig Signal, channel, steps int) []edge {
	dst := make([]float32, sig.Channels())
	var list []edge
	before := float32(-1)
	for i := range steps {
		sig.Next(dst)
		v := dst[channel]
		t, dt := float64(i), 1.0
		switch {
		case v > 0 && v < 1:
			// The level after the step is not known yet; the one before tells the sense.
			share := float64(v)
			if before == 0 {
				list = append(list, edge{(t + dt - share) / sig.StepHz(), true})
			} else {
				list = append(list, edge{(t + share) / sig.StepHz(), false})
			}
			before = 1 - before
		case before >= 0 && v != before:
			list = append(list, edge{t / sig.StepHz(), v == 1})
			before = v
		case before < 0:
			before = v
		}
	}
	return list
}

// TestEdgesStandAtWholeTurns checks both polarities under a changing speed.
func TestEdgesStandAtWholeTurns(t *testing.T) {
	for _, falling := range []bool{false, true} {
		c := PhasorConfig{
			Law:       SpeedLaw{RPM: 900, RPMPerS: 5, SwingRPM: 4, SwingS: 7, AngleDeg: 100},
			Reference: &Reference{Channel: 2, WidthDeg: 25, HighV: 1, Falling: falling},
		}
		p, err := NewPhasors(c, 1)
		if err != nil {
			t.Fatal(err)
		}
		leading := 0
		for _, e := range edges(p, 2, 80000) {
			angle := c.Law.Angle(e.s)
			want := 25.0
			if e.rising != falling {
				want, leading = 0, leading+1
			}
			if d := apart(angle*180/math.Pi, want); d > 2e-3 {
				t.Fatalf("edge at %.6f s stands at %.4f degrees, want %g", e.s, lagDegrees(angle), want)
			}
		}
		if want := int(c.Law.Angle(10) / (2 * math.Pi)); leading != want {
			t.Errorf("%d leading edges in 10 s, want %d", leading, want)
		}
	}
}

// TestMachineEdges: the machine's angle and its pulses are one and the same, also
// after thousands of turns and through the wrap of the angle.
func TestMachineEdges(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Drive.Slip, c.Drive.LoadWander, c.Drive.WanderS = 0.02, 0.5, 2
	m := start(t, c)
	dst := make([]float32, m.Channels())
	turns, last := 0, m.angle()
	for i := range 240000 {
		m.Next(dst)
		b := m.angle()
		if b < last {
			last -= 4 * math.Pi
		}
		// The pulse is high in the first ten degrees of each turn.
		from, to := math.Mod(last+4*math.Pi, 2*math.Pi), math.Mod(b+4*math.Pi, 2*math.Pi)
		if from > to {
			turns++
			if want := float32(to / (b - last)); math.Abs(float64(dst[6]-want)) > 1e-5 {
				t.Fatalf("step %d: mean of the edge is %g, want %g", i, dst[6], want)
			}
		} else if from > radians(10.1) && dst[6] != 0 || to < radians(9.9) && dst[6] != 1 {
			t.Fatalf("step %d: %g V between %.2f and %.2f rad", i, dst[6], from, to)
		}
		last = b
	}
	if turns < 700 || turns > 780 {
		t.Errorf("%d turns in 30 s, want about 740", turns)
	}
}

// count runs a reference and counts its leading edges in 400 turns.
func count(t *testing.T, r Reference) (edgesSeen int, spread float64) {
	t.Helper()
	r.HighV = 1
	c := PhasorConfig{Law: SpeedLaw{RPM: 1200, AngleDeg: 180}, Reference: &r}
	p, err := NewPhasors(c, 3)
	if err != nil {
		t.Fatal(err)
	}
	square := 0.0
	for _, e := range edges(p, 0, 8000*20) {
		if e.rising {
			d := math.Remainder(c.Law.Angle(e.s), 2*math.Pi) * 180 / math.Pi
			square += d * d
			edgesSeen++
		}
	}
	return edgesSeen, math.Sqrt(square / float64(edgesSeen))
}

func TestMissingAndExtraPulses(t *testing.T) {
	if n, spread := count(t, Reference{}); n != 400 || spread > 1e-3 {
		t.Errorf("sound: %d edges with %.4f degrees, want 400 exact ones", n, spread)
	}
	// Four standard deviations of a binomial count of 400 at 0.1 are 24.
	if n, _ := count(t, Reference{Missing: 0.1}); n < 336 || n > 384 {
		t.Errorf("one in ten missing: %d edges, want about 360", n)
	}
	if n, _ := count(t, Reference{Extra: 0.1}); n < 416 || n > 464 {
		t.Errorf("one in ten extra: %d edges, want about 440", n)
	}
	if n, spread := count(t, Reference{JitterDeg: 0.5}); n != 400 || spread < 0.43 || spread > 0.57 {
		t.Errorf("jitter: %d edges with %.3f degrees, want 400 with 0.5", n, spread)
	}
}
