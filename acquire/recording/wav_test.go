package recording

import (
	"bytes"
	"encoding/binary"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"heavyspot/acquire"
)

// chunk returns a RIFF chunk, padded to an even size.
func chunk(id string, body []byte) []byte {
	b := binary.LittleEndian.AppendUint32([]byte(id), uint32(len(body)))
	b = append(b, body...)
	return append(b, make([]byte, len(body)%2)...)
}

// riff returns a WAV file of chunks.
func riff(chunks ...[]byte) []byte {
	body := append([]byte("WAVE"), bytes.Join(chunks, nil)...)
	return chunk("RIFF", body)
}

// fmtChunk returns the body of a fmt chunk of 16 bytes.
func fmtChunk(tag, channels int, rate uint32, bits int) []byte {
	align := channels * bits / 8
	b := binary.LittleEndian.AppendUint16(nil, uint16(tag))
	b = binary.LittleEndian.AppendUint16(b, uint16(channels))
	b = binary.LittleEndian.AppendUint32(b, rate)
	b = binary.LittleEndian.AppendUint32(b, rate*uint32(align))
	b = binary.LittleEndian.AppendUint16(b, uint16(align))
	return binary.LittleEndian.AppendUint16(b, uint16(bits))
}

// extensible returns the body of a WAVEFORMATEXTENSIBLE fmt chunk.
func extensible(tag, channels int, rate uint32, bits int) []byte {
	b := fmtChunk(0xfffe, channels, rate, bits)
	b = append(b, 22, 0, byte(bits), 0, 0, 0, 0, 0, byte(tag), 0)
	return append(b, subformatTail...)
}

// openBytes opens data as the recording "r.wav".
func openBytes(data []byte, o Options) (*Source, error) {
	return newSource(bytes.NewReader(data), "r.wav", int64(len(data)), o)
}

// le appends values in little-endian order.
func le(values ...any) []byte {
	var b bytes.Buffer
	for _, v := range values {
		if err := binary.Write(&b, binary.LittleEndian, v); err != nil {
			panic(err)
		}
	}
	return b.Bytes()
}

func TestWAVSamples(t *testing.T) {
	const fs = 2.5
	for _, c := range []struct {
		name string
		fmt  []byte
		data []byte
		o    Options
		want []float32
	}{
		{"16 bit", fmtChunk(1, 2, 50, 16), le(int16(-32768), int16(32767), int16(1), int16(-16384)), Options{FullScaleV: fs},
			[]float32{-2.5, 2.5 * 32767. / 32768, 2.5 / 32768, -1.25}},
		{"24 bit", fmtChunk(1, 1, 50, 24), []byte{0, 0, 0x80, 0xff, 0xff, 0x7f, 1, 0, 0, 0xff, 0xff, 0xff}, Options{FullScaleV: fs},
			[]float32{-2.5, float32(2.5 * 8388607. / 8388608), 2.5 / 8388608, -2.5 / 8388608}},
		{"32 bit", fmtChunk(1, 2, 50, 32), le(int32(math.MinInt32), int32(math.MaxInt32), int32(1), int32(-3)), Options{FullScaleV: 1},
			[]float32{-1, 1, 1. / (1 << 31), -3. / (1 << 31)}},
		{"float 32", fmtChunk(3, 2, 50, 32), le(float32(0.1), float32(-7), float32(1e-45), float32(3e38)), Options{},
			[]float32{0.1, -7, 1e-45, 3e38}},
		{"float 32 with full scale", fmtChunk(3, 2, 50, 32), le(float32(0.5), float32(-7)), Options{FullScaleV: fs}, []float32{1.25, -17.5}},
		{"float 64", fmtChunk(3, 1, 50, 64), le(0.1, -1e-300), Options{}, []float32{0.1, float32(math.Copysign(0, -1))}},
		{"extensible 24 bit", extensible(1, 2, 50, 24), []byte{0, 0, 0x40, 0, 0, 0xc0}, Options{FullScaleV: 4}, []float32{2, -2}},
		{"extensible float", extensible(3, 3, 50, 32), le(float32(1), float32(2), float32(3)), Options{}, []float32{1, 2, 3}},
	} {
		data := riff(chunk("fmt ", c.fmt), chunk("data", c.data))
		s, err := openBytes(data, c.o)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		blocks, err := readAll(s)
		got := volts(blocks)
		if err != io.EOF || !slices.Equal(got, c.want) || s.Format().RateHz != 50 {
			t.Errorf("%s: %v, want %v; %v", c.name, got, c.want, err)
		}
		channels := s.Format().Channels
		if !s.Has(channels-1) || s.Has(channels) {
			t.Errorf("%s: channels", c.name)
		}
		if done, total := s.Progress(); done > total || total-done > 1 {
			t.Errorf("%s: %d of %d bytes", c.name, done, total)
		}
	}
}

