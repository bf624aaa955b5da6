package rig

import "testing"

// BenchmarkNext simulates one second of the fan with noise, at 8 channels and
// 8000 steps per second; real time divided by ns/op is the speed-up.
func BenchmarkNext(b *testing.B) {
	c := fan()
	c.Unbalances = []Unbalance{{KgM: 0.08, PositionM: 0.7}}
	c.Drive.LoadWander, c.Drive.WanderS = 0.1, 10
	c.Faults.Flow.ForceN = 100
	for i := range c.Sensors {
		c.Sensors[i].NoiseV = 1e-6
		c.Sensors[i].HighpassHz = 0.5
	}
	c.Reference.NoiseV, c.Reference.JitterDeg = 1e-5, 0.02
	m, err := New(c, 1)
	if err != nil {
		b.Fatal(err)
	}
	dst := make([]float32, m.Channels())
	b.ReportAllocs()
	for b.Loop() {
		for range 8000 {
			m.Next(dst)
		}
	}
}
