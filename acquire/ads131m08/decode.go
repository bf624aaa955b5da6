package ads131m08

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
)

const (
	// MaxChannels is the number of channels of the chip.
	MaxChannels = 8
	// FrameBytes is the length of a frame: status, eight channels and check
	// sum in words of 24 bits.
	FrameBytes   = 3 * (MaxChannels + 2)
	checkedBytes = FrameBytes - 3

	fullScaleVolts = 1.2 // internal reference, gain 1 (section 8.5.1.9)
)

// What can be wrong with a frame.
var (
	// ErrCheck means that the check sum does not match.
	ErrCheck = errors.New("check sum wrong")
	// ErrLow means that every bit read was 0.
	ErrLow = errors.New("all bits read 0")
	// ErrHigh means that every bit read was 1.
	ErrHigh = errors.New("all bits read 1")
)

// Decoder turns frames into volts. It may be used by several goroutines.
type Decoder struct {
	channels int
	scale    [MaxChannels]float64 // volts per count
}

// NewDecoder returns a decoder for the first len(gains) channels with the
// gains given, each 1, 2, 4 ... 128.
func NewDecoder(gains []int) (*Decoder, error) {
	if len(gains) < 1 || len(gains) > MaxChannels {
		return nil, fmt.Errorf("ads131m08: cannot decode %d channels, allowed 1 to %d", len(gains), MaxChannels)
	}
	d := &Decoder{channels: len(gains)}
	for ch, g := range gains {
		if _, ok := gainCode(g); !ok {
			return nil, fmt.Errorf("ads131m08: cannot use gain %d on channel %d, allowed 1, 2, 4, 8, 16, 32, 64, 128", g, ch)
		}
		d.scale[ch] = fullScaleVolts / float64(g) / (1 << 23)
	}
	return d, nil
}

// Decode checks a frame and writes the volts of one row to dst, which must
// hold as many values as the decoder has channels. It returns the first word,
// which is STATUS when the frame before carried the NULL command. The error
// is ErrCheck, ErrLow or ErrHigh, and dst is then unchanged.
func (d *Decoder) Decode(f *[FrameBytes]byte, dst []float32) (Status, error) {
	if frameCRC(f) != uint16(f[checkedBytes])<<8|uint16(f[checkedBytes+1]) {
		return 0, frameError(f)
	}
	if d.channels == MaxChannels {
		d.all(f, (*[MaxChannels]float32)(dst))
	} else {
		for ch := range dst[:d.channels] {
			dst[ch] = volts(binary.BigEndian.Uint32(f[3+3*ch:]), d.scale[ch])
		}
	}
	return Status(f[0])<<8 | Status(f[1]), nil
}

// all decodes eight channels; constant places need no check of a bound.
func (d *Decoder) all(f *[FrameBytes]byte, v *[MaxChannels]float32) {
	v[0] = volts(binary.BigEndian.Uint32(f[3:]), d.scale[0])
	v[1] = volts(binary.BigEndian.Uint32(f[6:]), d.scale[1])
	v[2] = volts(binary.BigEndian.Uint32(f[9:]), d.scale[2])
	v[3] = volts(binary.BigEndian.Uint32(f[12:]), d.scale[3])
	v[4] = volts(binary.BigEndian.Uint32(f[15:]), d.scale[4])
	v[5] = volts(binary.BigEndian.Uint32(f[18:]), d.scale[5])
	v[6] = volts(binary.BigEndian.Uint32(f[21:]), d.scale[6])
	v[7] = volts(binary.BigEndian.Uint32(f[24:]), d.scale[7])
}

// volts turns a word of 24 bits with the byte behind it into volts: the shift
// drops that byte and extends the sign.
func volts(word uint32, scale float64) float32 {
	return float32(float64(int32(word)>>8) * scale)
}

// frameError says what is wrong with a frame whose check sum does not match.
func frameError(f *[FrameBytes]byte) error {
	for _, b := range f {
		if b != f[0] {
			return ErrCheck
		}
	}
	switch f[0] {
	case 0:
		return ErrLow
	case math.MaxUint8:
		return ErrHigh
	}
	return ErrCheck
}

// gainCode returns the register code of a gain, its binary logarithm.
func gainCode(gain int) (uint16, bool) {
	for code := range uint16(8) {
		if gain == 1<<code {
			return code, true
		}
	}
	return 0, false
}
