package rig

// Faults are what besides the masses makes the machine vibrate. The zero value
// is a machine without any. All may change while it runs.
type Faults struct {
	Bow          Bow
	Misalignment Misalignment
	Pull         Pull
	Looseness    Looseness
	LooseRotor   LooseRotor
	Softening    Softening
	Flow         Flow
	Neighbours   []Neighbour
}

// Bow is a bent shaft: the journals run out against the line of the rotor's
// mass and, where the shaft is bent between them, slope against each other.
type Bow struct {
	// OffsetM is each journal's run-out, m, and SlopeRad the slope of its axis
	// there, rad, both in the plane of the bow; drive end first.
	OffsetM, SlopeRad [2]float64
	// AngleDeg is the plane's angle from the mark against the rotation.
	AngleDeg float64
}

// MidspanBow returns the bow of a shaft bent evenly between its bearings, spanM
// apart, by heightM in the middle (both m), about the chord's mean line.
func MidspanBow(heightM, spanM, angleDeg float64) Bow {
	// Parabola: the slope at the ends is 4 height / span.
	s := 4 * heightM / spanM
	return Bow{OffsetM: [2]float64{-heightM, -heightM}, SlopeRad: [2]float64{s, -s}, AngleDeg: angleDeg}
}

// Misalignment is the force of a misaligned coupling: alternating along one
// direction in space, not turning with the shaft, and independent of speed
// because the coupling imposes a displacement.
type Misalignment struct {
	// RadialN, AxialN (N) and MomentNM (N m) are the peak values of orders 1 to
	// 3. The moment bends in the plane of RadialN; a positive one lifts the
	// non-drive end where a positive force lifts the shaft.
	RadialN, AxialN, MomentNM [3]float64
	// LagDeg is the lag of each order, degrees of its own cycle.
	LagDeg [3]float64
	// DirectionDeg is the direction of RadialN from vertical, clockwise seen
	// from the drive end.
	DirectionDeg float64
	// PositionM is the coupling's position, usually negative.
	PositionM float64
}

// Pull is a force once a turn along one direction in space, as an eccentric
// rotor in a magnetic or belt pull makes it.
type Pull struct {
	// ForceN is the peak force, N.
	ForceN float64
	// DirectionDeg is the line of centres from vertical, clockwise seen from
	// the drive end; LagDeg the lag of the force.
	DirectionDeg, LagDeg float64
	// PositionM is where it acts on the rotor.
	PositionM float64
}

// Looseness is a pedestal that lifts off: above LiftM only a part of its
// vertical stiffness is left.
type Looseness struct {
	// End is the loose bearing.
	End End
	// Loss is the share of the stiffness lost when lifted, 0 to below 1; zero
	// means tight.
	Loss float64
	// LiftM is the upward motion at which the pedestal lifts, m, and Unsteady
	// the standard deviation of its random change as a share of itself.
	LiftM, Unsteady float64
}

// LooseRotor is a part of the unbalance that creeps round the shaft: a loose
// impeller, or the hot spot of a rub.
type LooseRotor struct {
	Unbalance
	// DegPerMinute is its steady creep and WalkDeg the standard deviation of its
	// random walk after one minute, degrees.
	DegPerMinute, WalkDeg float64
	// HalfOrderN is the peak of a vertical force at half the turn rate, N.
	HalfOrderN float64
}

// Softening is the share of the pedestals' stiffness lost in each direction,
// 0 to below 1, at both bearings: a cracked foundation or a resonance looked for.
type Softening struct{ V, H, A float64 }

// Flow is the random force of the gas on the rotor, alike in each direction.
type Flow struct {
	// ForceN is its standard deviation in each direction, N.
	ForceN float64
	// CornerHz is where its spectrum falls off, Hz; zero means 100.
	CornerHz float64
}

// Neighbour is another machine felt at the points.
type Neighbour struct {
	// RPM is its speed, r/min; WanderRPM the standard deviation of its own slow
	// wander with a correlation time of 20 s.
	RPM, WanderRPM float64
	// Velocity is what it causes at each sensor, in the order of the sensors;
	// the lag counts from the start of the simulation.
	Velocity []Vector
}
