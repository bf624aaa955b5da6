package config

import (
	"fmt"
	"math/bits"
	"regexp"
)

var (
	portForm = form{regexp.MustCompile(`^(/dev/spidev|SPI)[0-9]{1,3}\.[0-9]{1,3}$`), `like "/dev/spidev0.0" or "SPI0.0"`}
	pinForm  = form{regexp.MustCompile(`^GPIO[0-9]{1,3}$`), `like "GPIO25"`}
)

func (c *checker) validateSource(v *Source) {
	s := c.section("source")
	s.choice("driver", required, v.Driver, drivers)
	s.number("rate_hz", required, v.RateHz, span{10, 32000, "samples a second of each channel"})
	s.text("spi", optional, v.SPI, portForm)
	s.whole("spi_hz", optional, v.SPIHz, span{100_000, 25_000_000, "Hz"})
	s.text("data_ready", optional, v.DataReady, pinForm)
	s.choice("clock", optional, v.Clock, clocks)
	s.whole("clock_hz", optional, v.ClockHz, span{300_000, 8_400_000, "Hz"})
	s.flag("input_crc")
	s.validateGain(v.Gain)
}

// validateGain checks the gain of all channels or of each.
func (s section) validateGain(gain []int) {
	const each = "a power of two from 1 to 128"
	all := fmt.Sprintf("one number or a list of %d, each %s", converterChannels, each)
	s.check("gain", optional, len(gain) == 1 || len(gain) == converterChannels, "", all)
	if s.told[s.of("gain")] {
		return
	}
	for i, g := range gain {
		key := "gain" + index(i)
		right := g >= 1 && g <= 128 && bits.OnesCount(uint(g)) == 1
		switch {
		case s.wrong[s.of(key)] != "":
			s.failAt(key, fmt.Sprintf("must be %s, not %s", each, s.wrong[s.of(key)]))
		case !right && s.has(key):
			s.failAt(key, "must be "+each)
		case !right:
			s.failAt("gain", "must be "+each)
		}
	}
}

func (c *checker) validateRig(cfg *Config) {
	s, r := c.section("rig"), cfg.Rig
	if c.section("source").sound("driver") && cfg.Source.Driver != DriverRig {
		c.fail("rig", `belongs to source.driver = "rig", leave it out`)
		return
	}
	s.choice("fault", optional, r.Fault, faults)
	if s.sound("fault") && r.Fault == faultOverhung && c.section("machine").sound("rotor") && cfg.Machine.Rotor != "overhung" {
		s.failAt("fault", `must be another one beside machine.rotor = "`+cfg.Machine.Rotor+`"`)
	}
	s.number("mm_s_rms", optional, r.MMS, span{0, 100, "mm/s rms"})
	s.number("noise_mm_s_rms", optional, r.NoiseMMS, span{0, 20, "mm/s rms"})
	s.whole("seed", optional, r.Seed, span{0, 1<<31 - 1, ""})
	s.number("speed_up", optional, r.SpeedUp, span{0.1, 1000, "times faster than life"})
}
