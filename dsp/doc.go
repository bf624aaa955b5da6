// Package dsp turns blocks of samples into minute readings: it finds the turns
// of the shaft from the phase reference, fits the vectors of orders 1 to 3 of
// every point on the shaft angle, measures the overall velocity in the band of
// the standards, and states how good each figure is.
//
// A vector is the amplitude (mm/s rms) and the phase lag (degrees, 0 <= lag <
// 360) of the velocity of the bearing housing in the machine's positive
// directions:
//
//	v_n(t) = sqrt(2) * A_n * cos(n*theta(t) - lag_n)
//
// with theta = 0 at the edge of the phase-reference pulse.
//
// Nothing here reads a clock: the sample index is the only time.
package dsp
