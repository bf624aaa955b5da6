package config

// Config is a whole, checked configuration. It comes from Load or Parse; the
// keys of its tables are the toml tags, and what a tag's comment gives as
// default is filled in.
type Config struct {
	Machine Machine `toml:"machine"`
	Limits  Limits  `toml:"limits"`
	Source  Source  `toml:"source"`
	// Rig is the simulated machine's story; nil unless Source.Driver is
	// DriverRig.
	Rig *Rig `toml:"rig,omitempty"`
	// Reference is the phase reference; nil when the machine has none.
	Reference *Reference `toml:"reference,omitempty"`
	// Points holds the measuring points in the order of the file, at least one.
	Points []Point `toml:"point"`
	Buffer Buffer  `toml:"buffer"`
	MQTT   MQTT    `toml:"mqtt"`
	Alarm  Alarm   `toml:"alarm"`

	// origin lets later checks name the line of a key.
	origin origin
}

// Machine says which machine is watched.
type Machine struct {
	// Site and Name are levels of the topics: a-z, 0-9 and hyphens, 1 to 63.
	Site string `toml:"site"`
	Name string `toml:"name"`
	// Rotor is "between-bearings" or "overhung".
	Rotor string `toml:"rotor"`
	// Rotation is "clockwise" or "counter-clockwise", seen from the drive end.
	Rotation string `toml:"rotation"`
	// RatedRPM is the rated speed, 60 to 6000 r/min.
	RatedRPM float64 `toml:"rated_rpm"`
}

// Limits says how much vibration is too much. Which keys go together depends on
// Standard; those of another standard are empty.
type Limits struct {
	// Standard is "iso-14694", "iso-20816-3" or "own".
	Standard string `toml:"standard"`
	// Category is the fan's application category of ISO 14694, "BV-1" to
	// "BV-5".
	Category string `toml:"category,omitempty"`
	// Group is the machine group of ISO 20816-3: 1 above 300 kW, 2 from 15 to
	// 300 kW.
	Group int `toml:"group,omitempty"`
	// Support is "rigid" or "flexible"; beside "own" it is not needed and
	// changes nothing.
	Support string `toml:"support,omitempty"`
	// AlarmMMS and TripMMS are the plant's own limits of the overall velocity,
	// 0.1 to 100 mm/s rms, alarm below trip.
	AlarmMMS float64 `toml:"alarm_mm_s_rms,omitempty"`
	TripMMS  float64 `toml:"trip_mm_s_rms,omitempty"`
	// QuietShare is the share of the alarm limit under which the worst 1x is
	// quiet, 0.01 to 1; default 0.25.
	QuietShare float64 `toml:"quiet_share"`
}

// Source says where samples come from.
type Source struct {
	// Driver is one of the Driver constants.
	Driver string `toml:"driver"`
	// RateHz is the sampling rate of each channel, 10 to 32000 Hz. A
	// recording's own rate goes before it; what the converter can do is checked
	// by CheckSource.
	RateHz float64 `toml:"rate_hz"`
	// SPI is the port, "/dev/spidev0.0" (default) or "SPI0.0".
	SPI string `toml:"spi"`
	// SPIHz is the bit clock of the bus, 100000 to 25000000 Hz; default 8 MHz.
	SPIHz int `toml:"spi_hz"`
	// DataReady is the pin of the converter's data-ready signal, default
	// "GPIO25".
	DataReady string `toml:"data_ready"`
	// Clock is "crystal" (default) or "external".
	Clock string `toml:"clock"`
	// ClockHz is the converter's clock, 300000 to 8400000 Hz; default 8.192 MHz.
	ClockHz int `toml:"clock_hz"`
	// Gain holds the gain of each channel, a power of two from 1 to 128. In the
	// file one number stands for all channels; default 1.
	Gain []int `toml:"gain"`
	// InputCRC makes the converter check what it is told; default true.
	InputCRC bool `toml:"input_crc"`
}

// Rig is the story that the simulated machine plays.
type Rig struct {
	// Fault is what is wrong with it, one of the words of Faults; default
	// "static".
	Fault string `toml:"fault"`
	// MMS is the 1x velocity at the worst point, 0 to 100 mm/s rms; default 6.
	MMS float64 `toml:"mm_s_rms"`
	// NoiseMMS is the rms velocity of the broad-band noise, 0 to 20 mm/s;
	// default 0.3.
	NoiseMMS float64 `toml:"noise_mm_s_rms"`
	// Seed makes a run repeatable, 0 to 2147483647; default 1.
	Seed int `toml:"seed"`
	// SpeedUp is how many times faster than life it runs, 0.1 to 1000;
	// default 1.
	SpeedUp float64 `toml:"speed_up"`
}

