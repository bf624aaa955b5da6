package ads131m08

import (
	"fmt"
	"math"
	"time"
)

// Config is the set-up of a converter. Start from Default and change what
// differs: zero is not a default except where said.
type Config struct {
	// RateHz is the sample rate of each channel, Hz. It must be
	// ClockHz/2/OSR with OSR one of 128, 256 ... 16384: 250, 500 ... 32000
	// with the usual clock.
	RateHz float64 `toml:"rate_hz"`
	// Channels is the number of channels in use, 1 to 8, the first ones. The
	// others are switched off.
	Channels int `toml:"channels"`
	// Gains holds the gain of each channel, 1, 2, 4 ... 128; channels beyond
	// its end have gain 1. Full scale is +-1.2 V/gain.
	Gains []int `toml:"gains"`
	// ClockHz is the clock at CLKIN or of the crystal, Hz, 300 000 to
	// 8 400 000, at most 8 200 000 with a gain over 2.
	ClockHz float64 `toml:"clock_hz"`
	// Crystal is true when a crystal is at XTAL1 and XTAL2, false when a clock
	// is fed to CLKIN.
	Crystal bool `toml:"crystal"`
	// SPIHz is the fastest SPI clock, Hz, at most 25 000 000, and fast enough
	// to clock a frame in half a sample period. Avoid the neighbourhood of
	// 1 MHz: boards are known to release chip select too early there.
	SPIHz float64 `toml:"spi_hz"`
	// InputCRC makes the chip check the commands it gets.
	InputCRC bool `toml:"input_crc"`
	// BlockSeconds is the length of a block, seconds, more than 0, at most 1.
	BlockSeconds float64 `toml:"block_seconds"`
	// Blocks is how many blocks may wait to be read before the source has to
	// let the chip run over, at least 2.
	Blocks int `toml:"blocks"`

	// Now returns the wall time; nil means time.Now.
	Now func() time.Time `toml:"-"`
	// ClockSet says whether the wall clock is known to be set; nil means that
	// it never is.
	ClockSet func() bool `toml:"-"`
	// Thread, if not nil, is called once on the sampling goroutine after that
	// was locked to its thread, for instance to raise the thread's priority.
	Thread func() `toml:"-"`
	// OnFault, if not nil, is told when an outage begins, gets worse and is
	// over. It is called on the sampling goroutine and must return at once.
	OnFault func(Fault) `toml:"-"`
}

// Default returns the usual set-up: eight channels at 1 kHz and gain 1, clock
// 8.192 MHz fed in, SPI at 8 MHz, commands checked, blocks of 0.25 s, 4 s of
// them.
func Default() Config {
	return Config{
		RateHz: 1000, Channels: MaxChannels, ClockHz: 8_192_000, SPIHz: 8_000_000,
		InputCRC: true, BlockSeconds: 0.25, Blocks: 16,
	}
}

// Validate returns nil or an error that names the field, its value and what
// is allowed.
func (c *Config) Validate() error {
	if !(c.ClockHz >= 300_000 && c.ClockHz <= 8_400_000) {
		return fmt.Errorf("ads131m08: cannot use clock_hz = %g, allowed 300000 to 8400000", c.ClockHz)
	}
	if c.osr() == 0 {
		return fmt.Errorf("ads131m08: cannot use rate_hz = %g with clock_hz = %g, allowed %s", c.RateHz, c.ClockHz, c.rates())
	}
	if c.Channels < 1 || c.Channels > MaxChannels {
		return fmt.Errorf("ads131m08: cannot use channels = %d, allowed 1 to %d", c.Channels, MaxChannels)
	}
	if err := c.validateGains(); err != nil {
		return err
	}
	if lo := c.slowestSPI(); !(c.SPIHz >= lo && c.SPIHz <= maxSPIHz) {
		return fmt.Errorf("ads131m08: cannot use spi_hz = %g at rate_hz = %g, allowed %.0f to %d", c.SPIHz, c.RateHz, lo, maxSPIHz)
	}
	if !(c.BlockSeconds > 0 && c.BlockSeconds <= 1) {
		return fmt.Errorf("ads131m08: cannot use block_seconds = %g, allowed more than 0, up to 1", c.BlockSeconds)
	}
	if c.Blocks < 2 || c.Blocks > 10_000 {
		return fmt.Errorf("ads131m08: cannot use blocks = %d, allowed 2 to 10000", c.Blocks)
	}
	return nil
}

