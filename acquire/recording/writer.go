package recording

import (
	"fmt"
	"math"

	"heavyspot/acquire"
)

// Writer takes the blocks of a stream in order.
type Writer interface {
	// Write appends b. The first block begins the recording, whatever its
	// First; a Gap ahead of it is left out.
	Write(b *acquire.Block) error
	// Close completes the recording. It does not close what is written to.
	Close() error
}

var (
	_ Writer = (*CSVWriter)(nil)
	_ Writer = (*WAVWriter)(nil)
)

// maxWriteHz is the highest rate written, Hz.
const maxWriteHz = 1e7

// sequence checks that blocks follow each other.
type sequence struct {
	channels int
	started  bool
	// first is the index of the first row, next that of the one expected.
	first, next int64
}

// newSequence checks the format of a stream to be written.
func newSequence(f acquire.Format) (sequence, error) {
	if f.Channels < 1 || f.Channels > MaxChannels {
		return sequence{}, fmt.Errorf("cannot write recording: %d channels, allowed are 1 to %d", f.Channels, MaxChannels)
	}
	if !(f.RateHz >= 1e-3 && f.RateHz <= maxWriteHz) {
		return sequence{}, fmt.Errorf("cannot write recording: rate %v Hz, allowed are 0.001 to %g", f.RateHz, maxWriteHz)
	}
	return sequence{channels: f.Channels}, nil
}

// take checks b and returns the number of rows missing ahead of it.
func (s *sequence) take(b *acquire.Block) (lost int64, err error) {
	if len(b.Volts)%s.channels != 0 {
		return 0, fmt.Errorf("cannot write recording: a block of %d samples is no whole number of rows of %d channels", len(b.Volts), s.channels)
	}
	if s.started {
		lost = b.First - s.next
	} else {
		s.first = b.First
	}
	if lost < 0 || s.started && lost != b.Gap.Lost {
		return 0, fmt.Errorf("cannot write recording: block begins with row %d and states %d lost, expected row %d", b.First, b.Gap.Lost, s.next+b.Gap.Lost)
	}
	for i, v := range b.Volts {
		if math.IsNaN(float64(v)) || math.IsInf(float64(v), 0) {
			return 0, fmt.Errorf("cannot write recording: channel %d of row %d is %v V", i%s.channels, b.First+int64(i/s.channels), v)
		}
	}
	s.started = true
	s.next = b.First + int64(len(b.Volts)/s.channels)
	return lost, nil
}
