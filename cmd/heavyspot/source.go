package main

import (
	"errors"
	"fmt"
	"time"

	"periph.io/x/conn/v3/gpio/gpioreg"
	"periph.io/x/conn/v3/spi"
	"periph.io/x/conn/v3/spi/spireg"
	"periph.io/x/host/v3"

	"heavyspot/acquire"
	"heavyspot/acquire/ads131m08"
	"heavyspot/acquire/rig"
	"heavyspot/acquire/rig/chip"
	"heavyspot/config"
)

// liveSource is a source with what lies under it.
type liveSource struct {
	acquire.Source
	// under is closed after the source, in order.
	under []func() error
}

// Close closes the source and what lies under it.
func (s *liveSource) Close() error {
	err := s.Source.Close()
	for _, f := range s.under {
		err = errors.Join(err, f())
	}
	return err
}

// openSource opens the configured source. onFault is told of outages; it is
// called on the sampling goroutine and must return at once.
func openSource(cfg *config.Config, onFault func(ads131m08.Fault)) (acquire.Source, error) {
	dc := cfg.ADS131M08()
	dc.OnFault = onFault
	switch cfg.Source.Driver {
	case config.DriverADS131M08:
		return openConverter(cfg, dc)
	case config.DriverRig:
		m, err := newRig(cfg)
		if err != nil {
			return nil, err
		}
		src, c, err := openChip(m, dc, cfg.Rig.SpeedUp, uint64(cfg.Rig.Seed), time.Now())
		if err != nil {
			return nil, err
		}
		return &liveSource{src, []func() error{c.Close}}, nil
	}
	return nil, fmt.Errorf("cannot open source: there is no driver %q", cfg.Source.Driver)
}

// openConverter opens the converter on the board's SPI port.
func openConverter(cfg *config.Config, dc ads131m08.Config) (acquire.Source, error) {
	if _, err := host.Init(); err != nil {
		return nil, fmt.Errorf("cannot learn what board this is: %w", err)
	}
	if len(spireg.All()) == 0 {
		return nil, errors.New("cannot open the SPI port (source.spi): this computer has none; switch SPI on in the board's set-up, which makes /dev/spidev*")
	}
	port, err := spireg.Open(cfg.Source.SPI)
	if err != nil {
		return nil, fmt.Errorf("cannot open the SPI port %s (source.spi): %w; is it the right one, and may this user open /dev/spidev*?", cfg.Source.SPI, err)
	}
	src, halt, err := onPort(cfg, dc, port)
	if err != nil {
		return nil, errors.Join(err, port.Close())
	}
	return &liveSource{src, []func() error{halt, port.Close}}, nil
}

// onPort opens the converter on an open port; halt gives its pin free.
func onPort(cfg *config.Config, dc ads131m08.Config, port spi.Port) (src acquire.Source, halt func() error, err error) {
	pin := gpioreg.ByName(cfg.Source.DataReady)
	if pin == nil {
		return nil, nil, fmt.Errorf("cannot find the pin %s (source.data_ready) on this board; may this user open /dev/gpiochip*?", cfg.Source.DataReady)
	}
	ready, err := ads131m08.NewPinReady(pin)
	if err != nil {
		return nil, nil, err
	}
	dc.ClockSet = wallClockSet
	dc.Thread = hurry
	s, err := ads131m08.Open(port, ready, dc)
	if err != nil {
		return nil, nil, errors.Join(err, pin.Halt())
	}
	return s, pin.Halt, nil
}

// openChip opens the converter driver on a simulated converter that stands
// before a signal and runs at speed times real time (0: as fast as it can),
// with a wall clock that stood at start when it was switched on.
func openChip(signal rig.Signal, dc ads131m08.Config, speed float64, seed uint64, start time.Time) (*ads131m08.Source, *chip.Chip, error) {
	c, err := chip.New(chip.Options{Signal: signal, ClockHz: dc.ClockHz, Seed: seed, Speed: speed})
	if err != nil {
		return nil, nil, err
	}
	dc.Now = c.Wall(start)
	dc.ClockSet = func() bool { return true }
	src, err := ads131m08.Open(c, c.DataReady(), dc)
	if err != nil {
		return nil, nil, errors.Join(err, c.Close())
	}
	return src, c, nil
}
