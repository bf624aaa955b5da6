package buffer

import (
	"fmt"
	"sort"

	"go.etcd.io/bbolt"

	"heavyspot/publish"
)

// Pending returns the first messages in the outbox whose sequence number is
// above after, n at most, in order. A record that turns out to be damaged is
// left out for good.
func (b *Buffer) Pending(after uint64, n int) ([]Record, error) {
	var out []Record
	var bad []uint64
	err := guard(func() error {
		return b.db.View(func(tx *bbolt.Tx) error {
			c := tx.Bucket(bucketOutbox).Cursor()
			for k, v := c.Seek(key(after + 1)); k != nil && len(out) < n; k, v = c.Next() {
				r, err := fetch(tx, shelfByLetter(v), k)
				if err != nil {
					bad = append(bad, number(k))
					continue
				}
				out = append(out, r)
			}
			return nil
		})
	})
	if err != nil {
		return nil, fmt.Errorf("buffer: cannot read the outbox: %w", err)
	}
	if len(bad) > 0 {
		b.damaged.Add(int64(len(bad)))
		return out, b.Ack(bad...)
	}
	return out, nil
}

func fetch(tx *bbolt.Tx, s *shelf, k []byte) (Record, error) {
	if s == nil {
		return Record{}, errRecord
	}
	return decode(s.kind, number(k), tx.Bucket(s.records).Get(k))
}

// Ack takes messages out of the outbox, in one commit. Numbers that are not in
// it do no harm.
func (b *Buffer) Ack(sequences ...uint64) error {
	if len(sequences) == 0 {
		return nil
	}
	b.writing.Lock()
	defer b.writing.Unlock()
	var gone int64
	err := b.commit(func(tx *bbolt.Tx) error {
		gone = 0
		outbox := sequential(tx, bucketOutbox)
		for _, s := range sequences {
			k := key(s)
			if outbox.Get(k) == nil {
				continue
			}
			if err := outbox.Delete(k); err != nil {
				return err
			}
			gone++
		}
		return nil
	})
	if err != nil {
		return fmt.Errorf("buffer: cannot take %d messages out of the outbox: %w", len(sequences), err)
	}
	b.waiting.Add(-gone)
	return nil
}

// Waiting is the number of messages in the outbox.
func (b *Buffer) Waiting() int { return int(b.waiting.Load()) }

// Numbers returns the sequence number of the last message stored and the
// number of this start.
func (b *Buffer) Numbers() (sequence, boot uint64) { return b.sequence.Load(), b.opened.Boot }

// Standing returns what a broker should hold for later receivers: the newest
// finding and the newest message of every alarm, in the order of their numbers.
// Those that still wait in the outbox are left out, since they come from there.
func (b *Buffer) Standing() ([]Record, error) {
	var out []Record
	err := guard(func() error {
		return b.db.View(func(tx *bbolt.Tx) error {
			outbox := tx.Bucket(bucketOutbox)
			add := func(r Record, err error) {
				if err == nil && outbox.Get(key(r.Sequence)) == nil {
					out = append(out, r)
				}
			}
			s := shelfOf(publish.KindFinding)
			if k, v := tx.Bucket(s.records).Cursor().Last(); k != nil {
				add(decode(s.kind, number(k), v))
			}
			return tx.Bucket(bucketStanding).ForEach(func(_, v []byte) error {
				if len(v) >= recordHead {
					add(decode(publish.KindAlarm, number(v[atSequence:]), v))
				}
				return nil
			})
		})
	})
	if err != nil {
		return nil, fmt.Errorf("buffer: cannot read what stands: %w", err)
	}
	sort.Slice(out, func(i, j int) bool { return out[i].Sequence < out[j].Sequence })
	return out, nil
}
