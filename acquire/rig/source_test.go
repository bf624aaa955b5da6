package rig

import (
	"context"
	"errors"
	"testing"
	"time"

	"heavyspot/acquire"
)

var _ acquire.Source = (*Source)(nil)

func TestSourceTellsWhatItLost(t *testing.T) {
	at := time.Date(2026, 3, 1, 6, 30, 0, 0, time.UTC)
	src, err := NewSource(quietPhasors(t, Sensor{VoltsPerG: 1}), Sampling{
		RateHz: 1000, Smooth: 3, Duration: 3 * time.Second, BlockRows: 400, Start: at,
		Losses: []Loss{{First: 0, Rows: 10, Cause: acquire.Late}, {First: 900, Rows: 100, Misjudged: -2, Cause: acquire.BadCheck}, {First: 2990, Rows: 50, Cause: acquire.Late}},
	})
	if err != nil {
		t.Fatal(err)
	}
	whole, _ := record(t, quietPhasors(t, Sensor{VoltsPerG: 1}), Sampling{RateHz: 1000, Smooth: 3, Duration: 3 * time.Second}, 1)
	next, shift := int64(0), int64(0)
	gaps := []acquire.Gap{}
	for _, b := range collect(t, src) {
		if b.Gap != (acquire.Gap{}) {
			gaps = append(gaps, b.Gap)
			if !b.Gap.Exact {
				shift -= 2
			}
		}
		if b.First != next+b.Gap.Lost {
			t.Errorf("block starts at row %d after %d and a gap of %d", b.First, next, b.Gap.Lost)
		}
		next = b.First + int64(b.Rows(8))
		if want := at.Add(time.Duration(b.First-shift) * time.Millisecond); !b.Time.Equal(want) || !b.ClockSet {
			t.Errorf("row %d has time %v, want %v", b.First, b.Time, want)
		}
		for i := range b.Rows(8) {
			if want := float32(whole[b.First-shift+int64(i)]); b.Volts[i*8+1] != want {
				t.Fatalf("row %d carries %g V, want %g", b.First+int64(i), b.Volts[i*8+1], want)
			}
		}
	}
	if len(gaps) != 2 || gaps[0] != (acquire.Gap{Lost: 10, Exact: true, Cause: acquire.Late}) || gaps[1] != (acquire.Gap{Lost: 98, Cause: acquire.BadCheck}) {
		t.Errorf("gaps are %+v", gaps)
	}
}

func TestSourceStopsWithItsContext(t *testing.T) {
	src, err := NewSource(quietPhasors(t, Sensor{VoltsPerG: 1}), Sampling{RateHz: 1000})
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(context.Background())
	var b acquire.Block
	if err := src.Read(ctx, &b); err != nil || b.ClockSet || !b.Time.IsZero() {
		t.Fatalf("endless source without a start: %v, time %v", err, b.Time)
	}
	stop()
	if err := src.Read(ctx, &b); !errors.Is(err, context.Canceled) {
		t.Errorf("after the end of the context: %v", err)
	}
	if err := src.Close(); err != nil {
		t.Error(err)
	}
}

func TestSourceRefuses(t *testing.T) {
	for _, s := range []Sampling{
		{RateHz: 0}, {RateHz: -1}, {RateHz: 3000}, {RateHz: 16000}, {RateHz: 1000, Smooth: 4}, {RateHz: 1000, Smooth: -1},
		{RateHz: 1000, Losses: []Loss{{First: 5, Rows: 0}}},
		{RateHz: 1000, Losses: []Loss{{First: 5, Rows: 5}, {First: 10, Rows: 1}}},
	} {
		if _, err := NewSource(quietPhasors(t, Sensor{VoltsPerG: 1}), s); err == nil {
			t.Errorf("%+v: want an error", s)
		}
	}
}
