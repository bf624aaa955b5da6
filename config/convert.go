package config

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"heavyspot/acquire/ads131m08"
	"heavyspot/dsp"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

// DSP returns the configuration of the signal path for a stream of channels
// channels at rateHz, which for a recording may differ from RateHz. The
// response of the converter's filter belongs to the stream and is left out.
func (c *Config) DSP(rateHz float64, channels int) dsp.Config {
	out := dsp.Config{RateHz: rateHz, Channels: channels, RatedRPM: c.Machine.RatedRPM}
	if r := c.Reference; r != nil {
		out.Reference = &dsp.Reference{
			Channel:     r.Channel,
			Falling:     r.Edge == "falling",
			ThresholdV:  r.ThresholdV,
			HysteresisV: r.HysteresisV,
		}
	}
	for _, p := range c.Points {
		out.Points = append(out.Points, dsp.Point{
			Name:       p.Name,
			Channel:    p.Channel,
			VoltsPerG:  p.VoltsPerG,
			Inverted:   p.Inverted,
			HighpassHz: p.HighpassHz,
			FullScaleV: p.FullScaleV,
		})
	}
	return out
}

// directionOf holds the axis of each direction's word.
var directionOf = map[string]rules.Direction{
	"vertical":   rules.Vertical,
	"horizontal": rules.Horizontal,
	"axial":      rules.Axial,
}

// Rules returns what a judgement rests on. It panics when c did not come from
// Load or Parse and its limits do not exist.
func (c *Config) Rules() rules.Config {
	limits, err := c.Limits.severity()
	if err != nil {
		panic(fmt.Sprintf("config: cannot use limits that were never checked: %v", err))
	}
	out := rules.Config{
		Overhung:         c.Machine.Rotor == "overhung",
		CounterClockwise: c.Machine.Rotation == "counter-clockwise",
		RatedRPM:         c.Machine.RatedRPM,
		Limits:           limits,
		QuietShare:       c.Limits.QuietShare,
	}
	for _, p := range c.Points {
		out.Points = append(out.Points, rules.Point{
			Name:        p.Name,
			NonDriveEnd: p.Bearing == "non-drive-end",
			Direction:   directionOf[p.Direction],
		})
	}
	return out
}

// Alarms returns how strict and how patient the alarms are. It panics as Rules
// does.
func (c *Config) Alarms() alarm.Config {
	judged := c.Rules()
	return alarm.Config{
		Machine:          c.Machine.Name,
		AlarmMMS:         judged.Limits.Alarm,
		TripMMS:          judged.Limits.Trip,
		QuietShare:       judged.QuietShare,
		HasReference:     c.Reference != nil,
		UnbalanceMinutes: c.Alarm.UnbalanceMinutes,
		ClearMinutes:     c.Alarm.ClearMinutes,
	}
}

// ADS131M08 returns the configuration of the converter with all its channels
// in use. The clock, the thread's set-up and the fault reports are the caller's
// to add.
func (c *Config) ADS131M08() ads131m08.Config {
	out := ads131m08.Default()
	out.RateHz = c.Source.RateHz
	out.Channels = converterChannels
	out.Gains = slices.Clone(c.Source.Gain)
	out.ClockHz = float64(c.Source.ClockHz)
	out.Crystal = c.Source.Clock == "crystal"
	out.SPIHz = float64(c.Source.SPIHz)
	out.InputCRC = c.Source.InputCRC
	return out
}

// Channels returns the number of channels that the points and the reference
// need: the highest channel in use and one.
func (c *Config) Channels() int {
	highest := 0
	for _, p := range c.Points {
		highest = max(highest, p.Channel)
	}
	if c.Reference != nil {
		highest = max(highest, c.Reference.Channel)
	}
	return highest + 1
}

// BufferPath returns the buffer's file. A relative one stands in the folder
// that the service manager gives ($STATE_DIRECTORY), else in the working
// directory.
func (c *Config) BufferPath() string { return under("STATE_DIRECTORY", c.Buffer.Path) }

// SocketPath returns the daemon's socket. A relative one stands in the folder
// that the service manager gives ($RUNTIME_DIRECTORY), else in the working
// directory.
func (c *Config) SocketPath() string { return under("RUNTIME_DIRECTORY", c.Buffer.Socket) }

// FilePath returns the path of a file that [mqtt] names: a relative one is
// relative to the folder of the configuration file. The empty name stays empty.
func (c *Config) FilePath(name string) string {
	if name == "" || filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(filepath.Dir(c.origin.file), name)
}

// under returns path below the first folder of a variable, which may list
// several with colons (systemd.exec).
func under(variable, path string) string {
	folder, _, _ := strings.Cut(os.Getenv(variable), ":")
	if folder == "" || filepath.IsAbs(path) {
		return path
	}
	return filepath.Join(folder, path)
}
