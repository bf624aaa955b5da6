package recording

import (
	"bytes"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"testing"
	"time"

	"heavyspot/acquire"

	"pgregory.net/rapid"
)

// finite draws any float32 but NaN and the infinities.
var finite = rapid.Custom(func(t *rapid.T) float32 {
	bits := rapid.Uint32().Draw(t, "bits")
	if bits>>23&0xff == 0xff {
		bits &^= 1 << 23
	}
	return math.Float32frombits(bits)
})

// stream draws a format and blocks of it, each with its wall time. The first
// block is long enough to tell the rate.
func stream(t *rapid.T, gaps bool) (acquire.Format, []acquire.Block) {
	f := acquire.Format{RateHz: float64(rapid.OneOf(rapid.IntRange(1, 300000), rapid.SampledFrom([]int{50, 1000, 1024, 3000, 32000, 51200})).Draw(t, "rate"))}
	f.Channels = rapid.IntRange(1, 9).Draw(t, "channels")
	at := time.Date(2026, 3, 1, 6, 31, 0, rapid.IntRange(0, 999999999).Draw(t, "ns"), time.UTC)
	next := rapid.Int64Range(0, 1<<40).Draw(t, "first")
	var blocks []acquire.Block
	for i := range rapid.IntRange(1, 4).Draw(t, "blocks") {
		rows := rapid.IntRange(2, 6).Draw(t, "rows")
		b := acquire.Block{Time: at, ClockSet: true}
		if i == 0 {
			rows += 12
		} else if gaps && rapid.Bool().Draw(t, "gap") {
			b.Gap = acquire.Gap{
				Lost:  rapid.Int64Range(1, 1000000).Draw(t, "lost"),
				Exact: rapid.Bool().Draw(t, "exact"),
				Cause: acquire.Cause(rapid.IntRange(int(acquire.Late), int(acquire.Absent)).Draw(t, "cause")),
			}
		}
		b.First = next + b.Gap.Lost
		b.Volts = rapid.SliceOfN(finite, rows*f.Channels, rows*f.Channels).Draw(t, "volts")
		next = b.First + int64(rows)
		at = at.Add(time.Duration(rapid.Int64Range(1, 1e10).Draw(t, "until next")))
		blocks = append(blocks, b)
	}
	return f, blocks
}

// write writes blocks with w.
func write(t interface{ Fatal(...any) }, w Writer, err error, blocks []acquire.Block) {
	for i := range blocks {
		if err == nil {
			err = w.Write(&blocks[i])
		}
	}
	if err == nil {
		err = w.Close()
	}
	if err != nil {
		t.Fatal(err)
	}
}

// sameBits says whether two rows are the same to the last bit, -0 included.
func sameBits(a, b []float32) bool {
	return slices.EqualFunc(a, b, func(a, b float32) bool { return math.Float32bits(a) == math.Float32bits(b) })
}

func TestCSVRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, blocks := stream(t, true)
		var out bytes.Buffer
		w, err := NewCSVWriter(&out, f)
		write(t, w, err, blocks)
		s, err := newSource(bytes.NewReader(out.Bytes()), "r", int64(out.Len()), Options{BlockSeconds: 3600})
		if err != nil {
			t.Fatalf("%v\n%s", err, out.Bytes())
		}
		if s.Format().RateHz != f.RateHz || s.Format().Channels != f.Channels {
			t.Fatalf("%v Hz, want %v\n%s", s.Format().RateHz, f.RateHz, out.Bytes())
		}
		got, err := readAll(s)
		if err != io.EOF || len(got) != len(blocks) {
			t.Fatalf("%d blocks, want %d: %v\n%s", len(got), len(blocks), err, out.Bytes())
		}
		for i, b := range got {
			want := blocks[i]
			if b.First != want.First-blocks[0].First || b.Gap != want.Gap || !b.Time.Equal(want.Time) || !b.ClockSet || !sameBits(b.Volts, want.Volts) {
				t.Fatalf("block %d: %+v, want %+v\n%s", i, b, want, out.Bytes())
			}
		}
	})
}

func TestWAVRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, blocks := stream(t, false)
		var out bytes.Buffer
		w, err := NewWAVWriter(&out, f)
		write(t, w, err, blocks)
		s, err := openBytes(out.Bytes(), Options{})
		if err != nil {
			t.Fatal(err)
		}
		if s.Format().RateHz != f.RateHz || s.Format().Channels != f.Channels {
			t.Fatalf("%v", s.Format())
		}
		got, err := readAll(s)
		if err != io.EOF || !sameBits(volts(got), volts(blocks)) || !got[0].Time.Equal(blocks[0].Time) {
			t.Fatalf("%v, %v", got, err)
		}
	})
}

