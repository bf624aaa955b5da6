package buffer

import (
	"bytes"
	"time"

	"go.etcd.io/bbolt"

	"heavyspot/publish"
)

const (
	// trimBatch is the number of records of one kind that a commit deletes at
	// most: more than a tick adds, few enough to be quick, and slow enough that
	// a clock which wrongly jumps ahead does not empty the file in a moment.
	trimBatch = 16
	// filled is the share of the greatest size above which the oldest go.
	filled = 0.85
)

// trim deletes by age, by size and by the bound of the outbox.
func (b *Buffer) trim(tx *bbolt.Tx, t *Tick, set bool, done *result) error {
	if set && len(t.Messages) > 0 {
		now := t.Messages[0].Head().Time.Time
		for i, keep := range []time.Duration{b.opt.KeepMinutes, b.opt.KeepFindings, b.opt.KeepAlarms} {
			n := shelves[i].older(tx, now.Add(-keep).UnixMilli())
			if err := shelves[i].drop(tx, n, done); err != nil {
				return err
			}
		}
	}
	if b.used(tx) > int64(filled*float64(b.opt.MaxSize-growStep)) {
		r, err := makeRoom(tx, trimBatch)
		done.waiting += r.waiting
		if err != nil {
			return err
		}
	}
	over := b.waiting.Load() + done.waiting + int64(len(t.Messages)) - int64(b.opt.OutboxMax)
	if over > 0 {
		return thin(tx, min(over, 4*trimBatch), done)
	}
	return nil
}

// used returns the bytes of the file that are not free.
func (b *Buffer) used(tx *bbolt.Tx) int64 {
	s := b.db.Stats()
	return tx.Size() - int64(s.FreePageN+s.PendingPageN)*int64(b.db.Info().PageSize)
}

// older counts the first records that are older than the time, ms. A record
// taken with the clock unset counts as old only when a later one with the clock
// set is old.
func (s *shelf) older(tx *bbolt.Tx, ms int64) int {
	old := 0
	c := tx.Bucket(s.records).Cursor()
	n := 1
	for k, v := c.First(); k != nil && n <= trimBatch; k, v = c.Next() {
		at, set, err := peek(v)
		if err == nil && set {
			if at >= ms {
				break
			}
			old = n
		}
		n++
	}
	return old
}

// drop deletes the first n records, and their places in the outbox.
func (s *shelf) drop(tx *bbolt.Tx, n int, done *result) error {
	if n == 0 {
		return nil
	}
	records, outbox := tx.Bucket(s.records), tx.Bucket(bucketOutbox)
	var keys [][]byte
	c := records.Cursor()
	for k, _ := c.First(); k != nil && len(keys) < n; k, _ = c.Next() {
		keys = append(keys, bytes.Clone(k))
	}
	for _, k := range keys {
		if err := records.Delete(k); err != nil {
			return err
		}
		if outbox.Get(k) == nil {
			continue
		}
		if err := outbox.Delete(k); err != nil {
			return err
		}
		done.waiting--
	}
	if k, _ := records.Cursor().First(); k != nil {
		return s.forgetRuns(tx, number(k))
	}
	return s.forgetRuns(tx, 1<<63)
}

// makeRoom deletes the n oldest of minutes and findings, and alarms only when
// there is neither.
func makeRoom(tx *bbolt.Tx, n int) (result, error) {
	var done result
	for n > 0 {
		s, m := oldest(tx, n)
		if m == 0 {
			break
		}
		if err := s.drop(tx, m, &done); err != nil {
			return done, err
		}
		n -= m
	}
	return done, nil
}

// oldest returns the shelf whose first record goes next, and how many of its
// first records, n at most, go before any of the other.
func oldest(tx *bbolt.Tx, n int) (*shelf, int) {
	minutes, findings, alarms := &shelves[0], &shelves[1], &shelves[2]
	m, f := minutes.first(tx), findings.first(tx)
	switch {
	case m == 0 && f == 0:
		return alarms, alarms.before(tx, 1<<63, n)
	case f == 0 || m != 0 && m < f:
		return minutes, minutes.before(tx, max(f, m+1), n)
	default:
		return findings, findings.before(tx, max(m, f+1), n)
	}
}

// first returns the sequence number of the first record, 0 for none.
func (s *shelf) first(tx *bbolt.Tx) uint64 {
	k, _ := tx.Bucket(s.records).Cursor().First()
	return number(k)
}

// before counts the records below a sequence number, n at most.
func (s *shelf) before(tx *bbolt.Tx, sequence uint64, n int) int {
	m := 0
	c := tx.Bucket(s.records).Cursor()
	for k, _ := c.First(); k != nil && m < n && number(k) < sequence; k, _ = c.Next() {
		m++
	}
	return m
}

// thin takes n messages out of the outbox: the oldest minutes, then the oldest
// findings, never alarms.
func thin(tx *bbolt.Tx, n int64, done *result) error {
	outbox := tx.Bucket(bucketOutbox)
	for _, kind := range []publish.Kind{publish.KindMinute, publish.KindFinding} {
		letter := shelfOf(kind).letter
		var keys [][]byte
		c := outbox.Cursor()
		for k, v := c.First(); k != nil && int64(len(keys)) < n; k, v = c.Next() {
			if len(v) == 1 && v[0] == letter {
				keys = append(keys, bytes.Clone(k))
			}
		}
		for _, k := range keys {
			if err := outbox.Delete(k); err != nil {
				return err
			}
		}
		done.waiting -= int64(len(keys))
		if n -= int64(len(keys)); n == 0 {
			return nil
		}
	}
	return nil
}
