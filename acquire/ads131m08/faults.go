package ads131m08

import "heavyspot/acquire"

// Faults counts what went wrong since Open. All are totals.
type Faults struct {
	// Outages counts interruptions by their worst cause so far; the index is
	// an acquire.Cause.
	Outages [acquire.Absent]int64
	// LostRows is the number of rows told as lost by gaps.
	LostRows int64
	// InputChecks is the number of frames in which the chip told that a
	// command came with a wrong check sum.
	InputChecks int64
	// Restarts is how often the chip was reset and set up anew.
	Restarts int64
	// Open is true while no rows come.
	Open bool
	// Last is the latest fault, nil for none; it says what to look at.
	Last error
}

// Fault tells of an outage: when it begins, when its cause gets worse, and
// when it is over.
type Fault struct {
	// Cause is the worst cause so far.
	Cause acquire.Cause
	// Err says what happened and what to look at; nil when Over.
	Err error
	// Row is the index of the first row concerned.
	Row int64
	// Over is true when rows come again; Gap is then what was lost.
	Over bool
	Gap  acquire.Gap
}

// Faults returns the totals so far. It may be called at any time.
func (s *Source) Faults() Faults {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.faults
}

// noteFault records the beginning of an outage or a worse cause of it.
func (s *Source) noteFault(f *trouble, row int64) {
	s.mu.Lock()
	s.faults.Outages[f.cause]++
	s.faults.Open = true
	s.faults.Last = f.err
	s.mu.Unlock()
	s.tell(Fault{Cause: f.cause, Err: f.err, Row: row})
}

// noteOver records the end of an outage.
func (s *Source) noteOver(row int64, g acquire.Gap) {
	s.mu.Lock()
	s.faults.Open = false
	s.faults.LostRows += s.next - row
	s.mu.Unlock()
	s.tell(Fault{Cause: g.Cause, Row: row, Over: true, Gap: g})
}

func (s *Source) noteInput() {
	s.mu.Lock()
	s.faults.InputChecks++
	s.mu.Unlock()
}

func (s *Source) noteRestart() {
	s.mu.Lock()
	s.faults.Restarts++
	s.mu.Unlock()
}

func (s *Source) tell(f Fault) {
	if s.cfg.OnFault != nil {
		s.cfg.OnFault(f)
	}
}
