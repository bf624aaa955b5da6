package rules

// decide returns the verdict on signs that are not quiet, and the other causes
// that are sure (of NotUnbalance) or that could not be contradicted.
func (s *signs) decide() (Verdict, []Suspect) {
	var sure, possible []Suspect
	for _, c := range s.suspicions() {
		switch s.capped(c) {
		case yes:
			sure = append(sure, c.suspect)
		case open:
			possible = append(possible, c.suspect)
		}
	}
	if len(sure) > 0 {
		return NotUnbalance, append(sure, possible...)
	}
	kind, t := s.kind()
	if t == yes && len(possible) == 0 {
		return kind, nil
	}
	return Undetermined, possible
}

// capped lowers what one bearing alone, or vectors without a reference, cannot
// make sure.
func (s *signs) capped(c suspicion) truth {
	if c.t != yes {
		return c.t
	}
	alone := s.bearings < 2
	switch c.suspect {
	case NeighbourMachine, NotTurnRelated:
		alone = alone && !s.referenced
	}
	if alone {
		return open
	}
	return yes
}

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
	de, nde := s.circles(driveEnd), s.circles(nonDriveEnd)
	if !s.turning[driveEnd].ok || !s.turning[nonDriveEnd].ok {
		return either(de, nde)
	}
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
// explained: it may be raised by a couple (S1), and it does not mean a bent
// shaft when the ends' axial or radial phases are not those of one.
func (s *signs) axialFits(kind Verdict) truth {
	low := not(s.axial.atLeast(highAxial, ratioGuard))
	medium := not(s.axial.atLeast(misalignedAxial, ratioGuard))
	notOpposed := s.axialEnds.value().atMost(120, phaseGuard)
	switch kind {
	case CoupleUnbalance:
		return not(s.axial.atLeast(1, ratioGuard))
	case DynamicUnbalance:
		return either(low, all(medium, either(notOpposed, s.both.value().atLeast(60, phaseGuard))))
	}
	return either(low, all(medium, notOpposed))
}
