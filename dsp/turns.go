package dsp

import "math"

// A turn is one turn of the shaft, between two edges on the sample clock.
type turn struct{ start, end float64 }

// turns checks each edge against the ones before, mends missing pulses,
// rejects extra ones, and passes on the turns that can be believed.
type turns struct {
	emit func(turn)
	// lost is called where turns do not follow each other.
	lost func()

	recent  [4]float64 // edges seen while not locked, newest last
	nrecent int

	locked   bool
	last     float64 // last accepted edge
	period   float64 // of the last accepted turn, rows
	trend    float64 // change of the period per turn
	suspect  float64 // an edge out of place, awaiting the next; 0 = none
	rejected int     // edges rejected in a row
	smooth   smoother

	missing, extra, accepted int
}

const (
	// lockSpread is how much the first turns may differ from each other.
	lockSpread = 0.2
	// place is the share of a turn by which an edge may miss its place while
	// the speed is steady; a change of speed widens it.
	place = 0.05
	// mostMended is the number of pulses in a row that are mended.
	mostMended = 4
)

// restart forgets all edges, after a gap.
func (t *turns) restart() {
	t.smooth.flush(t.emit)
	if t.locked || t.nrecent > 0 {
		t.lost()
	}
	t.locked, t.nrecent, t.suspect, t.rejected = false, 0, 0, 0
}

// edge takes the next edge.
func (t *turns) edge(at float64) {
	if !t.locked {
		t.seek(at)
		return
	}
	expected := t.period + t.trend
	tol := place*expected + 2*math.Abs(t.trend)
	d := at - t.last
	if t.suspect != 0 {
		t.resolve(at, expected, tol)
		return
	}
	if math.Abs(d-expected) <= tol {
		t.accept(at)
		return
	}
	if d > 1.5*expected && t.mend(at, expected) {
		return
	}
	t.suspect = at
}

// resolve decides on an edge that was out of place, with the next one at hand.
func (t *turns) resolve(at, expected, tol float64) {
	d0, d1 := t.suspect-t.last, at-t.suspect
	switch {
	case math.Abs(at-t.last-expected) <= tol:
		t.extra++ // the suspect was one pulse too many
		t.rejected++
		t.suspect = 0
		t.accept(at)
	case math.Abs(d1-d0) <= lockSpread*d0 && d0 > expected/1.5 && d0 < 1.5*expected:
		suspect := t.suspect // the speed has changed
		t.suspect = 0
		t.accept(suspect)
		t.accept(at)
	case at-t.last < expected-tol:
		t.extra++
		t.rejected++
		t.suspect = at
	default:
		t.suspect = 0
		t.extra++
		t.rejected++
		if !t.mend(at, expected) {
			t.restart()
			t.seek(at)
		}
	}
	if t.rejected > 8 {
		t.restart()
	}
}

// mend fills in the pulses missing between the last edge and at, and reports
// whether that explains the distance.
func (t *turns) mend(at, expected float64) bool {
	d := at - t.last
	n := math.Round(d / expected)
	if n < 2 || n > mostMended+1 || math.Abs(d/n-expected) > place*expected {
		return false
	}
	start := t.last
	t.missing += int(n) - 1
	for k := 1.0; k <= n; k++ {
		t.accept(start + d*k/n)
	}
	return true
}

func (t *turns) accept(at float64) {
	d := at - t.last
	// The trend is smoothed: jitter of single pulses must not feed it.
	t.trend += 0.3 * (d - t.period - t.trend)
	t.period = d
	t.last = at
	t.rejected = 0
	t.accepted++
	t.smooth.push(at, t.emit)
}

// seek looks for three turns in a row that agree.
func (t *turns) seek(at float64) {
	if t.nrecent == len(t.recent) {
		copy(t.recent[:], t.recent[1:])
		t.nrecent--
	}
	t.recent[t.nrecent] = at
	t.nrecent++
	if t.nrecent < len(t.recent) {
		return
	}
	r := &t.recent
	a, b, c := r[1]-r[0], r[2]-r[1], r[3]-r[2]
	if max(a, b, c)-min(a, b, c) > lockSpread*b {
		return
	}
	t.locked, t.nrecent, t.suspect, t.rejected = true, 0, 0, 0
	t.last, t.period, t.trend = r[0], a, (c-a)/2
	t.smooth.push(r[0], t.emit)
	for _, e := range r[1:] {
		t.accept(e)
	}
}

// smoother takes the jitter off the edges when there is enough of it to matter.
// It passes turns on two edges late.
type smoother struct {
	edges [5]float64 // newest last
	n     int
	prev  float64 // last edge passed on
	begun bool
	// jitter is the running variance of an edge's place, rows squared.
	jitter float64
}

// smoothFrom is the jitter (rows, one standard deviation) from which smoothing
// pays: below it the interpolated angle is as good as any smoothing, above it
// the pulse times scatter more than the shaft does (computed beforehand over
// simulated pulse trains).
const smoothFrom = 0.3

func (s *smoother) push(at float64, emit func(turn)) {
	if s.n == len(s.edges) {
		copy(s.edges[:], s.edges[1:])
		s.n--
	}
	s.edges[s.n] = at
	s.n++
	if s.n < len(s.edges) {
		if s.n >= 3 {
			s.pass(s.edges[s.n-3], emit)
		}
		return
	}
	e := &s.edges
	// A third difference is blind to a steadily changing speed; independent
	// jitter appears in it with 1+9+9+1 times its variance.
	third := e[4] - 3*e[3] + 3*e[2] - e[1]
	s.jitter += 0.05 * (third*third/20 - s.jitter)
	mid := e[2]
	if s.jitter > smoothFrom*smoothFrom {
		// Quadratic over five points (Savitzky and Golay 1964, table I).
		mid = (-3*e[0] + 12*e[1] + 17*e[2] + 12*e[3] - 3*e[4]) / 35
	}
	s.pass(mid, emit)
}

func (s *smoother) pass(at float64, emit func(turn)) {
	if s.begun && at > s.prev {
		emit(turn{s.prev, at})
	}
	s.prev, s.begun = at, true
}

// flush passes on the edges held back and starts anew.
func (s *smoother) flush(emit func(turn)) {
	for k := max(0, s.n-2); k < s.n; k++ {
		s.pass(s.edges[k], emit)
	}
	s.n, s.begun = 0, false
}
