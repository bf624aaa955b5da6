package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"time"

	"heavyspot/config"
	"heavyspot/publish"
	"heavyspot/publish/buffer"
	"heavyspot/publish/mqtt"
	"heavyspot/rules/alarm"
)

const day = 24 * time.Hour

// delivery is the sink of a live pipeline: it stores each tick in one commit
// and lets the outbox be delivered to a broker.
type delivery struct {
	machine *config.Machine
	alarms  *alarm.Engine
	log     *slog.Logger
	box     *buffer.Buffer
	// broker is the embedded one, nil when others are configured.
	broker    *mqtt.Broker
	publisher *mqtt.Publisher
	// onStored, if not nil, is told the messages of each tick once they are
	// stored and numbered.
	onStored func(*tick, []publish.Message)
	stop     context.CancelFunc
	done     chan struct{}
	// failing is true while ticks cannot be stored.
	failing bool
}

// openDelivery opens the buffer, takes over the alarms' state from it and
// starts the embedded broker; start begins to deliver.
func openDelivery(cfg *config.Config, alarms *alarm.Engine, log *slog.Logger) (*delivery, error) {
	d := &delivery{machine: &cfg.Machine, alarms: alarms, log: log}
	var err error
	if d.box, err = buffer.Open(cfg.BufferPath(), bufferOptions(cfg)); err != nil {
		if errors.Is(err, buffer.ErrHeld) {
			err = fmt.Errorf("%w; does heavyspot run already for this machine?", err)
		}
		return nil, err
	}
	d.restore(cfg.BufferPath())
	mc := mqttConfig(cfg)
	if len(mc.Brokers) == 0 {
		if d.broker, err = mqtt.StartBroker(cfg.MQTT.EmbeddedListen, nil); err != nil {
			return nil, errors.Join(fmt.Errorf("%w; choose another mqtt.embedded_listen, or name a broker in mqtt.brokers", err), d.box.Close())
		}
		mc.Brokers = []string{d.broker.URL()}
	}
	if d.publisher, err = mqtt.New(mc, d.box); err != nil {
		return nil, errors.Join(err, d.close())
	}
	return d, nil
}

// restore takes over where the last run ended.
func (d *delivery) restore(path string) {
	o := d.box.Opened()
	if o.SetAside != "" {
		d.log.Error("The buffer was damaged and has been set aside", keyBuffer, o.SetAside, keyCause, o.Why)
	}
	d.log.Info("Buffer opened", keyBuffer, path, keyBoot, o.Boot, keySequence, o.Sequence, keyWaiting, d.box.Waiting())
	state, err := d.box.AlarmState()
	if err == nil && state != nil {
		err = d.alarms.Restore(state)
	}
	if err != nil {
		d.log.Error("The state of the alarms is lost; they begin as normal", keyError, err)
	}
}

// start begins to deliver.
func (d *delivery) start() {
	ctx, stop := context.WithCancel(context.Background())
	d.stop, d.done = stop, make(chan struct{})
	go func() {
		defer close(d.done)
		d.publisher.Run(ctx)
	}()
}

// take implements sink. A tick that cannot be stored is logged and given up,
// since watching goes on; a damaged file is an error, because opening it anew
// sets it aside.
func (d *delivery) take(t *tick) error {
	state, err := d.alarms.State()
	if err != nil {
		return err
	}
	list := t.messages(d.machine)
	err = d.box.Store(&buffer.Tick{Messages: list, AlarmState: state})
	switch {
	case errors.Is(err, buffer.ErrDamaged):
		return err
	case err != nil:
		if !d.failing {
			d.log.Error("Readings cannot be stored; look at the card and its free space", keyError, err)
		}
		d.failing = true
		return nil
	case d.failing:
		d.failing = false
		d.log.Info("Readings are stored again")
	}
	if d.onStored != nil {
		d.onStored(t, list)
	}
	return nil
}

// close lets the publisher say good-bye and closes broker and buffer.
func (d *delivery) close() error {
	if d.stop != nil {
		d.stop()
		<-d.done
		d.stop = nil
	}
	var err error
	if d.broker != nil {
		err = d.broker.Close()
	}
	return errors.Join(err, d.box.Close())
}

func bufferOptions(cfg *config.Config) buffer.Options {
	findings := time.Duration(cfg.Buffer.FindingsKeepDays) * day
	return buffer.Options{
		MaxSize:      int64(cfg.Buffer.MaxMB) << 20,
		KeepMinutes:  time.Duration(cfg.Buffer.KeepDays) * day,
		KeepFindings: findings,
		KeepAlarms:   findings,
	}
}

func mqttConfig(cfg *config.Config) mqtt.Config {
	m := &cfg.MQTT
	return mqtt.Config{
		Brokers: m.Brokers, ClientID: m.ClientID,
		Root: m.Root, Site: cfg.Machine.Site, Machine: cfg.Machine.Name,
		User: m.User, PasswordFile: cfg.FilePath(m.PasswordFile),
		CAFile: cfg.FilePath(m.CAFile), CertFile: cfg.FilePath(m.CertFile), KeyFile: cfg.FilePath(m.KeyFile),
		AllowPlainPassword: m.AllowPlainPassword,
		Keepalive:          time.Duration(m.KeepaliveS) * time.Second, InFlight: m.InFlight,
	}
}
