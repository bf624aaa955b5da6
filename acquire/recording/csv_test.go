package recording

import (
	"bytes"
	"context"
	"errors"
	"fmt"
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

// openText opens text as the recording "r.csv".
func openText(text string, o Options) (*Source, error) {
	return newSource(strings.NewReader(text), "r.csv", int64(len(text)), o)
}

// mustRead returns all volts and gaps of text, which must be sound.
func mustRead(t *testing.T, text string, o Options) (*Source, []acquire.Block) {
	t.Helper()
	s, err := openText(text, o)
	if err != nil {
		t.Fatal(err)
	}
	blocks, err := readAll(s)
	if err != io.EOF {
		t.Fatal(err)
	}
	return s, blocks
}

// volts joins the rows of blocks.
func volts(blocks []acquire.Block) []float32 {
	var all []float32
	for _, b := range blocks {
		all = append(all, b.Volts...)
	}
	return all
}

func TestCSVForms(t *testing.T) {
	want := []float32{0.5, -1, 1.5, -2, 2.5, -3}
	for name, text := range map[string]string{
		"plain":            "t_s,ch0,ch1\n0.00,0.5,-1\n0.01,1.5,-2\n0.02,2.5,-3\n",
		"no last newline":  "t_s,ch0,ch1\n0.00,0.5,-1\n0.01,1.5,-2\n0.02,2.5,-3",
		"crlf":             "t_s,ch0,ch1\r\n0.00,0.5,-1\r\n0.01,1.5,-2\r\n0.02,2.5,-3\r\n",
		"bom":              "\xef\xbb\xbft_s,ch0,ch1\n0.00,0.5,-1\n0.01,1.5,-2\n0.02,2.5,-3\n",
		"blanks":           " t_s ,\tch0, ch1 \n 0.00 ,0.5\t, -1\n0.01 ,1.5,-2 \n0.02,2.5,\t-3\n",
		"quotes":           "\"t_s\",\"ch0\",ch1\n\"0.00\",0.5,\"-1\"\n0.01, \"1.5\" ,-2\n0.02,2.5,-3\n",
		"order":            "ch1,t_s,ch0\n-1,0.00,0.5\n-2,0.01,1.5\n-3,0.02,2.5\n",
		"other columns":    "note,t_s,ch0,speed,ch1,,\n\"a,b \"\"c\"\"\",0.00,0.5,NaN,-1,,\n,0.01,1.5,,-2,x,y\nz,0.02,2.5,1e,-3,0x1,\n",
		"foreign time":     "t_s,time,ch0,gap,ch1\n0.00,noon,0.5,wide,-1\n0.01,later,1.5,,-2\n0.02,,2.5,x,-3\n",
		"blank lines last": "t_s,ch0,ch1\n0.00,0.5,-1\n0.01,1.5,-2\n0.02,2.5,-3\n\n  \r\n\n",
		"exponents":        "t_s,ch0,ch1\n0e0,5e-1,-1E0\n1e-2,+1.5,-200e-2\n2e-2,25E-1,-.3e1\n",
		"starts late":      "t_s,ch0,ch1\n-7.01,0.5,-1\n-7.00,1.5,-2\n-6.99,2.5,-3\n",
	} {
		s, blocks := mustRead(t, text, Options{})
		if got := volts(blocks); !slices.Equal(got, want) {
			t.Errorf("%s: %v", name, got)
		}
		if f := s.Format(); f.RateHz != 100 || f.Channels != 2 || !s.Has(0) || !s.Has(1) || s.Has(2) {
			t.Errorf("%s: %v", name, f)
		}
		if blocks[0].Gap != (acquire.Gap{}) || blocks[0].First != 0 || !blocks[0].Time.IsZero() {
			t.Errorf("%s: %+v", name, blocks[0])
		}
	}
}

func TestCSVMissingChannels(t *testing.T) {
	s, blocks := mustRead(t, "t_s,ch3,ch1\n0,1,2\n1,3,4\n2,5,6\n", Options{BlockSeconds: 2})
	if f := s.Format(); f.Channels != 4 || f.RateHz != 1 {
		t.Fatal(f)
	}
	for i, want := range []bool{false, true, false, true, false} {
		if s.Has(i) != want {
			t.Errorf("channel %d: %v", i, !want)
		}
	}
	if s.Has(-1) || s.Has(64) || s.Has(1<<20) {
		t.Error("channels out of range are there")
	}
	if got := volts(blocks); !slices.Equal(got, []float32{0, 2, 0, 1, 0, 4, 0, 3, 0, 6, 0, 5}) {
		t.Error(got)
	}
	// The same storage again, with rubbish in it.
	s, err := openText("t_s,ch1\n0,1\n1,2\n", Options{})
	if err != nil {
		t.Fatal(err)
	}
	b := acquire.Block{Volts: []float32{7, 7, 7, 7}}
	if err := s.Read(context.Background(), &b); err != nil || !slices.Equal(b.Volts, []float32{0, 1}) {
		t.Error(b.Volts, err)
	}
}

// header8 and rows8 make a sound file of eight channels.
const header8 = "t_s,ch0,ch1,ch2,ch3,ch4,ch5,ch6,ch7\n"

func rows8(n int) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, "%.3f,1,2,3,4,5,6,7,8\n", float64(i)/1000)
	}
	return b.String()
}

