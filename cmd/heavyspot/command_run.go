package main

import (
	"context"
	"errors"
	"log/slog"
	"runtime/debug"

	"heavyspot/acquire"
	"heavyspot/acquire/ads131m08"
	"heavyspot/config"
	"heavyspot/rules/alarm"
)

// memoryLimit is what the Go runtime tries to keep under, bytes: the daemon is
// to stay below 64 MiB resident on a board with 512, and the buffer's file is
// mapped beside that.
const memoryLimit = 48 << 20

// runCommand is the daemon.
type runCommand struct {
	Config string `short:"c" required:"" placeholder:"FILE" help:"Configuration of the machine."`
}

// Run watches until the context ends or something breaks that only a new start
// can mend.
func (c *runCommand) Run(env *environment) error {
	cfg, err := loadConfig(c.Config)
	if err != nil {
		return err
	}
	if err := cfg.CheckSource(); err != nil {
		return usageError{err}
	}
	if err := checkFiles(cfg); err != nil {
		return usageError{err}
	}
	debug.SetMemoryLimit(memoryLimit)
	log := newLog(env.talk)
	log.Info("Starting", keyVersion, version(), keyConfig, c.Config, keyMachine, cfg.Machine.Site+"/"+cfg.Machine.Name, keySource, cfg.Source.Driver)
	d, err := newWatch(cfg, log)
	if err != nil {
		return err
	}
	err = d.run(env.ctx)
	err = errors.Join(err, d.close())
	log.Info("Stopped")
	return err
}

// watch is all that runs while a machine is watched.
type watch struct {
	log      *slog.Logger
	src      acquire.Source
	pipeline *pipeline
	delivery *delivery
	faults   *faultLog
	report   *reporter
	service  *service
}

// newWatch opens everything; on an error nothing stays open.
func newWatch(cfg *config.Config, log *slog.Logger) (*watch, error) {
	alarms, err := alarm.New(cfg.Alarms())
	if err != nil {
		return nil, usageError{err}
	}
	d := &watch{log: log, faults: newFaultLog(log)}
	// The buffer first: to check it can take longer than the source can wait.
	if d.delivery, err = openDelivery(cfg, alarms, log); err != nil {
		d.faults.close()
		return nil, err
	}
	if d.src, err = openSource(cfg, d.faults.take); err != nil {
		return nil, errors.Join(err, d.close())
	}
	d.service = newService()
	d.report = &reporter{log: log, publisher: d.delivery.publisher, service: d.service}
	if d.pipeline, err = newPipeline(cfg, d.src.Format(), true, alarms, d.delivery, d.report); err != nil {
		return nil, errors.Join(usageError{err}, d.close())
	}
	d.pipeline.onBlock = d.block
	return d, nil
}

// block is told each block after it has passed.
func (d *watch) block(b *acquire.Block) {
	d.service.progress()
	d.report.block(b)
}

// run runs the pipeline until ctx ends.
func (d *watch) run(ctx context.Context) error {
	d.delivery.start()
	stop := d.report.watchLink()
	defer stop()
	d.service.ready(d.log)
	defer d.service.stopping()
	return d.pipeline.run(ctx, d.src)
}

// close closes what is open: the source first, so that nothing is added to what
// is being delivered.
func (d *watch) close() error {
	var err error
	if d.src != nil {
		err = d.src.Close()
	}
	d.faults.close()
	return errors.Join(err, d.delivery.close())
}

// faultLog takes the source's fault reports, which may not wait, and logs them
// from a goroutine of its own.
type faultLog struct {
	log    *slog.Logger
	faults chan ads131m08.Fault
	done   chan struct{}
}

func newFaultLog(log *slog.Logger) *faultLog {
	f := &faultLog{log: log, faults: make(chan ads131m08.Fault, 64), done: make(chan struct{})}
	go func() {
		defer close(f.done)
		for fault := range f.faults {
			f.write(fault)
		}
	}()
	return f
}

// take drops reports that the log cannot keep up with; the gaps tell of them.
func (f *faultLog) take(fault ads131m08.Fault) {
	select {
	case f.faults <- fault:
	default:
	}
}

func (f *faultLog) write(fault ads131m08.Fault) {
	if fault.Over {
		f.log.Info("Samples arrive again", keyCause, fault.Cause, keyRow, fault.Row)
		return
	}
	f.log.Warn("Samples fail to arrive", keyCause, fault.Cause, keyRow, fault.Row, keyError, fault.Err)
}

// close must be called after the source was closed.
func (f *faultLog) close() {
	close(f.faults)
	<-f.done
}
