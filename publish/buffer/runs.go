package buffer

import (
	"bytes"
	"encoding/binary"
	"math"

	"go.etcd.io/bbolt"
)

// A run is a row of records of one kind whose times do not go back. The index
// of runs finds the records of a span of time although clocks jump. Its key is
// the sequence number of a run's first record; its value that record's time in
// ms (8 bytes), and 1 when the run before it ended only because it was long.
type run struct {
	first, next uint64 // sequence numbers: from first, below next
	time        int64  // of the first record
	// last bounds the times in the run from above.
	last int64
}

// runLength is the greatest span of sequence numbers in a run.
const runLength = 1024

// index begins a new run if the record about to be added needs one.
func (s *shelf) index(tx *bbolt.Tx, sequence uint64, ms int64) error {
	runs := sequential(tx, s.runs)
	first, _ := runs.Cursor().Last()
	if _, v := tx.Bucket(s.records).Cursor().Last(); v != nil && first != nil {
		before, _, err := peek(v)
		if err == nil && before <= ms {
			if sequence-number(first) < runLength {
				return nil
			}
			return runs.Put(key(sequence), append(key(uint64(ms)), 1))
		}
	}
	return runs.Put(key(sequence), append(key(uint64(ms)), 0))
}

// within lists the runs that can hold records from one time to another, ms.
func (s *shelf) within(tx *bbolt.Tx, from, to int64) []run {
	var out []run
	prev := run{}
	c := tx.Bucket(s.runs).Cursor()
	for k, v := c.First(); ; k, v = c.Next() {
		next := run{first: math.MaxUint64, last: math.MaxInt64}
		if len(v) == 9 {
			next = run{first: number(k), time: int64(binary.BigEndian.Uint64(v)), last: math.MaxInt64}
			if v[8] == 1 {
				prev.last = next.time
			}
		}
		prev.next = next.first
		if prev.first != 0 && prev.time <= to && prev.last >= from {
			out = append(out, prev)
		}
		if k == nil {
			return out
		}
		prev = next
	}
}

// forgetRuns deletes the runs that hold nothing at or after the sequence number.
func (s *shelf) forgetRuns(tx *bbolt.Tx, kept uint64) error {
	runs := tx.Bucket(s.runs)
	var gone [][]byte
	c := runs.Cursor()
	before, _ := c.First()
	for k, _ := c.Next(); k != nil && number(k) <= kept; k, _ = c.Next() {
		gone = append(gone, bytes.Clone(before))
		before = k
	}
	for _, k := range gone {
		if err := runs.Delete(k); err != nil {
			return err
		}
	}
	return nil
}
