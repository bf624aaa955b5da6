package rules

import "strings"

// directionNames are the directions' names in tests and advice.
var directionNames = [3]string{"vertical", "horizontal", "axial"}

// noVibration is why ratios of the orders were not measured.
const noVibration = "no good radial point"

// worstEvidence is the test of the largest 1x vibration against the quiet level.
func worstEvidence(s *signs, b bound) Evidence {
	return evidence("worst-1x", s.worst, "mm/s rms", b, "", "no good point")
}

// evidence returns the tests behind a verdict, with the ranges that the named
// unbalance, or where none is named the nearest kind, would show.
func (s *signs) evidence(v Verdict, missing *[2][3]string) []Evidence {
	kind, _ := s.kind()
	list := []Evidence{
		evidence("1x-share", s.share, "", from(leastShare), "", noVibration),
		evidence("2x-to-1x", s.second, "", upTo(most2x), "", noVibration),
		evidence("3x-to-1x", s.third, "", upTo(most2x), "", noVibration),
		evidence("one-direction-harmonics-to-1x", s.roughest, "", upTo(hintingRough), "", noVibration),
		evidence("neighbour-to-1x", s.neighbour, "", upTo(1), "", noVibration),
	}
	for b := range s.turning {
		list = append(list, s.orbitEvidence(b, missing))
	}
	for b := range s.uneven {
		list = append(list, s.unevenEvidence(b, missing))
	}
	list = append(list, s.endsEvidence(kind, missing)...)
	list = append(list, s.axialEvidence(kind, missing)...)
	return append(list,
		evidence("phase-wander", s.wander, "deg", upTo(mostWander), "", noVibration),
		evidence("phase-creep", s.creep, "deg per minute", upTo(mostCreep), "", s.noCreep()))
}

func (s *signs) noCreep() string {
	if !s.referenced {
		return "no phase reference"
	}
	return "fewer than four steady minutes at this speed yet"
}

// orbitEvidence is the test of the lag of horizontal behind vertical.
func (s *signs) orbitEvidence(b int, missing *[2][3]string) Evidence {
	r := span(90-circling, 90+circling)
	if s.forward[b].atLeast(mostlyForward, 0) == yes {
		r = span(90-circlingRound, 90+circlingRound)
	}
	return evidence("horizontal-behind-vertical-"+bearingNames[b], s.turning[b].value(), "deg", r,
		"in the sense of rotation", because(missing[b][Vertical], missing[b][Horizontal]))
}

// unevenEvidence is the test of one radial direction against the other.
func (s *signs) unevenEvidence(b int, missing *[2][3]string) Evidence {
	r, purpose := upTo(lopsided), ""
	if s.circles(b) == yes {
		r, purpose = from(1), "while horizontal is a quarter turn behind"
	}
	return evidence("larger-to-smaller-"+bearingNames[b], s.uneven[b], "", r, purpose,
		because(missing[b][Vertical], missing[b][Horizontal]))
}

// endsRange is the phase between the ends that a kind of unbalance shows.
func endsRange(kind Verdict) bound {
	switch kind {
	case StaticUnbalance:
		return span(0, inLine)
	case CoupleUnbalance:
		return span(180-inLine, 180)
	case DynamicUnbalance:
		return span(inLine, 180-inLine)
	}
	return span(0, 180)
}

// endsEvidence are the tests of the ends against each other.
func (s *signs) endsEvidence(kind Verdict, missing *[2][3]string) []Evidence {
	r := endsRange(kind)
	v := because(missing[driveEnd][Vertical], missing[nonDriveEnd][Vertical])
	h := because(missing[driveEnd][Horizontal], missing[nonDriveEnd][Horizontal])
	radial := because(missing[driveEnd][Vertical], missing[nonDriveEnd][Vertical],
		missing[driveEnd][Horizontal], missing[nonDriveEnd][Horizontal])
	alike := span(0, 180)
	if kind == DynamicUnbalance {
		alike = span(0, inLine)
	}
	return []Evidence{
		evidence("ends-phase", s.both.value(), "deg", r, "", radial),
		evidence("ends-phase-vertical", s.ends[Vertical].value(), "deg", r, "", v),
		evidence("ends-phase-horizontal", s.ends[Horizontal].value(), "deg", r, "", h),
		evidence("ends-phase-disagreement", s.disagreement, "deg", alike, "", radial),
		evidence("in-phase-share", s.inPhase, "", span(0, 1), "", radial),
	}
}

// axialEvidence are the tests of the axial 1x.
func (s *signs) axialEvidence(kind Verdict, missing *[2][3]string) []Evidence {
	r, phase, purpose := upTo(highAxial), span(0, 180), "while axial is low"
	raised := s.axial.atLeast(highAxial, ratioGuard) != no
	switch {
	case kind == OverhungUnbal:
		r, phase, purpose = from(overhungAxial), span(0, inLine), ""
	case kind == CoupleUnbalance:
		r, purpose = upTo(1), "as a couple may raise axial"
	case raised && kind == DynamicUnbalance && s.axialFits(kind) == yes:
		r, purpose = upTo(misalignedAxial), "as the ends are not those of a bent shaft"
	case raised:
		phase, purpose = span(0, farFromOpposed), "while axial is high"
	}
	why := because(missing[driveEnd][Axial], missing[nonDriveEnd][Axial])
	return []Evidence{
		evidence("axial-to-radial", s.axial, "", r, "", why),
		evidence("axial-ends-phase", s.axialEnds.value(), "deg", phase, purpose, why),
	}
}

// because joins the reasons that are not empty.
func because(reasons ...string) string {
	var list []string
	for _, r := range reasons {
		if r != "" {
			list = append(list, r)
		}
	}
	if len(list) == 0 {
		return "no 1x vibration there"
	}
	return strings.Join(list, ", ")
}