// rows makes rows of one channel at a rate with some decimals of t_s.
func rows(hz float64, decimals, n int) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, "%.*f,1\n", decimals, float64(i)/hz)
	}
	return b.String()
}

func TestCSVFaults(t *testing.T) {
	const good = "t_s,ch0,ch1\n0.0,1,2\n0.1,3,4\n0.2,5,6\n"
	for _, c := range []struct {
		name, text string
		line       int64
		column     int
		column2    string
		reason     string
	}{
		{"empty", "", 0, 0, "", "the file is empty"},
		{"header only", "t_s,ch0\n", 0, 0, "", "no row of data"},
		{"header only, no newline", "t_s,ch0", 0, 0, "", "no row of data"},
		{"one row", "t_s,ch0\n0,1\n", 0, 0, "", "only one row"},
		{"blank header", "\n0,1\n", 1, 0, "", "header line is blank"},
		{"no t_s", "time,ch0\n0,1\n", 1, 0, "", "no column t_s"},
		{"no channel", "t_s,CH0\n0,1\n", 1, 0, "", "no channel column"},
		{"no header", "0.0,1,2\n0.1,1,2\n", 1, 0, "", `begins with the number "0.0"`},
		{"twice", "t_s,ch0,ch1,ch0\n", 1, 4, "ch0", "column 2 has the same name"},
		{"t_s twice", "t_s,t_s,ch1\n", 1, 2, "t_s", "column 1 has the same name"},
		{"channel too high", "t_s,ch64\n", 1, 2, "ch64", "ch0 to ch63"},
		{"channel far too high", "t_s,ch99999999999999999999\n", 1, 2, "ch99999999999999999999", "ch0 to ch63"},
		{"leading zero", "t_s,ch00\n", 1, 2, "ch00", "written ch0"},
		{"semicolons", "t_s;ch0\n0,0;1,5\n", 1, 0, "", `separated by ";"`},
		{"tabs", "t_s\tch0\n0\t1\n", 1, 0, "", "separated by"},
		{"decimal commas", "t_s,ch0\n0,0,1,5\n0,1,1,6\n", 2, 0, "", "4 cells, the header 2; are the decimals written with a comma"},
		{"quote in header", "t_s,\"ch0\n0,1\n", 1, 2, "", "a quote is opened"},
		{"utf-16", "\xff\xfet\x00_\x00s\x00", 1, 0, "", "UTF-16"},
		{"binary", "\x7fELF\x00\x00\x01\n", 1, 0, "", "neither CSV text nor a WAV file"},
		{"not utf-8", "t_s,ch0,\xb0C\n", 1, 0, "", "neither CSV text nor a WAV file"},
		{"too many columns", "t_s" + strings.Repeat(",", 2000) + "\n", 1, 1025, "", "more than 1024 columns"},
		{"long header", "t_s,ch0," + strings.Repeat("x", 2<<20), 1, 0, "", "longer than 1048576 bytes"},
		{"few cells", good + "0.3,7\n0.4,8,9\n", 5, 3, "ch1", "2 cells, the header 3"},
		{"many cells", good + "0.3,7,8,9\n", 5, 0, "", "4 cells, the header 3"},
		{"comma at the end", good + "0.3,7,8,\n", 5, 0, "", "4 cells, the header 3"},
		{"empty cell", good + "0.3,,8\n", 5, 2, "ch0", "the cell is empty"},
		{"empty last cell", good + "0.3,7,\n0.4,8,9\n", 5, 3, "ch1", "the cell is empty"},
		{"empty time", good + ",7,8\n", 5, 1, "t_s", "the cell is empty"},
		{"blank cell", good + "0.3, ,8\n", 5, 2, "ch0", "the cell is empty"},
		{"blank line", good + "\n0.3,7,8\n", 5, 0, "", "the line is blank"},
		{"text", good + "0.3,7,volt\n", 5, 3, "ch1", `"volt" is not a decimal number`},
		{"long text", good + "0.3,7," + strings.Repeat("z", 5000) + "\n", 5, 3, "ch1", `zzz"... is not a decimal number`},
		{"nan", good + "0.3,NaN,8\n", 5, 2, "ch0", "is not a finite number"},
		{"inf", good + "0.3,7,-Inf\n", 5, 3, "ch1", "is not a finite number"},
		{"hex", good + "0.3,0x1p-2,8\n", 5, 2, "ch0", "hexadecimal"},
		{"underscore", good + "0.3,1_0,8\n", 5, 2, "ch0", "is not a decimal number"},
		{"overflow", good + "0.3,7,1e39\n", 5, 3, "ch1", "more than a recording can hold"},
		{"far overflow", good + "0.3,7,-1e999\n", 5, 3, "ch1", "more than a recording can hold"},
		{"time overflow", good + "1e999,7,8\n", 5, 1, "t_s", "out of range"},
		{"quote", good + "0.3,\"7,8\n", 5, 2, "ch0", "a quote is opened"},
		{"text behind quote", good + "0.3,\"7\"7,8\n", 5, 2, "ch0", "text behind a closing quote"},
		{"garbage", good + "\x00\x01\xff,7,8\n", 5, 1, "t_s", `"\x00\x01\xff" is not a decimal number`},
		{"long line", good + "0.3," + strings.Repeat("1", 2<<20) + ",8\n", 5, 0, "", "longer than 1048576 bytes"},
		{"cut off in a cell", good + "0.3,7,-", 5, 3, "ch1", "cut off"},
		{"cut off behind a comma", good + "0.3,7,", 5, 3, "ch1", "cut off"},
		{"cut off between cells", good + "0.3,7", 5, 3, "ch1", "cut off: the line has 2 cells, the header 3"},
		{"cut off in the time", good + "0.", 5, 2, "ch0", "cut off"},
		{"time repeats", good + "0.2,7,8\n", 5, 1, "t_s", "expected 0.3 s, found 0.2 s: the time repeats"},
		{"time goes back", good + "0.1,7,8\n", 5, 1, "t_s", "expected 0.3 s, found 0.1 s: the time goes back"},
		{"time never moves", "t_s,ch0\n0,1\n0,1\n0,1\n", 3, 1, "t_s", "does not increase: 0 s follows 0 s"},
		{"uneven", "t_s,ch0\n" + rows(1000, 6, 100) + "0.100030,1\n", 102, 1, "t_s", "expected 0.100000 s, found 0.100030 s: the steps are not uniform"},
		{"uneven hole", "t_s,ch0\n" + rows(1000, 6, 100) + "0.155500,1\n", 102, 1, "t_s", "no whole number of steps of 0.001 s"},
		{"time falls", "t_s,ch0\n0,1\n1,1\n0,1\n-1,1\n-2,1\n", 4, 1, "t_s", "does not increase: 0 s follows 1 s"},
		{"no seconds", "t_s,ch0\n0,1\n1e-12,1\n2e-12,1\n", 3, 1, "t_s", "make 1e+12 Hz, allowed are"},
		{"too coarse", "t_s,ch0\n" + rows(1024, 3, 100), 0, 1, "t_s", "too few decimals"},
	} {
		s, err := openText(c.text, Options{})
		if err == nil {
			_, err = readAll(s)
		}
		var fault *Error
		if !errors.As(err, &fault) {
			t.Errorf("%s: %v, want an *Error", c.name, err)
			continue
		}
		if c.line > 0 && fault.Line != c.line || fault.Column != c.column || fault.Name != c.column2 ||
			fault.Path != "r.csv" || !strings.Contains(fault.Reason, c.reason) {
			t.Errorf("%s: %v\n\twant line %d, column %d (%s), %q", c.name, fault, c.line, c.column, c.column2, c.reason)
		}
	}
}

