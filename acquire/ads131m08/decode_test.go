package ads131m08

import (
	"errors"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// seal writes the check sum of a frame.
func seal(f *[FrameBytes]byte) {
	crc := crcBytes(crcSeed, f[:checkedBytes]...)
	f[checkedBytes], f[checkedBytes+1], f[checkedBytes+2] = byte(crc>>8), byte(crc), 0
}

// Vectors of 24-bit words: the first two from a frame of a real part on the
// maker's forum (thread 1011774), the others computed independently.
func TestCRCVectors(t *testing.T) {
	real := append([]byte{0x81}, make([]byte, 14)...)
	if got := crcBytes(crcSeed, real...); got != 0xB42D {
		t.Errorf("check sum of the real frame %04X, want B42D", got)
	}
	b := newBus(nil)
	for _, v := range []struct {
		cmd  uint16
		regs []uint16
		want uint16
	}{
		{cmdNull, nil, 0xCC9C}, {cmdReset, nil, 0xFCDE}, {cmdUnlock, nil, 0x8F76},
		{0x0022, nil, 0xAC18}, {0x0033, nil, 0x9C5A}, {0x0555, nil, 0xD626},
		{opRead | regID<<7, nil, 0x7100}, {opRead | 1<<7, nil, 0x6A98},
		{opRead | regMode<<7, nil, 0x4630}, {opRead | regClock<<7, nil, 0x5DA8},
		{opWrite | regMode<<7, []uint16{0x0110}, 0x20EB}, {opWrite | regMode<<7, []uint16{0x1110}, 0x6388},
		{opWrite | regClock<<7, []uint16{0xFF96}, 0x4B56}, {opWrite | regClock<<7, []uint16{0xFF92}, 0x8792},
		{opWrite | regClock<<7, []uint16{0xFF8E}, 0xC18C}, {opWrite | regClock<<7, []uint16{0x008E}, 0x0EEF},
	} {
		b.fill(v.cmd, v.regs...)
		at := 3 * (1 + len(v.regs))
		if got := uint16(b.w[at])<<8 | uint16(b.w[at+1]); got != v.want {
			t.Errorf("check sum of %04X %04X is %04X, want %04X", v.cmd, v.regs, got, v.want)
		}
	}
}

// TestFrameCRC: the tables by place give what the definition gives.
func TestFrameCRC(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var f [FrameBytes]byte
		copy(f[:], rapid.SliceOfN(rapid.Byte(), FrameBytes, FrameBytes).Draw(t, "frame"))
		if got, want := frameCRC(&f), crcBytes(crcSeed, f[:checkedBytes]...); got != want {
			t.Fatalf("check sum %04X, want %04X", got, want)
		}
	})
}

// TestVolts holds every kind of code against exact arithmetic: code*1.2/gain/
// 2^23 V, within the rounding of a float32 and of the float64 in between.
func TestVolts(t *testing.T) {
	codes := []int32{0, 1, -1, 2, 0x7FFFFF, -0x800000, 0x400000, -0x400000, 0x123456, -0x123457}
	for range 500 {
		codes = append(codes, rand.Int32()>>8, rand.Int32()>>(8+rand.IntN(20))-1)
	}
	for gain := 1; gain <= 128; gain *= 2 {
		gains := []int{gain, gain, gain, gain, gain, gain, gain, gain}
		d, err := NewDecoder(gains)
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range codes {
			var f [FrameBytes]byte
			for ch := range MaxChannels {
				f[3+3*ch], f[4+3*ch], f[5+3*ch] = byte(c>>16), byte(c>>8), byte(c)
			}
			seal(&f)
			var row [MaxChannels]float32
			if _, err := d.Decode(&f, row[:]); err != nil {
				t.Fatal(err)
			}
			// 1.2/2^23/gain = 12/10/2^23/gain, exactly.
			exact := new(big.Rat).SetFrac64(int64(c)*12, 10*int64(gain)<<23)
			want, _ := exact.Float32()
			for ch, got := range row {
				// The float64 product may lie on the other side of a border
				// between two float32 values, nowhere else.
				if got != want && math.Nextafter32(got, want) != want {
					t.Fatalf("gain %d, code %d, channel %d: %v V, want %v", gain, c, ch, got, want)
				}
				if p := float32(float64(c) * (1.2 / float64(gain) / (1 << 23))); got != p {
					t.Fatalf("gain %d, code %d: %v V, the float64 product rounds to %v", gain, c, got, p)
				}
			}
		}
	}
}

