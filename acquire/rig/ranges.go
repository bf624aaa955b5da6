package rig

import (
	"math"
	"math/rand/v2"
)

// span is the range of a random value.
type span struct{ lo, hi float64 }

// even draws with equal density, byRatio with equal density of the logarithm.
func (s span) even(r *rand.Rand) float64    { return s.lo + (s.hi-s.lo)*r.Float64() }
func (s span) byRatio(r *rand.Rand) float64 { return s.lo * math.Pow(s.hi/s.lo, r.Float64()) }

// The ranges of random machines. They are our own choice of what industrial
// fans look like; no source prints them.
var (
	// speeds are running speeds, r/min, from slow induced-draft fans to two-pole motors.
	speeds = span{400, 3600}
	// severities are the worst radial 1x, mm/s rms: a little over quiet to
	// severe. quiets are those of a healthy machine.
	severities = span{2.2, 15}
	quiets     = span{0.2, 0.9}
	// overhungShare is the share of overhung rotors where the kind leaves it open.
	overhungShare = 0.3
	// tipSpeeds of the impeller, m/s, give its radius.
	tipSpeeds = span{70, 130}
	// massAt1000 is the rotor's mass at 1000 r/min, kg; it falls with speed^1.2.
	massAt1000 = span{500, 3000}
	// pulseWidths are widths of the reference's pulse, degrees; it lasts at least
	// leastPulse, s, so that a converter at 1 kHz sees its full height.
	pulseWidths = span{15, 75}
	leastPulse  = 3.5e-3
	// clearance is what the running speed keeps from every natural frequency, as a share of it.
	clearance = 0.22
)

// betweenRanges describe a rotor between its bearings, on two pedestals.
var betweenRanges = struct {
	spanRadii, centre, housing, stiff, soft, anisotropy, axial, floating, tilt, pedestal span
	softShare                                                                            float64
}{
	spanRadii:  span{1.8, 3.2},   // span over impeller radius
	centre:     span{0.42, 0.58}, // centre of mass over span
	housing:    span{0.03, 0.08}, // housing mass over rotor mass
	stiff:      span{1.35, 3.2},  // vertical natural frequency over speed, rigid support
	soft:       span{0.3, 0.72},  // the same on springs or a tall steel frame
	softShare:  0.2,              // share of machines on soft supports
	anisotropy: span{0.55, 0.95}, // horizontal over vertical stiffness
	axial:      span{0.6, 1.4},   // axial over vertical stiffness of a pedestal
	floating:   span{0.05, 0.35}, // axial stiffness of the floating over the fixed bearing
	tilt:       span{0.02, 0.15}, // tilting stiffness of the bearing over that of the pedestal
	pedestal:   span{0.3, 0.7},   // height over impeller radius
}

// overhungRanges describe an impeller beyond the non-drive-end bearing, both
// bearings on one frame.
var overhungRanges = struct {
	spanRadii, overhang, frame, height, rocking, upright, stand, tilt span
}{
	spanRadii: span{1.0, 2.0},   // span over impeller radius
	overhang:  span{0.25, 0.55}, // centre of mass beyond the bearing over span
	frame:     span{0.4, 1.5},   // frame mass over rotor mass
	height:    span{1.1, 2.2},   // shaft above the frame's springs over span
	rocking:   span{1.4, 2.4},   // frequency of rocking over speed
	upright:   span{1.4, 2.4},   // frequency of the frame's translation over speed
	stand:     span{3, 5},       // frequency of the pedestals on the frame over speed
	tilt:      span{0.1, 0.5},   // tilting stiffness of the bearing over that of the pedestal
}

// springRanges hold damping and the bearings' own stiffness.
var springRanges = struct{ damping, bearingDamping, bearing span }{
	damping:        span{0.02, 0.06},   // share of critical of pedestals and frames
	bearingDamping: span{0.005, 0.015}, // the same of bearings
	bearing:        span{3.5, 6},       // frequency of the rotor on its bearings alone over speed
}

// faultRanges describe the faults of a kind.
var faultRanges = struct {
	residual, bentResidual, harmonic2, harmonic3, thrust, flow     span
	couple, coupleTurn, dynamicPhase                               span
	overhungAxial, overhungEnds                                    span
	bentTilt, bentAxial, bentEnds                                  span
	misalignmentAxial, twice, thrice, lever, fixedPlane, misalEnds span
	detuning, resonanceRatio                                       span
	loss, lift, unsteady, harmonics                                span
	creep, walk, half                                              span
	neighbourOffset, neighbourLevel, neighbourOwn                  span
}{
	residual:          span{0.02, 0.08}, // other unbalance over the main cause
	bentResidual:      span{0.05, 0.2},  // the same where the main cause is no unbalance
	harmonic2:         span{0.02, 0.08}, // 2x and 3x over 1x where the kind sets none
	harmonic3:         span{0.01, 0.03},
	thrust:            span{0.02, 0.1}, // axial over radial 1x beside what the kind causes
	lever:             span{0.3, 1.2},  // moment over force of a coupling, in spans
	bentEnds:          span{0, 40},     // from in phase radially and from opposed axially, degrees
	fixedPlane:        span{0, 40},     // V-H from 0 or 180 of misalignment, degrees
	misalEnds:         span{0.2, 1},    // radial 1x of the lesser over the greater end
	overhungEnds:      span{0.15, 1},   // radial 1x of the lesser over the greater end
	flow:              span{0.05, 0.2}, // broadband over 1x, roughly
	couple:            span{0.6, 1.7},  // couple over static part of dynamic unbalance
	coupleTurn:        span{40, 140},   // angle between the two, degrees
	dynamicPhase:      span{40, 140},   // phase between the ends that makes it dynamic, degrees
	overhungAxial:     span{0.3, 2},    // axial over radial 1x of an overhung rotor
	bentTilt:          span{0.3, 1.2},  // tilting stiffness of the bearing with a bent shaft
	bentAxial:         span{0.4, 1.5},  // axial over radial 1x of a bent shaft
	misalignmentAxial: span{0.6, 1.2},  // axial over radial of misalignment, 1x and 2x
	twice:             span{0.2, 1.5},  // 2x over 1x of misalignment
	thrice:            span{0.05, 0.3},
	detuning:          span{0.96, 1.04}, // natural frequency over speed at resonance
	resonanceRatio:    span{3, 30},      // of the two directions at resonance
	loss:              span{0.3, 0.7},
	lift:              span{0.2, 0.7}, // lift over the amplitude without lifting
	unsteady:          span{0.2, 0.5},
	harmonics:         span{0.45, 3}, // 2x to 4x against 1x, vertical at the loose end
	creep:             span{20, 180}, // degrees a minute, either way
	walk:              span{20, 60},  // degrees in a minute
	half:              span{0.02, 0.1},
	neighbourOffset:   span{0.006, 0.04}, // of the running speed, either way
	neighbourLevel:    span{1.2, 6},      // mm/s rms at the points
	neighbourOwn:      span{0.3, 0.9},    // own worst 1x, mm/s rms
}
