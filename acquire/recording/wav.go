package recording

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"math/bits"
	"slices"

	"heavyspot/acquire"
)

// wavBuffer is about how many bytes of a WAV file are read at once.
const wavBuffer = 64 << 10

// wavReader reads the frames of a WAV file into blocks.
type wavReader struct {
	wavHead
	path string
	in   io.Reader
	buf  []byte
	// scale is the voltage of a sample of value 1.
	scale    float64
	clock    clock
	perBlock int
	// left is the number of bytes of samples not yet read, short what the file
	// lacks of those its header states.
	left, short int64
	// unused holds the channels to be left at 0 V, as bits.
	unused uint64
	frame  int64
	err    error
}

// openWAV reads the head of a WAV file which has size bytes.
func (s *Source) openWAV(r io.ReadSeeker, size int64, o Options) error {
	h, fault := parseWAV(r)
	if fault != nil {
		fault.Path = s.path
		return fault
	}
	w := &wavReader{wavHead: *h, path: s.path, in: r, left: h.dataSize}
	if held := max(0, size-h.dataStart); h.dataSize < 0 || h.dataSize > held {
		w.left, w.short = held, max(0, h.dataSize-held)
	}
	if err := w.check(size, o); err != nil {
		return err
	}
	all := uint64(1)<<h.channels - 1
	var err error
	if s.has, err = o.use(s.path, all); err != nil {
		return err
	}
	w.unused = all &^ s.has
	w.scale = o.FullScaleV
	if w.scale == 0 {
		w.scale = 1
	}
	if h.tag == tagPCM {
		w.scale = math.Ldexp(w.scale, 1-h.bits)
	}
	hz := float64(h.rateHz)
	w.buf = make([]byte, max(1, wavBuffer/h.align)*h.align)
	w.clock = clock{rateHz: hz, at: h.created}
	if !o.Start.IsZero() {
		w.clock.at = o.Start
	}
	w.perBlock = o.blockRows(hz, h.channels)
	s.format = acquire.Format{RateHz: hz, Channels: h.channels}
	s.blocks = w
	return nil
}

// check returns an error for a file without samples, of another rate, or of
// unknown full scale.
func (w *wavReader) check(size int64, o Options) error {
	fail := func(format string, a ...any) error {
		return &Error{Path: w.path, Reason: fmt.Sprintf(format, a...)}
	}
	switch {
	case w.dataSize == 0 && size > w.dataStart:
		return fail("the data chunk is stated to be empty, yet %d bytes follow; was the recorder stopped before it could finish the file?", size-w.dataStart)
	case w.left == 0 && w.short == 0:
		return fail("there are no samples")
	case w.tag == tagPCM && o.FullScaleV == 0:
		return fail("the samples are %d-bit PCM, the voltage of full scale must be given", w.bits)
	}
	return o.checkRate(w.path, float64(w.rateHz))
}

// consumed returns the bytes read so far.
func (w *wavReader) consumed() int64 {
	return w.dataStart + w.frame*int64(w.align)
}

// readBlock fills b.
func (w *wavReader) readBlock(b *acquire.Block) error {
	if w.err != nil {
		return w.err
	}
	b.Volts = b.Volts[:0]
	b.First, b.Gap = w.frame, acquire.Gap{}
	w.clock.stamp(b)
	rows := min(int64(w.perBlock), w.left/int64(w.align))
	for rows > 0 {
		n := int(min(rows, int64(len(w.buf)/w.align)))
		buf := w.buf[:n*w.align]
		if _, err := io.ReadFull(w.in, buf); err != nil {
			return &Error{Path: w.path, Reason: fmt.Sprintf("reading failed behind frame %d", w.frame), Err: err}
		}
		samples := n * w.channels
		at := len(b.Volts)
		b.Volts = slices.Grow(b.Volts, samples)[:at+samples]
		w.decode(b.Volts[at:], buf)
		w.mute(b.Volts[at:])
		if bad := notFinite(b.Volts[at:]); bad >= 0 {
			return w.bad(b, at+bad)
		}
		w.left -= int64(len(buf))
		w.frame += int64(n)
		rows -= int64(n)
	}
	if len(b.Volts) == 0 {
		return w.end()
	}
	return nil
}

// end returns io.EOF, or an error if the last frames are missing.
func (w *wavReader) end() error {
	missing := w.left + w.short
	if missing == 0 {
		return io.EOF
	}
	if w.short == 0 {
		return &Error{Path: w.path, Reason: fmt.Sprintf(
			"the last frame is cut off: %d frames read, %d of the %d bytes of another follow", w.frame, w.left, w.align)}
	}
	return &Error{Path: w.path, Reason: fmt.Sprintf(
		"the file is cut off: %d frames read, the header states %d", w.frame, w.dataSize/int64(w.align))}
}

// bad keeps the fault of sample n of b, counted from frame first, for the next
// call, and drops its frame and those behind it.
func (w *wavReader) bad(b *acquire.Block, n int) error {
	frame, channel := n/w.channels, n%w.channels
	w.err = &Error{Path: w.path, Reason: fmt.Sprintf(
		"channel %d of frame %d is %v V, allowed are finite voltages up to %.3g", channel, b.First+int64(frame), b.Volts[n], math.MaxFloat32)}
	b.Volts = b.Volts[:frame*w.channels]
	if frame == 0 {
		return w.err
	}
	return nil
}

// decode turns the samples in buf into volts.
func (w *wavReader) decode(volts []float32, buf []byte) {
	switch {
	case w.tag == tagPCM && w.bits == 16:
		for i := range volts {
			volts[i] = float32(float64(int16(binary.LittleEndian.Uint16(buf[2*i:]))) * w.scale)
		}
	case w.tag == tagPCM && w.bits == 24:
		for i := range volts {
			s := buf[3*i : 3*i+3]
			v := int32(s[0])<<8 | int32(s[1])<<16 | int32(s[2])<<24
			volts[i] = float32(float64(v>>8) * w.scale)
		}
	case w.tag == tagPCM:
		for i := range volts {
			volts[i] = float32(float64(int32(binary.LittleEndian.Uint32(buf[4*i:]))) * w.scale)
		}
	case w.bits == 32:
		for i := range volts {
			v := math.Float32frombits(binary.LittleEndian.Uint32(buf[4*i:]))
			volts[i] = float32(float64(v) * w.scale)
		}
	default:
		for i := range volts {
			v := math.Float64frombits(binary.LittleEndian.Uint64(buf[8*i:]))
			volts[i] = float32(v * w.scale)
		}
	}
}

// mute sets unused channels of volts, which are whole frames, to 0 V.
func (w *wavReader) mute(volts []float32) {
	for set := w.unused; set != 0; set &= set - 1 {
		for i := bits.TrailingZeros64(set); i < len(volts); i += w.channels {
			volts[i] = 0
		}
	}
}

// notFinite returns the place of the first value that is infinite or no
// number, -1 if there is none.
func notFinite(volts []float32) int {
	for i, v := range volts {
		if v-v != 0 {
			return i
		}
	}
	return -1
}
