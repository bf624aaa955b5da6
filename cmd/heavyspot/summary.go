package main

import (
	"fmt"
	"io"
	"strings"

	"heavyspot/acquire"
	"heavyspot/config"
	"heavyspot/dsp"
)

// summary gathers what is to be said at the end of a run of minutes.
type summary struct {
	minutes, steady int
	seconds         float64
	lost, gaps      int64
	lostBy          [acquire.Absent + 1]int64
	// faulty counts the minutes of each point's states other than good.
	faulty map[string]map[dsp.PointState]int
	// doubtful and none count the running minutes whose phase reference was so.
	doubtful, none int
	// worst is the judged minute with the highest overall velocity, last the
	// last judged one.
	worst, last *tick
}

func (s *summary) take(t *tick) error {
	m := &t.Minute
	s.minutes++
	s.seconds += m.Seconds * m.Coverage
	if m.Speed.State == dsp.Steady {
		s.steady++
	}
	for _, p := range m.Points {
		if p.State == dsp.PointGood {
			continue
		}
		if s.faulty == nil {
			s.faulty = map[string]map[dsp.PointState]int{}
		}
		if s.faulty[p.Name] == nil {
			s.faulty[p.Name] = map[dsp.PointState]int{}
		}
		s.faulty[p.Name][p.State]++
	}
	if m.Speed.State != dsp.Stopped {
		switch m.Speed.Reference {
		case dsp.ReferenceDoubtful:
			s.doubtful++
		case dsp.ReferenceNone:
			s.none++
		}
	}
	if t.Finding != nil {
		s.last = t
		if s.worst == nil || t.Finding.Severity.MMS > s.worst.Finding.Severity.MMS {
			s.worst = t
		}
	}
	return nil
}

// gap counts what was lost ahead of a block.
func (s *summary) gap(b *acquire.Block, rateHz float64) {
	if b.Gap.Lost <= 0 {
		return
	}
	s.gaps++
	s.lost += b.Gap.Lost
	s.lostBy[min(b.Gap.Cause, acquire.Absent)] += b.Gap.Lost
}

// doubts lists what in the data was wrong.
func (s *summary) doubts(cfg *config.Config) []string {
	var list []string
	if s.minutes == 0 {
		list = append(list, fmt.Sprintf("the recording holds no minute, nor %d turns of a shorter one", leastTurns))
	}
	for _, p := range cfg.Points {
		for _, state := range []dsp.PointState{dsp.PointClipped, dsp.PointFlat, dsp.PointOpen, dsp.PointShort, dsp.PointNoisy} {
			if n := s.faulty[p.Name][state]; n > 0 {
				list = append(list, fmt.Sprintf("point %s was %s in %d of %s", p.Name, state, n, several(s.minutes, "minute")))
			}
		}
	}
	for cause, n := range s.lostBy {
		if n > 0 {
			list = append(list, fmt.Sprintf("%s missing: %s", several(int(n), "sample row"), acquire.Cause(cause)))
		}
	}
	if s.doubtful > 0 {
		list = append(list, fmt.Sprintf("the phase reference had missing, extra or too narrow pulses in %d of %s", s.doubtful, several(s.minutes, "minute")))
	}
	if s.none > 0 && cfg.Reference != nil {
		list = append(list, fmt.Sprintf("the phase reference gave no usable pulses in %d of %s", s.none, several(s.minutes, "minute")))
	}
	return list
}

// several is a number with its noun.
func several(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// print prints the verdict at the worst moment with its evidence, and the last.
func (s *summary) print(out io.Writer) {
	var b strings.Builder
	fmt.Fprintf(&b, "\n%s of data in %s, %d of them steady\n", duration(s.seconds), several(s.minutes, "minute"), s.steady)
	if s.worst == nil {
		b.WriteString("no minute was steady, so there is no verdict\n")
	} else {
		s.conclude(&b)
	}
	io.WriteString(out, b.String())
}

// conclude writes the verdicts and the evidence.
func (s *summary) conclude(b *strings.Builder) {
	w := s.worst
	b.WriteString(wrap("worst    ", fmt.Sprintf("%s: %s; %s", stampOf(&w.Minute), w.Finding.Verdict, severityText(&w.Finding.Severity))))
	if s.last != w {
		b.WriteString(wrap("last     ", fmt.Sprintf("%s: %s; %s", stampOf(&s.last.Minute), s.last.Finding.Verdict, severityText(&s.last.Finding.Severity))))
	}
	b.WriteString("evidence of the worst minute\n")
	b.WriteString(evidenceTable(w.Finding.Evidence))
	b.WriteString(wrap("advice   ", w.Finding.Advice))
}

// duration is a number of seconds for people.
func duration(seconds float64) string {
	if seconds < 120 {
		return fmt.Sprintf("%.1f s", seconds)
	}
	return fmt.Sprintf("%.1f min", seconds/60)
}
