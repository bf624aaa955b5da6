package dsp

// Config is what the signal path has to know of the machine and its sensors.
type Config struct {
	// RateHz is the sample rate of each channel, Hz.
	RateHz float64
	// Channels is the number of channels in a row of samples.
	Channels int
	// Gain is the amplitude response of the converter's filter at a frequency
	// in Hz; nil means none to correct.
	Gain func(hz float64) float64
	// RatedRPM is the machine's rated speed, r/min, used only to know which
	// line is 1x when there is no reference; 0 means unknown.
	RatedRPM float64
	// Reference is the phase reference; nil when the machine has none.
	Reference *Reference
	// Points are the measuring points, in the order of the readings.
	Points []Point
}

// Reference describes the once-per-turn pulse.
type Reference struct {
	// Channel is its channel, counted from 0.
	Channel int
	// Falling is true when the leading edge falls.
	Falling bool
	// ThresholdV is the level that the leading edge crosses, volts.
	ThresholdV float64
	// HysteresisV is how far the signal must fall back behind the threshold
	// before the next edge counts, volts.
	HysteresisV float64
}

// Point describes a measuring point's sensor chain.
type Point struct {
	// Name is the point's name.
	Name string
	// Channel is its channel, counted from 0.
	Channel int
	// VoltsPerG is the sensitivity, volts per standard gravity (9.80665 m/s2).
	VoltsPerG float64
	// Inverted is true when the sensor's positive direction is opposite to the
	// machine's.
	Inverted bool
	// HighpassHz is the corner of the chain's first-order high pass, Hz,
	// corrected in amplitude and phase; 0 means none.
	HighpassHz float64
	// FullScaleV is the voltage at which the chain saturates, either way from
	// zero, volts; 0 means unknown, and only flat tops tell of clipping.
	FullScaleV float64
}
