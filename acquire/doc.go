// Package acquire defines what a source of samples hands to the signal path:
// a Format that holds for the whole stream and Blocks of consecutive samples.
//
// The sample index is the clock of the signal path. Every Block says the index
// of its first sample; two blocks that do not follow each other without a gap
// carry in the second what was lost and why. Wall time is attached beside the
// samples and never used to place one sample against another.
//
// Drivers and readers live below this folder: ads131m08 (converter over SPI),
// recording (CSV and WAV) and rig (a simulated machine behind simulated
// converters).
package acquire
