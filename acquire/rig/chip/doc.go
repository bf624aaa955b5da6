// Package chip is a simulated ADS131M08, the eight-channel 24-bit
// delta-sigma converter, built register by register from its data sheet
// (SBAS950B). A Chip is an spi.PortCloser: a driver talks to it as to the
// real part, and whatever the part would refuse is refused here.
//
// Simulated: frames of 16, 24 and 32 bit words, every command with its
// response one frame later, both check sums, the register map with reset
// values and write masks, locking, standby, gain, clipping, over-sampling,
// channel enables, input multiplexer, offset and gain calibration, DC block,
// the decimation filter, the input noise of table 7-1, the two samples deep
// output with its data-ready bits, and the data-ready line.
//
// Only held as registers, without effect: channel phase shift, current
// detection, global chop, power mode, external voltage reference.
//
// Time is virtual. It moves when the host waits for the data-ready line and
// while a frame is clocked; SetSpeed ties it to the wall clock.
package chip
