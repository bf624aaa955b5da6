package recording

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"time"
)

// Format tags of a fmt chunk (Microsoft and IBM, Multimedia Programming
// Interface and Data Specifications 1.0, 1991; Microsoft, WAVEFORMATEXTENSIBLE).
const (
	tagPCM        = 1
	tagFloat      = 3
	tagExtensible = 0xfffe
)

const (
	// fmtExtensibleSize is the size of a fmt chunk with a WAVEFORMATEXTENSIBLE.
	fmtExtensibleSize = 40
	// sizeElsewhere stands in 32-bit sizes of an RF64 file whose true size is in
	// its ds64 chunk (EBU Tech 3306), and of a RIFF file written to a stream.
	sizeElsewhere = math.MaxUint32
	// maxListSize bounds the LIST chunk that is looked through, bytes.
	maxListSize = 1 << 16
)

// subformatTail are the last 14 bytes of the subformat GUIDs whose first two
// bytes are a format tag.
const subformatTail = "\x00\x00\x00\x00\x10\x00\x80\x00\x00\xaa\x00\x38\x9b\x71"

// wavHead is what stands ahead of the samples of a WAV file.
type wavHead struct {
	tag      uint16
	channels int
	rateHz   uint32
	align    int
	bits     int
	// dataSize is the size of the data chunk as stated, bytes; -1 means to the
	// end of the file.
	dataSize  int64
	dataStart int64
	// created is the time of the first row; the zero time means unknown.
	created time.Time
}

// wavFault makes an *Error of a reason; newSource's caller adds the path.
func wavFault(format string, a ...any) *Error {
	return &Error{Reason: fmt.Sprintf(format, a...)}
}

// readFault makes an *Error of a failed read of what.
func readFault(what string, err error) *Error {
	if err == io.EOF || err == io.ErrUnexpectedEOF {
		return wavFault("the file ends inside %s", what)
	}
	return &Error{Reason: "reading failed", Err: err}
}

// parseWAV reads the chunks up to the samples and leaves r there.
func parseWAV(r io.ReadSeeker) (*wavHead, *Error) {
	var riff [12]byte
	if _, err := io.ReadFull(r, riff[:]); err != nil {
		return nil, readFault("the RIFF header", err)
	}
	if string(riff[8:]) != "WAVE" {
		return nil, wavFault("it is a RIFF file of form %s, not WAVE", clip(riff[8:]))
	}
	h := &wavHead{dataStart: int64(len(riff))}
	large := int64(-1)
	for {
		var head [8]byte
		if _, err := io.ReadFull(r, head[:]); err == io.EOF {
			return nil, wavFault("there is no data chunk")
		} else if err != nil {
			return nil, readFault("a chunk header", err)
		}
		h.dataStart += int64(len(head))
		size := int64(binary.LittleEndian.Uint32(head[4:]))
		if string(head[:4]) == "data" {
			h.dataSize = size
			if size == sizeElsewhere {
				h.dataSize = large
			}
			return h, h.check()
		}
		var fault *Error
		switch string(head[:4]) {
		case "ds64":
			large, fault = readLargeSize(r, size)
		case "fmt ":
			fault = h.readFormat(r, size)
		case "LIST":
			fault = h.readList(r, size)
		}
		if fault != nil {
			return nil, fault
		}
		// Chunks are padded to an even size.
		h.dataStart += size + size%2
		if _, err := r.Seek(h.dataStart, io.SeekStart); err != nil {
			return nil, readFault("a chunk", err)
		}
	}
}

// check returns an error when the format is missing or not one we read.
func (h *wavHead) check() *Error {
	switch {
	case h.tag == 0:
		return wavFault("there is no fmt chunk ahead of the data chunk")
	case h.tag != tagPCM && h.tag != tagFloat:
		return wavFault("the codec has format tag %#04x, allowed are 1 (PCM) and 3 (floating point)", h.tag)
	case h.tag == tagPCM && h.bits != 16 && h.bits != 24 && h.bits != 32:
		return wavFault("PCM samples have %d bits, allowed are 16, 24 and 32", h.bits)
	case h.tag == tagFloat && h.bits != 32 && h.bits != 64:
		return wavFault("floating-point samples have %d bits, allowed are 32 and 64", h.bits)
	case h.channels < 1 || h.channels > MaxChannels:
		return wavFault("it has %d channels, allowed are 1 to %d", h.channels, MaxChannels)
	case h.align != h.channels*h.bits/8:
		return wavFault("the block align is %d bytes, %d channels of %d bits make %d", h.align, h.channels, h.bits, h.channels*h.bits/8)
	case h.rateHz == 0:
		return wavFault("the sampling rate is 0 Hz")
	}
	return nil
}

// readFormat reads a fmt chunk of the given size.
func (h *wavHead) readFormat(r io.Reader, size int64) *Error {
	if size < 16 {
		return wavFault("the fmt chunk has %d bytes, allowed are 16 and more", size)
	}
	var b [fmtExtensibleSize]byte
	if _, err := io.ReadFull(r, b[:min(size, fmtExtensibleSize)]); err != nil {
		return readFault("the fmt chunk", err)
	}
	h.tag = binary.LittleEndian.Uint16(b[0:])
	h.channels = int(binary.LittleEndian.Uint16(b[2:]))
	h.rateHz = binary.LittleEndian.Uint32(b[4:])
	h.align = int(binary.LittleEndian.Uint16(b[12:]))
	h.bits = int(binary.LittleEndian.Uint16(b[14:]))
	if h.tag != tagExtensible {
		return nil
	}
	if size < fmtExtensibleSize {
		return wavFault("the extensible fmt chunk has %d bytes, allowed are %d and more", size, fmtExtensibleSize)
	}
	if string(b[26:]) != subformatTail {
		return wavFault("the subformat %x is neither PCM nor floating point", b[24:])
	}
	h.tag = binary.LittleEndian.Uint16(b[24:])
	return nil
}

// readLargeSize returns the size of the data chunk from a ds64 chunk.
func readLargeSize(r io.Reader, size int64) (int64, *Error) {
	var b [16]byte
	if size < int64(len(b)) {
		return 0, wavFault("the ds64 chunk has %d bytes, allowed are 28 and more", size)
	}
	if _, err := io.ReadFull(r, b[:]); err != nil {
		return 0, readFault("the ds64 chunk", err)
	}
	data := binary.LittleEndian.Uint64(b[8:])
	if data > math.MaxInt64/2 {
		return 0, wavFault("the ds64 chunk states %d bytes of data", data)
	}
	return int64(data), nil
}

// readList takes the time of the first row from the creation date (ICRD) of a
// LIST chunk of type INFO. The date alone, which other programs write, says
// too little and is passed over.
func (h *wavHead) readList(r io.Reader, size int64) *Error {
	if size < 4 || size > maxListSize {
		return nil
	}
	b := make([]byte, size)
	if _, err := io.ReadFull(r, b); err != nil {
		return readFault("the LIST chunk", err)
	}
	if string(b[:4]) != "INFO" {
		return nil
	}
	for b = b[4:]; len(b) >= 8; {
		n := int64(binary.LittleEndian.Uint32(b[4:]))
		if n > int64(len(b)-8) {
			return nil
		}
		text := b[8 : 8+n]
		for len(text) > 0 && text[len(text)-1] == 0 {
			text = text[:len(text)-1]
		}
		var at time.Time
		if string(b[:4]) == "ICRD" && at.UnmarshalText(text) == nil {
			h.created = at
		}
		b = b[min(8+n+n%2, int64(len(b))):]
	}
	return nil
}
