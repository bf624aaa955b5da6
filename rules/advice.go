package rules

import (
	"math"
	"slices"
	"strings"
)

// safety are the short safety words that go with advice to work on the machine.
const safety = "isolate and lock out before opening the casing, stay out of the plane of rotation on the first start with a trial mass, " +
	"fasten masses for the speed they will see; local codes, the maker's instructions and a qualified person decide"

// careful are the safety words where no mass is put on.
const careful = "isolate and lock out before opening the casing; local codes, the maker's instructions and a qualified person decide"

// nearer is how much more one end must move than the other for the correction
// plane to lie nearer to it.
const nearer = 1.5

// checks says what to look at first for each suspect.
var checks = map[Suspect]string{
	BentShaft:        "check run-out of the shaft with a dial gauge at several places",
	Misalignment:     "check coupling and alignment, hot as well as cold",
	Eccentricity:     "check run-out of hub and pulley, and whether the vibration goes with the motor's power",
	Resonance:        "find the natural frequency by a bump test or from the run-down, and check the supports for cracks and loose bolts",
	Looseness:        "check foundation bolts, feet, bearing caps and clearances",
	RubOrLooseRotor:  "check for rubbing at seals and inlet cone, and for a loose hub or impeller",
	NeighbourMachine: "compare with the speeds of the machines nearby before anything is done here",
	NotTurnRelated:   "check flow: damper position, surge or stall, inlet conditions, and the bearings",
}

// advise returns the sentence for the engineer.
func advise(f *Finding, s *signs, p *picture) string {
	switch f.Verdict {
	case Quiet:
		return "nothing to do about unbalance"
	case StaticUnbalance:
		return "single-plane balance" + nearEnd(p) + "; look for deposits, wear or a lost part on the rotor first; " + safety
	case CoupleUnbalance:
		return "two-plane balance with masses opposed in the two planes; look for deposits, wear or a lost part on the rotor first; " + safety
	case DynamicUnbalance:
		return "two-plane balance; look for deposits, wear or a lost part on the rotor first; " + safety
	case OverhungUnbal:
		return "balance the overhung rotor in one plane first, then in two if the ends still differ; " +
			"look for deposits, wear or a lost part on it first; " + safety
	case NotUnbalance:
		return "do not balance; " + checks[f.Suspects[0]] + "; " + careful
	}
	return undeterminedAdvice(f, s)
}

// nearEnd says where the correction plane lies when one end moves much more
// than the other in phase with it: a static unbalance away from the middle.
func nearEnd(p *picture) string {
	var a [2]float64
	for b := range a {
		a[b] = math.Hypot(p.at[b][Vertical].amplitude(), p.at[b][Horizontal].amplitude())
	}
	for b, name := range bearingNames {
		if a[b] > nearer*a[1-b] {
			return ", with the correction plane nearer to the " + name + ", which moves more"
		}
	}
	return ""
}

// undeterminedAdvice says what keeps the cause open, and what comes first.
func undeterminedAdvice(f *Finding, s *signs) string {
	var absent, against []string
	for _, e := range f.Evidence {
		switch {
		case e.Test == "phase-creep" && e.Missing != "":
		case e.Missing != "":
			absent = append(absent, strings.Split(e.Missing, ", ")...)
		case !e.Holds:
			against = append(against, e.Test)
		}
	}
	parts := []string{"do not balance on this reading"}
	if len(absent) > 0 {
		slices.Sort(absent)
		parts = append(parts, "not all could be tested: "+strings.Join(slices.Compact(absent), ", "))
	}
	if kind, _ := s.kind(); len(absent) > 0 && len(against) == 0 && s.both.ok {
		parts = append(parts, "what could be tested looks like "+strings.ReplaceAll(string(kind), "-", " "))
	}
	if len(against) > 0 {
		parts = append(parts, "out of the range for unbalance: "+strings.Join(against, ", "))
	}
	if reversed(s) {
		parts = append(parts, "the bearings circle against the rotor: check the configured rotation and the sensors' sides, "+
			"or the machine runs between its vertical and horizontal resonances")
	}
	if len(absent)+len(against) == 0 {
		parts = append(parts, "it is near a border between two causes, so compare the next minutes")
	}
	if len(f.Suspects) > 0 {
		parts = append(parts, checks[f.Suspects[0]])
	}
	return strings.Join(append(parts, careful), "; ")
}

// reversed tells whether both bearings circle clearly against the rotor.
func reversed(s *signs) bool {
	for _, a := range s.turning {
		if !a.ok || math.Abs(a.deg+90) > circling {
			return false
		}
	}
	return true
}
