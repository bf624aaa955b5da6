package recording

import (
	"bytes"
	"context"
	"errors"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"heavyspot/acquire"
)

// fuzzRead reads data, checks what holds for every file, and returns the volts
// of channel 0 and whether the file was sound to its end.
func fuzzRead(t *testing.T, data []byte, o Options) (s *Source, all []float32, sound bool) {
	s, err := newSource(bytes.NewReader(data), "fuzz", int64(len(data)), o)
	fault := new(Error)
	if err != nil {
		if !errors.As(err, &fault) || fault.Path != "fuzz" || fault.Reason == "" || len(fault.Error()) > 4096 && fault.Name == "" {
			t.Fatalf("%#v", err)
		}
		return nil, nil, false
	}
	f := s.Format()
	if f.Channels < 1 || f.Channels > MaxChannels || !(f.RateHz > 0) || math.IsInf(f.RateHz, 0) {
		t.Fatalf("%+v", f)
	}
	b, next := acquire.Block{}, int64(0)
	for {
		err := s.Read(context.Background(), &b)
		if err != nil && err != io.EOF && (!errors.As(err, &fault) || fault.Path != "fuzz") {
			t.Fatalf("%#v", err)
		}
		if err != nil {
			return s, all, err == io.EOF
		}
		rows := b.Rows(f.Channels)
		if rows == 0 || rows*f.Channels != len(b.Volts) || cap(b.Volts) > 2*maxCells || b.Gap.Lost < 0 || b.First != next+b.Gap.Lost {
			t.Fatalf("%d samples from row %d, expected row %d, %+v", len(b.Volts), b.First, next, b.Gap)
		}
		if (b.Gap.Lost > 0) != (b.Gap.Cause != acquire.NoGap) || b.ClockSet == b.Time.IsZero() {
			t.Fatalf("%+v", b)
		}
		for _, v := range b.Volts {
			if v-v != 0 {
				t.Fatalf("%v V", v)
			}
		}
		for i := 0; i < rows; i++ {
			all = append(all, b.Volts[i*f.Channels:][0])
		}
		next = b.First + int64(rows)
		if done, total := s.Progress(); done < 0 || done > total {
			t.Fatalf("%d of %d bytes", done, total)
		}
	}
}

// naive reads column ch0 of a file without quotes the plain way.
func naive(text string) []float32 {
	text = strings.TrimPrefix(text, "\xef\xbb\xbf")
	lines := strings.Split(text, "\n")
	column := -1
	for i, name := range strings.Split(lines[0], ",") {
		if strings.Trim(name, " \t\r") == "ch0" {
			column = i
		}
	}
	var all []float32
	for _, line := range lines[1:] {
		if strings.TrimSpace(line) == "" {
			continue
		}
		v := 0.0
		if column >= 0 {
			v, _ = strconv.ParseFloat(strings.Trim(strings.Split(line, ",")[column], " \t\r"), 64)
		}
		all = append(all, float32(v))
	}
	return all
}

func FuzzCSV(f *testing.F) {
	for _, text := range []string{
		"t_s,ch0,ch1\n0.0,1,2\n0.1,3,4\n0.2,5,6\n",
		"\xef\xbb\xbft_s , ch0,x\r\n0.00,-1e-3,\r\n0.02, 2.5 ,\"a,b\"\r\n0.10,9007199254740993,z\r\n",
		"ch2,t_s,ch0,time,gap\n1,0,2,2026-03-01T06:31:00Z,\n1,1,2,,\n1,5,2,2026-03-01T06:31:05.5Z,late estimated\n",
		header8 + rows8(20) + "0.02", header8 + rows8(3) + "\n\n", "t_s,ch63\n0,1\n1e9,1\n",
		"t_s,ch0\n0,1\n1e-9,1\n2e-9,1\n0.5,1\n", "t_s,ch0\n-1e8,1\n1e8,1\n", "t_s;ch0\n", "0,1\n", "t_s,\"ch0\n",
	} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) > 1<<16 || bytes.HasPrefix(data, []byte("RIFF")) || bytes.HasPrefix(data, []byte("RF64")) {
			return
		}
		_, got, sound := fuzzRead(t, data, Options{})
		if !sound || bytes.ContainsRune(data, '"') {
			return
		}
		want := naive(string(data))
		if !sameBits(got, want) {
			t.Fatalf("%v, want %v", got, want)
		}
	})
}

func FuzzWAV(f *testing.F) {
	samples := le(float32(1), float32(-2), float32(3), float32(4))
	f.Add(riff(chunk("fmt ", fmtChunk(1, 2, 50, 16)), chunk("data", samples)))
	f.Add(riff(chunk("fmt ", fmtChunk(1, 1, 50, 24)), chunk("data", samples)))
	f.Add(riff(chunk("odd ", []byte("x")), chunk("fmt ", extensible(3, 2, 4000000000, 32)), chunk("data", samples)))
	f.Add(riff(chunk("fmt ", fmtChunk(3, 1, 50, 64)), chunk("data", samples))[:60])
	list := append([]byte("INFOICRD\x15\x00\x00\x00"), "2026-03-01T06:31:00Z\x00\x00"...)
	large := riff(chunk("ds64", le(uint64(0), uint64(16), uint64(4), uint32(0))), chunk("LIST", list),
		chunk("fmt ", extensible(1, 2, 1, 32)), append([]byte("data\xff\xff\xff\xff"), samples...))
	f.Add(append([]byte("RF64"), large[4:]...))
	f.Fuzz(func(t *testing.T, data []byte) {
		if !bytes.HasPrefix(data, []byte("RIFF")) && !bytes.HasPrefix(data, []byte("RF64")) {
			return
		}
		s, got, _ := fuzzRead(t, data, Options{FullScaleV: 2})
		if s != nil && len(got)*s.Format().Channels*2 > len(data) {
			t.Fatalf("%d rows out of %d bytes", len(got), len(data))
		}
	})
}
