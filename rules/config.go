package rules

// Config is the geometry and the limits that a judgement rests on.
type Config struct {
	// Overhung is true for an overhung rotor, false between bearings.
	Overhung bool
	// CounterClockwise is the sense of rotation seen from the drive end.
	CounterClockwise bool
	// RatedRPM is the rated speed, r/min.
	RatedRPM float64
	// Points holds the measuring points in the order of the readings.
	Points []Point
	Limits Limits
	// QuietShare is the share of the alarm limit under which the worst 1x is
	// quiet; 0 means 0.25.
	QuietShare float64
}

// Point is a measuring point's place.
type Point struct {
	Name string
	// NonDriveEnd is false at the drive end.
	NonDriveEnd bool
	Direction   Direction
}

// Direction is a machine axis: vertical is up, horizontal is to the right seen
// from the drive end towards the non-drive end, axial is from the drive end
// towards the non-drive end.
type Direction uint8

// The directions.
const (
	Vertical Direction = iota
	Horizontal
	Axial
)

// Limits are bounds of the overall velocity, mm/s rms.
type Limits struct {
	// Standard names their source: "iso-14694", "iso-20816-3" or "own".
	Standard string
	// Acceptable is where Good ends, Alarm where Acceptable ends, Trip where
	// Alarm ends; 0 means the standard gives none and the level is not used.
	Acceptable, Alarm, Trip float64
}
