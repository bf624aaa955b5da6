package buffer

import (
	"bytes"
	"errors"
	"fmt"
	"strings"
	"syscall"

	"go.etcd.io/bbolt"
	berrors "go.etcd.io/bbolt/errors"

	"heavyspot/publish"
)

// Tick is what is stored at once.
type Tick struct {
	// Messages get their sequence numbers in this order.
	Messages []publish.Message
	// AlarmState is the alarm engine's exported state; nil leaves the stored one.
	AlarmState []byte
}

// Store writes a tick in one commit: its records, their places in the outbox,
// the alarm state, and the deletion of what is too old or too much. It sets
// Sequence and Boot of the messages. When it returns nil the tick survives a
// power cut; when it returns an error nothing of it is stored and the numbers
// set are void.
func (b *Buffer) Store(t *Tick) error {
	b.writing.Lock()
	defer b.writing.Unlock()
	var done result
	err := b.commit(func(tx *bbolt.Tx) (err error) {
		done, err = b.store(tx, t)
		return err
	})
	if err != nil {
		return fmt.Errorf("buffer: cannot store: %w", err)
	}
	b.sequence.Store(done.sequence)
	b.waiting.Add(done.waiting)
	b.notify()
	return nil
}

// result is what a transaction changes in the counts once it is committed.
type result struct {
	sequence uint64
	waiting  int64
}

func (b *Buffer) notify() {
	select {
	case b.changed <- struct{}{}:
	default:
	}
}

// Changed receives a value after each Store; several may be gathered into one.
// It is meant for one receiver.
func (b *Buffer) Changed() <-chan struct{} { return b.changed }

// commit runs f in a write transaction. When the file or the card is full it
// deletes the oldest and tries again.
func (b *Buffer) commit(f func(*bbolt.Tx) error) error {
	for try := 1; ; try++ {
		err := guard(func() error { return b.db.Update(f) })
		if !full(err) || try == 8 {
			return err
		}
		freed := result{}
		mend := guard(func() error {
			return b.db.Update(func(tx *bbolt.Tx) (err error) {
				freed, err = makeRoom(tx, 32<<try)
				return err
			})
		})
		if mend != nil {
			return errors.Join(err, mend)
		}
		b.waiting.Add(freed.waiting)
	}
}

func full(err error) bool {
	return errors.Is(err, berrors.ErrMaxSizeReached) || errors.Is(err, syscall.ENOSPC) || errors.Is(err, syscall.EDQUOT)
}

func (b *Buffer) store(tx *bbolt.Tx, t *Tick) (result, error) {
	var done result
	set := clockSet(t)
	if err := b.trim(tx, t, set, &done); err != nil {
		return done, err
	}
	meta := tx.Bucket(bucketMeta)
	sequence := number(meta.Get(keySequence))
	for _, m := range t.Messages {
		sequence++
		if err := b.put(tx, m, sequence, set); err != nil {
			return done, err
		}
	}
	done.sequence = sequence
	done.waiting += int64(len(t.Messages))
	if len(t.Messages) > 0 {
		if err := meta.Put(keySequence, key(sequence)); err != nil {
			return done, err
		}
	}
	if state := tx.Bucket(bucketState); t.AlarmState != nil && !bytes.Equal(state.Get(keyAlarms), t.AlarmState) {
		return done, state.Put(keyAlarms, t.AlarmState)
	}
	return done, nil
}

// clockSet says what the tick's minute says of the clock; without a minute the
// clock is believed.
func clockSet(t *Tick) bool {
	for _, m := range t.Messages {
		if minute, ok := m.(*publish.Minute); ok {
			return minute.Clock == publish.ClockSet
		}
	}
	return true
}

// put files one message.
func (b *Buffer) put(tx *bbolt.Tx, m publish.Message, sequence uint64, set bool) error {
	head := m.Head()
	s := shelfOf(head.Kind)
	if s == nil {
		return fmt.Errorf("%s messages are not kept", head.Kind)
	}
	head.Sequence, head.Boot = sequence, b.opened.Boot
	body, err := publish.Encode(m)
	if err != nil {
		return err
	}
	r := Record{
		Sequence: sequence, Boot: head.Boot, Time: head.Time.Time, ClockSet: set,
		Retained: m.Retained(), Levels: m.Levels(), JSON: body,
	}
	value := r.encode(b.packer)
	if err := s.index(tx, sequence, r.Time.UnixMilli()); err != nil {
		return err
	}
	if err := sequential(tx, s.records).Put(key(sequence), value); err != nil {
		return err
	}
	if err := sequential(tx, bucketOutbox).Put(key(sequence), []byte{s.letter}); err != nil {
		return err
	}
	if head.Kind != publish.KindAlarm {
		return nil
	}
	topic := strings.Join(r.Levels, "/")
	return tx.Bucket(bucketStanding).Put([]byte(topic), value)
}
