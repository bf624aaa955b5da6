package rig

import (
	"math"
	"math/cmplx"
	"os"
	"testing"
)

// jeffcott is a rotor with its mass in the middle of two rigid housings: natural
// frequency 1 rad/s, stiffness 1 N/m, mass 1 kg, and eccentricity 1 m.
func jeffcott(zeta float64) Config {
	b := Spring{K: 0.5, C: zeta}
	s := Support{BearingV: b, BearingH: b, BearingA: b, BearingTilt: b}
	c := Config{
		Rotor:      Rotor{MassKg: 1, PolarKgM2: 0.02, TransverseKgM2: 0.01, CentreM: 0.5},
		Supports:   [2]Support{s, s},
		Drive:      Drive{RPM: 1 / rpm},
		Unbalances: []Unbalance{{KgM: 1, PositionM: 0.5}},
		StepHz:     1,
	}
	c.Supports[1].PositionM = 1
	return c
}

// displacement returns amplitude and lag (degrees) of the rotor's vertical
// displacement in the steady response at w rad/s.
func displacement(t *testing.T, c Config, w float64) (amplitude, lag float64) {
	t.Helper()
	q, err := respond(assemble(&c), newLoads(&c).at(1, w), w, w)
	if err != nil {
		t.Fatal(err)
	}
	if apart(lagDegrees(-cmplx.Phase(q[rotorH])), lagDegrees(-cmplx.Phase(q[rotorV])+math.Pi/2)) > 1e-6 {
		t.Errorf("clockwise rotor: horizontal %v does not lag vertical %v by 90 degrees", q[rotorH], q[rotorV])
	}
	return cmplx.Abs(q[rotorV]), lagDegrees(-cmplx.Phase(q[rotorV]))
}

// near fails unless got is want to half a unit of the last digit printed.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: got %.6f, want %.6f", what, got, want)
	}
}

// jeffcottTable is the Jeffcott rotor, A/e and lag against r for a damping ratio
// of 0.05 and of 0.10, recomputed from the formula in R. Tiwari, Rotor Dynamics
// (NPTEL course, IIT Guwahati), module 2.
var jeffcottTable = []struct{ r, a05, lag05, a10, lag10 float64 }{
	{0.2, 0.04166, 1.193, 0.04163, 2.386},
	{0.5, 0.33260, 3.814, 0.33041, 7.595},
	{0.8, 1.73544, 12.529, 1.62455, 23.962},
	{0.9, 3.85278, 25.346, 3.09485, 43.452},
	{1.0, 10.00000, 90.000, 5.00000, 90.000},
	{1.1, 5.10408, 152.354, 3.97846, 133.668},
	{1.2, 3.15741, 164.745, 2.87311, 151.390},
	{1.5, 1.78718, 173.157, 1.75030, 166.504},
	{2.0, 1.33038, 176.186, 1.32164, 172.405},
	{3.0, 1.12421, 177.852, 1.12185, 175.711},
	{5.0, 1.04144, 178.807, 1.04076, 177.614},
	{1.002509, 10.012523, math.NaN(), math.NaN(), math.NaN()},
	{1.010153, math.NaN(), math.NaN(), 5.025189, math.NaN()},
}

func TestSteadyEqualsJeffcott(t *testing.T) {
	for _, row := range jeffcottTable {
		for _, z := range []struct{ zeta, a, lag float64 }{{0.05, row.a05, row.lag05}, {0.10, row.a10, row.lag10}} {
			a, lag := displacement(t, jeffcott(z.zeta), row.r)
			if !math.IsNaN(z.a) {
				near(t, "amplitude", a, z.a, 5.1e-6)
			}
			if !math.IsNaN(z.lag) {
				near(t, "lag", lag, z.lag, 5.1e-4)
			}
		}
	}
}

// constant is a torque that gives the same acceleration at every speed.
type constant float64

func (c constant) alpha(float64) float64 { return float64(c) }

