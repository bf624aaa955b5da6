package rules

// decide returns the verdict on signs that are not quiet, and the other causes
// that are sure (of NotUnbalance) or that could not be contradicted.
func (s *signs) decide() (Verdict, []Suspect) {
	// seen are the possible ones that something speaks for, not only a missing point.
	var sure, possible, seen []Suspect
	for _, c := range s.suspicions() {
		switch {
		case c.t == yes && s.complete():
			sure = append(sure, c.suspect)
		case c.t != no:
			possible = append(possible, c.suspect)
			if c.suspect != BentShaft || s.axial.ok {
				seen = append(seen, c.suspect)
			}
		}
	}
	if len(sure) > 0 {
		return NotUnbalance, append(sure, seen...)
	}
	kind, t := s.kind()
	if t == yes && len(possible) == 0 && s.complete() {
		return kind, nil
	}
	return Undetermined, possible
}

// complete tells whether both bearings are measured in both radial directions.
// Short of that nothing is concluded: the bearing that moves most may be the
// one that is not measured, and the other tells little of the rotor.
func (s *signs) complete() bool { return s.inPhase.ok }

// kind returns the kind of unbalance that fits best, and how well. Unbalance of
// any kind has a dominant 1x, little 2x and bearings that circle with the rotor.
func (s *signs) kind() (Verdict, truth) {
	common := all(
		s.share.atLeast(leastShare, shareGuard),
		s.second.atMost(most2x, ratioGuard),
		s.third.atMost(most2x, ratioGuard),
		s.turns(),
		not(s.unsteady()),
	)
	if s.overhung {
		return OverhungUnbal, all(common,
			s.axial.atLeast(overhungAxial, ratioGuard),
			s.axialEnds.value().atMost(inLine, phaseGuard))
	}
	kind, ends := s.endsKind()
	return kind, all(common, ends, s.axialFits(kind))
}

// calm is the share of the radial power below which a bearing's orbit is
// overlooked: a little of anything else shapes it.
const calm = 0.2

// turns tells whether the bearings circle with the rotor. A weaker bearing that
// does not is overlooked when it hardly moves, or when it is not on a straight
// line either: S3 finds the pattern broken in 10 to 20 % of plain unbalance on
// unequal supports and on overhung rotors.
func (s *signs) turns() truth {
	b := s.heavier()
	broken := all(not(s.straight(1-b)), not(s.circles(1-b)))
	return all(s.circles(b), either(s.circles(1-b), broken, s.weight[1-b].atMost(calm, 0)))
}

// slack is how far past the border of a class, in degrees, one direction's
// phase difference may lie when both together lie within it.
const slack = 5.0

// endsKind returns the kind that the phase between the ends means, and how well
// it fits: both directions together clear of the borders, each alone not past
// them, and for dynamic unbalance the two alike (S2). Without both directions
// it stays open.
func (s *signs) endsKind() (Verdict, truth) {
	both := s.both.value()
	v, h := s.ends[Vertical].value(), s.ends[Horizontal].value()
	each := func(lo, hi float64) truth {
		return all(v.atLeast(lo-slack, 0), v.atMost(hi+slack, 0), h.atLeast(lo-slack, 0), h.atMost(hi+slack, 0))
	}
	opposed := 180 - inLine
	switch {
	case !both.ok:
		return DynamicUnbalance, open
	case both.x <= inLine:
		return StaticUnbalance, all(both.atMost(inLine, phaseGuard), each(-slack, inLine))
	case both.x >= opposed:
		return CoupleUnbalance, all(both.atLeast(opposed, phaseGuard), each(opposed, 180+slack))
	}
	return DynamicUnbalance, all(both.atLeast(inLine, phaseGuard), both.atMost(opposed, phaseGuard),
		each(inLine, opposed), s.disagreement.atMost(inLine, 0))
}

// axialFits tells whether the axial 1x is low enough for the kind, or is
// explained: it may be raised by a couple (S1), alone or as a part of dynamic
// unbalance, where it does not mean a bent shaft when the ends' axial or radial
// phases are not those of one.
func (s *signs) axialFits(kind Verdict) truth {
	low := not(s.axial.atLeast(highAxial, ratioGuard))
	switch kind {
	case CoupleUnbalance:
		return not(s.axial.atLeast(1, ratioGuard))
	case DynamicUnbalance:
		medium := not(s.axial.atLeast(misalignedAxial, ratioGuard))
		notOpposed := s.axialEnds.value().atMost(farFromOpposed, phaseGuard)
		notInPhase := s.both.value().atLeast(farFromInPhase, phaseGuard)
		return either(low, all(medium, either(notOpposed, notInPhase)))
	}
	return low
}

// farFromOpposed and farFromInPhase are phases between the ends, degrees, that
// are twice inLine away from those of a bent shaft.
const farFromOpposed, farFromInPhase = 180 - 2*inLine, 2 * inLine
