package config

import (
	"reflect"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"
)

// allKeys returns every key of every table.
func allKeys() []string {
	var keys []string
	tables := reflect.TypeFor[Config]()
	for i := range tables.NumField() {
		f := tables.Field(i)
		t := f.Type
		if t.Kind() != reflect.Struct {
			if keyOf(f) == "" {
				continue
			}
			t = t.Elem()
		}
		if keyOf(f) != "" {
			keys = append(keys, keysOf(t)...)
		}
	}
	return keys
}

// drawName draws a name for topics.
func drawName(t *rapid.T, label string) string {
	return rapid.StringMatching(`[a-z0-9-]{1,20}`).Draw(t, label)
}

// drawConfig draws a configuration that is right.
func drawConfig(t *rapid.T) *Config {
	cfg := defaults()
	cfg.Machine = Machine{
		Site: drawName(t, "site"), Name: drawName(t, "name"),
		Rotor: rapid.SampledFrom(rotors).Draw(t, "rotor"), Rotation: rapid.SampledFrom(rotations).Draw(t, "rotation"),
		RatedRPM: rapid.Float64Range(60, 6000).Draw(t, "rated_rpm"),
	}
	cfg.Limits = drawLimits(t)
	cfg.Source = Source{
		Driver: rapid.SampledFrom(drivers).Draw(t, "driver"), RateHz: rapid.Float64Range(10, 32000).Draw(t, "rate"),
		SPI: rapid.SampledFrom([]string{"/dev/spidev1.0", "SPI0.1"}).Draw(t, "spi"), SPIHz: rapid.IntRange(100000, 25000000).Draw(t, "spi_hz"),
		DataReady: "GPIO7", Clock: rapid.SampledFrom(clocks).Draw(t, "clock"), ClockHz: rapid.IntRange(300000, 8400000).Draw(t, "clock_hz"),
		Gain: rapid.SliceOfN(rapid.SampledFrom([]int{1, 2, 4, 8, 16, 32, 64, 128}), 8, 8).Draw(t, "gain"), InputCRC: rapid.Bool().Draw(t, "crc"),
	}
	if cfg.Source.Driver == DriverRig {
		cfg.Rig = &Rig{
			Fault: rapid.SampledFrom(faults).Draw(t, "fault"), MMS: rapid.Float64Range(0, 100).Draw(t, "mms"),
			NoiseMMS: rapid.Float64Range(0, 20).Draw(t, "noise"), Seed: rapid.IntRange(0, 1<<31-1).Draw(t, "seed"),
			SpeedUp: rapid.Float64Range(0.1, 1000).Draw(t, "speed_up"),
		}
		if cfg.Rig.Fault == faultOverhung {
			cfg.Machine.Rotor = "overhung"
		}
	}
	drawSensors(t, cfg)
	drawDelivery(t, cfg)
	return cfg
}

func drawLimits(t *rapid.T) Limits {
	l := Limits{
		Standard:   rapid.SampledFrom(standards).Draw(t, "standard"),
		QuietShare: rapid.Float64Range(0.01, 1).Draw(t, "quiet_share"),
	}
	switch l.Standard {
	case StandardISO14694:
		l.Category = rapid.SampledFrom(categories).Draw(t, "category")
	case StandardISO208163:
		l.Group = rapid.IntRange(1, 2).Draw(t, "group")
	case StandardOwn:
		l.AlarmMMS = rapid.Float64Range(0.1, 50).Draw(t, "alarm")
		l.TripMMS = rapid.Float64Range(51, 100).Draw(t, "trip")
	}
	l.Support = rapid.SampledFrom(supports).Draw(t, "support")
	return l
}