// TestCSVRowsAheadOfFault are delivered, and the fault stays.
func TestCSVRowsAheadOfFault(t *testing.T) {
	s, err := openText(header8+rows8(2500)+"2.500,1,2,x,4,5,6,7,8\n"+rows8(1), Options{})
	if err != nil {
		t.Fatal(err)
	}
	blocks, err := readAll(s)
	if n := len(volts(blocks)) / 8; n != 2500 || len(blocks) != 3 {
		t.Errorf("%d rows in %d blocks", n, len(blocks))
	}
	if want := `cannot read recording r.csv: line 2502, column 4 (ch2): "x" is not a decimal number`; err.Error() != want {
		t.Errorf("%v\nwant %s", err, want)
	}
	var b acquire.Block
	if again := s.Read(context.Background(), &b); again != err {
		t.Error(again)
	}
}

func TestOnlyChannelsInUse(t *testing.T) {
	text := "t_s,ch0,ch1,ch2\n0,1,,3\n1,4,volt,6\n2,7,1e99,9\n"
	nan := float32(math.NaN())
	wav := riff(chunk("fmt ", fmtChunk(3, 3, 1, 32)), chunk("data", le([]float32{1, nan, 3, 4, 5, 6, 7, 8, 9})))
	for _, data := range []string{text, string(wav)} {
		s, blocks := mustRead(t, data, Options{Channels: []int{2, 0, 2}})
		if got := volts(blocks); !slices.Equal(got, []float32{1, 0, 3, 4, 0, 6, 7, 0, 9}) || s.Format().Channels != 3 || s.Has(1) || !s.Has(2) {
			t.Error(got, s.Format())
		}
		for _, c := range []int{3, -1, 64} {
			var fault *Error
			if _, err := openText(data, Options{Channels: []int{0, c}}); !errors.As(err, &fault) || !strings.Contains(fault.Reason, "not in the file") {
				t.Errorf("channel %d: %v", c, err)
			}
		}
	}
}

