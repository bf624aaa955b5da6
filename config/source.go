package config

import (
	"fmt"
	"math"
	"strings"

	"heavyspot/acquire/ads131m08"
)

// CheckSource tells what keeps the configured source from being driven: run and
// check need it, replay of a recording does not. The error is an *Errors.
func (c *Config) CheckSource() error {
	k := newChecker(c.origin)
	s := k.section("source")
	if c.Source.Driver == DriverADXL355 {
		s.failAt("driver", fmt.Sprintf("driver adxl355 is not in this version; it drives %q and %q, and replays recordings of any",
			DriverADS131M08, DriverRig))
		return sorted(k.problems)
	}
	s.checkRate(c)
	s.checkBus(c)
	if c.Source.ClockHz > 8_200_000 {
		for i, g := range c.Source.Gain {
			if g > 2 {
				s.failAt("clock_hz", fmt.Sprintf("must be at most 8200000 (Hz) with a gain above 2, channel %d has %d", i, g))
				break
			}
		}
	}
	k.checkReferenceLevel(c)
	if converter := c.ADS131M08(); len(k.problems) == 0 {
		if err := converter.Validate(); err != nil {
			s.failAt("driver", err.Error())
		}
	}
	return sorted(k.problems)
}

// checkRate checks the rate against the oversampling ratios of the converter
// (ADS131M08 data sheet, table 8-2: the modulator runs at half the clock) and
// against the machine's speed.
func (s section) checkRate(c *Config) {
	rates := Rates(c.Source.ClockHz)
	words := make([]string, len(rates))
	found := false
	for i, r := range rates {
		words[i] = plain(r)
		found = found || math.Abs(r-c.Source.RateHz) < 1e-6*r
	}
	if !found {
		s.failAt("rate_hz", fmt.Sprintf("must be %s (Hz, from clock_hz = %d)", oneOf(words), c.Source.ClockHz))
		return
	}
	// Order 3 must stay clear of half the rate, where the filter's response has
	// fallen too far to be corrected.
	const samplesPerTurn = 8
	if least := samplesPerTurn * c.Machine.RatedRPM / 60; c.Source.RateHz < least {
		s.failAt("rate_hz", fmt.Sprintf("must be at least %s (Hz, %d samples a turn at rated_rpm)", plain(math.Ceil(least)), samplesPerTurn))
	}
}

// checkBus checks that a frame of the converter crosses the bus in half a
// sample period, so that there is time to react.
func (s section) checkBus(c *Config) {
	least := 2 * 8 * ads131m08.FrameBytes * c.Source.RateHz
	switch {
	case float64(c.Source.SPIHz) >= least:
	case s.has("spi_hz"):
		s.failAt("spi_hz", fmt.Sprintf("must be at least %s (Hz) at rate_hz = %s", plain(least), plain(c.Source.RateHz)))
	case !s.told[s.of("rate_hz")]:
		s.failAt("rate_hz", fmt.Sprintf("needs spi_hz of at least %s (Hz); the default is %d", plain(least), c.Source.SPIHz))
	}
}

// Rates returns the sampling rates of the converter at a clock in Hz, slowest
// first, Hz.
func Rates(clockHz int) []float64 {
	var rates []float64
	for ratio := 16384; ratio >= 128; ratio /= 2 {
		rates = append(rates, float64(clockHz)/2/float64(ratio))
	}
	return rates
}

// checkReferenceLevel checks that the converter can see the pulse cross its
// levels (full scale 1.2 V over the gain, data sheet 8.5.1.9).
func (c *checker) checkReferenceLevel(cfg *Config) {
	r := cfg.Reference
	if r == nil || r.Channel >= len(cfg.Source.Gain) {
		return
	}
	full := 1.2 / float64(cfg.Source.Gain[r.Channel])
	s := c.section("reference")
	if math.Abs(r.ThresholdV) >= full {
		s.failAt("threshold_v", fmt.Sprintf("must be within %s (volts, the converter's full scale at gain %d)",
			strings.TrimPrefix(span{-full, full, ""}.String(), "from "), cfg.Source.Gain[r.Channel]))
		return
	}
	back := r.ThresholdV - r.HysteresisV
	if r.Edge == "falling" {
		back = r.ThresholdV + r.HysteresisV
	}
	if math.Abs(back) >= full {
		s.failAt("hysteresis_v", fmt.Sprintf("must keep threshold and hysteresis within the converter's full scale, %s V at gain %d",
			plain(full), cfg.Source.Gain[r.Channel]))
	}
}
