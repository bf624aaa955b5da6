package buffer

import (
	"bytes"
	"fmt"
	"time"

	"go.etcd.io/bbolt"

	"heavyspot/publish"
)

// page is the number of records read in one transaction. A transaction held
// open would keep the file from reusing pages.
const page = 128

// Range calls fn with each record of a kind whose time lies from one time to
// another, both included, in the order of their sequence numbers. fn runs
// outside any transaction; an error from it ends the walk and is returned.
// Damaged records are left out (see Damaged). Records stored during the walk
// may or may not be seen.
func (b *Buffer) Range(kind publish.Kind, from, to time.Time, fn func(Record) error) error {
	s := shelfOf(kind)
	if s == nil {
		return fmt.Errorf("buffer: cannot read: %s messages are not kept", kind)
	}
	var runs []run
	err := b.view(func(tx *bbolt.Tx) error {
		runs = s.within(tx, from.UnixMilli(), to.UnixMilli())
		return nil
	})
	if err != nil {
		return err
	}
	for _, r := range runs {
		if err := b.walk(s, r, from, to, fn); err != nil {
			return err
		}
	}
	return nil
}

func (b *Buffer) walk(s *shelf, r run, from, to time.Time, fn func(Record) error) error {
	for at := r.first; at < r.next; {
		var got []Record
		err := b.view(func(tx *bbolt.Tx) error {
			got, at = b.page(tx, s, at, r.next, from.UnixMilli(), to.UnixMilli())
			return nil
		})
		if err != nil {
			return err
		}
		for _, rec := range got {
			if err := fn(rec); err != nil {
				return err
			}
		}
	}
	return nil
}

// page reads the records from a sequence number up to an end, at most one page
// of them, and returns where to go on.
func (b *Buffer) page(tx *bbolt.Tx, s *shelf, at, end uint64, from, to int64) ([]Record, uint64) {
	var got []Record
	c := tx.Bucket(s.records).Cursor()
	k, v := c.Seek(key(at))
	for range page {
		if k == nil || number(k) >= end {
			return got, end
		}
		if ms, _, err := peek(v); err != nil || ms >= from && ms <= to {
			if r, err := decode(s.kind, number(k), v); err == nil {
				got = append(got, r)
			} else {
				b.damaged.Add(1)
			}
		}
		k, v = c.Next()
	}
	if k == nil {
		return got, end
	}
	return got, number(k)
}

// AlarmState returns the stored state of the alarm engine, nil when there is
// none.
func (b *Buffer) AlarmState() ([]byte, error) {
	var state []byte
	err := b.view(func(tx *bbolt.Tx) error {
		state = bytes.Clone(tx.Bucket(bucketState).Get(keyAlarms))
		return nil
	})
	return state, err
}

// Damaged is the number of damaged records met since the buffer was opened.
func (b *Buffer) Damaged() int { return int(b.damaged.Load()) }

// Usage returns the size of the file and the part of it in use, bytes.
func (b *Buffer) Usage() (file, used int64, err error) {
	err = b.view(func(tx *bbolt.Tx) error {
		file, used = tx.Size(), b.used(tx)
		return nil
	})
	return file, used, err
}

func (b *Buffer) view(f func(*bbolt.Tx) error) error {
	if err := guard(func() error { return b.db.View(f) }); err != nil {
		return fmt.Errorf("buffer: cannot read: %w", err)
	}
	return nil
}