const (
	maxSPIHz = 25_000_000
	// timeoutClocks is the longest a frame may take, in periods of the
	// converter's clock (section 8.5.1.7).
	timeoutClocks = 32768
)

// slowestSPI is the clock at which a frame takes half a sample period, or
// half the frame timeout where that is shorter.
func (c *Config) slowestSPI() float64 {
	longest := math.Min(0.5/c.RateHz, 0.5*timeoutClocks/c.ClockHz)
	return 8 * FrameBytes / longest
}

func (c *Config) validateGains() error {
	if len(c.Gains) > c.Channels {
		return fmt.Errorf("ads131m08: cannot use %d gains for %d channels", len(c.Gains), c.Channels)
	}
	for ch, g := range c.Gains {
		if _, ok := gainCode(g); !ok {
			return fmt.Errorf("ads131m08: cannot use gain %d on channel %d, allowed 1, 2, 4, 8, 16, 32, 64, 128", g, ch)
		}
		if g > 2 && c.ClockHz > 8_200_000 {
			return fmt.Errorf("ads131m08: cannot use gain %d on channel %d with clock_hz = %g, allowed up to 8200000", g, ch, c.ClockHz)
		}
	}
	return nil
}

// osr returns the over-sampling ratio that gives the rate, 0 for none.
func (c *Config) osr() int {
	for osr := 128; osr <= 16384; osr *= 2 {
		if r := c.RateHz * float64(2*osr) / c.ClockHz; math.Abs(r-1) < 1e-6 {
			return osr
		}
	}
	return 0
}

// rates lists the possible rates for a message.
func (c *Config) rates() string {
	s := ""
	for osr := 16384; osr >= 128; osr /= 2 {
		if s != "" {
			s += ", "
		}
		s += fmt.Sprintf("%g", c.ClockHz/float64(2*osr))
	}
	return s
}

// gains returns the gain of every channel in use.
func (c *Config) gains() []int {
	g := make([]int, c.Channels)
	for ch := range g {
		g[ch] = 1
		if ch < len(c.Gains) {
			g[ch] = c.Gains[ch]
		}
	}
	return g
}

// clockReg returns the CLOCK register, with the channels on or off.
func (c *Config) clockReg(on bool) uint16 {
	v := uint16(clockHighRes)
	for osr := c.osr(); osr > 128; osr /= 2 {
		v += 1 << 2
	}
	if !c.Crystal {
		v |= clockXtalOff
	}
	if on {
		v |= c.mask() << 8
	}
	return v
}

// mask has a bit set for every channel in use.
func (c *Config) mask() uint16 { return 1<<c.Channels - 1 }

// gainReg returns GAIN1 (first 0) or GAIN2 (first 4).
func (c *Config) gainReg(first int) uint16 {
	v := uint16(0)
	for ch, g := range c.gains() {
		if ch/4 == first/4 {
			code, _ := gainCode(g)
			v |= code << (4 * (ch % 4))
		}
	}
	return v
}

// modeReg returns the MODE register.
func (c *Config) modeReg() uint16 {
	if c.InputCRC {
		return modeBase | modeRxCRC
	}
	return modeBase
}

// blockRows returns the rows of a full block, at least 1.
func (c *Config) blockRows() int {
	return max(1, int(math.Round(c.BlockSeconds*c.RateHz)))
}

// frameTime is how long a frame takes on the bus at least.
func (c *Config) frameTime() time.Duration {
	return time.Duration(8 * FrameBytes / c.SPIHz * 1e9)
}
