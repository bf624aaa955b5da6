package rig

import (
	"math"
	"os"
	"testing"
)

// draws is the number of machines of a kind looked at.
func draws() int {
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		return 500
	}
	return 25
}

// each draws machines of a kind.
func each(t *testing.T, k Kind, look func(c Case)) {
	t.Helper()
	for seed := range draws() {
		c := Random(k, newRand(uint64(seed)))
		if c.Kind != k || len(c.Points) != 6 {
			t.Fatalf("%v, seed %d: got %v with %d points", k, seed, c.Kind, len(c.Points))
		}
		look(c)
		if t.Failed() {
			t.Fatalf("%v, seed %d", k, seed)
		}
	}
}

// TestForwardWhirl: unbalance moves the housing with the rotation, so that H
// lags V by 90 degrees when it turns clockwise (contract of the vectors).
func TestForwardWhirl(t *testing.T) {
	for _, k := range []Kind{Static, Couple} {
		bearings, other := 0, 0
		each(t, k, func(c Case) {
			want := 90 * c.Config.Rotor.sense()
			for e := DriveEnd; e <= NonDriveEnd; e++ {
				v, h := vectorOf(c.Points, e, Vertical), vectorOf(c.Points, e, Horizontal)
				bearings++
				if apart(h.Lag-v.Lag, want) > 30 {
					other++
				}
			}
		})
		// A bearing near a node, or a speed between the natural frequencies of the
		// two directions, turns the other way; section 5 puts such cases at 10 to
		// 20 % in practice (S3), and ours, clear of resonance, are rarer.
		if share := float64(other) / float64(bearings); share > 0.05 {
			t.Errorf("%v: H does not lag V by 90 with the rotation at %.3f of the bearings", k, share)
		}
	}
}

// TestSeverityAndClearance holds the promises of the ranges.
func TestSeverityAndClearance(t *testing.T) {
	for _, k := range Kinds() {
		each(t, k, func(c Case) {
			lo, hi := severities.lo*0.8, severities.hi*1.25
			switch k {
			case Quiet, NeighbourMachine:
				lo, hi = 0.15, 1.2
			}
			if w := worst(c.Points, 1, false); w < lo || w > hi {
				t.Errorf("worst radial 1x is %.2f mm/s, want %.2f to %.2f", w, lo, hi)
			}
			list, err := c.Config.NaturalRPM(c.Config.Drive.RPM)
			if err != nil {
				t.Fatal(err)
			}
			d := clearOf(list, c.Config.Drive.RPM)
			if resonant := d < 0.05; resonant != (k == Resonant) {
				t.Errorf("a natural frequency lies %.3f from the speed", d)
			}
		})
	}
}

// TestOverhungAxialInPhase is common practice's mark of an overhung rotor. No
// draw is rejected for its axial phase.
func TestOverhungAxialInPhase(t *testing.T) {
	each(t, OverhungRotor, func(c Case) {
		if d := ends(c.Points, Axial); d > 30 {
			t.Errorf("axial readings are %.0f degrees apart, want in phase", d)
		}
	})
}

// TestBentShaftAxialOpposed is the mark of a bent shaft (published student
// slides on bent shafts, +-30 degrees): axial opposed, radial in phase. It looks at draws before any is rejected for it.
func TestBentShaftAxialOpposed(t *testing.T) {
	r := newRand(1)
	n, opposed := 0, 0
	for n < draws() {
		d := newDraw(BentShaft, nil, r)
		list, err := d.c.NaturalRPM(d.c.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		if clearOf(list, d.c.Drive.RPM) < clearance {
			continue
		}
		c := d.mainCause()
		points, err := c.Steady(c.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		n++
		if ends(points, Axial) > 150 && ends(points, Vertical) < 30 && ends(points, Horizontal) < 30 {
			opposed++
		}
	}
	if share := float64(opposed) / float64(n); share < 0.7 {
		t.Errorf("%.2f of bent shafts show opposed axial and like radial phase, want most", share)
	}
}

func TestKindsByDefinition(t *testing.T) {
	each(t, Static, func(c Case) {
		if len(c.Config.Faults.Neighbours) != 0 || c.Config.Faults.Bow != (Bow{}) {
			t.Error("static unbalance has other causes")
		}
		if u := c.Config.Unbalances[0]; u.PositionM != c.Config.Rotor.CentreM {
			t.Errorf("the resultant lies at %g, want the centre of mass %g", u.PositionM, c.Config.Rotor.CentreM)
		}
	})
	each(t, Couple, func(c Case) {
		a, b := c.Config.Unbalances[0], c.Config.Unbalances[1]
		if a.KgM != b.KgM || apart(a.AngleDeg, b.AngleDeg) < 179.999 {
			t.Errorf("masses %v and %v are not opposed", a, b)
		}
	})
	each(t, Dynamic, func(c Case) {
		for _, d := range []Direction{Vertical, Horizontal} {
			if p := ends(c.Points, d); p < 40 || p > 140 {
				t.Errorf("phase between the ends is %.0f, want 40 to 140", p)
			}
		}
	})
	each(t, Misaligned, func(c Case) {
		if r := worst(c.Points, 1, true) / worst(c.Points, 1, false); r < 0.4 {
			t.Errorf("axial is %.2f of radial, want about half or more", r)
		}
	})
}

func TestRandomIsRepeatable(t *testing.T) {
	for _, k := range Kinds() {
		a, b := Random(k, newRand(5)), Random(k, newRand(5))
		if a.Points[0] != b.Points[0] || a.Config.Drive != b.Config.Drive {
			t.Errorf("%v: two machines from one seed differ", k)
		}
	}
}

// TestRandomMachinesRun simulates one machine of each kind and compares its 1x
// with the truth; the kinds whose steady response is not the whole truth are bounded.
func TestRandomMachinesRun(t *testing.T) {
	oneGoroutine(t)
	for _, k := range Kinds() {
		c := Random(k, newRand(9))
		m := start(t, c.Config)
		for i, o := range observe(m, 4) {
			want := c.Points[i].Order[0]
			if math.IsNaN(o.rms) || o.rms > 60 {
				t.Errorf("%v, %s: %g mm/s", k, c.Points[i].Name, o.rms)
			}
			if k == Loose || k == RubOrLooseRotor || want.RMS < 0.3 {
				continue
			}
			rel, deg := 0.05, 3.0
			if k == Resonant {
				rel, deg = 0.3, 20 // the speed's wander moves it on the flank
			}
			same(t, k.String()+" "+c.Points[i].Name, o.order[1], want, rel, deg)
		}
	}
}
