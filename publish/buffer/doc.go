// Package buffer keeps what the pipeline has found in one file: minute
// readings, findings, alarm changes, the state of the alarms, and the outbox of
// messages that a broker has not acknowledged yet.
//
// What belongs to one tick is stored in one commit, together with the deletion
// of what is too old or too much, so that the file never holds half a tick.
// Sequence numbers are part of that commit and have no gaps over restarts.
//
// The file has a fixed greatest size. When it is nearly full the oldest
// readings and findings go first; alarms go only when nothing else is left. A
// damaged file is set aside under another name and a new one begun, since
// watching the machine matters more than what was watched.
//
// Only one process can hold the file. Times come from the messages, never from
// a clock, and a clock that jumps does no harm: records are kept in the order
// of their sequence numbers.
package buffer
