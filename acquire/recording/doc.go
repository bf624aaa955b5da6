// Package recording reads and writes recordings of converter voltages.
//
// Open gives a CSV or WAV file as an [acquire.Source]; NewCSVWriter and
// NewWAVWriter write the blocks of any source. What is written is read back to
// the last bit.
//
// A CSV recording has one header line. Column t_s is seconds from the start in
// uniform steps; columns ch0, ch1 ... are volts at the converter's input.
// Two further columns are understood when they hold what the writer puts
// there, and ignored otherwise: time, the wall time (RFC 3339) of a row, which
// may be empty, and gap, the cause of a hole ahead of a row. All other columns
// are ignored.
//
// A WAV recording has one track per channel. Its wall time is kept in the
// LIST/INFO chunk as creation date (ICRD), to the nanosecond.
//
// A hole in t_s of a whole number of steps becomes an [acquire.Gap]. Everything
// else that is wrong with a file is an [*Error] which names the place; the rows
// ahead of that place are delivered first.
package recording