func drawSensors(t *rapid.T, cfg *Config) {
	channels := rapid.Permutation([]int{0, 1, 2, 3, 4, 5, 6, 7}).Draw(t, "channels")
	if rapid.Bool().Draw(t, "has reference") {
		cfg.Reference = &Reference{
			Channel: channels[6], Edge: rapid.SampledFrom(edges).Draw(t, "edge"),
			ThresholdV: rapid.Float64Range(-50, 50).Draw(t, "threshold"), HysteresisV: rapid.Float64Range(0.0001, 50).Draw(t, "hysteresis"),
		}
	}
	for i := range rapid.IntRange(1, 6).Draw(t, "points") {
		cfg.Points = append(cfg.Points, Point{
			Name: drawName(t, "point") + index2(i), Bearing: bearings[i%2], Direction: directions[i/2], Channel: channels[i],
			VoltsPerG: rapid.Float64Range(0.0001, 100).Draw(t, "volts"), Inverted: rapid.Bool().Draw(t, "inverted"),
			HighpassHz: rapid.Float64Range(0, 10).Draw(t, "highpass"),
		})
	}
}

// index2 makes names unique.
func index2(i int) string { return "-" + string(rune('a'+i)) }

func drawDelivery(t *rapid.T, cfg *Config) {
	text := rapid.StringMatching(`[^\x00-\x1f\x7f]{1,30}`)
	cfg.Buffer = Buffer{
		Path: text.Draw(t, "path"), Socket: "/run/x.sock", MaxMB: rapid.IntRange(16, 900).Draw(t, "max_mb"),
		KeepDays: rapid.IntRange(1, 3650).Draw(t, "keep"), FindingsKeepDays: rapid.IntRange(1, 3650).Draw(t, "findings"),
	}
	m := &cfg.MQTT
	m.Root = rapid.StringMatching(`[^+#$/\x00-\x20\x7f]{1,20}(/[a-zé]{1,9})?`).Draw(t, "root")
	m.ClientID = rapid.StringMatching(`[A-Za-z0-9_.-]{1,30}`).Draw(t, "client")
	m.KeepaliveS, m.InFlight = rapid.IntRange(5, 3600).Draw(t, "keepalive"), rapid.IntRange(1, 64).Draw(t, "in flight")
	if rapid.Bool().Draw(t, "has broker") {
		m.EmbeddedListen, m.Brokers = "", []string{"ssl://broker.example:8883", "tcp://[::1]:1883"}
		m.User, m.PasswordFile, m.CAFile = text.Draw(t, "user"), text.Draw(t, "password"), text.Draw(t, "ca")
		m.AllowPlainPassword = rapid.Bool().Draw(t, "plain")
	}
	cfg.Alarm = Alarm{UnbalanceMinutes: rapid.IntRange(1, 60).Draw(t, "on"), ClearMinutes: rapid.IntRange(1, 60).Draw(t, "off")}
}

// same compares configurations without where their keys stand.
var same = cmpopts.IgnoreUnexported(Config{})

func TestEffectiveParsesToTheSame(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		cfg := drawConfig(t)
		text := cfg.Effective()
		again, err := Parse("effective.toml", []byte(text))
		if err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		if diff := cmp.Diff(cfg, again, same); diff != "" {
			t.Fatalf("the configuration changed (-written +read):\n%s", diff)
		}
		if again.Effective() != text {
			t.Fatal("the second text differs from the first")
		}
	})
}

func TestEffectiveWritesDefaults(t *testing.T) {
	cfg, err := Parse("f.toml", []byte(good))
	if err != nil {
		t.Fatal(err)
	}
	text := cfg.Effective()
	for _, line := range []string{
		"quiet_share = 0.25", "spi_hz = 8000000", "clock_hz = 8192000", "gain = [1, 1, 1, 1, 1, 1, 1, 1]", "input_crc = true",
		"highpass_hz = 0.0", "max_mb = 256", "keep_days = 400", "in_flight = 16", "keepalive_s = 30", "unbalance_minutes = 3",
		"embedded_listen = '127.0.0.1:1883'", "client_id = 'heavyspot-north-works-kiln-fan-2'",
	} {
		if !strings.Contains(text, "\n"+line+"\n") {
			t.Errorf("no line %q in\n%s", line, text)
		}
	}
	again, err := Parse("f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(cfg, again, same); diff != "" {
		t.Error(diff)
	}
}
