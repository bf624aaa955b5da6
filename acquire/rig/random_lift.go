package rig

import "math"

// lifts reports whether the loose pedestal makes itself felt: a machine that
// hardly lifts is one with an unbalance and nothing else that could be seen.
// The machine is run in time without noise, because the steady response is
// linear.
func (d *draw) lifts() bool {
	c := d.c.clone()
	l := c.Faults.Looseness
	c.Faults.Flow, c.Faults.Neighbours = Flow{}, nil
	c.Faults.Looseness.Unsteady = 0
	c.Drive.LoadWander = 0
	c.Reference = nil
	c.StepHz = 4000
	c.Sensors = []Sensor{{Name: "v", End: l.End, Direction: Vertical, VoltsPerG: 1}}
	c.Channels = 1
	m, err := New(c, 1)
	if err != nil {
		return false
	}
	const settleTurns, turns = 12, 16
	steps := int(turns * 60 / c.Drive.RPM * c.StepHz)
	row := make([]float32, 1)
	for range int(settleTurns * 60 / c.Drive.RPM * c.StepHz) {
		m.Next(row)
	}
	var re, im [5]float64
	for i := range steps {
		m.Next(row)
		for n := 1; n < len(re); n++ {
			sin, cos := math.Sincos(float64(n) * d.omega * float64(i) / c.StepHz)
			re[n] += float64(row[0]) * cos
			im[n] += float64(row[0]) * sin
		}
	}
	harmonics := 0.0
	for n := 2; n < len(re); n++ {
		v := math.Hypot(re[n], im[n]) / float64(n) // acceleration to velocity
		harmonics += v * v
	}
	return faultRanges.harmonics.holds(math.Sqrt(harmonics) / math.Hypot(re[1], im[1]))
}
