package main

import (
	"context"
	"io"
	"log/slog"
	"sync"

	"github.com/coreos/go-systemd/v22/journal"
)

// The keys of log records; a key of a quantity carries its unit.
const (
	keyError    = "error"
	keyVersion  = "version"
	keyConfig   = "config"
	keyMachine  = "machine"
	keySource   = "source"
	keyBuffer   = "buffer"
	keyBroker   = "broker"
	keyBoot     = "boot"
	keySequence = "sequence"
	keyWaiting  = "waiting_messages"
	keyLost     = "lost_rows"
	keyRow      = "row"
	keyCause    = "cause"
	keyVerdict  = "verdict"
	keyLevel    = "level"
	keyWorst    = "worst_mm_s_rms"
	keyPoint    = "point"
	keyAlarm    = "alarm"
	keyState    = "state"
	keySpeed    = "speed_rpm"
	keySet      = "clock_set"
)

// newLog returns the program's log on w. For the journal, which dates records
// itself, each begins with its priority instead of the time (sd-daemon(3)).
func newLog(w io.Writer) *slog.Logger {
	if ok, err := journal.StderrIsJournalStream(); err != nil || !ok {
		return slog.New(slog.NewTextHandler(w, nil))
	}
	p := &prioritised{out: w}
	p.Handler = slog.NewTextHandler(p, &slog.HandlerOptions{ReplaceAttr: func(groups []string, a slog.Attr) slog.Attr {
		if len(groups) == 0 && (a.Key == slog.TimeKey || a.Key == slog.LevelKey) {
			return slog.Attr{}
		}
		return a
	}})
	return slog.New(p)
}

// prioritised puts the priority ahead of each record of its handler.
type prioritised struct {
	slog.Handler
	mu    sync.Mutex
	out   io.Writer
	level slog.Level
}

// Handle implements slog.Handler.
func (p *prioritised) Handle(ctx context.Context, r slog.Record) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.level = r.Level
	return p.Handler.Handle(ctx, r)
}

// Write takes one record from the handler.
func (p *prioritised) Write(record []byte) (int, error) {
	priority := "<6>" // info
	switch {
	case p.level >= slog.LevelError:
		priority = "<3>"
	case p.level >= slog.LevelWarn:
		priority = "<4>"
	case p.level < slog.LevelInfo:
		priority = "<7>"
	}
	if _, err := p.out.Write(append([]byte(priority), record...)); err != nil {
		return 0, err
	}
	return len(record), nil
}
