package buffer

import (
	"errors"
	"fmt"
	"math/bits"
	"time"
)

// Options tells how much is kept. The zero value means the defaults.
type Options struct {
	// MaxSize bounds the file, bytes; 0 means 256 MiB. It must be from 2 MiB to
	// 64 GiB, on a 32-bit machine under 1 GiB, since the file is mapped into
	// memory as a whole.
	MaxSize int64
	// Timeout is how long to wait for another process to let go of the file; 0
	// means 500 ms.
	Timeout time.Duration
	// KeepMinutes, KeepFindings and KeepAlarms are the ages at which each kind
	// is deleted, by the times of the messages; 0 means 400 days for minutes and
	// 3650 days for the others.
	KeepMinutes, KeepFindings, KeepAlarms time.Duration
	// OutboxMax is the number of messages that may wait for the broker; 0 means
	// 100000, some five weeks. Beyond it the oldest minutes are left out of the
	// outbox, then the oldest findings, never alarms; they stay in the buffer.
	OutboxMax int
	// ReadOnly opens a file that no process writes to; nothing is changed, and a
	// damaged file is an error.
	ReadOnly bool
}

const (
	day = 24 * time.Hour
	// leastSize leaves room for the tree beside a little data.
	leastSize = 2 << 20
	// growStep is how much the file grows at a time, bytes. It bounds what a
	// small file wastes on the card.
	growStep = 256 << 10
)

// ErrHeld is returned by Open when another process holds the file.
var ErrHeld = errors.New("another process holds it")

// ErrDamaged is returned when the file turns out to be damaged while it is in
// use. Closing the buffer and opening it again sets the file aside.
var ErrDamaged = errors.New("file is damaged")

func (o *Options) fill() error {
	if o.MaxSize == 0 {
		o.MaxSize = 256 << 20
	}
	most := int64(64) << 30
	if bits.UintSize == 32 {
		most = 1<<30 - 1
	}
	if o.MaxSize < leastSize || o.MaxSize > most {
		return fmt.Errorf("greatest size %d bytes: must be from %d to %d", o.MaxSize, int64(leastSize), most)
	}
	for _, f := range []struct {
		name  string
		value *time.Duration
		unset time.Duration
	}{
		{"timeout", &o.Timeout, 500 * time.Millisecond},
		{"age of minutes", &o.KeepMinutes, 400 * day},
		{"age of findings", &o.KeepFindings, 3650 * day},
		{"age of alarms", &o.KeepAlarms, 3650 * day},
	} {
		if *f.value < 0 {
			return fmt.Errorf("%s %v: must be over 0", f.name, *f.value)
		}
		if *f.value == 0 {
			*f.value = f.unset
		}
	}
	if o.OutboxMax < 0 {
		return fmt.Errorf("outbox of %d messages: must be over 0", o.OutboxMax)
	}
	if o.OutboxMax == 0 {
		o.OutboxMax = 100_000
	}
	return nil
}
