package dsp_test

import (
	"testing"
	"time"

	"heavyspot/dsp"
)

// benchSignal is a minute of 7 points and a reference at 1 kSPS.
func benchSignal() signal {
	s := base(1)
	s.points = 7
	return s
}

// BenchmarkEngine reports the time of the signal path per sample of a channel,
// over blocks of a quarter of a second with the reading of the minute included,
// and its ratio to a bare sum of as many int32 in the same run.
func BenchmarkEngine(b *testing.B) {
	s := benchSignal()
	v := s.render()
	e, err := dsp.NewEngine(s.config())
	if err != nil {
		b.Fatal(err)
	}
	stride := s.points + 1
	ints := make([]int32, len(v))
	for i := range ints {
		ints[i] = int32(v[i] * 1e6)
	}
	var sum int64
	var bare, path time.Duration
	b.ResetTimer()
	for k := range b.N {
		start := time.Now()
		for _, x := range ints {
			sum += int64(x)
		}
		bare += time.Since(start)
		start = time.Now()
		at := int64(k * len(v) / stride)
		for i := 0; i < len(v); i += 250 * stride {
			e.Push(at+int64(i/stride), v[i:i+250*stride])
		}
		e.Close(at+int64(len(v)/stride), time.Time{}, false)
		path += time.Since(start)
	}
	if sum == 1 {
		b.Log(sum)
	}
	n := float64(b.N) * float64(len(v))
	b.ReportMetric(float64(path.Nanoseconds())/n, "ns/sample")
	b.ReportMetric(float64(path)/float64(bare), "xsum")
	b.ReportMetric(0, "ns/op")
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
