package recording

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"math"
	"os"
	"sync/atomic"
	"time"

	"heavyspot/acquire"
)

// MaxChannels is the largest number of channels a recording may have; the
// highest column is ch63.
const MaxChannels = 64

const (
	// maxCells bounds the samples of one block, whatever rate a file claims.
	maxCells = 1 << 20
	// rateTolerance is how far the rate may be from the one expected. A
	// thousandth moves the speed found by as much and no more.
	rateTolerance = 1e-3
)

// Options says how a recording is to be understood.
type Options struct {
	// FullScaleV is the voltage of a WAV file's full scale, volts. 0 means not
	// given: then it is 1 for floating-point files, and PCM files are refused.
	// CSV files do not use it.
	FullScaleV float64
	// Start is the wall time of the first row. The zero time means the one the
	// file carries, or unknown.
	Start time.Time
	// BlockSeconds is the length of a block, seconds; 0 means 1.
	BlockSeconds float64
	// ExpectRateHz is the sampling rate the file must have within 0.1 %, Hz;
	// 0 means any.
	ExpectRateHz float64
	// Channels are the channels that will be used, counted from 0. The file must
	// hold them; others are ignored, whatever stands there, and read as 0 V.
	// Empty means all that the file holds.
	Channels []int
}

// use returns the channels of has to read, as bits, or an error if the file
// lacks one that will be used.
func (o *Options) use(path string, has uint64) (uint64, error) {
	if len(o.Channels) == 0 {
		return has, nil
	}
	var wanted uint64
	for _, c := range o.Channels {
		if c < 0 || c >= MaxChannels || has>>c&1 == 0 {
			return 0, &Error{Path: path, Reason: fmt.Sprintf("channel %d, which the configuration uses, is not in the file", c)}
		}
		wanted |= 1 << c
	}
	return wanted, nil
}

// Source is a recording as a stream of blocks. Only Progress may be called
// while Read runs.
type Source struct {
	path   string
	file   io.Closer
	format acquire.Format
	has    uint64
	total  int64
	done   atomic.Int64
	blocks blockReader
	err    error
}

var _ acquire.Source = (*Source)(nil)

// blockReader is what CSV and WAV differ in. It returns io.EOF or an *Error
// when there is no row left to return.
type blockReader interface {
	readBlock(b *acquire.Block) error
	// consumed returns the number of bytes of the file used so far.
	consumed() int64
}

// Open opens the recording at path. Whether it is CSV or WAV is seen from its
// content. Faults of the file are *Error.
func Open(path string, o Options) (*Source, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, &Error{Path: path, Reason: "the file does not open", Err: err}
	}
	info, err := f.Stat()
	switch {
	case err != nil:
		err = &Error{Path: path, Reason: "the file's size is not known", Err: err}
	case !info.Mode().IsRegular():
		err = &Error{Path: path, Reason: "it is not a regular file"}
	}
	if err != nil {
		f.Close()
		return nil, err
	}
	s, err := newSource(f, path, info.Size(), o)
	if err != nil {
		f.Close()
		return nil, err
	}
	s.file = f
	return s, nil
}

// newSource reads the head of the recording in r, which holds size bytes.
func newSource(r io.ReadSeeker, path string, size int64, o Options) (*Source, error) {
	if err := o.check(path); err != nil {
		return nil, err
	}
	s := &Source{path: path, total: size}
	var magic [4]byte
	n, err := io.ReadFull(r, magic[:])
	if err == nil || err == io.EOF || err == io.ErrUnexpectedEOF {
		_, err = r.Seek(0, io.SeekStart)
	}
	switch {
	case err != nil:
		return nil, &Error{Path: path, Reason: "reading failed", Err: err}
	case n == 0:
		return nil, &Error{Path: path, Reason: "the file is empty"}
	case bytes.Equal(magic[:], []byte("RIFF")), bytes.Equal(magic[:], []byte("RF64")):
		err = s.openWAV(r, size, o)
	default:
		err = s.openCSV(r, size, o)
	}
	if err != nil {
		return nil, err
	}
	return s, nil
}

// check returns an error for options out of their range.
func (o *Options) check(path string) error {
	if o.BlockSeconds == 0 {
		o.BlockSeconds = 1
	}
	for _, v := range []struct {
		name  string
		value float64
		high  float64
	}{
		{"full scale (V)", o.FullScaleV, 1e6},
		{"block length (s)", o.BlockSeconds, 3600},
		{"expected rate (Hz)", o.ExpectRateHz, 1e9},
	} {
		if !(v.value >= 0 && v.value <= v.high) {
			return &Error{Path: path, Reason: fmt.Sprintf("%s is %v, allowed are 0 to %g", v.name, v.value, v.high)}
		}
	}
	return nil
}

// checkRate refuses a rate that is not the one expected.
func (o *Options) checkRate(path string, hz float64) error {
	if o.ExpectRateHz == 0 || math.Abs(hz-o.ExpectRateHz) <= rateTolerance*o.ExpectRateHz {
		return nil
	}
	return &Error{Path: path, Reason: fmt.Sprintf(
		"it is sampled at %.6g Hz, the configuration expects %.6g Hz within 0.1 %%", hz, o.ExpectRateHz)}
}

// blockRows returns the number of rows of a block.
func (o *Options) blockRows(hz float64, channels int) int {
	rows := math.Round(hz * o.BlockSeconds)
	return int(max(1, min(rows, float64(maxCells/channels))))
}

// Format returns the rate found in the file, Hz, and the number of channels:
// the highest channel in the file plus one.
func (s *Source) Format() acquire.Format { return s.format }

// Has says whether channel, counted from 0, is read: whether the file holds it
// and Options do not leave it out. Other channels up to the highest one in the
// file are 0 V.
func (s *Source) Has(channel int) bool {
	return channel >= 0 && channel < MaxChannels && s.has>>channel&1 == 1
}

// Progress returns how many bytes of the file are used and how many it has. It
// may be called from any goroutine at any time.
func (s *Source) Progress() (done, total int64) { return s.done.Load(), s.total }

// Read fills b with the next block; see [acquire.Source]. It returns io.EOF
// after the last row and an *Error where the file is at fault, once the rows
// ahead of the fault are delivered.
func (s *Source) Read(ctx context.Context, b *acquire.Block) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	if s.err == nil {
		s.err = s.blocks.readBlock(b)
		// A file that is still being written may give more than it had.
		s.done.Store(min(s.blocks.consumed(), s.total))
	}
	return s.err
}

// Close closes the file. Read returns an error from then on.
func (s *Source) Close() error {
	if s.err == nil {
		s.err = &Error{Path: s.path, Reason: "it is closed"}
	}
	if s.file == nil {
		return nil
	}
	f := s.file
	s.file = nil
	return f.Close()
}

// clock gives rows their wall time: that of a row whose time is known, plus
// the rows since.
type clock struct {
	rateHz float64
	at     time.Time
	row    int64
}

// stamp puts the wall time of row b.First into b.
func (c *clock) stamp(b *acquire.Block) {
	b.Time, b.ClockSet = time.Time{}, false
	if c.at.IsZero() {
		return
	}
	seconds := float64(b.First-c.row) / c.rateHz
	whole := math.Floor(seconds)
	// Whole seconds apart: a Duration in nanoseconds ends after 292 years and a
	// float64 loses nanoseconds after 104 days.
	b.Time = c.at.Add(time.Duration(math.Round((seconds - whole) * 1e9)))
	b.Time = b.Time.Add(time.Duration(whole) * time.Second)
	b.ClockSet = true
}
