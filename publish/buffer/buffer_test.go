package buffer

import (
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"
	"time"

	"go.etcd.io/bbolt"

	"heavyspot/dsp"
	"heavyspot/publish"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

var start = time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC)

// minute returns a minute of usual size, n minutes after start.
func minute(n int) *publish.Minute {
	m := dsp.Minute{
		Start: start.Add(time.Duration(n) * time.Minute), ClockSet: true, Seconds: 60, Coverage: 1,
		Speed: dsp.Speed{State: dsp.Steady, Mean: 988.4, Min: 987, Max: 989, Turns: 988, Reference: dsp.ReferenceGood},
	}
	for i, p := range []string{"de-v", "de-h", "de-a", "nde-v", "nde-h", "nde-a"} {
		rng := rand.New(rand.NewPCG(uint64(n), uint64(i)))
		r := dsp.PointReading{Name: p, State: dsp.PointGood, Overall: 3 + rng.Float64(), Share: 0.9 - rng.Float64()/10, Wander: rng.Float64()}
		for o := range r.Order {
			r.Order[o] = dsp.Vector{RMS: (3 + rng.Float64()) / float64(o+1), Lag: float64(40*i) + rng.Float64(), RMSSD: rng.Float64() / 50, LagSD: rng.Float64()}
		}
		m.Points = append(m.Points, r)
	}
	return publish.MinuteMessage(&m)
}

func finding(n int) *publish.Finding {
	f := rules.Finding{Start: start.Add(time.Duration(n) * time.Minute), Verdict: rules.StaticUnbalance, Advice: "balance"}
	rng := rand.New(rand.NewPCG(uint64(n), 7))
	for i := range 6 {
		f.Evidence = append(f.Evidence, rules.Evidence{Test: fmt.Sprintf("test-%d", i), Measured: rng.Float64() * 180, SD: rng.Float64(), Unit: "deg", Expected: "30 to 150", Holds: true, Margin: rng.Float64() * 60})
	}
	return publish.FindingMessage(&f)
}

func alarmMessage(n int, point string, s alarm.State) *publish.Alarm {
	at := start.Add(time.Duration(n) * time.Minute)
	return publish.AlarmMessage(&alarm.Event{Alarm: alarm.HighOverall, Point: point, State: s, Time: at, Since: at, Unit: "mm/s rms", Text: "high"})
}

func tick(n int) *Tick { return &Tick{Messages: []publish.Message{minute(n), finding(n)}} }

// opened opens a buffer and checks the file at the end of the test, with our
// check and with bbolt's own.
func opened(t *testing.T, path string, opt Options) *Buffer {
	t.Helper()
	b, err := Open(path, opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := b.Close(); err != nil {
			t.Errorf("close: %v", err)
		}
		consistent(t, path)
	})
	return b
}

func consistent(t *testing.T, path string) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		t.Fatal(err)
	}
	if err := check(f, info.Size()); err != nil {
		t.Errorf("our check: %v", err)
	}
	db, err := bbolt.Open(path, 0o640, &bbolt.Options{Timeout: time.Second, ReadOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	if err := db.View(func(tx *bbolt.Tx) error {
		var errs []error
		for err := range tx.Check() {
			errs = append(errs, err)
		}
		return errors.Join(errs...)
	}); err != nil {
		t.Errorf("bbolt's check: %v", err)
	}
}

func file(t testing.TB) string { return filepath.Join(t.TempDir(), "heavyspot.db") }

func mustStore(t testing.TB, b *Buffer, ticks ...*Tick) {
	t.Helper()
	for _, k := range ticks {
		if err := b.Store(k); err != nil {
			t.Fatal(err)
		}
	}
}

func sequences(records []Record) []uint64 {
	var out []uint64
	for _, r := range records {
		out = append(out, r.Sequence)
	}
	return out
}

func TestSequenceGoesOnOverRestarts(t *testing.T) {
	path := file(t)
	want := uint64(0)
	for boot := uint64(1); boot <= 3; boot++ {
		b, err := Open(path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if got := b.Opened(); got.Boot != boot || got.Sequence != want || got.SetAside != "" {
			t.Errorf("start %d: %+v, want sequence %d", boot, got, want)
		}
		for i := range 5 {
			k := tick(int(boot)*10 + i)
			mustStore(t, b, k)
			for _, m := range k.Messages {
				want++
				if h := m.Head(); h.Sequence != want || h.Boot != boot {
					t.Errorf("sequence %d boot %d, want %d and %d", h.Sequence, h.Boot, want, boot)
				}
			}
		}
		if err := b.Close(); err != nil {
			t.Fatal(err)
		}
		consistent(t, path)
	}
	b := opened(t, path, Options{})
	pending, err := b.Pending(0, 1000)
	if err != nil {
		t.Fatal(err)
	}
	for i, r := range pending {
		if r.Sequence != uint64(i+1) {
			t.Fatalf("pending %v", sequences(pending))
		}
	}
	if len(pending) != 30 || b.Waiting() != 30 {
		t.Errorf("%d pending, %d waiting, want 30", len(pending), b.Waiting())
	}
}
