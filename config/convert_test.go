package config

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"heavyspot/acquire/ads131m08"
	"heavyspot/dsp"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

func parse(t *testing.T, text string) *Config {
	t.Helper()
	cfg, err := Parse("plant/f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return cfg
}

func TestDSP(t *testing.T) {
	text := strings.Replace(spoil(24, "volts_per_g = 0.1\ninverted = true\nhighpass_hz = 0.5"), `"rising"`, `"falling"`, 1)
	want := dsp.Config{
		RateHz: 2048, Channels: 9, RatedRPM: 990,
		Reference: &dsp.Reference{Channel: 6, Falling: true, ThresholdV: 0.5, HysteresisV: 0.1},
		Points: []dsp.Point{
			{Name: "de-v", Channel: 0, VoltsPerG: 0.1, Inverted: true, HighpassHz: 0.5},
			{Name: "nde-h", Channel: 1, VoltsPerG: 0.05},
		},
	}
	if diff := cmp.Diff(want, parse(t, text).DSP(2048, 9)); diff != "" {
		t.Error(diff)
	}
	none := parse(t, withoutReference())
	if got := none.DSP(1000, 2).Reference; got != nil {
		t.Errorf("reference %+v, want none", got)
	}
}

// withoutReference returns good without its reference.
func withoutReference() string {
	from, to := strings.Index(good, "[reference]"), strings.Index(good, "[[point]]")
	return good[:from] + good[to:]
}

func TestChannels(t *testing.T) {
	if got := parse(t, good).Channels(); got != 7 {
		t.Errorf("%d channels, want 7", got)
	}
	if got := parse(t, withoutReference()).Channels(); got != 2 {
		t.Errorf("%d channels without a reference, want 2", got)
	}
}

func TestRules(t *testing.T) {
	text := spoil(4, `rotor = "overhung"`)
	text = strings.Replace(text, `"clockwise"`, `"counter-clockwise"`, 1)
	got := parse(t, strings.Replace(text, `"vertical"`, `"axial"`, 1)).Rules()
	want := rules.Config{
		Overhung: true, CounterClockwise: true, RatedRPM: 990, QuietShare: 0.25, Limits: got.Limits,
		Points: []rules.Point{
			{Name: "de-v", Direction: rules.Axial},
			{Name: "nde-h", NonDriveEnd: true, Direction: rules.Horizontal},
		},
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
	if got := parse(t, good).Rules(); got.Overhung || got.CounterClockwise || got.Points[0].Direction != rules.Vertical {
		t.Errorf("rules %+v; want between bearings, clockwise, vertical", got)
	}
}

// Alarm and trip, mm/s rms: ISO 14694:2003 table 5 (BV-3 and BV-4 as a fan
// manual prints them), ISO 10816-3:2009 tables A.1 and A.2 (B/C and C/D as a fan
// manual prints them).
func TestRulesLimits(t *testing.T) {
	for _, c := range []struct {
		limits              string
		standard            string
		alarm, trip, quietX float64
	}{
		{"standard = \"iso-14694\"\ncategory = \"BV-3\"\nsupport = \"rigid\"", "iso-14694", 7.1, 9.0, 0.25},
		{"standard = \"iso-14694\"\ncategory = \"BV-4\"\nsupport = \"flexible\"", "iso-14694", 7.1, 11.2, 0.25},
		{"standard = \"iso-20816-3\"\ngroup = 1\nsupport = \"flexible\"", "iso-20816-3", 7.1, 11.0, 0.25},
		{"standard = \"iso-20816-3\"\ngroup = 2\nsupport = \"rigid\"\nquiet_share = 1", "iso-20816-3", 2.8, 4.5, 1},
		{"standard = \"own\"\nalarm_mm_s_rms = 3\ntrip_mm_s_rms = 5.5", "own", 3, 5.5, 0.25},
	} {
		from, to := strings.Index(good, "standard ="), strings.Index(good, "[source]")
		got := parse(t, good[:from]+c.limits+"\n"+good[to:]).Rules()
		l := got.Limits
		if l.Standard != c.standard || l.Alarm != c.alarm || l.Trip != c.trip || got.QuietShare != c.quietX {
			t.Errorf("%s:\ngot %+v, quiet %v", c.limits, l, got.QuietShare)
		}
	}
}

func TestRulesRefusesUncheckedLimits(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("limits that do not exist were used")
		}
	}()
	(&Config{Limits: Limits{Standard: StandardISO208163, Group: 7}}).Rules()
}

