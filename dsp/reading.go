package dsp

import "time"

// Orders is the number of orders of the turn rate that are fitted: 1x, 2x, 3x.
const Orders = 3

// SpeedState tells how the machine ran in a minute.
type SpeedState string

// The states of the speed.
const (
	Steady   SpeedState = "steady"
	Changing SpeedState = "changing"
	Stopped  SpeedState = "stopped"
)

// ReferenceState tells how good the phase reference was in a minute.
type ReferenceState string

// The states of the phase reference.
const (
	// ReferenceGood: every pulse where it was expected.
	ReferenceGood ReferenceState = "good"
	// ReferenceDoubtful: pulses were missing, extra ones were rejected, or they
	// are too narrow for the sampling.
	ReferenceDoubtful ReferenceState = "doubtful"
	// ReferenceNone: no usable pulses; the turn rate comes from the vibration.
	ReferenceNone ReferenceState = "none"
)

// PointState tells whether a point's signal can be believed.
type PointState string

// The states of a point.
const (
	PointGood    PointState = "good"
	PointClipped PointState = "clipped"
	PointFlat    PointState = "flat"
	PointOpen    PointState = "open"
	PointShort   PointState = "short"
	PointNoisy   PointState = "noisy"
)

// Vector is one order of one point's velocity over a minute.
type Vector struct {
	// RMS is the amplitude, mm/s rms.
	RMS float64
	// Lag is the phase lag, degrees of the order's own cycle, 0 <= Lag < 360.
	Lag float64
	// RMSSD and LagSD are one standard deviation of the minute's RMS (mm/s)
	// and Lag (degrees), from the scatter of the parts it was averaged from.
	RMSSD, LagSD float64
}

// PointReading is what one point showed in a minute. Order, Overall, Share and
// Wander are zero unless State is PointGood.
type PointReading struct {
	// Name is the point's name in the configuration.
	Name string
	// State says whether the signal can be believed.
	State PointState
	// Order holds the vectors of 1x, 2x and 3x.
	Order [Orders]Vector
	// Overall is the velocity in the band of the standards, mm/s rms.
	Overall float64
	// Share is (Order[0].RMS/Overall) squared, the part of the power at 1x.
	Share float64
	// Wander is the angular deviation of the 1x lag among the parts of the
	// minute, degrees, with the part that noise explains taken off; 0 means as
	// steady as can be told.
	Wander float64
}

// Line is a spectral line close to the turn rate that does not turn with the
// shaft: another machine.
type Line struct {
	// RPM is the line's frequency, r/min.
	RPM float64
	// RMS is its velocity at each point, mm/s rms, in the order of Points.
	RMS []float64
}

// Speed is what was learnt of the speed in a minute.
type Speed struct {
	State SpeedState
	// Mean, Min and Max are r/min; 0 when State is Stopped.
	Mean, Min, Max float64
	// Turns is the number of whole turns used.
	Turns     int
	Reference ReferenceState
	// Missing and Extra count the reference pulses mended and rejected.
	Missing, Extra int
}

// Minute is the reading of one minute of data.
type Minute struct {
	// First is the sample index of the minute's first row.
	First int64
	// Start is the wall time of the first row, the zero time when unknown.
	Start time.Time
	// ClockSet says whether the wall clock was set then.
	ClockSet bool
	// Seconds is the length covered, 60 except for a last part-minute.
	Seconds float64
	// Coverage is the share of the minute's samples that arrived, 0 to 1.
	Coverage float64
	Speed    Speed
	// LagFrom names the point that lags are relative to when there is no
	// usable reference; empty means lags are from the reference pulse.
	LagFrom string
	// Points holds one reading a configured point, in their order.
	Points []PointReading
	// Lines holds the neighbours found close to 1x, strongest first.
	Lines []Line
}