// TestAllChannels: as many as there may be.
func TestAllChannels(t *testing.T) {
	for _, csv := range []bool{true, false} {
		var out bytes.Buffer
		b := acquire.Block{Volts: make([]float32, 64*30)}
		for i := range b.Volts {
			b.Volts[i] = float32(i)
		}
		w, err := Writer(nil), error(nil)
		if f := (acquire.Format{RateHz: 10, Channels: 64}); csv {
			w, err = NewCSVWriter(&out, f)
		} else {
			w, err = NewWAVWriter(&out, f)
		}
		write(t, w, err, []acquire.Block{b})
		s, blocks := mustRead(t, out.String(), Options{})
		if !slices.Equal(volts(blocks), b.Volts) || !s.Has(63) || s.Format().Channels != 64 {
			t.Errorf("csv %v: %v", csv, s.Format())
		}
	}
}

func TestCSVWallTime(t *testing.T) {
	start := time.Date(2026, 3, 1, 6, 31, 0, 0, time.UTC)
	_, blocks := mustRead(t, header8+rows8(2500), Options{Start: start, BlockSeconds: 0.5})
	for i, b := range blocks {
		if want := start.Add(time.Duration(i) * 500 * time.Millisecond); !b.Time.Equal(want) || !b.ClockSet || b.Rows(8) != 500 {
			t.Errorf("block %d: %v, want %v, %d rows", i, b.Time, want, b.Rows(8))
		}
	}
	text := "t_s,ch0,time\n0,1,\n1,2,2026-03-01T06:31:00+02:00\n2,3,\n3,4,2026-03-01T06:31:03Z\n4,5,2026-03-01T06:31:04Z\n"
	_, blocks = mustRead(t, text, Options{BlockSeconds: 10})
	if len(blocks) != 3 || !blocks[0].Time.IsZero() || blocks[0].ClockSet ||
		!blocks[1].Time.Equal(start.Add(-2*time.Hour)) || !blocks[2].Time.Equal(start.Add(3*time.Second)) || len(blocks[2].Volts) != 2 {
		t.Errorf("%+v", blocks)
	}
	_, blocks = mustRead(t, text, Options{BlockSeconds: 10, Start: start})
	if len(blocks) != 1 || !blocks[0].Time.Equal(start) {
		t.Errorf("%+v", blocks)
	}
}

func TestSourceRefuses(t *testing.T) {
	text := header8 + rows8(50)
	for _, o := range []Options{{ExpectRateHz: 1002}, {ExpectRateHz: 998.9}, {ExpectRateHz: -1}, {BlockSeconds: -1}, {FullScaleV: -1}} {
		var fault *Error
		if _, err := openText(text, o); !errors.As(err, &fault) {
			t.Errorf("%+v: %v", o, err)
		} else if o.ExpectRateHz > 0 && !strings.Contains(fault.Reason, "1000 Hz") {
			t.Error(fault)
		}
	}
	if _, err := openText(text, Options{ExpectRateHz: 1000.5}); err != nil {
		t.Error(err)
	}
	dir := t.TempDir()
	for _, path := range []string{dir, filepath.Join(dir, "absent.csv")} {
		var fault *Error
		if _, err := Open(path, Options{}); !errors.As(err, &fault) || fault.Path != path {
			t.Error(err)
		}
	}
	if _, err := Open(filepath.Join(dir, "absent.csv"), Options{}); !errors.Is(err, os.ErrNotExist) {
		t.Error(err)
	}
}

func TestSourceEnds(t *testing.T) {
	path := filepath.Join(t.TempDir(), "r.wav")
	if err := os.WriteFile(path, []byte(header8+rows8(50)), 0o600); err != nil {
		t.Fatal(err)
	}
	// The name says WAV, the content CSV.
	s, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var b acquire.Block
	if err := s.Read(ctx, &b); err != context.Canceled {
		t.Error(err)
	}
	if err := s.Read(context.Background(), &b); err != nil || b.Rows(8) != 50 {
		t.Error(err)
	}
	if err := s.Close(); err != nil {
		t.Error(err)
	}
	if err := s.Read(context.Background(), &b); err == nil || err == io.EOF {
		t.Error(err)
	}
	if err := s.Close(); err != nil {
		t.Error(err)
	}
}