func TestPaths(t *testing.T) {
	cfg := parse(t, good)
	t.Setenv("STATE_DIRECTORY", "")
	t.Setenv("RUNTIME_DIRECTORY", "")
	if got := cfg.BufferPath(); got != "heavyspot.db" {
		t.Errorf("buffer %q by hand", got)
	}
	t.Setenv("STATE_DIRECTORY", "/var/lib/heavyspot/a:/var/lib/other")
	t.Setenv("RUNTIME_DIRECTORY", "/run/heavyspot/a")
	if got := cfg.BufferPath(); got != "/var/lib/heavyspot/a/heavyspot.db" {
		t.Errorf("buffer %q as a service", got)
	}
	if got := cfg.SocketPath(); got != "/run/heavyspot/a/heavyspot.sock" {
		t.Errorf("socket %q as a service", got)
	}
	cfg.Buffer.Path = "/data/fan.db"
	if got := cfg.BufferPath(); got != "/data/fan.db" {
		t.Errorf("buffer %q, want the absolute path", got)
	}
	for name, want := range map[string]string{"": "", "/etc/p": "/etc/p", "p": filepath.Join("plant", "p")} {
		if got := cfg.FilePath(name); got != want {
			t.Errorf("file %q is %q, want %q", name, got, want)
		}
	}
}

// Limits: ISO 14694:2003 table 5, BV-3 rigid.
func TestAlarms(t *testing.T) {
	want := alarm.Config{
		Machine: "kiln-fan-2", AlarmMMS: 7.1, TripMMS: 9, QuietShare: 0.25, HasReference: true,
		UnbalanceMinutes: 5, ClearMinutes: 7,
	}
	text := good + "[alarm]\nunbalance_minutes = 5\nclear_minutes = 7\n"
	if diff := cmp.Diff(want, parse(t, text).Alarms()); diff != "" {
		t.Error(diff)
	}
	if parse(t, withoutReference()).Alarms().HasReference {
		t.Error("a reference that is not configured")
	}
}

func TestADS131M08(t *testing.T) {
	usual := parse(t, good).ADS131M08()
	if err := usual.Validate(); err != nil {
		t.Error(err)
	}
	if !usual.Crystal || !usual.InputCRC || usual.RateHz != 1000 || usual.ClockHz != 8_192_000 || usual.SPIHz != 8_000_000 {
		t.Errorf("defaults %+v", usual)
	}
	text := spoil(13, "rate_hz = 500\nclock = \"external\"\nclock_hz = 4096000\nspi_hz = 2000000\ninput_crc = false\ngain = [1, 2, 4, 8, 16, 32, 64, 128]")
	got := parse(t, text).ADS131M08()
	want := ads131m08.Default()
	want.RateHz, want.ClockHz, want.SPIHz, want.InputCRC, want.Crystal = 500, 4_096_000, 2_000_000, false, false
	want.Channels, want.Gains = 8, []int{1, 2, 4, 8, 16, 32, 64, 128}
	if diff := cmp.Diff(want, got, cmpopts.IgnoreTypes(func() {}, func() bool { return false }, time.Now, func(ads131m08.Fault) {})); diff != "" {
		t.Error(diff)
	}
}

// Ways to sign on at a broker that are right.
func TestSignOnAtBrokers(t *testing.T) {
	for _, text := range []string{
		"brokers = [\"tcp://broker.example:1883\"]\nuser = \"fan\"",
		"brokers = [\"tcp://127.0.0.1:1883\", \"tcp://[::1]:1883\", \"tcp://localhost:1883\"]\nuser = \"fan\"\npassword_file = \"p\"",
		"brokers = [\"tcp://broker.example:1883\"]\nuser = \"fan\"\npassword_file = \"p\"\nallow_plain_password = true",
		"brokers = [\"ssl://broker.example:8883\"]\nuser = \"fan\"\npassword_file = \"p\"\nca_file = \"ca\"\ncert_file = \"c\"\nkey_file = \"k\"",
		"brokers = []\nembedded_listen = \"[::1]:0\"\nroot = \"plant/fans\"",
	} {
		if _, err := Parse("f.toml", []byte(good+"[mqtt]\n"+text)); err != nil {
			t.Errorf("%s:\n%v", text, err)
		}
	}
}