// rotating returns the complex amplitude of a coordinate that moves once a turn.
func rotating(y *motion, i int) complex128 {
	return complex(y.q[i], -y.v[i]/y.omega) * cmplx.Rect(1, -y.theta)
}

// TestTimeDomainEqualsJeffcott starts at rest and waits for the transient to die.
func TestTimeDomainEqualsJeffcott(t *testing.T) {
	for _, row := range jeffcottTable[:11] {
		c := jeffcott(0.1)
		s := newSystem(&c)
		y := motion{omega: row.r}
		var a0, a1 vector
		s.acceleration(&a1, &y, 0)
		h := 0.02 / max(1, row.r)
		for range int(150 / h) { // exp(-0.1*150) = 3e-7
			a0 = a1
			s.step(&y, h, constant(0), &a0, &a1)
		}
		q := rotating(&y, rotorV)
		near(t, "amplitude", cmplx.Abs(q), row.a10, 2e-5)
		near(t, "lag", lagDegrees(-cmplx.Phase(q)), row.lag10, 1e-3)
	}
}

// TestRaoWhirl is a whirling problem after S. S. Rao, Mechanical Vibrations,
// chapter 9 (k 3.75 MN/m, 60 kg, e 2 mm, 3600 r/min, zeta 0.05); the values were
// recomputed from the closed form.
func TestRaoWhirl(t *testing.T) {
	const k, m = 3.75e6, 60.0
	c := jeffcott(0)
	b := Spring{K: k / 2, C: 0.05 * math.Sqrt(k*m)}
	c.Supports[0].BearingV, c.Supports[0].BearingH = b, b
	c.Supports[1].BearingV, c.Supports[1].BearingH = b, b
	c.Rotor.MassKg = m
	c.Unbalances[0].KgM = m * 2000e-6
	a, lag := displacement(t, c, 3600*rpm)
	near(t, "amplitude, mm", a*1000, 3.545163, 1e-6)
	near(t, "lag", lag, 173.2494, 1e-4)
	a, _ = displacement(t, c, 250)
	near(t, "at the natural frequency, mm", a*1000, 20, 1e-6)
	a, _ = displacement(t, c, 250/math.Sqrt(1-2*0.05*0.05))
	near(t, "peak, mm", a*1000, 20.025047, 1e-6)
}

// cantilever is a thin disc (Ip = 2 Id) at the tip of a shaft of length l and
// bending stiffness ei.
func cantilever(ei, l, mass, id float64) Config {
	return Config{
		Rotor: Rotor{MassKg: mass, PolarKgM2: 2 * id, TransverseKgM2: id},
		Shaft: Shaft{Translation: 12 * ei / (l * l * l), Coupling: -6 * ei / (l * l), Tilt: 4 * ei / l},
		Drive: Drive{RPM: 1},
	}
}

// TestCantilever is example 2.9 of R. Tiwari, Rotor Dynamics (NPTEL course): a
// point mass at the tip; the frequency was recomputed from the printed data.
func TestCantilever(t *testing.T) {
	ei := 2.1e11 * 4.908739e-10
	c := cantilever(ei, 0.2, 1, 1e-9)
	list, err := c.NaturalRPM(1e-3)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "natural frequency, r/min", list[0], 1877.507, 2e-3)
}

