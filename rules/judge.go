package rules

import (
	"fmt"
	"math"

	"heavyspot/dsp"
)

// Judge says what steady minutes of one machine mean. It remembers the latest
// of them to tell whether the phase is steady. It is not safe for concurrent use.
type Judge struct {
	cfg    Config
	memory memory
}

// usualQuietShare is the QuietShare that zero stands for.
const usualQuietShare = 0.25

// NewJudge returns a judge for a machine. It fails when there is no alarm limit,
// the limits do not rise, QuietShare is outside 0 to 1, or a point's direction
// is none of the three.
func NewJudge(cfg Config) (*Judge, error) {
	if err := cfg.Limits.check(); err != nil {
		return nil, err
	}
	if !(cfg.QuietShare >= 0 && cfg.QuietShare <= 1) {
		return nil, fmt.Errorf("set up judge: quiet share is %g, must be from 0 to 1", cfg.QuietShare)
	}
	if cfg.QuietShare == 0 {
		cfg.QuietShare = usualQuietShare
	}
	for _, p := range cfg.Points {
		if p.Direction > Axial {
			return nil, fmt.Errorf("set up judge: point %q has direction %d, must be vertical, horizontal or axial", p.Name, p.Direction)
		}
	}
	return &Judge{cfg: cfg}, nil
}

// check says what is wrong with limits.
func (l *Limits) check() error {
	if !(l.Alarm > 0) || math.IsInf(l.Alarm, 0) {
		return fmt.Errorf("set up judge: alarm limit is %g mm/s, must be above 0", l.Alarm)
	}
	if !(l.Acceptable >= 0 && l.Acceptable <= l.Alarm) {
		return fmt.Errorf("set up judge: acceptable limit is %g mm/s, must be from 0 to the alarm limit, %g", l.Acceptable, l.Alarm)
	}
	if !(l.Trip == 0 || l.Trip >= l.Alarm) || math.IsInf(l.Trip, 0) {
		return fmt.Errorf("set up judge: trip limit is %g mm/s, must be 0 or at least the alarm limit, %g", l.Trip, l.Alarm)
	}
	return nil
}

// Judge returns the finding on a minute, whose points are in the order of the
// configuration; false when the machine did not run steadily in it. Minutes are
// to come in their order of time.
func (j *Judge) Judge(m dsp.Minute) (Finding, bool) {
	if m.Speed.State != dsp.Steady {
		return Finding{}, false
	}
	p := newPicture(&j.cfg, &m)
	j.memory.add(&m, &p)
	s := measure(&j.cfg, &m, &p, j.memory.creep())
	quiet := j.cfg.QuietShare * j.cfg.Limits.Alarm
	f := Finding{Start: m.Start, Severity: severity(j.cfg.Limits, &m)}
	// A little 1x under a high overall velocity leaves something to diagnose.
	loud := f.Severity.Level == Alarm || f.Severity.Level == Trip
	if s.worst.ok && s.worst.x < quiet && !loud {
		f.Verdict = Quiet
		f.Evidence = []Evidence{worstEvidence(s, upTo(quiet))}
	} else {
		f.Verdict, f.Suspects = s.decide()
		f.Evidence = append([]Evidence{worstEvidence(s, from(quiet))}, s.evidence(f.Verdict, j.missing(&p))...)
	}
	f.Advice = advise(&f, s, &p)
	return f, true
}

// missing returns the names of the places without a good point, for messages:
// bearing by direction, empty where there is one.
func (j *Judge) missing(p *picture) *[2][3]string {
	var out [2][3]string
	for b := range out {
		for d := range out[b] {
			if !p.at[b][d].good {
				out[b][d] = "no point at " + bearingNames[b] + " " + directionNames[d]
			}
		}
	}
	for _, c := range j.cfg.Points {
		if at := &out[bearingOf(c)][c.Direction]; *at != "" {
			*at = "no good signal from " + c.Name
		}
	}
	return &out
}
