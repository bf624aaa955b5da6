package main

import (
	"os"

	"golang.org/x/sys/unix"
)

// wallClockSet says whether the wall clock can be believed: it is kept by a
// time server, or was set from a battery clock at boot.
func wallClockSet() bool {
	var t unix.Timex
	if _, err := unix.Adjtimex(&t); err == nil && t.Status&unix.STA_UNSYNC == 0 {
		return true
	}
	// The mark of systemd-timesyncd, for where the call above is not allowed.
	if _, err := os.Stat("/run/systemd/timesync/synchronized"); err == nil {
		return true
	}
	b, err := os.ReadFile("/sys/class/rtc/rtc0/hctosys")
	return err == nil && len(b) > 0 && b[0] == '1'
}

// hurry asks for real-time scheduling of the calling thread, below the kernel's
// own interrupt threads (priority 50). Where it is refused sampling goes on
// without; rows that are then lost show as gaps.
func hurry() {
	const priority = 40
	unix.SchedSetAttr(0, &unix.SchedAttr{Size: unix.SizeofSchedAttr, Policy: unix.SCHED_FIFO, Priority: priority}, 0)
}

// freeBytes returns how many bytes an ordinary user may still write in a
// folder's file system; false when that is not known.
func freeBytes(folder string) (int64, bool) {
	var s unix.Statfs_t
	if err := unix.Statfs(folder, &s); err != nil {
		return 0, false
	}
	return int64(s.Bavail) * int64(s.Bsize), true
}
