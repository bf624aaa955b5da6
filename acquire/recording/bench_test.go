package recording

import (
	"bytes"
	"context"
	"io"
	"math/rand/v2"
	"testing"

	"heavyspot/acquire"
)

// benchFormat is what the daemon records as a rule.
var benchFormat = acquire.Format{RateHz: 1000, Channels: 8}

// benchBlock returns a second of noise, seed fixed.
func benchBlock(first int64) *acquire.Block {
	r := rand.New(rand.NewPCG(1, uint64(first)))
	b := &acquire.Block{First: first, Volts: make([]float32, 8*1000)}
	for i := range b.Volts {
		b.Volts[i] = float32(r.NormFloat64() * 0.1)
	}
	return b
}

// benchFile returns a recording of the given length and how it is read.
func benchFile(tb testing.TB, csv bool, seconds int) []byte {
	var out bytes.Buffer
	w := Writer(nil)
	var err error
	if csv {
		w, err = NewCSVWriter(&out, benchFormat)
	} else {
		w, err = NewWAVWriter(&out, benchFormat)
	}
	if err != nil {
		tb.Fatal(err)
	}
	for i := range seconds {
		if err := w.Write(benchBlock(int64(i) * 1000)); err != nil {
			tb.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		tb.Fatal(err)
	}
	return out.Bytes()
}

func benchRead(b *testing.B, csv bool) {
	data := benchFile(b, csv, 60)
	b.SetBytes(int64(len(data)))
	var block acquire.Block
	for b.Loop() {
		s, err := newSource(bytes.NewReader(data), "bench", int64(len(data)), Options{})
		if err != nil {
			b.Fatal(err)
		}
		for err == nil {
			err = s.Read(context.Background(), &block)
		}
		if err != io.EOF {
			b.Fatal(err)
		}
	}
}

func BenchmarkReadCSV(b *testing.B) { benchRead(b, true) }
func BenchmarkReadWAV(b *testing.B) { benchRead(b, false) }

func benchWrite(b *testing.B, open func(io.Writer) (Writer, error)) {
	w, err := open(io.Discard)
	if err != nil {
		b.Fatal(err)
	}
	block := benchBlock(0)
	b.SetBytes(int64(4 * len(block.Volts)))
	for b.Loop() {
		if err := w.Write(block); err != nil {
			b.Fatal(err)
		}
		block.First += 1000
	}
}

func BenchmarkWriteCSV(b *testing.B) {
	benchWrite(b, func(w io.Writer) (Writer, error) { return NewCSVWriter(w, benchFormat) })
}

func BenchmarkWriteWAV(b *testing.B) {
	benchWrite(b, func(w io.Writer) (Writer, error) { return NewWAVWriter(w, benchFormat) })
}

// TestSteadyStateAllocates nothing: blocks reuse their storage.
func TestSteadyStateAllocates(t *testing.T) {
	for _, csv := range []bool{true, false} {
		data := benchFile(t, csv, 14)
		s, err := newSource(bytes.NewReader(data), "bench", int64(len(data)), Options{})
		if err != nil {
			t.Fatal(err)
		}
		var b acquire.Block
		read := func() {
			if err := s.Read(context.Background(), &b); err != nil {
				t.Fatal(err)
			}
		}
		read()
		if n := testing.AllocsPerRun(10, read); n != 0 {
			t.Errorf("csv %v: %v allocations per block, want none", csv, n)
		}
	}
}
