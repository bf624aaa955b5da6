package acquire

import (
	"context"
	"time"
)

// Format is what stays the same over a whole stream.
type Format struct {
	// RateHz is the nominal number of samples per second of each channel, Hz.
	RateHz float64
	// Channels is the number of channels in each sample row.
	Channels int
	// Response is the amplitude response of the converter's digital filter at
	// a frequency in Hz, 1 = unchanged; its delay is the same for every
	// channel and needs no entry. nil means none to correct.
	Response func(hz float64) float64
}

// Gain returns the amplitude response of the converter's filter at hz (Hz),
// 1 where no response is given.
func (f Format) Gain(hz float64) float64 {
	if f.Response == nil {
		return 1
	}
	return f.Response(hz)
}

// Block is a run of consecutive sample rows of all channels, at most a second
// or so long. Inside a block no sample is missing.
type Block struct {
	// First is the sample index of the first row, counted from the start of
	// the stream, lost rows included.
	First int64
	// Volts holds the rows one after another, all channels of a row together:
	// row i, channel c is Volts[i*channels+c], volts at the converter's input.
	Volts []float32
	// Time is the wall time of the first row; the zero time means unknown.
	Time time.Time
	// ClockSet says whether the wall clock was known to be set when Time was
	// taken. It is false on a board that has just booted without a clock.
	ClockSet bool
	// Gap tells what was lost between the previous block and this one.
	Gap Gap
}

// Rows returns the number of sample rows in b for a stream of n channels.
func (b *Block) Rows(n int) int { return len(b.Volts) / n }

// Gap describes lost rows ahead of a block. The zero value means none.
type Gap struct {
	// Lost is the number of rows missing.
	Lost int64
	// Exact is false when Lost was estimated from time stamps and may be off
	// by a row; the shaft angle must then be found anew after the gap.
	Exact bool
	// Cause says why.
	Cause Cause
}

// Cause is the reason for a gap.
type Cause uint8

// The causes of a gap.
const (
	// NoGap: the block follows the previous one.
	NoGap Cause = iota
	// Late: the converter's output was read too late and was overwritten.
	Late
	// BadCheck: frames failed their cyclic redundancy check.
	BadCheck
	// ChipReset: the converter restarted by itself and was set up again.
	ChipReset
	// BusFault: transactions on the bus failed.
	BusFault
	// Absent: the recording holds no samples there.
	Absent
)

// String returns the cause in words, for messages to people.
func (c Cause) String() string {
	switch c {
	case NoGap:
		return "none"
	case Late:
		return "read too late"
	case BadCheck:
		return "check sum wrong"
	case ChipReset:
		return "converter restarted"
	case BusFault:
		return "bus fault"
	case Absent:
		return "absent from the recording"
	}
	return "unknown"
}

// Source delivers a stream of blocks.
type Source interface {
	// Format returns what holds for the whole stream.
	Format() Format
	// Read fills b with the next block and reuses the storage of b.Volts. It
	// waits until a block is there or ctx ends. It returns io.EOF after the
	// last block of a stream that has an end, and ctx.Err() when ctx ends.
	// After any other error the stream is over; faults from which the source
	// recovers are told by the Gap of the next block instead. An error to an
	// operator says what to look at.
	Read(ctx context.Context, b *Block) error
	// Close releases what the source holds. Read must not be running.
	Close() error
}
