package rules

import "math"

// Borders of the tests. Where the trade gives a figure its source stands beside
// it; the short names are those of the project's table of phase rules: S1 an
// illustrated diagnostic chart for fan vibration, S2 a training sheet on phase
// relationships, S3 a textbook chapter, S4 slides on bent shafts, S5 an
// identification guide.
const (
	// inLine is how far from 0 or 180 degrees a phase difference still counts
	// as in phase or opposed: +-30 (S1, S2, S4).
	inLine = 30.0
	// circling is how far from 90 degrees the lag of horizontal behind vertical
	// may be for unbalance: +-40 (S2; S1 says +-30).
	circling = 40.0
	// circlingRound is the same for an orbit whose forward circle is at least
	// mostlyForward times its backward one; S3 warns that unequal supports bend
	// the +-40 in 10 to 20 % of plain unbalance.
	circlingRound, mostlyForward = 60.0, 2.0
	// leastShare is the least share of 1x in the power for unbalance ("1x
	// dominates", S1; the figure: common practice).
	leastShare = 0.5
	// most2x is 2x against 1x up to which a coupling is held for sound (common
	// practice, to be given low weight); some2x and some3x are seen beside
	// other signs (S4: 2x is 30 to 200 % of 1x with a bent shaft).
	most2x, some2x, some3x, double2x = 0.5, 0.3, 0.3, 1.0
	// oneSided is the amplitude of the harmonics in one radial direction of a
	// bearing against the other's, from which, at liftingRough of 1x or more, a
	// support that lifts is suspected (common practice: a support that opens and
	// closes is stiff one way and soft the other, and makes harmonics in that
	// direction). hintingRough, and half as one-sided, leaves it open.
	oneSided, liftingRough, hintingRough = 2.0, 0.35, 0.3
	// highAxial is the axial 1x against the radial one from which it needs a
	// cause (common practice; S5 gives 0.5 for misalignment, S4 only "high").
	highAxial, misalignedAxial = 0.3, 0.5
	// overhungAxial is the same for an overhung rotor, where nothing with low
	// axial vibration competes (common practice).
	overhungAxial = 0.2
	// lopsided is one radial direction against the other from which a structural
	// resonance is suspected (common practice; S2: "much larger").
	lopsided = 4.0
	// amplified is the same from which no usual difference of the supports
	// explains it, whatever the phase; turnedOff is how far from 90 degrees the
	// phase may be, from lopsided on, before a resonance is possible (common
	// practice: damping turns the phase only near a resonance).
	amplified, turnedOff = 8.0, 15.0
	// halfTurned is how far from 90 degrees the phase is when the speed lies
	// between the natural frequencies of the two directions (S2: 180 in total
	// across a resonance); the ratio besideResonance then means that one is near.
	halfTurned, besideResonance = 120.0, 3.0
	// mostWander is the unsteadiness of the lag in a minute, and mostCreep its
	// step from minute to minute, up to which it is steady (common practice).
	mostWander, mostCreep = 5.0, 10.0
	// someWander leaves the lag's steadiness open while it has not been seen
	// from minute to minute (common practice).
	someWander = 2.0
)

// Guards: the distance from a border, beyond the uncertainty, within which a
// test stays open.
const (
	phaseGuard  = 3.0 // degrees
	steadyGuard = 1.5 // degrees
	// bentGuard is small because no other cause is near: with high axial 1x an
	// overhung rotor's is in phase at the ends, a bent shaft's opposed.
	bentGuard      = 1.0  // degrees
	ratioGuard     = 0.04 // of 1x
	shareGuard     = 0.05
	neighbourGuard = 0.2
	lopsidedGuard  = 0.4
)

// straight tells whether the bearing moves on a line: horizontal 0 or 180
// degrees from vertical.
func (s *signs) straight(b int) truth {
	v := s.turning[b].size().value()
	return either(v.atMost(inLine, phaseGuard), v.atLeast(180-inLine, phaseGuard))
}

// offQuarter returns how far from 90 degrees horizontal lags vertical, 0 to 180.
func (s *signs) offQuarter(b int) value {
	a := s.turning[b]
	return angle{math.Remainder(a.deg-90, 360), a.sd, a.ok}.size().value()
}

// circles tells whether the bearing circles with the rotor.
func (s *signs) circles(b int) truth {
	off := s.offQuarter(b)
	round := all(off.atMost(circlingRound, phaseGuard), s.forward[b].atLeast(mostlyForward, 0))
	return either(off.atMost(circling, phaseGuard), round)
}

// heavier returns the bearing with the greater radial 1x.
func (s *signs) heavier() int {
	if s.weight[nonDriveEnd].x > s.weight[driveEnd].x {
		return nonDriveEnd
	}
	return driveEnd
}

