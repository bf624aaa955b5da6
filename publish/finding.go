package publish

import "heavyspot/rules"

// Finding is the verdict on one steady minute, with its evidence.
type Finding struct {
	Envelope
	Verdict  rules.Verdict   `json:"verdict"`
	Severity Severity        `json:"severity"`
	Suspects []rules.Suspect `json:"suspects"`
	Evidence []Evidence      `json:"evidence"`
	Advice   string          `json:"advice"`
}

// Severity is the worst point's overall velocity against the limits.
type Severity struct {
	Standard   string      `json:"standard"`
	Level      rules.Level `json:"level"`
	WorstPoint string      `json:"worst_point"`
	MMS        float64     `json:"mm_s_rms"`
	Limit      float64     `json:"limit_mm_s_rms"`
}

// Evidence is one test of a verdict.
type Evidence struct {
	Test string `json:"test"`
	// Measured, SD and Margin are in Unit; they are left out when the test could
	// not be made, SD also when it is not known. Margin is the distance to the nearest bound, negative outside.
	Measured *float64 `json:"measured,omitempty"`
	SD       *float64 `json:"sd,omitempty"`
	Unit     string   `json:"unit"`
	Expected string   `json:"expected"`
	Holds    bool     `json:"holds"`
	Margin   *float64 `json:"margin,omitempty"`
	// Missing says why the test could not be made.
	Missing string `json:"missing,omitempty"`
}

// FindingMessage makes the message of a finding; site, machine, sequence and
// boot are left to the sender.
func FindingMessage(f *rules.Finding) *Finding {
	out := &Finding{
		Envelope: Envelope{Schema: Schema, Kind: KindFinding, Time: At(f.Start)},
		Verdict:  f.Verdict,
		Severity: Severity{
			Standard: f.Severity.Standard, Level: f.Severity.Level, WorstPoint: f.Severity.WorstPoint,
			MMS: round(f.Severity.MMS, 4), Limit: round(f.Severity.Limit, 4),
		},
		Suspects: append([]rules.Suspect{}, f.Suspects...),
		Evidence: make([]Evidence, len(f.Evidence)),
		Advice:   f.Advice,
	}
	for i := range f.Evidence {
		out.Evidence[i] = evidence(&f.Evidence[i])
	}
	return out
}

func evidence(e *rules.Evidence) Evidence {
	out := Evidence{Test: e.Test, Unit: e.Unit, Expected: e.Expected, Holds: e.Holds, Missing: e.Missing}
	if e.Missing != "" {
		return out
	}
	if !finite(e.Measured) {
		out.Missing, out.Holds = "no figure could be computed", false
		return out
	}
	out.Measured, out.Margin = measured(e.Measured, 4), measured(e.Margin, 4)
	if e.SD > 0 {
		out.SD = measured(e.SD, 4)
	}
	return out
}

// Levels are the levels of the topic below the machine.
func (f *Finding) Levels() []string { return []string{string(KindFinding)} }

// Retained is true: the newest finding is the state of the machine.
func (f *Finding) Retained() bool { return true }
