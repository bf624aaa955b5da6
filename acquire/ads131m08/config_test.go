package ads131m08

import (
	"math"
	"strings"
	"testing"
)

// Register values for 8.192 MHz from the data sheet (SBAS950B, CLOCK register).
func TestClockRegister(t *testing.T) {
	for _, v := range []struct {
		rate    float64
		crystal bool
		want    uint16
	}{
		{1000, false, 0xFF96}, {2000, false, 0xFF92}, {4000, false, 0xFF8E},
		{1000, true, 0xFF16}, {2000, true, 0xFF12}, {4000, true, 0xFF0E},
		{32000, false, 0xFF82}, {250, true, 0xFF1E},
	} {
		c := Default()
		c.RateHz, c.Crystal = v.rate, v.crystal
		if got := c.clockReg(true); got != v.want {
			t.Errorf("CLOCK for %v Hz, crystal %v: %04X, want %04X", v.rate, v.crystal, got, v.want)
		}
		if got := c.clockReg(false); got != v.want&0xFF {
			t.Errorf("CLOCK with channels off: %04X", got)
		}
	}
	c := Default()
	c.Channels = 7
	c.Gains = []int{1, 2, 4, 8, 16, 32, 128}
	if got := c.clockReg(true) >> 8; got != 0x7F {
		t.Errorf("enables for 7 channels %02X", got)
	}
	if got := c.gainReg(0); got != 0x3210 {
		t.Errorf("GAIN1 %04X, want 3210", got)
	}
	if got := c.gainReg(4); got != 0x0754 {
		t.Errorf("GAIN2 %04X, want 0754", got)
	}
	if got := c.modeReg(); got != 0x1110 {
		t.Errorf("MODE %04X, want 1110", got)
	}
}

func TestValidate(t *testing.T) {
	for _, v := range []struct {
		names  string
		change func(*Config)
	}{
		{"rate_hz = 1001", func(c *Config) { c.RateHz = 1001 }},
		{"250, 500, 1000, 2000, 4000, 8000, 16000, 32000", func(c *Config) { c.RateHz = 0 }},
		{"rate_hz", func(c *Config) { c.RateHz = math.NaN() }},
		{"rate_hz", func(c *Config) { c.RateHz = 64000 }},
		{"rate_hz", func(c *Config) { c.RateHz = 125 }},
		{"clock_hz", func(c *Config) { c.ClockHz = 0 }},
		{"clock_hz", func(c *Config) { c.ClockHz = 8.5e6 }},
		{"clock_hz", func(c *Config) { c.ClockHz = math.NaN() }},
		{"rate_hz = 1000 with clock_hz = 8e+06", func(c *Config) { c.ClockHz = 8e6 }},
		{"channels = 0", func(c *Config) { c.Channels = 0 }},
		{"channels = 9", func(c *Config) { c.Channels = 9 }},
		{"gain 3 on channel 1", func(c *Config) { c.Gains = []int{1, 3} }},
		{"9 gains", func(c *Config) { c.Gains = make([]int, 9) }},
		{"up to 8200000", func(c *Config) { c.ClockHz = 8.4e6; c.RateHz = 8.4e6 / 2 / 4096; c.Gains = []int{4} }},
		{"spi_hz", func(c *Config) { c.SPIHz = 0 }},
		{"spi_hz", func(c *Config) { c.SPIHz = 26e6 }},
		{"spi_hz", func(c *Config) { c.SPIHz = math.NaN() }},
		{"480000 to 25000000", func(c *Config) { c.SPIHz = 100e3 }},
		{"spi_hz", func(c *Config) { c.RateHz = 32000 }},
		{"spi_hz", func(c *Config) { c.RateHz = 250; c.SPIHz = 100e3 }},
		{"block_seconds", func(c *Config) { c.BlockSeconds = 0 }},
		{"block_seconds", func(c *Config) { c.BlockSeconds = 2 }},
		{"block_seconds", func(c *Config) { c.BlockSeconds = math.NaN() }},
		{"blocks", func(c *Config) { c.Blocks = 1 }},
	} {
		c := Default()
		v.change(&c)
		err := c.Validate()
		if err == nil || !strings.HasPrefix(err.Error(), "ads131m08: cannot use ") || !strings.Contains(err.Error(), v.names) {
			t.Errorf("error %v, want one with %q", err, v.names)
		}
	}
	c := Default()
	if err := c.Validate(); err != nil {
		t.Error(err)
	}
	c.ClockHz, c.RateHz = 8e6, 8e6/2/4096
	if err := c.Validate(); err != nil {
		t.Errorf("clock of 8 MHz: %v", err)
	}
}

// Computed beforehand from the structure of the filter (data sheet SBAS950B,
// section 8.3.7, clock 8.192 MHz): delay, corner, gains at 5, 25, 60 and 120 Hz.
func TestResponse(t *testing.T) {
	for _, v := range []struct {
		osr        int
		delay      float64 // us
		corner     float64 // Hz, -3.01 dB
		a, b, c, d float64
	}{
		{128, 46.5, 8382, 1.00000, 1.00000, 0.99998, 0.99993},
		{256, 93.4, 4191, 1.00000, 0.99999, 0.99993, 0.99972},
		{512, 187.1, 2096, 1.00000, 0.99995, 0.99972, 0.99889},
		{1024, 374.6, 1048, 0.99999, 0.99981, 0.99889, 0.99557},
		{2048, 499.6, 736, 0.99998, 0.99961, 0.99778, 0.99115},
		{4096, 749.6, 421, 0.99995, 0.99884, 0.99335, 0.97359},
		{8192, 1249.6, 219, 0.99983, 0.99576, 0.97576, 0.90522},
		{16384, 2249.6, 110, 0.99934, 0.98351, 0.90724, 0.65988},
	} {
		const clock = 8.192e6
		if got := Delay(clock, v.osr) * 1e6; math.Abs(got-v.delay) > 0.06 {
			t.Errorf("OSR %d: delay %.2f us, want %.1f", v.osr, got, v.delay)
		}
		if got := Response(clock, v.osr, v.corner); math.Abs(got-math.Sqrt(0.5)) > 0.005 {
			t.Errorf("OSR %d: gain at %g Hz %.4f, want 0.7071", v.osr, v.corner, got)
		}
		for hz, want := range map[float64]float64{0: 1, 5: v.a, 25: v.b, 60: v.c, 120: v.d} {
			if got := Response(clock, v.osr, hz); math.Abs(got-want) > 6e-6 {
				t.Errorf("OSR %d: gain at %g Hz %.6f, want %.5f", v.osr, hz, got, want)
			}
		}
		// Notch at the output rate.
		if got := Response(clock, v.osr, clock/2/float64(v.osr)); got > 1e-9 {
			t.Errorf("OSR %d: gain %g at the output rate, want 0", v.osr, got)
		}
	}
}
