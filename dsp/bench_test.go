package dsp_test

import (
	"math"
	"testing"
	"time"

	"heavyspot/acquire/ads131m08"
	"heavyspot/dsp"
)

// benchSignal is a minute of 7 points and a reference at 1 kSPS.
func benchSignal() signal {
	s := base(1)
	s.points = 7
	return s
}

// minuteOfFrames returns the frames of a converter for the rows of v, eight
// channels of 24 bits between a status word and a check sum (CCITT).
func minuteOfFrames(v []float32) [][ads131m08.FrameBytes]byte {
	out := make([][ads131m08.FrameBytes]byte, len(v)/8)
	for i := range out {
		f := &out[i]
		f[0], f[1] = 0x05, 0xff
		for ch := range 8 {
			n := int32(math.Round(float64(v[8*i+ch]) / 1.2 * (1 << 23)))
			n = max(-1<<23, min(1<<23-1, n))
			f[3+3*ch], f[4+3*ch], f[5+3*ch] = byte(n>>16), byte(n>>8), byte(n)
		}
		crc := uint16(0xffff)
		for _, b := range f[:27] {
			crc ^= uint16(b) << 8
			for range 8 {
				if crc&0x8000 != 0 {
					crc = crc<<1 ^ 0x1021
				} else {
					crc <<= 1
				}
			}
		}
		f[27], f[28] = byte(crc>>8), byte(crc)
	}
	return out
}

// BenchmarkMinute reports the time from the converter's bytes to a minute
// reading of seven points at 1 kSPS, per sample of a channel, and its ratio to a
// bare sum of as many int32 in the same run; "engine" leaves the frames out. The
// fastest of all minutes counts, for sum and path alike, since the machine may
// be shared.
func BenchmarkMinute(b *testing.B) {
	s := benchSignal()
	v := s.render()
	frames := minuteOfFrames(v)
	ints := make([]int32, len(v))
	for i := range ints {
		ints[i] = int32(v[i] * 1e6)
	}
	d, err := ads131m08.NewDecoder([]int{1, 1, 1, 1, 1, 1, 1, 1})
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct {
		name  string
		bytes bool
	}{{"engine", false}, {"bytes", true}} {
		b.Run(c.name, func(b *testing.B) {
			e, err := dsp.NewEngine(s.config())
			if err != nil {
				b.Fatal(err)
			}
			block := make([]float32, 250*8)
			bare, path := time.Hour, time.Hour
			var sum int64
			b.ReportAllocs()
			for k := range b.N {
				start := time.Now()
				for _, x := range ints {
					sum += int64(x)
				}
				bare = min(bare, time.Since(start))
				start = time.Now()
				at := int64(k * len(frames))
				for i := 0; i < len(frames); i += 250 {
					rows := v[i*8 : (i+250)*8]
					if c.bytes {
						rows = block
						for j := range 250 {
							if _, err := d.Decode(&frames[i+j], block[8*j:8*j+8]); err != nil {
								b.Fatal(err)
							}
						}
					}
					e.Push(at+int64(i), rows)
				}
				e.Close(at+int64(len(frames)), time.Time{}, false)
				path = min(path, time.Since(start))
			}
			if sum == 1 {
				b.Log(sum)
			}
			b.ReportMetric(float64(path.Nanoseconds())/float64(len(v)), "ns/sample")
			b.ReportMetric(float64(path)/float64(bare), "sums")
		})
	}
}

// TestNoAllocation: pushing blocks allocates nothing.
func TestNoAllocation(t *testing.T) {
	s := benchSignal()
	v := s.render()
	e, err := dsp.NewEngine(s.config())
	if err != nil {
		t.Fatal(err)
	}
	stride := s.points + 1
	at, i := int64(0), 0
	block := func() {
		e.Push(at, v[i:i+250*stride])
		at += 250
		i = (i + 250*stride) % len(v)
		if at%60000 == 0 {
			e.Close(at, time.Time{}, false)
		}
	}
	for range 60 {
		block()
	}
	if n := testing.AllocsPerRun(100, block); n != 0 {
		t.Errorf("%v allocations a block", n)
	}
}