// line tells whether the bearings move on lines: the heavier one straight, the
// other at least not circling, as the pattern is clear at about three quarters
// of the bearings (S3).
func (s *signs) line() truth {
	b := s.heavier()
	return all(s.straight(b), not(s.circles(1-b)))
}

// unsteady tells whether the phase moves within the minute or between minutes.
func (s *signs) unsteady() truth {
	creep := s.creep.atLeast(mostCreep, steadyGuard)
	if !s.creep.ok {
		// The minute itself decides until there is a memory, more cautiously.
		creep = all(s.wander.atLeast(someWander, 0), open)
	}
	t := either(s.wander.atLeast(mostWander, steadyGuard), creep)
	if !s.referenced {
		t = min(t, open) // the point that the lags are relative to may be the unsteady one
	}
	return t
}

// axialOut tells whether a high axial 1x is there that an overhung rotor's
// unbalance does not explain.
func (s *signs) axialOut(limit float64) truth {
	high := s.axial.atLeast(limit, ratioGuard)
	if s.overhung {
		return all(high, not(s.axialEnds.value().atMost(inLine, phaseGuard)))
	}
	return high
}

// suspicion is a cause other than unbalance and how sure it is.
type suspicion struct {
	suspect Suspect
	t       truth
}

// suspicions goes through the causes of 1x other than unbalance, likely ones
// first where several fit.
func (s *signs) suspicions() []suspicion {
	unsteady := s.unsteady()
	h2, h3 := s.second.atLeast(some2x, ratioGuard), s.third.atLeast(some3x, ratioGuard)
	neighbour := s.neighbour.atLeast(1, neighbourGuard)
	harmonics := either(all(h2, h3), s.second.atLeast(most2x, ratioGuard))
	buried := not(s.share.atLeast(leastShare, shareGuard))
	list := []suspicion{
		{NeighbourMachine, neighbour},
		{RubOrLooseRotor, all(unsteady, not(h2), not(h3))},
		{Looseness, either(all(h2, h3), all(unsteady, either(h2, h3)), s.lifting())},
		{Misalignment, s.misaligned()},
		{BentShaft, s.bent()},
		{Resonance, s.resonant()},
		{Eccentricity, s.eccentric()},
		{NotTurnRelated, all(buried, not(harmonics), not(neighbour))},
	}
	if s.line() == yes && unsteady == no {
		// Steady motion on lines is a coupling's doing rather than looseness.
		list[2], list[3] = list[3], list[2]
	}
	return list
}

// lifting: the harmonics of a support that opens and closes, in one direction.
// A coupling makes them in one direction too, but then moves the bearings on
// lines.
func (s *signs) lifting() truth {
	t := no
	for _, r := range s.rough {
		sure := all(r.toFirst.atLeast(liftingRough, ratioGuard), r.toOther.atLeast(oneSided, ratioGuard*oneSided))
		hint := all(r.toFirst.atLeast(hintingRough, ratioGuard), r.toOther.atLeast(1+(oneSided-1)/2, ratioGuard), open)
		t = either(t, sure, hint)
	}
	return all(t, not(s.line()))
}

// eccentric: motion on lines (common practice) without the axial motion and the
// 2x of a misaligned coupling.
func (s *signs) eccentric() truth {
	return all(s.line(), not(s.axialOut(highAxial)), not(s.second.atLeast(some2x, ratioGuard)))
}

// bent: high axial 1x with the ends opposed, radial in phase, all +-30 (S4).
func (s *signs) bent() truth {
	return all(s.axial.atLeast(highAxial, ratioGuard),
		s.axialEnds.value().atLeast(180-inLine, bentGuard),
		s.both.value().atMost(inLine, bentGuard))
}

// misaligned: two of straight motion at the bearings (S3), high 2x (common
// practice) and axial at least half of radial (S5); or 2x above 1x, or a high
// 2x alone, which leaves it open.
func (s *signs) misaligned() truth {
	line, axial := s.line(), s.axialOut(misalignedAxial)
	second := s.second.atLeast(most2x, ratioGuard)
	return either(all(line, second), all(line, axial), all(second, axial),
		all(line, s.axialOut(highAxial), s.second.atLeast(some2x, ratioGuard)),
		s.second.atLeast(double2x, ratioGuard), all(second, open))
}

// resonant: one radial direction much larger and its phase turned away from a
// quarter turn (S2), at the bearing that moves most; or so much larger that
// nothing but a resonance explains it.
func (s *signs) resonant() truth {
	b := s.heavier()
	large := s.uneven[b].atLeast(lopsided, lopsidedGuard)
	between := all(s.uneven[b].atLeast(besideResonance, lopsidedGuard), s.offQuarter(b).atLeast(halfTurned, phaseGuard))
	hint := all(large, s.offQuarter(b).atLeast(turnedOff, 0), open)
	return either(all(large, not(s.circles(b))), between, hint,
		s.uneven[b].atLeast(amplified, 2*lopsidedGuard))
}