// Reference describes the once-per-turn pulse.
type Reference struct {
	// Channel is its channel, counted from 0; no point may use it.
	Channel int `toml:"channel"`
	// Edge is the leading edge, "rising" or "falling".
	Edge string `toml:"edge"`
	// ThresholdV is the level that the leading edge crosses, -50 to 50 V.
	ThresholdV float64 `toml:"threshold_v"`
	// HysteresisV is how far the signal must fall back before the next edge
	// counts, 0.0001 to 50 V.
	HysteresisV float64 `toml:"hysteresis_v"`
}

// Point is a measuring point: a sensor's place, direction and chain.
type Point struct {
	// Name is unique: a-z, 0-9 and hyphens, 1 to 32.
	Name string `toml:"name"`
	// Bearing is "drive-end" or "non-drive-end".
	Bearing string `toml:"bearing"`
	// Direction is "vertical", "horizontal" or "axial"; a bearing has one point
	// in each at most.
	Direction string `toml:"direction"`
	// Channel is unique, counted from 0.
	Channel int `toml:"channel"`
	// VoltsPerG is the sensitivity, 0.0001 to 100 volts per standard gravity.
	VoltsPerG float64 `toml:"volts_per_g"`
	// Inverted is true when the sensor's positive direction is opposite to the
	// machine's; default false.
	Inverted bool `toml:"inverted"`
	// HighpassHz is the corner of the chain's first-order high pass, 0 to 10
	// Hz; 0 (default) means none.
	HighpassHz float64 `toml:"highpass_hz"`
	// FullScaleV is the voltage at which the sensor's chain saturates, either
	// way from zero, 0 to 100 V; 0 (default) means where the converter does.
	FullScaleV float64 `toml:"full_scale_v"`
}

// Buffer is the rolling buffer on the card.
type Buffer struct {
	// Path is its file; a relative one is resolved by BufferPath. Default
	// "heavyspot.db".
	Path string `toml:"path"`
	// Socket is where pull asks the running daemon; a relative one is resolved
	// by SocketPath. Default "heavyspot.sock".
	Socket string `toml:"socket"`
	// MaxMB bounds the file, 16 to 900 MB; default 256. The upper bound leaves
	// room to map the file on a 32-bit board.
	MaxMB int `toml:"max_mb"`
	// KeepDays is how long readings are kept, 1 to 3650 days; default 400.
	KeepDays int `toml:"keep_days"`
	// FindingsKeepDays is how long findings and alarms are kept, 1 to 3650
	// days; default 3650.
	FindingsKeepDays int `toml:"findings_keep_days"`
}

// MQTT says where messages go.
type MQTT struct {
	// Brokers are tried in turn, "tcp://host:port" or "ssl://host:port"; empty
	// (default) means the embedded broker.
	Brokers []string `toml:"brokers"`
	// EmbeddedListen is the loopback address of the embedded broker, default
	// "127.0.0.1:1883"; empty when there are brokers.
	EmbeddedListen string `toml:"embedded_listen,omitempty"`
	// Root is the first level or levels of every topic, default "heavyspot".
	Root string `toml:"root"`
	// ClientID is the name given to the broker; default "heavyspot-SITE-NAME".
	ClientID string `toml:"client_id"`
	// User and PasswordFile sign on at the broker; the password is the first
	// line of the file. Empty means none. Files are resolved by FilePath.
	User         string `toml:"user,omitempty"`
	PasswordFile string `toml:"password_file,omitempty"`
	// CAFile holds the certificates that the broker's is checked against; empty
	// means those of the system. CertFile and KeyFile are this client's own,
	// both or none. All are PEM.
	CAFile   string `toml:"ca_file,omitempty"`
	CertFile string `toml:"cert_file,omitempty"`
	KeyFile  string `toml:"key_file,omitempty"`
	// AllowPlainPassword permits a password over an unencrypted connection to
	// another host, where anybody on the network can read it; default false.
	AllowPlainPassword bool `toml:"allow_plain_password"`
	// KeepaliveS is the time between signs of life, 5 to 3600 s; default 30.
	KeepaliveS int `toml:"keepalive_s"`
	// InFlight is how many messages may wait for the broker's acknowledgement,
	// 1 to 64; default 16.
	InFlight int `toml:"in_flight"`
}

// Alarm is how patient the alarms are.
type Alarm struct {
	// UnbalanceMinutes is how many steady minutes in a row must show unbalance
	// before its alarm comes, 1 to 60; default 3.
	UnbalanceMinutes int `toml:"unbalance_minutes"`
	// ClearMinutes is how many minutes in a row must be free of a cause before
	// its alarm returns, 1 to 60; default 3.
	ClearMinutes int `toml:"clear_minutes"`
}