// TestOverhungDisc is the overhung thin disc in the form of Den Hartog, values
// recomputed from D K^4 + (4-12D) K^2 - 12 = 0 and its kin: ratios to the point
// mass's frequency. A critical speed is where a natural frequency equals the
// speed; unbalance excites the forward one and no backward one.
func TestOverhungDisc(t *testing.T) {
	for _, row := range []struct{ d, still, forward, backward1, backward2 float64 }{
		{0.05, 0.94643, 1.05879, 0.85506, 3.48680},
		{1.0 / 12, 0.91370, 1.10050, 0.78198, 2.95328},
		{0.10, 0.89821, 1.12196, 0.75099, 2.80722},
		{0.20, 0.81650, 1.25403, 0.61676, 2.41699},
		{1.0 / 3, 0.73205, 1.41421, 0.51280, 2.25175},
		{0.50, 0.65376, 1.55901, 0.43490, 2.16789},
		{1.00, 0.51280, 1.75988, 0.31993, 2.08377},
		{2.00, 0.38408, 1.87686, 0.23088, 2.04179},
	} {
		c := cantilever(1, 1, 1, row.d)
		unit := math.Sqrt(3) // rad/s
		list, err := c.NaturalRPM(0)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "non-rotating", list[0]*rpm/unit, row.still, 5.1e-6)
		for _, critical := range []float64{row.forward, row.backward1, row.backward2} {
			list, err := c.NaturalRPM(critical * unit / rpm)
			if err != nil {
				t.Fatal(err)
			}
			near(t, "distance to a critical speed", clearOf(list, critical*unit/rpm), 0, 1e-5/min(1, critical))
		}
		c.Unbalances = []Unbalance{{KgM: 1}}
		excited := func(r float64) float64 {
			a, _ := displacement(t, c, r*unit)
			return a
		}
		if a := excited(row.forward); a < 1e3 {
			t.Errorf("D %g: unbalance at the forward critical gives %g, want resonance", row.d, a)
		}
		if a, b := excited(row.backward1), excited(row.backward2); a > 100 || b > 100 {
			t.Errorf("D %g: unbalance excites a backward critical: %g, %g", row.d, a, b)
		}
	}
}

// TestSweepThroughCritical is the run-up of a Jeffcott rotor from r 0.5 to 1.8 and
// the run-down back, from the steady response, computed beforehand with a fixed
// step of 0.02/w_n; compare Baker, ASME J. Appl. Mech. 6(4):A145, 1939.
func TestSweepThroughCritical(t *testing.T) {
	oneGoroutine(t)
	for _, row := range []struct{ zeta, a, up, upAt, down, downAt float64 }{
		{0.02, 1e-4, 24.6837, 1.0092, 24.3950, 0.9919},
		{0.02, 5e-4, 22.3450, 1.0309, 21.6303, 0.9714},
		{0.02, 1e-3, 20.2837, 1.0492, 19.3699, 0.9543},
		{0.02, 2e-3, 17.7132, 1.0762, 16.6236, 0.9291},
		{0.05, 1e-4, 10.0345, 1.0065, 9.9759, 0.9987},
		{0.05, 5e-4, 10.0049, 1.0210, 9.7613, 0.9856},
		{0.05, 1e-3, 9.8632, 1.0358, 9.4684, 0.9727},
		{0.05, 2e-3, 9.5285, 1.0595, 8.9468, 0.9522},
	} {
		if row.a < 5e-4 && os.Getenv("HEAVYSPOT_LONG") != "1" {
			continue // 650 000 steps each way
		}
		peak, at := sweep(t, row.zeta, 0.5, 1.8, row.a)
		near(t, "up: peak", peak, row.up, 2e-4)
		near(t, "up: speed at peak", at, row.upAt, 1e-4)
		peak, at = sweep(t, row.zeta, 1.8, 0.5, -row.a)
		near(t, "down: peak", peak, row.down, 2e-4)
		near(t, "down: speed at peak", at, row.downAt, 1e-4)
	}
}

// sweep returns the greatest whirl radius of the Jeffcott rotor and the speed there.
func sweep(t *testing.T, zeta, from, to, alpha float64) (peak, at float64) {
	t.Helper()
	c := jeffcott(zeta)
	s := newSystem(&c)
	m := Machine{config: c, system: s}
	if err := m.settle(from); err != nil {
		t.Fatal(err)
	}
	var a0, a1 vector
	s.acceleration(&a1, &m.now, alpha)
	for range int((to - from) / alpha / 0.02) {
		a0 = a1
		s.step(&m.now, 0.02, constant(alpha), &a0, &a1)
		if r := math.Hypot(m.now.q[rotorV], m.now.q[rotorH]); r > peak {
			peak, at = r, m.now.omega
		}
	}
	return peak, at
}
