// Package alarm turns minute readings and findings into alarms that come and
// clear. An alarm comes when its cause has been present for a set number of
// minutes and clears when the cause has been away, by more than a deadband, for
// a set number of minutes (on-delay, deadband and off-delay in the sense of
// IEC 62682 and ANSI/ISA-18.2).
//
// What depends on the machine running steadily holds its state while the
// machine is stopped or changes its speed: a stopped fan does not vibrate, which
// says nothing about its balance, and one that runs up passes its resonances.
//
// Nothing here reads a clock; all times are those of the minutes.
package alarm
