package chip

import (
	"fmt"
	"math/rand/v2"
	"sync"
	"time"

	"periph.io/x/conn/v3/physic"
)

// channels is the number of the chip's input channels.
const channels = 8

// Signal is what is wired to the inputs. The chip calls Next from inside its
// own lock: an implementation must not call the chip.
type Signal interface {
	// Channels is the number of inputs that are wired, 1 to 8, the first ones.
	Channels() int
	// StepHz is the number of steps per second. It must be
	// f_MOD/(128*2^k), k = 0 to 3: 32, 16, 8 or 4 kHz with a clock of
	// 8.192 MHz (f_MOD is half the clock).
	StepHz() float64
	// Next writes to dst the mean voltage of every input over the next
	// 1/StepHz seconds. dst has Channels entries.
	Next(dst []float32)
}

// Options are what a Chip is made of.
type Options struct {
	// Signal is what is wired to the inputs; it must not be nil.
	Signal Signal
	// ClockHz is the nominal frequency at CLKIN, Hz, 300 000 to 8 400 000;
	// 0 means 8 192 000.
	ClockHz float64
	// ClockErrorPPM is by how much the real clock is fast, parts per million.
	// The signal's steps belong to the chip's clock: a clock which is off
	// shows in the times of data-ready, not in the samples.
	ClockErrorPPM float64
	// Quiet switches the input noise off.
	Quiet bool
	// KeepOldest chooses what happens to a full output: true drops the newest
	// sample, false overwrites the oldest. The data sheet does not say.
	KeepOldest bool
	// QueueEdges makes Wait tell edges one by one, the oldest of up to 16
	// first, as a queue of line events does; otherwise it tells the latest.
	QueueEdges bool
	// Seed starts the noise and the random faults.
	Seed uint64
	// Speed is the start value of SetSpeed; 0 means as fast as asked.
	Speed float64
}

// Chip is one simulated converter with its port and its data-ready line. Its
// methods may be called from several goroutines.
type Chip struct {
	mu   sync.Mutex
	opts Options
	rnd  *rand.Rand

	// The bus.
	connected bool
	closed    bool
	limit     physic.Frequency
	joined    [2][]byte // packets of a transaction that keeps chip select

	// The digital part.
	regs      registers
	locked    bool
	standby   bool
	status    uint16 // latched bits of STATUS
	answer    answer
	busyUntil time.Duration
	mapCRC    uint16
	out       [4 * maxWords]byte

	// The analogue part.
	conv converter
	fifo fifo

	// Time, pins, faults.
	clock  clock
	line   line
	faults []Fault
	count  Counters
}

// Counters are totals since power-on.
type Counters struct {
	// Frames is the number of transactions the chip has seen.
	Frames int64
	// Conversions is the number of completed conversions.
	Conversions int64
	// Overwritten is the number of conversions lost in a full output.
	Overwritten int64
	// InputChecks is the number of commands with a wrong check sum.
	InputChecks int64
	// Short is the number of frames cut short while channels were on.
	Short int64
	// Resets is the number of resets, by command, pin or fault.
	Resets int64
}

// New returns a chip that has just been switched on at virtual time 0.
func New(o Options) (*Chip, error) {
	if o.Signal == nil {
		return nil, fmt.Errorf("chip: cannot build without a signal")
	}
	if o.ClockHz == 0 {
		o.ClockHz = 8_192_000
	}
	if o.ClockHz < 300_000 || o.ClockHz > 8_400_000 {
		return nil, fmt.Errorf("chip: cannot run at a clock of %g Hz, allowed 300000 to 8400000", o.ClockHz)
	}
	if n := o.Signal.Channels(); n < 1 || n > channels {
		return nil, fmt.Errorf("chip: cannot take a signal of %d channels, allowed 1 to %d", n, channels)
	}
	step, err := stepOf(o.ClockHz/2, o.Signal.StepHz())
	if err != nil {
		return nil, err
	}
	c := &Chip{opts: o, rnd: rand.New(rand.NewPCG(o.Seed, 0x131)), limit: maxClock}
	c.conv.init(o.Signal, step)
	c.clock.rate = o.ClockHz / 2 * (1 + o.ClockErrorPPM*1e-6)
	if err := c.SetSpeed(o.Speed); err != nil {
		return nil, err
	}
	c.reset()
	c.count.Resets = 0
	c.answer = answer{word: resetDone}
	c.busyUntil = powerOn
	return c, nil
}

// stepOf returns the length of a signal step in modulator periods.
func stepOf(fMod, stepHz float64) (int, error) {
	for step := 128; step <= 1024; step *= 2 {
		if r := stepHz * float64(step) / fMod; r > 1-1e-9 && r < 1+1e-9 {
			return step, nil
		}
	}
	return 0, fmt.Errorf("chip: cannot take a signal of %g steps per second, allowed %g, %g, %g, %g",
		stepHz, fMod/128, fMod/256, fMod/512, fMod/1024)
}

// Counters returns the totals so far.
func (c *Chip) Counters() Counters {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.count
}

// Sync strobes the SYNC/RESET pin for less than 2048 clocks: conversions start
// anew, the output is emptied and STATUS.F_RESYNC is set.
func (c *Chip) Sync() {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.resync()
}

func (c *Chip) resync() {
	c.status |= statusResync
	c.restart()
}

// Reset holds the SYNC/RESET pin low long enough for a reset.
func (c *Chip) Reset() {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.reset()
}

// reset puts every register to its default and starts to convert.
func (c *Chip) reset() {
	c.count.Resets++
	c.regs.reset()
	c.locked, c.standby = false, false
	c.status = 0
	c.answer = answer{word: resetDone}
	c.busyUntil = c.clock.now + regAcquire
	c.mapCRC = 0
	c.restart()
	c.conv.fast = 2
}

// restart clears the filter and the output, after which conversions count
// from the next step of the signal.
func (c *Chip) restart() {
	c.fifo.n = 0
	c.conv.restart = true
}
