package main

import (
	"math"
	"time"
)

const (
	// clockStep is how far the wall clock must be from where the samples put it
	// to have been set anew; less is drift, which the next boundary takes up.
	clockStep = 2 * time.Second
	// shortest and longest bound the one minute in which the wall clock was set
	// anew.
	shortest, longest = 30 * time.Second, 120 * time.Second
)

// minutes says where the minutes of a stream begin and end, as sample indices.
// Where the wall time is known they are UTC minutes, found from the newest
// block's time so that the drift of the sample clock does not add up; elsewhere
// they count 60 s of samples from the first one. It reads no clock.
type minutes struct {
	rateHz float64
	// start is the first row of the running minute, end the row after its last.
	start, end int64
	// label is the wall time of start; the zero time means unknown.
	label time.Time
	// set says whether label can be believed and end is a UTC minute.
	set bool
	// next is the UTC minute at end; meaningless unless set.
	next time.Time
	// reached is the row after the last one that has arrived.
	reached int64
	begun   bool
	// counted is the number of counted minutes since the row origin.
	counted int64
	origin  int64
	// row and at are a row whose wall time was told last; the zero time means
	// none was.
	row int64
	at  time.Time
}

// observe takes the first row of a block and its wall time (the zero time means
// unknown), before its rows are counted by arrived.
func (m *minutes) observe(first int64, at time.Time, set bool) {
	at = at.Round(0).UTC()
	switch {
	case !m.begun:
		m.begin(first, at, set)
	case at.IsZero() || m.set && !set:
		// The plan stands by the last time that could be believed.
	case !set:
		m.row, m.at = first, at
	case !m.set:
		m.row, m.at, m.set = first, at, true
		m.realign()
	default:
		off := at.Sub(m.timeOf(first))
		m.row, m.at = first, at
		m.end = m.rowOf(m.next)
		if off.Abs() >= clockStep && !m.fits() {
			m.realign()
		}
	}
	m.end = max(m.end, m.reached)
}

// begin takes the first block.
func (m *minutes) begin(first int64, at time.Time, set bool) {
	m.begun = true
	m.start, m.reached, m.origin = first, first, first
	m.row, m.at, m.label = first, at, at
	m.set = set && !at.IsZero()
	if !m.set {
		m.end = first + m.samples(time.Minute)
		m.counted = 1
		return
	}
	m.next = following(at)
	m.end = m.rowOf(m.next)
	if m.end <= first { // within half a sample of the next minute
		m.label = m.next
		m.next = m.next.Add(time.Minute)
		m.end = m.rowOf(m.next)
	}
}

// fits says whether the running minute would have a fair length.
func (m *minutes) fits() bool {
	n := m.end - m.start
	return n >= m.samples(shortest) && n <= m.samples(longest) && m.end >= m.reached
}

// realign plans the end of the running minute at a UTC minute after what has
// arrived, by the time told last, and dates its start by the same clock.
func (m *minutes) realign() {
	m.label = m.timeOf(m.start)
	m.next = following(m.timeOf(m.reached))
	m.end = m.rowOf(m.next)
	for m.end-m.start < m.samples(shortest) {
		m.next = m.next.Add(time.Minute)
		m.end = m.rowOf(m.next)
	}
}

// arrived counts rows up to, but not including, row.
func (m *minutes) arrived(row int64) { m.reached = row }

// advance begins the next minute where the running one ends.
func (m *minutes) advance() {
	m.start = m.end
	m.reached = max(m.reached, m.start)
	if m.set {
		m.label = m.next
		m.next = m.next.Add(time.Minute)
		m.end = max(m.rowOf(m.next), m.start+1)
		return
	}
	if !m.at.IsZero() {
		m.label = m.timeOf(m.start)
	}
	m.counted++
	m.end = m.origin + int64(math.Round(float64(m.counted)*60*m.rateHz))
}

// skip moves on to the minute that holds row, if it begins after the running
// one, and says whether it did: nothing arrived in those between.
func (m *minutes) skip(row int64) bool {
	if m.end > row {
		return false
	}
	n := (row - m.end) / m.samples(time.Minute)
	if n > 1 { // all but the last, which is stepped over exactly
		m.end += (n - 1) * m.samples(time.Minute)
		m.next = m.next.Add(time.Duration(n-1) * time.Minute)
		m.counted += n - 1
		if m.set {
			m.end = m.rowOf(m.next)
		}
	}
	for m.end <= row {
		m.advance()
	}
	return true
}

// timeOf returns the wall time of a row by the time told last.
func (m *minutes) timeOf(row int64) time.Time {
	return m.at.Add(m.duration(row - m.row))
}

// rowOf returns the row at a wall time by the time told last.
func (m *minutes) rowOf(t time.Time) int64 {
	return m.row + m.samples(t.Sub(m.at))
}

func (m *minutes) samples(d time.Duration) int64 {
	return int64(math.Round(d.Seconds() * m.rateHz))
}

func (m *minutes) duration(rows int64) time.Duration {
	return time.Duration(math.Round(float64(rows) / m.rateHz * 1e9))
}

// following returns the UTC minute after t.
func following(t time.Time) time.Time { return t.Truncate(time.Minute).Add(time.Minute) }
