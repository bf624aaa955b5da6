package rig

import (
	"fmt"
	"math/rand/v2"
)

// Kind is what makes a random machine vibrate.
type Kind uint8

// The kinds. Resultant of Static lies at the centre of mass, Couple has opposed masses,
// Dynamic has both at clearly different angles, Overhung has its masses in an
// overhung impeller. Quiet has a little of everything.
const (
	Quiet Kind = iota
	Static
	Couple
	Dynamic
	OverhungRotor
	BentShaft
	Misaligned
	Eccentric
	Resonant
	Loose
	RubOrLooseRotor
	NeighbourMachine
	kinds
)

// Kinds returns all kinds.
func Kinds() []Kind {
	var list []Kind
	for k := range kinds {
		list = append(list, k)
	}
	return list
}

// String returns the kind in the words of the trade.
func (k Kind) String() string {
	names := [...]string{"quiet", "static unbalance", "couple unbalance", "dynamic unbalance", "overhung unbalance",
		"bent shaft", "misalignment", "eccentricity", "resonance", "looseness", "rub or loose rotor", "neighbour machine"}
	if int(k) < len(names) {
		return names[k]
	}
	return fmt.Sprintf("kind %d", k)
}

// Case is a random machine and the truth about it.
type Case struct {
	Kind   Kind
	Config Config
	// Overhung is true when the rotor is overhung beyond the non-drive end.
	Overhung bool
	// Points is the steady response at the running speed, as Config.Steady gives it.
	Points []Point
}

// maxDraws bounds the draws for one machine; the rarest kind, the overhung rotor,
// needs eight on average.
const maxDraws = 5000

// Random draws a machine of a kind, with six sensors on channels 0 to 5 and the
// phase reference on channel 6. Apart from resonance all kinds run clear of the
// natural frequencies. A draw is repeated until the machine's steady response
// shows what defines its kind; no verdict of ours has a say in it. It panics for an
// unknown kind.
func Random(k Kind, r *rand.Rand) Case {
	if k >= kinds {
		panic(fmt.Sprintf("rig: there is no %v", k))
	}
	c, err := drawUntil(k, nil, r)
	if err != nil {
		panic(err)
	}
	return c
}

// drawUntil draws until a machine is what its kind demands.
func drawUntil(k Kind, w *Wish, r *rand.Rand) (Case, error) {
	for range maxDraws {
		d := newDraw(k, w, r)
		if d.build() {
			return d.finish()
		}
	}
	return Case{}, fmt.Errorf("rig: no machine with %v in %d draws", k, maxDraws)
}

// draw is a machine in the making.
type draw struct {
	kind Kind
	r    *rand.Rand
	c    Config
	// radius of the impeller and span of the bearings, m; omega in rad/s.
	radius, span, omega float64
	overhung            bool
	// severity is the worst radial 1x to be reached, mm/s rms.
	severity float64
	// wish is what is not left to chance, nil for nothing.
	wish *Wish
}

// newDraw draws a machine without loads.
func newDraw(k Kind, w *Wish, r *rand.Rand) *draw {
	d := &draw{kind: k, r: r, wish: w, severity: severities.byRatio(r)}
	switch k {
	case Quiet:
		d.severity = quiets.byRatio(r)
	case NeighbourMachine:
		d.severity = faultRanges.neighbourOwn.byRatio(r)
	}
	d.c.Drive = Drive{RPM: speeds.byRatio(r), Slip: span{0.004, 0.02}.even(r), LoadWander: span{0.02, 0.1}.even(r), WanderS: span{5, 60}.byRatio(r)}
	if w != nil {
		d.obeyLevels()
	}
	d.omega = d.c.Drive.RPM * rpm
	d.radius = tipSpeeds.even(r) / d.omega
	d.instruments()
	switch k {
	case OverhungRotor:
		d.overhung = true
	case Quiet, Loose, RubOrLooseRotor, NeighbourMachine, Eccentric:
		d.overhung = r.Float64() < overhungShare
	}
	if w != nil {
		d.overhung, d.c.Rotor.CounterClockwise = w.Overhung, w.CounterClockwise
	}
	if d.overhung {
		d.buildOverhung()
	} else {
		d.buildBetween()
	}
	return d
}

// build adds the loads and says whether the machine is what its kind demands.
func (d *draw) build() bool {
	list, err := d.c.NaturalRPM(d.c.Drive.RPM)
	if err != nil || (d.kind != Resonant && clearOf(list, d.c.Drive.RPM) < clearance) {
		return false
	}
	return d.addLoads()
}

// finish hands over the machine.
func (d *draw) finish() (Case, error) {
	if d.wish != nil && d.wish.NoiseMMS > 0 {
		if err := setFlow(&d.c, d.wish.NoiseMMS); err != nil {
			return Case{}, err
		}
	}
	points, err := d.c.Steady(d.c.Drive.RPM)
	return Case{Kind: d.kind, Config: d.c, Overhung: d.overhung, Points: points}, err
}
