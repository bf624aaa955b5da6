// Package ads131m08 reads an ADS131M08, an eight-channel 24-bit converter, over
// SPI and a data-ready line, as an acquire.Source.
//
// Open resets the chip, sets it up, reads every register back, lets it settle
// and measures its rate against the time of the data-ready edges. From then on
// one goroutine reads a frame for each conversion. Every frame's check sum and
// status are checked. The chip has no sample counter and holds two samples
// only, so a row's index is counted from frame to frame and proved by the time
// of the edges; what was lost is told by the Gap of the next block and never
// bridged. After faults the source finds its place again, or resets the chip
// and sets it up anew, for as long as it takes.
//
// Section and table numbers in this package are those of the data sheet,
// SBAS950B.
package ads131m08
