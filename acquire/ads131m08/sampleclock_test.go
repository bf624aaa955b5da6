package ads131m08

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// TestFit: period and place of edges of which one in fifteen wakes the process
// up to three periods late. Those that come meanwhile are told as one.
func TestFit(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		seed := rapid.Uint64().Draw(t, "seed")
		rate := rapid.SampledFrom([]float64{250, 1000, 4000, 32000}).Draw(t, "rate")
		ppm := rapid.Float64Range(-3000, 3000).Draw(t, "ppm")
		rnd := rand.New(rand.NewPCG(seed, 0))
		period := 1e9 / rate * (1 + ppm*1e-6)
		n := (&Config{RateHz: rate}).measureEdges()
		var times []time.Duration
		for row := 0.0; len(times) < n; row++ {
			late := rnd.ExpFloat64() * 0.02
			if rnd.IntN(15) == 0 {
				late += 3 * rnd.Float64()
			}
			times = append(times, time.Duration(1e9+(row+late)*period))
			row += math.Floor(late)
		}
		k := fit(times, 1e9/rate)
		if d := k.period/period - 1; math.Abs(d) > 0.1/float64(n) {
			t.Fatalf("period off by %.3g of it over %d edges", d, n)
		}
		place := (k.time - 1e9) / period
		if d := place - math.Round(place); d < -0.05 || d > 0.1 {
			t.Fatalf("place off by %.3f periods", d)
		}
	})
}

// TestClockFollows: the clock learns period and place, holds them over a gap,
// and knows for how long it can.
func TestClockFollows(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	const period = 1e6 * (1 + 80e-6)
	noise := func() float64 { return rnd.NormFloat64() * 20e3 }
	var times []time.Duration
	for i := range 50 {
		times = append(times, time.Duration(float64(i)*period+noise()))
	}
	k := fit(times, 1e6)
	k.row = 49
	if k.exact(1_000_000) {
		t.Error("fifty edges must not be trusted for a million rows")
	}
	for i := int64(50); i < 20_000; i++ {
		k.update(i, time.Duration(float64(i)*period+noise()))
	}
	if d := k.period/period - 1; math.Abs(d) > 0.2e-6 {
		t.Errorf("period off by %.2g", d)
	}
	if !k.exact(1000) || k.exact(1_000_000) {
		t.Errorf("exact over 1000 rows %v, over a million %v", k.exact(1000), k.exact(1_000_000))
	}
	for _, i := range []int64{20_000, 25_000, 40_000} {
		if got := k.nearest(time.Duration(float64(i) * period)); got != i {
			t.Errorf("row %d taken for %d", i, got)
		}
	}
	if k.update(20_000, time.Duration(20_000*period+0.3*period)) {
		t.Error("an edge 0.3 periods late was learnt from")
	}
	before := k
	k.update(20_000, time.Duration(20_000*period+0.1*period))
	if d := k.at(20_000) - before.at(20_000); d < 0 || d > 0.001*period {
		t.Errorf("one edge moved the clock by %v ns", d)
	}
}
