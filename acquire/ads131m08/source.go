package ads131m08

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"heavyspot/acquire"

	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
)

// Source is a converter that is set up and samples. It implements
// acquire.Source.
type Source struct {
	cfg     Config
	bus     *bus
	ready   DataReady
	decoder *Decoder
	wire    time.Duration // least time of a frame
	nominal float64       // sample period, ns
	delay   time.Duration // of the decimation filter

	// Owned by the sampling goroutine.
	clock   sampleClock
	next    int64         // index of the next row
	edge    int64         // row of the latest edge seen
	edgeAt  time.Duration // its time
	unseen  int           // rows since an edge was seen in its place
	badEdge int           // edges out of place in a row
	row     [MaxChannels]float32
	block   *acquire.Block // being filled, nil for none
	gap     acquire.Gap    // ahead of the next block
	outset  outset
	size    int // values in a full block

	// Between the goroutine and the reader.
	full  chan *acquire.Block
	free  chan *acquire.Block
	done  chan struct{} // closed by Close
	ended chan struct{} // closed when the goroutine is gone
	close sync.Once

	mu     sync.Mutex
	faults Faults
}

var _ acquire.Source = (*Source)(nil)

// Open connects to the converter on port, sets it up, measures its rate and
// starts sampling. port is connected once, in mode 1; ready is its data-ready
// line. Whatever fails here is an error that says what to look at. To try
// again, open the port anew: a port takes one Connect in its life. ready and
// port stay the caller's to close, after Close.
func Open(port spi.Port, ready DataReady, cfg Config) (*Source, error) {
	if err := cfg.Validate(); err != nil {
		return nil, err
	}
	conn, err := port.Connect(physic.Frequency(cfg.SPIHz*float64(physic.Hertz)), spi.Mode1, 8)
	if err != nil {
		return nil, fmt.Errorf("ads131m08: cannot connect to %s: %w", port, err)
	}
	s, err := newSource(conn, ready, cfg)
	if err != nil {
		return nil, err
	}
	if err := s.bringUp(); err != nil {
		return nil, fmt.Errorf("ads131m08: %w", err)
	}
	if err := s.start(func(float64) int64 { return 0 }); err != nil {
		return nil, fmt.Errorf("ads131m08: %w", err)
	}
	go s.run()
	return s, nil
}

// newSource makes a source that has not yet talked to its chip.
func newSource(conn spi.Conn, ready DataReady, cfg Config) (*Source, error) {
	if cfg.Now == nil {
		cfg.Now = time.Now
	}
	if cfg.ClockSet == nil {
		cfg.ClockSet = func() bool { return false }
	}
	decoder, err := NewDecoder(cfg.gains())
	if err != nil {
		return nil, err
	}
	s := &Source{
		cfg: cfg, bus: newBus(conn), ready: ready, decoder: decoder,
		wire:    cfg.frameTime(),
		nominal: 1e9 / cfg.RateHz,
		delay:   time.Duration(Delay(cfg.ClockHz, cfg.osr()) * 1e9),
		size:    cfg.blockRows() * cfg.Channels,
		full:    make(chan *acquire.Block, cfg.Blocks),
		free:    make(chan *acquire.Block, cfg.Blocks),
		done:    make(chan struct{}),
		ended:   make(chan struct{}),
	}
	for range cfg.Blocks {
		s.free <- &acquire.Block{Volts: make([]float32, 0, s.size)}
	}
	return s, nil
}

// Format implements acquire.Source.
func (s *Source) Format() acquire.Format {
	clock, osr := s.cfg.ClockHz, s.cfg.osr()
	return acquire.Format{
		RateHz:   s.cfg.RateHz,
		Channels: s.cfg.Channels,
		Response: func(hz float64) float64 { return Response(clock, osr, hz) },
	}
}

var errOver = errors.New("ads131m08: cannot read: source closed")

// Read implements acquire.Source. Block.Time is the wall time at which the
// voltages of the first row were at the input: completion of the row less the
// delay of the filter.
func (s *Source) Read(ctx context.Context, b *acquire.Block) error {
	select {
	case k := <-s.full:
		volts := append(b.Volts[:0], k.Volts...)
		*b = *k
		b.Volts = volts
		s.free <- k
		return nil
	case <-ctx.Done():
		return ctx.Err()
	case <-s.ended:
		return errOver
	}
}

// Close stops sampling and waits until the bus is at rest. The chip goes on
// converting.
func (s *Source) Close() error {
	s.close.Do(func() { close(s.done) })
	<-s.ended
	return nil
}

// stopping says whether Close was called.
func (s *Source) stopping() bool {
	select {
	case <-s.done:
		return true
	default:
		return false
	}
}
