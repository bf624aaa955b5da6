package config

import (
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// The rates at 8.192 MHz are those of the ADS131M08 data sheet, table 8-2.
func TestRatesOfTheConverter(t *testing.T) {
	want := []float64{250, 500, 1000, 2000, 4000, 8000, 16000, 32000}
	if got := Rates(8_192_000); !slices.Equal(got, want) {
		t.Errorf("rates %v, want %v", got, want)
	}
}

func TestCheckSource(t *testing.T) {
	const list = "must be 250, 500, 1000, 2000, 4000, 8000, 16000 or 32000 (Hz, from clock_hz = 8192000)"
	for _, m := range []mistake{
		{13, "rate_hz = 1000", ""},
		{13, "rate_hz = 16000.0", ""},
		{13, "rate_hz = 32000", "13: source.rate_hz = 32000: needs spi_hz of at least 15360000 (Hz); the default is 8000000"},
		{13, "rate_hz = 32000\nspi_hz = 15359999", "14: source.spi_hz = 15359999: must be at least 15360000 (Hz) at rate_hz = 32000"},
		{13, "rate_hz = 32000\nspi_hz = 15360000", ""},
		{13, "rate_hz = 1024", "13: source.rate_hz = 1024: " + list},
		{13, "rate_hz = 125", "13: source.rate_hz = 125: " + list},
		{13, "rate_hz = 1000\nclock_hz = 4096000", ""},
		{13, "rate_hz = 32000\nclock_hz = 4096000",
			"13: source.rate_hz = 32000: must be 125, 250, 500, 1000, 2000, 4000, 8000 or 16000 (Hz, from clock_hz = 4096000)"},
		{12, `driver = "rig"`, ""},
		{12, `driver = "adxl355"`, `12: source.driver = "adxl355": driver adxl355 is not in this version; ` +
			`it drives "ads131m08" and "rig", and replays recordings of any`},
		// The data sheet allows 8.2 MHz above gain 2.
		{13, "rate_hz = 1024.4140625\nclock_hz = 8392000\ngain = [4, 1, 1, 1, 1, 1, 1, 1]",
			"14: source.clock_hz = 8392000: must be at most 8200000 (Hz) with a gain above 2, channel 0 has 4"},
		{13, "rate_hz = 1024.4140625\nclock_hz = 8392000\ngain = 2", ""},
		{17, "threshold_v = 1.3", "17: reference.threshold_v = 1.3: must be within -1.2 to 1.2 (volts, the converter's full scale at gain 1)"},
		{13, "rate_hz = 1000\ngain = 4", "18: reference.threshold_v = 0.5: must be within -0.3 to 0.3 (volts, the converter's full scale at gain 4)"},
		{18, "hysteresis_v = 1.8", "18: reference.hysteresis_v = 1.8: must keep threshold and hysteresis within the converter's full scale, 1.2 V at gain 1"},
		{16, "edge = \"falling\"\n", ""},
	} {
		cfg, err := Parse("f.toml", []byte(spoil(m.line, m.text)))
		if err != nil {
			t.Errorf("%q: %v", m.text, err)
			continue
		}
		got := ""
		if err := cfg.CheckSource(); err != nil {
			got = strings.TrimPrefix(err.Error(), "f.toml:")
		}
		if got != m.want {
			t.Errorf("%q:\n got %s\nwant %s", m.text, got, m.want)
		}
	}
}

// Where nothing but the converter can object, the two judge alike.
func TestCheckSourceAgreesWithTheConverter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		cfg := drawConfig(t)
		cfg.Source.Driver, cfg.Machine.RatedRPM, cfg.Reference = DriverADS131M08, 60, nil
		if rapid.Bool().Draw(t, "rate of the converter") {
			cfg.Source.RateHz = rapid.SampledFrom(Rates(cfg.Source.ClockHz)).Draw(t, "rate")
		}
		converter := cfg.ADS131M08()
		ours, theirs := cfg.CheckSource(), converter.Validate()
		if (ours == nil) != (theirs == nil) {
			t.Fatalf("here %v, at the converter %v", ours, theirs)
		}
		if ours != nil && strings.Contains(ours.Error(), "ads131m08:") {
			t.Fatalf("only the converter knew: %v", ours)
		}
	})
}

// A machine too fast for the rate is told, just fast enough is not.
func TestCheckSourceKnowsTheSpeed(t *testing.T) {
	for _, c := range []struct{ rpm, want string }{
		{"3750", ""},
		{"3751", "f.toml:13: source.rate_hz = 500: must be at least 501 (Hz, 8 samples a turn at rated_rpm)"},
	} {
		text := strings.Replace(spoil(13, "rate_hz = 500"), "rated_rpm = 990", "rated_rpm = "+c.rpm, 1)
		cfg, err := Parse("f.toml", []byte(text))
		if err != nil {
			t.Fatal(err)
		}
		got := ""
		if err := cfg.CheckSource(); err != nil {
			got = err.Error()
		}
		if got != c.want {
			t.Errorf("%s r/min: got %q, want %q", c.rpm, got, c.want)
		}
	}
}

// A falling edge is armed above its threshold.
func TestCheckSourceKnowsTheEdge(t *testing.T) {
	text := strings.Replace(spoil(18, "hysteresis_v = 0.8"), `"rising"`, `"falling"`, 1)
	cfg, err := Parse("f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	if cfg.CheckSource() == nil {
		t.Error("a level of 1.3 V that the converter cannot see was taken")
	}
}