func TestWAVChunks(t *testing.T) {
	format := chunk("fmt ", fmtChunk(3, 1, 10, 32))
	samples := le(float32(1), float32(2), float32(3))
	data := chunk("data", samples)
	open := func(size uint32) []byte {
		return append(le([]byte("data"), size), samples...)
	}
	ds64 := chunk("ds64", le(uint64(0), uint64(len(samples)), uint64(3), uint32(0)))
	rf64 := riff(ds64, format, open(math.MaxUint32), chunk("LIST", []byte("x")))
	copy(rf64, "RF64")
	copy(rf64[4:], "\xff\xff\xff\xff")
	for name, file := range map[string][]byte{
		"plain":           riff(format, data),
		"unknown and odd": riff(chunk("bext", []byte("odd")), format, chunk("fact", make([]byte, 4)), chunk("junk", make([]byte, 99999)), data),
		"chunks behind":   riff(format, data, chunk("LIST", []byte("INFO"))),
		"stream":          riff(format, open(math.MaxUint32)),
		"rf64":            rf64,
		"broken list":     riff(chunk("LIST", []byte("INFOICRD\xff\xff\xff\xff2026")), chunk("LIST", []byte("INFOICRD\x04\x00\x00\x002026yyy")), format, data),
	} {
		s, err := openBytes(file, Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		blocks, err := readAll(s)
		if got := volts(blocks); err != io.EOF || !slices.Equal(got, []float32{1, 2, 3}) {
			t.Errorf("%s: %v, %v", name, got, err)
		}
	}
}

func TestWAVFaults(t *testing.T) {
	pcm := chunk("fmt ", fmtChunk(1, 2, 50, 16))
	float := chunk("fmt ", fmtChunk(3, 2, 50, 32))
	data := chunk("data", make([]byte, 400))
	patched := func(at int, v uint16) []byte {
		b := fmtChunk(1, 2, 50, 16)
		binary.LittleEndian.PutUint16(b[at:], v)
		return chunk("fmt ", b)
	}
	fs := Options{FullScaleV: 1}
	nan := make([]byte, 400)
	binary.LittleEndian.PutUint32(nan[8*7+4:], math.Float32bits(float32(math.NaN())))
	double := chunk("fmt ", fmtChunk(3, 1, 50, 64))
	sub := extensible(1, 2, 50, 16)
	sub[30] = 7
	for _, c := range []struct {
		name   string
		file   []byte
		o      Options
		rows   int
		reason string
	}{
		{"magic only", []byte("RIFF"), fs, 0, "ends inside the RIFF header"},
		{"not WAVE", chunk("RIFF", []byte("AVI ")), fs, 0, `form "AVI ", not WAVE`},
		{"nothing", riff(), fs, 0, "no data chunk"},
		{"cut in a chunk header", riff(pcm)[:30+8], fs, 0, "a chunk header"},
		{"cut in fmt", riff(pcm)[:24], fs, 0, "the fmt chunk"},
		{"no data", riff(pcm), fs, 0, "no data chunk"},
		{"chunk beyond the end", riff(pcm, []byte("junk\xf0\xff\xff\xff"), data), fs, 0, "no data chunk"},
		{"no fmt", riff(data), fs, 0, "no fmt chunk"},
		{"short fmt", riff(chunk("fmt ", make([]byte, 14)), data), fs, 0, "the fmt chunk has 14 bytes"},
		{"codec", riff(patched(0, 2), data), fs, 0, "format tag 0x0002"},
		{"bits", riff(patched(14, 8), data), fs, 0, "PCM samples have 8 bits"},
		{"float bits", riff(chunk("fmt ", fmtChunk(3, 2, 50, 16)), data), fs, 0, "floating-point samples have 16 bits"},
		{"align", riff(patched(12, 6), data), fs, 0, "the block align is 6 bytes"},
		{"align 0", riff(patched(12, 0), data), fs, 0, "the block align is 0 bytes"},
		{"no channels", riff(patched(2, 0), data), fs, 0, "0 channels"},
		{"65 channels", riff(chunk("fmt ", fmtChunk(1, 65, 50, 16)), data), fs, 0, "65 channels, allowed are 1 to 64"},
		{"rate 0", riff(patched(4, 0), data), fs, 0, "sampling rate is 0"},
		{"short extensible", riff(chunk("fmt ", fmtChunk(0xfffe, 1, 50, 16)), data), fs, 0, "the extensible fmt chunk has 16"},
		{"subformat", riff(chunk("fmt ", sub), data), fs, 0, "the subformat 0100"},
		{"short ds64", riff(chunk("ds64", make([]byte, 8)), pcm, data), fs, 0, "the ds64 chunk has 8"},
		{"huge ds64", riff(chunk("ds64", bytes.Repeat([]byte{0xff}, 28)), pcm, data), fs, 0, "the ds64 chunk states"},
		{"no full scale", riff(pcm, data), Options{}, 0, "16-bit PCM, the voltage of full scale must be given"},
		{"rate", riff(pcm, data), Options{FullScaleV: 1, ExpectRateHz: 51}, 0, "sampled at 50 Hz, the configuration expects 51 Hz"},
		{"no samples", riff(pcm, chunk("data", nil)), fs, 0, "no samples"},
		{"unfinished", append(riff(pcm, chunk("data", nil)), 1, 2, 3, 4), fs, 0, "was the recorder stopped"},
		{"cut off", riff(pcm, data)[:44+201], fs, 50, "cut off: 50 frames read, the header states 100"},
		{"cut off at once", riff(pcm, data)[:44], fs, 0, "cut off: 0 frames read, the header states 100"},
		{"part of a frame", riff(pcm, chunk("data", make([]byte, 402))), fs, 100, "100 frames read, 2 of the 4 bytes"},
		{"nan", riff(float, chunk("data", nan)), fs, 7, "channel 1 of frame 7 is NaN V"},
		{"inf", riff(double, chunk("data", le(1.0, math.Inf(-1)))), fs, 1, "channel 0 of frame 1 is -Inf V"},
		{"overflow", riff(double, chunk("data", le(1e39))), fs, 0, "channel 0 of frame 0 is +Inf V"},
	} {
		s, err := openBytes(c.file, c.o)
		var blocks []acquire.Block
		if err == nil {
			blocks, err = readAll(s)
		}
		var fault *Error
		if !errors.As(err, &fault) || fault.Path != "r.wav" || !strings.Contains(fault.Reason, c.reason) {
			t.Errorf("%s: %v, want %q", c.name, err, c.reason)
			continue
		}
		if s != nil {
			if n := len(volts(blocks)) / s.Format().Channels; n != c.rows {
				t.Errorf("%s: %d rows ahead of the fault, want %d", c.name, n, c.rows)
			}
		}
	}
}

// TestWAVLarge: the head of a file too large for 32 bits, with a lower limit.
func TestWAVLarge(t *testing.T) {
	path := filepath.Join(t.TempDir(), "r")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	w, err := NewWAVWriter(f, acquire.Format{RateHz: 10, Channels: 1})
	if err != nil {
		t.Fatal(err)
	}
	w.largest = 100
	start := time.Date(2026, 3, 1, 6, 31, 0, 123456789, time.UTC)
	err = errors.Join(w.Write(&acquire.Block{First: 77, Volts: []float32{1, 2, 3}, Time: start, ClockSet: true}), w.Close())
	if err != nil {
		t.Fatal(err)
	}
	raw, err := os.ReadFile(path)
	if err != nil || string(raw[:4]) != "RF64" || string(raw[12:16]) != "ds64" {
		t.Fatalf("%q %v", raw, err)
	}
	s, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	blocks, err := readAll(s)
	if err != io.EOF || !slices.Equal(volts(blocks), []float32{1, 2, 3}) || !blocks[0].Time.Equal(start) {
		t.Errorf("%+v %v", blocks, err)
	}
	if s, err = openBytes(raw[:len(raw)-4], Options{}); err != nil {
		t.Fatal(err)
	}
	if _, err = readAll(s); err == io.EOF || !strings.Contains(err.Error(), "2 frames read, the header states 3") {
		t.Error(err)
	}
}