// TestWAVFileSizes: with a file the head states the sizes.
func TestWAVFileSizes(t *testing.T) {
	f, err := os.Create(filepath.Join(t.TempDir(), "r.wav"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	w, err := NewWAVWriter(f, acquire.Format{RateHz: 1000, Channels: 3})
	write(t, w, err, []acquire.Block{{Volts: make([]float32, 3*40000)}})
	raw, err := os.ReadFile(f.Name())
	if err != nil {
		t.Fatal(err)
	}
	h, fault := parseWAV(bytes.NewReader(raw))
	if fault != nil || h.dataSize != 4*3*40000 || h.dataStart+h.dataSize != int64(len(raw)) || !h.created.IsZero() {
		t.Errorf("%+v %v", h, fault)
	}
	if at, err := f.Seek(0, io.SeekCurrent); err != nil || at != int64(len(raw)) {
		t.Errorf("left at %d of %d, %v", at, len(raw), err)
	}
}

// TestCSVOddRates: what is no whole number of hertz is found to a millionth,
// and exactly when its step is a decimal.
func TestCSVOddRates(t *testing.T) {
	for _, hz := range []float64{976.5625, 0.1, 0.25, 1000.5, 31.25, 3906.25, 100. / 3, 25600. / 7} {
		f := acquire.Format{RateHz: hz, Channels: 1}
		var out bytes.Buffer
		w, err := NewCSVWriter(&out, f)
		write(t, w, err, []acquire.Block{{Volts: make([]float32, 6000)}})
		s, blocks := mustRead(t, out.String(), Options{})
		if got := s.Format().RateHz; math.Abs(got-hz) > 1e-6*hz {
			t.Errorf("%v Hz, want %v", got, hz)
		} else if step := 1e9 / hz; step == math.Trunc(step) && got != hz {
			t.Errorf("%v Hz, want exactly %v", got, hz)
		}
		if n := len(volts(blocks)); n != 6000 {
			t.Errorf("%v Hz: %d rows", hz, n)
		}
	}
}

// TestShortestDecimalTwiceRounded: 7.038531e-26 is the shortest decimal of the
// float32 0x15ae43fd, but the float64 nearest to it lies in the middle between
// that and the next one, so that rounding twice gives the other.
func TestShortestDecimalTwiceRounded(t *testing.T) {
	for _, bits := range []uint32{0x15ae43fd, 0x95ae43fd} {
		v := math.Float32frombits(bits)
		short, err := strconv.ParseFloat(strconv.FormatFloat(float64(v), 'g', -1, 32), 64)
		if err != nil || float32(short) == v {
			t.Fatalf("%v is no such number", v)
		}
		cell := appendVolts(nil, v)
		n, reason := parseNumber(cell)
		if reason != "" || float32(n.value) != v {
			t.Errorf("%v is written %s and reads back as %v", v, cell, float32(n.value))
		}
	}
}

func TestWritersRefuse(t *testing.T) {
	for _, f := range []acquire.Format{{RateHz: 0, Channels: 1}, {RateHz: math.NaN(), Channels: 1}, {RateHz: 1e8, Channels: 1}, {RateHz: 1, Channels: 0}, {RateHz: 1, Channels: 65}} {
		_, csv := NewCSVWriter(io.Discard, f)
		_, wav := NewWAVWriter(io.Discard, f)
		if csv == nil || wav == nil {
			t.Errorf("%v: %v, %v", f, csv, wav)
		}
	}
	if _, err := NewWAVWriter(io.Discard, acquire.Format{RateHz: 976.5625, Channels: 1}); err == nil {
		t.Error("a WAV file of 976.5625 Hz")
	}
	f := acquire.Format{RateHz: 1000, Channels: 2}
	nan := float32(math.NaN())
	for name, b := range map[string]acquire.Block{
		"part of a row": {First: 5, Volts: []float32{1, 2, 3}},
		"not a number":  {First: 5, Volts: []float32{1, nan}},
		"a row again":   {First: 4, Volts: []float32{1, 2}},
		"silent loss":   {First: 7, Volts: []float32{1, 2}},
		"false loss":    {First: 5, Volts: []float32{1, 2}, Gap: acquire.Gap{Lost: 3}},
	} {
		csv, _ := NewCSVWriter(io.Discard, f)
		wav, _ := NewWAVWriter(io.Discard, f)
		for _, w := range []Writer{csv, wav} {
			if err := w.Write(&acquire.Block{First: 4, Volts: []float32{1, 2}}); err != nil {
				t.Fatal(err)
			}
			if err := w.Write(&b); err == nil {
				t.Errorf("%s: %T takes it", name, w)
			}
			if err := w.Write(&acquire.Block{First: 5, Volts: []float32{1, 2}}); err != nil {
				t.Errorf("%s: %T is spoilt: %v", name, w, err)
			}
		}
	}
	wav, _ := NewWAVWriter(io.Discard, f)
	if err := wav.Write(&acquire.Block{First: 4, Gap: acquire.Gap{Lost: 4, Exact: true, Cause: acquire.Late}, Volts: []float32{1, 2}}); err != nil {
		t.Error(err)
	}
	err := wav.Write(&acquire.Block{First: 9, Gap: acquire.Gap{Lost: 4, Exact: true, Cause: acquire.Late}, Volts: []float32{1, 2}})
	if !errors.Is(err, ErrGap) {
		t.Error(err)
	}
	empty, _ := NewWAVWriter(io.Discard, f)
	if err := empty.Close(); err == nil {
		t.Error("a WAV file without rows")
	}
}

// full is a disk that is full after some bytes.
type full int

func (f *full) Write(b []byte) (int, error) {
	if *f -= full(len(b)); *f < 0 {
		return 0, errors.New("no space left")
	}
	return len(b), nil
}

func TestWritersTellFullDisk(t *testing.T) {
	f := acquire.Format{RateHz: 1000, Channels: 1}
	for _, room := range []full{0, 70 << 10} {
		for _, csv := range []bool{true, false} {
			disk := room
			var w Writer
			if csv {
				w, _ = NewCSVWriter(&disk, f)
			} else {
				w, _ = NewWAVWriter(&disk, f)
			}
			err := w.Write(&acquire.Block{Volts: make([]float32, 100000)})
			if err == nil {
				err = w.Close()
			}
			if err == nil {
				t.Errorf("csv %v: nothing said with %d bytes of room", csv, room)
			}
		}
	}
}
