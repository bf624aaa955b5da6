package mqtt

import (
	"syscall"
	"time"

	"golang.org/x/sys/unix"
)

// userTimeout makes the kernel give up a connection on which sent data stay
// unacknowledged for that long; without it a half-open connection would be
// noticed after a quarter of an hour.
func userTimeout(d time.Duration) func(network, address string, c syscall.RawConn) error {
	return func(_, _ string, c syscall.RawConn) error {
		var err error
		if e := c.Control(func(fd uintptr) {
			err = unix.SetsockoptInt(int(fd), unix.IPPROTO_TCP, unix.TCP_USER_TIMEOUT, int(d.Milliseconds()))
		}); e != nil {
			return e
		}
		return err
	}
}
