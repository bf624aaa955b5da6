package config

import (
	"errors"
	"strings"
	"testing"
)

// good is a short configuration that is right; the tables below spoil one line.
const good = `[machine]
site = "north-works"
name = "kiln-fan-2"
rotor = "between-bearings"
rotation = "clockwise"
rated_rpm = 990
[limits]
standard = "iso-14694"
category = "BV-3"
support = "rigid"
[source]
driver = "ads131m08"
rate_hz = 1000
[reference]
channel = 6
edge = "rising"
threshold_v = 0.5
hysteresis_v = 0.1
[[point]]
name = "de-v"
bearing = "drive-end"
direction = "vertical"
channel = 0
volts_per_g = 0.1
[[point]]
name = "nde-h"
bearing = "non-drive-end"
direction = "horizontal"
channel = 1
volts_per_g = 0.05
`

// spoil returns good with a line, counted from 1, replaced by text, which may
// hold several lines; line 31 adds text at the end.
func spoil(line int, text string) string {
	lines := strings.Split(good, "\n")
	lines[line-1] = text
	return strings.Join(lines, "\n")
}

// mistake is one spoilt file and what is said of it, line by line, without the
// file's name.
type mistake struct {
	line int
	text string
	want string
}

// mistakes in the tables that the contract fixes.
var contractMistakes = []mistake{
	// [machine]
	{2, `site = "North"`, `2: machine.site = "North": must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{2, `site = ""`, `2: machine.site = "": must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{2, `site = "a/b"`, `2: machine.site = "a/b": must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{2, `site = "` + strings.Repeat("n", 64) + `"`,
		`2: machine.site = "` + strings.Repeat("n", 56) + `...: must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{2, ``, `1: machine.site: missing; must be text: a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{3, `name = 2`, `3: machine.name = 2: must be text: a-z, 0-9 and hyphens, from 1 to 63 characters, not a whole number`},
	{3, `name = "a\nb"`, `3: machine.name = "a\nb": must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{3, "name = \"\"\"a\nb\"\"\"", `3: machine.name = """a b""": must be a-z, 0-9 and hyphens, from 1 to 63 characters`},
	{4, `rotor = "overhang"`, `4: machine.rotor = "overhang": must be "between-bearings" or "overhung"`},
	{4, `rotor = true`, `4: machine.rotor = true: must be "between-bearings" or "overhung", not true or false`},
	{5, `rotation = "Clockwise"`, `5: machine.rotation = "Clockwise": must be "clockwise" or "counter-clockwise"`},
	{5, `rotation = ["clockwise"]`, `5: machine.rotation = ["clockwise"]: must be "clockwise" or "counter-clockwise", not a list`},
	{6, `rated_rpm = 59.9`, `6: machine.rated_rpm = 59.9: must be from 60 to 6000 (r/min)`},
	{6, `rated_rpm = 6_001`, `6: machine.rated_rpm = 6_001: must be from 60 to 6000 (r/min)`},
	{6, `rated_rpm = nan`, `6: machine.rated_rpm = nan: must be from 60 to 6000 (r/min)`},
	{6, `rated_rpm = inf # fast`, `6: machine.rated_rpm = inf: must be from 60 to 6000 (r/min)`},
	{6, `rated_rpm = "990"`, `6: machine.rated_rpm = "990": must be a number from 60 to 6000 (r/min), not text`},
	{6, `rated_rpm = 1990-01-01`, `6: machine.rated_rpm = 1990-01-01: must be a number from 60 to 6000 (r/min), not a date or time`},
	{6, `rated_rmp = 990`, "1: machine.rated_rpm: missing; must be a number from 60 to 6000 (r/min)\n" +
		`6: machine.rated_rmp: unknown key; did you mean rated_rpm?`},
	{6, "rated_rpm = 990\n\"odd key\" = 1", `7: machine."odd key": unknown key; known here: site, name, rotor, rotation, rated_rpm`},
	{6, "rated_rpm = 990\nvolts_per_g = 1", `7: machine.volts_per_g: unknown key here; it belongs in [[point]]`},
	{1, `[machin]`, "1: machin: unknown table; did you mean machine?\n1: machine: missing table [machine]"},
	{1, `[[machine]]`, `1: machine: must be one table, [machine], not a list`},
	{1, "site = 1\n[machine]", `1: site: unknown key here; it belongs in [machine]`},
	{1, "threshold_v = 1\n[machine]", `1: threshold_v: unknown key here; it belongs in [reference]`},
	// [limits]
	{8, `standard = "iso-10816"`, `8: limits.standard = "iso-10816": must be "iso-14694", "iso-20816-3" or "own"`},
	{8, ``, `7: limits.standard: missing; must be "iso-14694", "iso-20816-3" or "own"`},
	{8, "standard = \"amca\"\ncategory = 3\n[x]", `8: limits.standard = "amca": must be "iso-14694", "iso-20816-3" or "own"` + "\n" +
		`9: limits.category = 3: must be "BV-1", "BV-2", "BV-3", "BV-4" or "BV-5", not a whole number` + "\n" +
		`10: x: unknown table; known here: machine, limits, source, rig, reference, point, buffer, mqtt, alarm`},
	{9, `category = "BV-6"`, `9: limits.category = "BV-6": must be "BV-1", "BV-2", "BV-3", "BV-4" or "BV-5"`},
	{9, ``, `7: limits.category: missing; must be "BV-1", "BV-2", "BV-3", "BV-4" or "BV-5"`},
	{9, "category = \"BV-3\"\ngroup = 1", `10: limits.group = 1: belongs to standard = "iso-20816-3", leave it out`},
	{9, "category = \"BV-3\"\ntrip_mm_s_rms = 9", `10: limits.trip_mm_s_rms = 9: belongs to standard = "own", leave it out`},
	{10, `support = "soft"`, `10: limits.support = "soft": must be "rigid" or "flexible"`},
	{10, "support = \"rigid\"\nquiet_share = 0", `11: limits.quiet_share = 0: must be from 0.01 to 1 (share of the alarm limit)`},
	{8, `standard = "iso-20816-3"`, `7: limits.group: missing; must be a whole number, 1 (above 300 kW) or 2 (15 to 300 kW)` +
		"\n" + `9: limits.category = "BV-3": belongs to standard = "iso-14694", leave it out`},
	{8, "standard = \"iso-20816-3\"\ngroup = 3", `9: limits.group = 3: must be 1 (above 300 kW) or 2 (15 to 300 kW)` +
		"\n" + `10: limits.category = "BV-3": belongs to standard = "iso-14694", leave it out`},
	{8, `standard = "own"`, "7: limits.alarm_mm_s_rms: missing; must be a number from 0.1 to 100 (mm/s rms)\n" +
		"7: limits.trip_mm_s_rms: missing; must be a number from 0.1 to 100 (mm/s rms)\n" +
		`9: limits.category = "BV-3": belongs to standard = "iso-14694", leave it out`},
	{8, "standard = \"own\"\nalarm_mm_s_rms = 9.0\ntrip_mm_s_rms = 9\n[x]", "10: limits.trip_mm_s_rms = 9: must be above alarm_mm_s_rms, 9\n" +
		`11: x: unknown table; known here: machine, limits, source, rig, reference, point, buffer, mqtt, alarm`},
	// [source]
	{12, `driver = "ads1310"`, `12: source.driver = "ads1310": must be "ads131m08", "adxl355" or "rig"`},
	{13, `rate_hz = 9`, `13: source.rate_hz = 9: must be from 10 to 32000 (samples a second of each channel)`},
	{13, `rate_hz = -1e9`, `13: source.rate_hz = -1e9: must be from 10 to 32000 (samples a second of each channel)`},
	{13, `rate_hz = {}`, `13: source.rate_hz = {}: must be a number from 10 to 32000 (samples a second of each channel), not a table`},
	// [reference]
	{15, `channel = 8`, `15: reference.channel = 8: must be from 0 to 7 (channels count from 0)`},
	{15, `channel = -1`, `15: reference.channel = -1: must be from 0 to 7 (channels count from 0)`},
	{15, `channel = 6.0`, `15: reference.channel = 6.0: must be a whole number from 0 to 7 (channels count from 0), not a number`},
	{15, `channel = 9223372036854775807`, `15: reference.channel = 9223372036854775807: must be from 0 to 7 (channels count from 0)`},
	{15, `channel = 1`, `15: reference.channel = 1: must be used once; it is taken by point[1].channel in line 29`},
	{16, `edge = "up"`, `16: reference.edge = "up": must be "rising" or "falling"`},
	{17, `threshold_v = 51`, `17: reference.threshold_v = 51: must be from -50 to 50 (volts)`},
	{18, `hysteresis_v = 0`, `18: reference.hysteresis_v = 0: must be from 0.0001 to 50 (volts)`},
	{18, ``, `14: reference.hysteresis_v: missing; must be a number from 0.0001 to 50 (volts)`},
	// [[point]]
	{20, `name = "DE V"`, `20: point[0].name = "DE V": must be a-z, 0-9 and hyphens, from 1 to 32 characters`},
	{26, `name = "de-v"`, `26: point[1].name = "de-v": must be used once; it is taken by point[0].name in line 20`},
	{21, `bearing = "de"`, `21: point[0].bearing = "de": must be "drive-end" or "non-drive-end"`},
	{28, `direction = "radial"`, `28: point[1].direction = "radial": must be "vertical", "horizontal" or "axial"`},
	{22, "direction = \"horizontal\"\ninverted = 1", `23: point[0].inverted = 1: must be true or false, not a whole number`},
	{29, `channel = 0`, `29: point[1].channel = 0: must be used once; it is taken by point[0].channel in line 23`},
	{24, `volts_per_g = 0`, `24: point[0].volts_per_g = 0: must be from 0.0001 to 100 (volts per standard gravity)`},
	{30, `volts_per_g = -0.1`, `30: point[1].volts_per_g = -0.1: must be from 0.0001 to 100 (volts per standard gravity)`},
	{30, ``, `25: point[1].volts_per_g: missing; must be a number from 0.0001 to 100 (volts per standard gravity)`},
	{30, `milli_volts_per_g = 50`, "25: point[1].volts_per_g: missing; must be a number from 0.0001 to 100 (volts per standard gravity)\n" +
		`30: point[1].milli_volts_per_g: unknown key; known here: name, bearing, direction, channel, volts_per_g, inverted, highpass_hz, full_scale_v`},
	{30, "volts_per_g = 0.1\nhighpass_hz = 11", `31: point[1].highpass_hz = 11: must be from 0 to 10 (Hz, 0 = none)`},
	{30, "volts_per_g = 0.1\nmax_mb = 64", `31: point[1].max_mb: unknown key here; it belongs in [buffer]`},
	{31, "[[point]]\nname = \"x\"\nbearing = \"drive-end\"\ndirection = \"vertical\"\nchannel = 2\nvolts_per_g = 1",
		`34: point[2].direction = "vertical": must be used once; drive-end vertical is taken by point[0] in line 19`},
}

func TestMistakesInTheContractsTables(t *testing.T) { checkMistakes(t, contractMistakes) }

func TestMistakesInOtherTables(t *testing.T) { checkMistakes(t, otherMistakes) }

// mistakes in the tables that the daemon adds.
var otherMistakes = []mistake{
	{13, "rate_hz = 1000\nspi = \"/dev/spi0\"", `14: source.spi = "/dev/spi0": must be like "/dev/spidev0.0" or "SPI0.0"`},
	{13, "rate_hz = 1000\nspi_hz = 99999", `14: source.spi_hz = 99999: must be from 100000 to 25000000 (Hz)`},
	{13, "rate_hz = 1000\ndata_ready = \"25\"", `14: source.data_ready = "25": must be like "GPIO25"`},
	{13, "rate_hz = 1000\nclock = \"internal\"", `14: source.clock = "internal": must be "crystal" or "external"`},
	{13, "rate_hz = 1000\nclock_hz = 8400001", `14: source.clock_hz = 8400001: must be from 300000 to 8400000 (Hz)`},
	{13, "rate_hz = 1000\ngain = 3", `14: source.gain = 3: must be a power of two from 1 to 128`},
	{13, "rate_hz = 1000\ngain = 1.0", `14: source.gain = 1.0: must be one number or a list of 8, each a power of two from 1 to 128, not a number`},
	{13, "rate_hz = 1000\ngain = [1, 2]", `14: source.gain = [1, 2]: must be one number or a list of 8, each a power of two from 1 to 128`},
	{13, "rate_hz = 1000\ngain = []", `14: source.gain = []: must be one number or a list of 8, each a power of two from 1 to 128`},
	{13, "rate_hz = 1000\ngain = [1, 1, 1, 1,\n 1, 1, 0, 256]", "15: source.gain[6] = 0: must be a power of two from 1 to 128\n" +
		`15: source.gain[7] = 256: must be a power of two from 1 to 128`},
	{13, "rate_hz = 1000\ngain = [1, 1, 1, 1, 1, 1, 1, \"1\"]", `14: source.gain[7] = "1": must be a power of two from 1 to 128, not text`},
	{13, "rate_hz = 1000\ninput_crc = \"yes\"", `14: source.input_crc = "yes": must be true or false, not text`},
	{31, "[rig]", `31: rig: belongs to source.driver = "rig", leave it out`},
	{12, "driver = \"rig\"\nrig = 1", `13: source.rig: unknown key; known here: driver, rate_hz, spi, spi_hz, data_ready, clock, clock_hz, gain, input_crc`},
	{12, "driver = \"rig\"\n[rig]\nfault = \"rub\"\n[x]",
		"11: source.rate_hz: missing; must be a number from 10 to 32000 (samples a second of each channel)\n" +
			`14: rig.fault = "rub": must be "none", "static", "couple", "dynamic", "overhung", "bent-shaft", "misalignment", ` +
			`"eccentricity", "resonance", "looseness", "rub-or-loose-rotor", "neighbour-machine" or "not-turn-related"` + "\n" +
			"15: x: unknown table; known here: machine, limits, source, rig, reference, point, buffer, mqtt, alarm"},
	{12, "rig.fault = 1\ndriver = \"rig\"", "12: source.rig: unknown table; known here: driver, rate_hz, spi, spi_hz, data_ready, clock, clock_hz, gain, input_crc"},
	{31, "[buffer]\npath = \"\"", `32: buffer.path = "": must be the name of a file, at most 1000 characters`},
	{31, "[buffer]\nsocket = \"a b\"", `32: buffer.socket = "a b": must be the name of a socket, at most 100 ASCII characters without spaces`},
	{31, "[buffer]\npath = \"a\"\nsocket = \"a\"", `33: buffer.socket = "a": must differ from path, "a"`},
	{31, "[buffer]\nmax_mb = 15", `32: buffer.max_mb = 15: must be from 16 to 900 (MB)`},
	{31, "[buffer]\nmax_mb = 901", `32: buffer.max_mb = 901: must be from 16 to 900 (MB)`},
	{31, "[buffer]\nkeep_days = 0", `32: buffer.keep_days = 0: must be from 1 to 3650 (days)`},
	{31, "[buffer]\nkeep_hours = 1", `32: buffer.keep_hours: unknown key; known here: path, socket, max_mb, keep_days, findings_keep_days`},
	{31, "[mqtt]\nbrokers = \"tcp://127.0.0.1:1883\"",
		`32: mqtt.brokers = "tcp://127.0.0.1:1883": must be a list of addresses ` + brokerWords + `, not text`},
	{31, "[mqtt]\nbrokers = [1, 2, 3, 4, 5, 6, 7, 8, 9]", `32: mqtt.brokers = [1, 2, 3, 4, 5, 6, 7, 8, 9]: must be a list of at most 8 addresses`},
	{31, "[mqtt]\nbrokers = [1]", `32: mqtt.brokers[0] = 1: must be an address ` + brokerWords + `, not a whole number`},
	{31, "[mqtt]\nbrokers = [\"http://a:1\"]", `32: mqtt.brokers[0] = "http://a:1": must be an address ` + brokerWords},
	{31, "[mqtt]\nbrokers = [\"tcp://a\"]", `32: mqtt.brokers[0] = "tcp://a": must be an address ` + brokerWords},
	{31, "[mqtt]\nbrokers = [\"tcp://a:0\"]", `32: mqtt.brokers[0] = "tcp://a:0": must be an address ` + brokerWords},
	{31, "[mqtt]\nbrokers = [\"ssl://a:1/x\"]", `32: mqtt.brokers[0] = "ssl://a:1/x": must be an address ` + brokerWords},
	{31, "[mqtt]\nbrokers = [\"ssl://u:hunter2@a:1\"]", `32: mqtt.brokers[0]: must not hold a user or password; use user and password_file`},
	{31, "[mqtt]\nbrokers = \"ssl://u:hunter2@a:1\"", `32: mqtt.brokers: must be a list of addresses ` + brokerWords + `, not text`},
	{31, "[mqtt]\npassword = \"hunter2\"",
		`32: mqtt.password: a password does not stand in this file; put it in a file of its own and name that in password_file`},
	{31, "[mqtt]\nroot = \"/a\"", `32: mqtt.root = "/a": must be 1 to 4 levels of 1 to 63 characters with / between them, without + # $ or spaces`},
	{31, "[mqtt]\nroot = \"a/+\"", `32: mqtt.root = "a/+": must be 1 to 4 levels of 1 to 63 characters with / between them, without + # $ or spaces`},
	{31, "[mqtt]\nroot = \"$SYS\"", `32: mqtt.root = "$SYS": must be 1 to 4 levels of 1 to 63 characters with / between them, without + # $ or spaces`},
	{31, "[mqtt]\nclient_id = \"a b\"", `32: mqtt.client_id = "a b": must be letters, digits, _ . and -, from 1 to 128 characters`},
	{31, "[mqtt]\nkeepalive_s = 4", `32: mqtt.keepalive_s = 4: must be from 5 to 3600 (seconds)`},
	{31, "[mqtt]\nin_flight = 65", `32: mqtt.in_flight = 65: must be from 1 to 64 (messages)`},
	{31, "[mqtt]\nembedded_listen = \"0.0.0.0:1883\"",
		`32: mqtt.embedded_listen = "0.0.0.0:1883": must be a loopback address like "127.0.0.1:1883" (the embedded broker asks for no password)`},
	{31, "[mqtt]\nembedded_listen = \"127.0.0.1:1883\"\nbrokers = [\"tcp://a:1\"]",
		`32: mqtt.embedded_listen = "127.0.0.1:1883": belongs to the embedded broker, leave it out beside brokers`},
	{31, "[mqtt]\nuser = \"fan\"", `32: mqtt.user = "fan": belongs to a broker in brokers, leave it out`},
	{31, "[mqtt]\nbrokers = [\"ssl://a:1\"]\npassword_file = \"p\"", `33: mqtt.password_file = "p": must stand beside user`},
	{31, "[mqtt]\nbrokers = [\"ssl://a:1\"]\nkey_file = \"k\"", `33: mqtt.key_file = "k": must stand beside cert_file`},
	{31, "[mqtt]\nbrokers = [\"tcp://a:1\"]\nca_file = \"k\"", `33: mqtt.ca_file = "k": belongs to an ssl:// broker, leave it out`},
	{31, "[mqtt]\nbrokers = [\n\"ssl://a:1\",\n\"tcp://a:1\"]\nuser = \"u\"\npassword_file = \"p\"",
		`34: mqtt.brokers[1] = "tcp://a:1": must be ssl:// when password_file is set, or set allow_plain_password = true`},
	{31, "[alarm]\nunbalance_minutes = 61", `32: alarm.unbalance_minutes = 61: must be from 1 to 60 (minutes)`},
	{31, "[alarm]\nclear_minutes = 0", `32: alarm.clear_minutes = 0: must be from 1 to 60 (minutes)`},
	{31, "[reference.more]", `31: reference.more: unknown table; known here: channel, edge, threshold_v, hysteresis_v`},
	{31, "[[buffer]]", `31: buffer: must be one table, [buffer], not a list`},
	{31, "[alarms]\nclear_minutes = 3", `31: alarms: unknown table; did you mean alarm?`},
	{31, "[plot]\nx = 3", `31: plot: unknown table; known here: machine, limits, source, rig, reference, point, buffer, mqtt, alarm`},
	// not TOML at all
	{4, `rotor = overhung`, `4:9: not valid TOML: unexpected character U+006F 'o' at start of value (texts stand in double quotes)`},
	{24, `volts_per_g = 0,1`, `24:16: not valid TOML: expected newline but got U+002C ',' (decimals are written with a point)`},
	{3, `site = "twice"`, `3:1: not valid TOML: key site is already defined`},
	{25, `[machine]`, `25:2: not valid TOML: table machine already exists`},
	{19, `[[point]`, `19:8: not valid TOML: expected ']]' to close array table name`},
}

// checkMistakes checks that each spoilt file is refused with exactly these
// words, and that the error is a list with the file's name throughout.
func checkMistakes(t *testing.T, mistakes []mistake) {
	t.Helper()
	for _, m := range mistakes {
		cfg, err := Parse("f.toml", []byte(spoil(m.line, m.text)))
		var list *Errors
		if !errors.As(err, &list) || cfg != nil {
			t.Errorf("%q: configuration %v, error %v; want none and *Errors", m.text, cfg, err)
			continue
		}
		want := "f.toml:" + strings.ReplaceAll(m.want, "\n", "\nf.toml:")
		if got := err.Error(); got != want {
			t.Errorf("%q:\n got %s\nwant %s", m.text, got, want)
		}
		if strings.Contains(err.Error(), "hunter2") {
			t.Errorf("%q: the password is shown", m.text)
		}
	}
}

// Mistakes that take more than one line to make.
func TestMistakesOfTheWhole(t *testing.T) {
	rig := strings.Replace(good, `"ads131m08"`, `"rig"`, 1)
	head, _, _ := strings.Cut(good, "[[point]]")
	for _, c := range []struct{ text, want string }{
		{"", "f.toml:1: machine: missing table [machine]\nf.toml:1: limits: missing table [limits]\n" +
			"f.toml:1: source: missing table [source]\nf.toml:1: point: missing table [[point]], one for each measuring point"},
		{"machine = 1\n" + good[strings.Index(good, "[limits]"):], "f.toml:1: machine = 1: must be one table, [machine], not a whole number"},
		{head + "[point]\nname = \"a\"", "f.toml:19: point: must be a list of tables, [[point]], not a table"},
		{"point = [1]\n" + head, "f.toml:1: point[0] = 1: must be a table, [[point]], not a whole number"},
		{"point = []\n" + head, "f.toml:1: point = []: missing table [[point]], one for each measuring point"},
		{head + strings.Repeat("[[point]]\n", 32), "f.toml:19: point: 32 points: must be from 1 to 31"},
		{"reference = 6\n" + withoutReference(), "f.toml:1: reference = 6: must be one table, [reference], not a whole number"},
		{rig + "[rig]\nfault = \"overhung\"", `f.toml:32: rig.fault = "overhung": must be another one beside machine.rotor = "between-bearings"`},
		{rig + "[rig]\nmm_s_rms = 101\nnoise_mm_s_rms = -1\nseed = 1.5\nspeed_up = 0",
			"f.toml:32: rig.mm_s_rms = 101: must be from 0 to 100 (mm/s rms)\n" +
				"f.toml:33: rig.noise_mm_s_rms = -1: must be from 0 to 20 (mm/s rms)\n" +
				"f.toml:34: rig.seed = 1.5: must be a whole number from 0 to 2147483647, not a number\n" +
				"f.toml:35: rig.speed_up = 0: must be from 0.1 to 1000 (times faster than life)"},
	} {
		_, err := Parse("f.toml", []byte(c.text))
		if err == nil || err.Error() != c.want {
			t.Errorf("%q:\n got %v\nwant %s", c.text, err, c.want)
		}
	}
}

// Channels beyond the converter's eight exist only in other drivers' recordings.
func TestChannelsDependOnTheDriver(t *testing.T) {
	text := spoil(29, "channel = 17")
	const want = "f.toml:29: point[1].channel = 17: must be from 0 to 7 (channels count from 0)"
	if _, err := Parse("f.toml", []byte(text)); err == nil || err.Error() != want {
		t.Errorf("error %v, want %s", err, want)
	}
	if _, err := Parse("f.toml", []byte(strings.Replace(text, `"ads131m08"`, `"adxl355"`, 1))); err != nil {
		t.Error(err)
	}
}
