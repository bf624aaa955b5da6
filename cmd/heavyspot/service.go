package main

import (
	"log/slog"
	"sync/atomic"
	"time"

	"github.com/coreos/go-systemd/v22/daemon"
)

// service talks to the service manager, if there is one: ready, stopping, a
// line of status, and the watchdog's signs of life, which stop when no blocks
// pass the pipeline any more.
type service struct {
	blocks atomic.Int64
	quit   chan struct{}
	done   chan struct{}
}

func newService() *service {
	return &service{quit: make(chan struct{}), done: make(chan struct{})}
}

// notify sends a state; without a service manager it does nothing.
func notify(state string) error {
	// false: the variable must stay for the next one.
	_, err := daemon.SdNotify(false, state)
	return err
}

// ready tells that all is open and blocks are awaited, and starts the signs of
// life.
func (s *service) ready(log *slog.Logger) {
	if err := notify(daemon.SdNotifyReady); err != nil {
		log.Warn("The service manager cannot be told", keyError, err)
	}
	period, err := daemon.SdWatchdogEnabled(false)
	if err != nil {
		log.Warn("The service manager's watchdog is misconfigured", keyError, err)
	}
	if period <= 0 {
		close(s.done)
		return
	}
	go s.live(period/2, s.blocks.Load())
}

// live gives a sign of life each period in which a block has passed; last is how
// many had when it was started.
func (s *service) live(period time.Duration, last int64) {
	defer close(s.done)
	tick := time.NewTicker(period)
	defer tick.Stop()
	for {
		select {
		case <-s.quit:
			return
		case <-tick.C:
		}
		if now := s.blocks.Load(); now != last {
			last = now
			notify(daemon.SdNotifyWatchdog)
		}
	}
}

// progress counts a block that has passed the pipeline.
func (s *service) progress() { s.blocks.Add(1) }

// status sets the line of status.
func (s *service) status(line string) { notify("STATUS=" + line) }

// stopping tells that the end has begun; it must be called once, after ready.
func (s *service) stopping() {
	close(s.quit)
	<-s.done
	notify(daemon.SdNotifyStopping)
}
