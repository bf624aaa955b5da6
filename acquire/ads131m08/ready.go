package ads131m08

import "time"

// DataReady is the chip's data-ready line, active low, and the clock that its
// edges are timed with.
type DataReady interface {
	// Wait waits for a falling edge, at most for timeout, which is positive.
	// An edge that came since the last Wait counts at once; of several the
	// latest should be told. mono is the time of the edge on the clock of
	// Now, as near to the edge as can be had; ready is false when there was
	// none, which is not an error.
	Wait(timeout time.Duration) (mono time.Duration, ready bool, err error)
	// Now returns the time on a clock which never jumps.
	Now() time.Duration
}
