package recording

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"math/bits"
	"strconv"
	"time"

	"heavyspot/acquire"
)

// CSVWriter writes blocks as a CSV recording: t_s from 0, ch0, ch1 ..., then
// time with the wall time of the first row of each block whose clock was set,
// and gap with the cause of a hole. Reading it gives the same blocks, if the
// reader's are not shorter. A block of one row may join the next.
type CSVWriter struct {
	out  *bufio.Writer
	seq  sequence
	time timeFormat
	row  []byte
}

// NewCSVWriter writes the header line for a stream of format f to w.
func NewCSVWriter(w io.Writer, f acquire.Format) (*CSVWriter, error) {
	seq, err := newSequence(f)
	if err != nil {
		return nil, err
	}
	c := &CSVWriter{out: bufio.NewWriterSize(w, 64<<10), seq: seq, time: newTimeFormat(f.RateHz)}
	c.row = append(c.row, "t_s"...)
	for i := range f.Channels {
		c.row = append(c.row, ",ch"...)
		c.row = strconv.AppendInt(c.row, int64(i), 10)
	}
	c.row = append(c.row, ",time,gap\n"...)
	if _, err := c.out.Write(c.row); err != nil {
		return nil, fmt.Errorf("cannot write recording: %w", err)
	}
	return c, nil
}

// Write appends the rows of b; see [Writer].
func (c *CSVWriter) Write(b *acquire.Block) error {
	lost, err := c.seq.take(b)
	if err != nil {
		return err
	}
	index := b.First - c.seq.first
	for volts := b.Volts; len(volts) > 0; volts = volts[c.seq.channels:] {
		c.row = c.time.append(c.row[:0], index)
		for _, v := range volts[:c.seq.channels] {
			c.row = appendVolts(append(c.row, ','), v)
		}
		c.row = append(c.row, ',')
		if b.ClockSet && !b.Time.IsZero() {
			if index == b.First-c.seq.first {
				c.row = b.Time.UTC().AppendFormat(c.row, time.RFC3339Nano)
			}
		}
		c.row = append(c.row, ',')
		if lost > 0 {
			c.row = append(c.row, causeWord(b.Gap)...)
		}
		if _, err := c.out.Write(append(c.row, '\n')); err != nil {
			return fmt.Errorf("cannot write recording: %w", err)
		}
		index++
		lost = 0
	}
	return nil
}

// Close writes out what is still buffered.
func (c *CSVWriter) Close() error {
	if err := c.out.Flush(); err != nil {
		return fmt.Errorf("cannot write recording: %w", err)
	}
	return nil
}

// appendVolts appends the shortest decimal that reads back as v.
func appendVolts(b []byte, v float32) []byte {
	start := len(b)
	b = strconv.AppendFloat(b, float64(v), 'g', -1, 32)
	// The reader rounds twice, to float64 and then to float32, which differs for
	// a decimal very close to the middle between two float32.
	if n, _ := parseNumber(b[start:]); float32(n.value) != v {
		b = strconv.AppendFloat(b[:start], float64(v), 'g', -1, 64)
	}
	return b
}

// timeFormat writes row numbers as seconds, with enough decimals that a reader
// can tell the rate from all other whole numbers of hertz.
type timeFormat struct {
	rateHz float64
	// whole is the rate where it is a whole number, else 0.
	whole    uint64
	decimals int
	scale    uint64
}

// newTimeFormat finds the decimals for a rate, Hz.
func newTimeFormat(hz float64) timeFormat {
	t := timeFormat{rateHz: hz}
	if hz == math.Trunc(hz) {
		t.whole = uint64(hz)
	}
	// Two rates one hertz apart have steps that differ by 1/hz^2 seconds.
	t.decimals = max(9, int(math.Ceil(math.Log10(100*hz*hz))))
	for d := range 10 {
		if t.whole > 0 && uint64(pow10[d])%t.whole == 0 {
			t.decimals = d
			break
		}
	}
	t.scale = uint64(pow10[t.decimals])
	return t
}

// append appends the time of row index, seconds.
func (t timeFormat) append(b []byte, index int64) []byte {
	if t.whole == 0 {
		return strconv.AppendFloat(b, float64(index)/t.rateHz, 'f', t.decimals, 64)
	}
	n := uint64(index)
	b = strconv.AppendUint(b, n/t.whole, 10)
	if t.decimals == 0 {
		return b
	}
	high, low := bits.Mul64(n%t.whole, t.scale)
	fraction, rest := bits.Div64(high, low, t.whole)
	if 2*rest >= t.whole {
		fraction++
	}
	// The 1 ahead keeps the zeros; the point takes its place.
	at := len(b)
	b = strconv.AppendUint(b, t.scale+fraction, 10)
	b[at] = '.'
	return b
}
