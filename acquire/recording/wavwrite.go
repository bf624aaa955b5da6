package recording

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"time"

	"heavyspot/acquire"
)

// ErrGap says that a WAV file cannot hold a hole. The caller closes the file
// and begins another one with the same block.
var ErrGap = errors.New("a WAV file cannot hold missing rows")

// Places of the sizes in the head that writeHead writes.
const (
	riffSizeAt = 4
	ds64At     = 12
	ds64Size   = 28
)

// WAVWriter writes blocks as a WAV recording of 32-bit floating-point samples,
// full scale 1 V, so that samples are volts. The wall time of its first row
// goes into the LIST chunk. Written to an [io.WriteSeeker] that stands at its
// start, files over 4 GiB become RF64 (EBU Tech 3306); otherwise sizes are left
// open, as is usual for streams.
type WAVWriter struct {
	out  io.Writer
	seek io.WriteSeeker
	seq  sequence
	rate uint32
	buf  []byte
	// framesAt and sizeAt are the places of the number of frames (fact chunk)
	// and of the data chunk's size, dataSize its bytes so far.
	framesAt, sizeAt, dataSize int64
	// largest is the size, bytes, from which on a file is RF64.
	largest int64
	err     error
}

// NewWAVWriter prepares a recording of a stream of format f, whose rate must
// be a whole number of hertz; the head is written with the first block.
func NewWAVWriter(w io.Writer, f acquire.Format) (*WAVWriter, error) {
	seq, err := newSequence(f)
	if err != nil {
		return nil, err
	}
	if f.RateHz != math.Trunc(f.RateHz) {
		return nil, fmt.Errorf("cannot write recording: a WAV file holds whole hertz only, the rate is %v Hz; write CSV instead", f.RateHz)
	}
	out := &WAVWriter{out: w, seq: seq, rate: uint32(f.RateHz), largest: math.MaxUint32}
	if seek, ok := w.(io.WriteSeeker); ok {
		// A pipe is an os.File too, but does not seek.
		if at, err := seek.Seek(0, io.SeekCurrent); err == nil && at == 0 {
			out.seek = seek
		}
	}
	return out, nil
}

// Write appends the rows of b; see [Writer]. It returns ErrGap, and has written
// nothing, when rows are missing ahead of b.
func (w *WAVWriter) Write(b *acquire.Block) error {
	if w.err != nil {
		return w.err
	}
	if w.seq.started && (b.Gap.Lost > 0 || b.First != w.seq.next) {
		return fmt.Errorf("cannot write recording: %d rows are missing ahead of row %d: %w", b.Gap.Lost, b.First, ErrGap)
	}
	first := !w.seq.started
	if _, err := w.seq.take(b); err != nil {
		return err
	}
	if first {
		w.writeHead(b)
	}
	for volts := b.Volts; len(volts) > 0 && w.err == nil; {
		n := min(len(volts), wavBuffer/4)
		w.buf = w.buf[:0]
		for _, v := range volts[:n] {
			w.buf = binary.LittleEndian.AppendUint32(w.buf, math.Float32bits(v))
		}
		w.write(w.buf)
		w.dataSize += int64(len(w.buf))
		volts = volts[n:]
	}
	return w.err
}

// write writes b unless something failed before.
func (w *WAVWriter) write(b []byte) {
	if w.err != nil {
		return
	}
	if _, err := w.out.Write(b); err != nil {
		w.err = fmt.Errorf("cannot write recording: %w", err)
	}
}

// writeHead writes all chunks up to the samples, with the time of first.
func (w *WAVWriter) writeHead(first *acquire.Block) {
	le := binary.LittleEndian
	b := append([]byte(nil), "RIFF\xff\xff\xff\xffWAVE"...)
	// Room for a ds64 chunk, which must be the first one.
	b = append(le.AppendUint32(append(b, "JUNK"...), ds64Size), make([]byte, ds64Size)...)
	b = le.AppendUint32(append(b, "fmt "...), fmtExtensibleSize)
	align := 4 * w.seq.channels
	b = le.AppendUint16(b, tagExtensible)
	b = le.AppendUint16(b, uint16(w.seq.channels))
	b = le.AppendUint32(b, w.rate)
	b = le.AppendUint32(b, uint32(min(uint64(w.rate)*uint64(align), math.MaxUint32)))
	b = le.AppendUint16(b, uint16(align))
	b = le.AppendUint16(b, 32)
	b = le.AppendUint16(b, 22)
	b = le.AppendUint16(b, 32)
	// Channel mask 0: the tracks belong to no loudspeaker.
	b = le.AppendUint32(b, 0)
	b = append(le.AppendUint16(b, tagFloat), subformatTail...)
	b = le.AppendUint32(append(b, "fact"...), 4)
	w.framesAt = int64(len(b))
	b = le.AppendUint32(b, sizeElsewhere)
	if first.ClockSet && !first.Time.IsZero() {
		text := first.Time.UTC().Format(time.RFC3339Nano) + "\x00"
		text += "\x00"[:len(text)%2]
		b = le.AppendUint32(append(b, "LIST"...), uint32(4+8+len(text)))
		b = le.AppendUint32(append(b, "INFOICRD"...), uint32(len(text)))
		b = append(b, text...)
	}
	b = append(b, "data"...)
	w.sizeAt = int64(len(b))
	w.write(le.AppendUint32(b, sizeElsewhere))
}

// Close puts the sizes into the head where w can seek. It returns an error for
// a recording without rows.
func (w *WAVWriter) Close() error {
	if w.err == nil && w.dataSize == 0 {
		w.err = errors.New("cannot write recording: there are no rows")
	}
	if w.err != nil || w.seek == nil {
		return w.err
	}
	le := binary.LittleEndian
	riff := w.sizeAt + 4 + w.dataSize - 8
	frames := w.dataSize / int64(4*w.seq.channels)
	if riff < w.largest {
		w.patch(riffSizeAt, le.AppendUint32(nil, uint32(riff)))
		w.patch(w.framesAt, le.AppendUint32(nil, uint32(frames)))
		w.patch(w.sizeAt, le.AppendUint32(nil, uint32(w.dataSize)))
	} else {
		b := le.AppendUint32([]byte("ds64"), ds64Size)
		b = le.AppendUint64(b, uint64(riff))
		b = le.AppendUint64(b, uint64(w.dataSize))
		b = le.AppendUint64(b, uint64(frames))
		b = le.AppendUint32(b, 0)
		w.patch(ds64At, b)
		w.patch(0, []byte("RF64"))
	}
	if _, err := w.seek.Seek(0, io.SeekEnd); err != nil && w.err == nil {
		w.err = fmt.Errorf("cannot write recording: %w", err)
	}
	return w.err
}

// patch writes b at a place in the head.
func (w *WAVWriter) patch(at int64, b []byte) {
	if w.err != nil {
		return
	}
	if _, err := w.seek.Seek(at, io.SeekStart); err != nil {
		w.err = fmt.Errorf("cannot write recording: %w", err)
		return
	}
	w.write(b)
}
