// Package publish holds the messages that leave the pipeline: minute readings,
// findings, alarms and the state of the link, as JSON, and the topics they go
// to. The same object goes to a broker, to standard output and into the buffer.
//
// The numbers are rounded to what a reader can use (velocity to 0.0001 mm/s,
// angles to 0.01 degree, speed to 0.001 r/min), so that the same reading always
// gives the same text. Fields may be added to a message; what stands here is
// not renamed, moved or given another unit.
//
// Packages below keep messages (buffer) and deliver them (mqtt).
package publish