func TestDecodeFewChannels(t *testing.T) {
	d, err := NewDecoder([]int{1, 4, 1})
	if err != nil {
		t.Fatal(err)
	}
	var f [FrameBytes]byte
	f[0], f[1] = 0x01, 0x07
	for ch := range MaxChannels {
		f[3+3*ch] = 0x40
	}
	seal(&f)
	row := []float32{9, 9, 9, 9}
	st, err := d.Decode(&f, row)
	if err != nil || !st.Configured() || st.Fresh() != 7 {
		t.Errorf("status %04X, %v", uint16(st), err)
	}
	if row[0] != 0.6 || row[1] != 0.15 || row[2] != 0.6 || row[3] != 9 {
		t.Errorf("row %v", row)
	}
}

func TestDecodeErrors(t *testing.T) {
	d, _ := NewDecoder([]int{1})
	for _, v := range []struct {
		fill byte
		want error
	}{{0x00, ErrLow}, {0xFF, ErrHigh}, {0x55, ErrCheck}} {
		var f [FrameBytes]byte
		for i := range f {
			f[i] = v.fill
		}
		row := []float32{7}
		if _, err := d.Decode(&f, row); err != v.want || row[0] != 7 {
			t.Errorf("frame of %02X: %v, row %v, want %v", v.fill, err, row, v.want)
		}
	}
	var f [FrameBytes]byte
	f[0] = 1
	seal(&f)
	row := []float32{7}
	for bit := range 8 * (checkedBytes + 2) {
		g := f
		g[bit/8] ^= 1 << (bit % 8)
		if _, err := d.Decode(&g, row); !errors.Is(err, ErrCheck) {
			t.Errorf("bit %d flipped: %v", bit, err)
		}
	}
	for _, gains := range [][]int{nil, make([]int, 9), {3}, {0}, {256}, {-1}} {
		if _, err := NewDecoder(gains); err == nil {
			t.Errorf("decoder made for gains %v", gains)
		}
	}
}

// FuzzDecode: a frame decodes exactly when its check sum holds, and then the
// volts give the frame's own codes back.
func FuzzDecode(f *testing.F) {
	var frame [FrameBytes]byte
	frame[0], frame[1] = 0x01, 0xFF
	seal(&frame)
	f.Add(frame[:], true)
	f.Add(make([]byte, FrameBytes), false)
	d, err := NewDecoder([]int{1, 2, 4, 8, 16, 32, 64, 128})
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, p []byte, good bool) {
		var f [FrameBytes]byte
		copy(f[:], p)
		if good {
			seal(&f)
		}
		holds := crcBytes(crcSeed, f[:checkedBytes]...) == uint16(f[27])<<8|uint16(f[28])
		var row [MaxChannels]float32
		st, err := d.Decode(&f, row[:])
		if (err == nil) != holds {
			t.Fatalf("%v with check sum %v: % X", err, holds, f)
		}
		if err != nil {
			return
		}
		if byte(st>>8) != f[0] || byte(st) != f[1] {
			t.Fatalf("status %04X of % X", uint16(st), f)
		}
		for ch, v := range row {
			code := int32(math.RoundToEven(float64(v) / 1.2 * float64(int(1)<<ch) * (1 << 23)))
			if got, want := uint32(code)&0xFFFFFF, uint32(f[3+3*ch])<<16|uint32(f[4+3*ch])<<8|uint32(f[5+3*ch]); got != want {
				t.Fatalf("channel %d: %v V is code %06X, want %06X", ch, v, got, want)
			}
		}
	})
}

// BenchmarkDecode decodes frames of eight channels, check sum included, and
// compares with the bare sum of as many int32 values.
func BenchmarkDecode(b *testing.B) {
	const rows = 1024
	d, err := NewDecoder([]int{1, 1, 1, 1, 1, 1, 1, 1})
	if err != nil {
		b.Fatal(err)
	}
	frames := make([][FrameBytes]byte, rows)
	bare := make([]int32, rows*MaxChannels)
	for i := range frames {
		for j := range checkedBytes {
			frames[i][j] = byte(rand.Uint32())
		}
		seal(&frames[i])
	}
	for i := range bare {
		bare[i] = rand.Int32()
	}
	volts := make([]float32, rows*MaxChannels)
	var decode, sum time.Duration // of all runs, taken in turns
	for b.Loop() {
		began := time.Now()
		for i := range frames {
			if _, err := d.Decode(&frames[i], volts[i*MaxChannels:]); err != nil {
				b.Fatal(err)
			}
		}
		mid := time.Now()
		total := int32(0)
		for _, v := range bare {
			total += v
		}
		sink = total
		decode += mid.Sub(began)
		sum += time.Since(mid)
	}
	b.ReportMetric(float64(decode.Nanoseconds())/float64(b.N)/(rows*MaxChannels), "ns/sample")
	b.ReportMetric(float64(decode)/float64(sum), "x-int32-sum")
}

// sink keeps the sum from being optimised away.
var sink int32
