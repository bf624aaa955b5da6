package rules

import "time"

// Verdict is what the 1x vibration of the machine was judged to be.
type Verdict string

// The verdicts.
const (
	// Quiet: the worst 1x is under a share of the alarm limit, and no point's
	// overall velocity has reached that limit.
	Quiet            Verdict = "quiet"
	StaticUnbalance  Verdict = "static-unbalance"
	CoupleUnbalance  Verdict = "couple-unbalance"
	DynamicUnbalance Verdict = "dynamic-unbalance"
	OverhungUnbal    Verdict = "overhung-unbalance"
	// NotUnbalance: the evidence contradicts unbalance; Suspects says what
	// else it may be.
	NotUnbalance Verdict = "not-unbalance"
	// Undetermined: near a border, contradictory, or points are missing.
	Undetermined Verdict = "undetermined"
)

// Suspect is a cause other than unbalance.
type Suspect string

// The suspects of NotUnbalance.
const (
	BentShaft        Suspect = "bent-shaft"
	Misalignment     Suspect = "misalignment"
	Eccentricity     Suspect = "eccentricity"
	Resonance        Suspect = "resonance"
	Looseness        Suspect = "looseness"
	RubOrLooseRotor  Suspect = "rub-or-loose-rotor"
	NeighbourMachine Suspect = "neighbour-machine"
	NotTurnRelated   Suspect = "not-turn-related"
)

// Level is a step of severity.
type Level string

// The levels of severity, rising.
const (
	Good       Level = "good"
	Acceptable Level = "acceptable"
	Alarm      Level = "alarm"
	Trip       Level = "trip"
)

// Severity is the worst point's overall velocity against the limits.
type Severity struct {
	// Standard is the table used: "iso-14694", "iso-20816-3" or "own".
	Standard string
	// Level is empty when no point is good.
	Level Level
	// WorstPoint is the name of the point with the highest overall velocity;
	// empty when no point is good.
	WorstPoint string
	// MMS is its overall velocity and Limit the lower bound of Level (for Good
	// and Acceptable: the bound above that was not reached), mm/s rms.
	MMS, Limit float64
}

// Evidence is one test of a verdict.
type Evidence struct {
	// Test is the test's name, for instance "ends-phase-horizontal".
	Test string
	// Measured is the measured value in Unit; SD is its standard deviation.
	Measured, SD float64
	Unit         string
	// Expected is the range in words, for instance "30 to 150".
	Expected string
	// Holds says whether Measured lies in the expected range. Margin is the
	// distance to the nearest bound in Unit, negative outside.
	Holds  bool
	Margin float64
	// Missing says why the test could not be made; the figures are then zero.
	Missing string
}

// Finding is the verdict on one steady minute.
type Finding struct {
	// Start is the start of the minute judged.
	Start    time.Time
	Verdict  Verdict
	Severity Severity
	// Suspects is in order of likelihood; empty unless Verdict is NotUnbalance
	// or Undetermined.
	Suspects []Suspect
	Evidence []Evidence
	// Advice is one sentence for the engineer, with the safety words where it
	// leads to work on the machine.
	Advice string
}
