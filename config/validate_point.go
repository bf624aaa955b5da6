package config

import (
	"fmt"
	"strconv"
)

// mostPoints bounds the measuring points of one machine; the other drivers than
// the converter have no smaller bound of their own.
const mostPoints = 31

// channelSpan is the range of channels of the driver.
func (c *checker) channelSpan(cfg *Config) span {
	if cfg.Source.Driver == DriverADXL355 || !c.section("source").sound("driver") {
		return span{0, mostPoints, "channels count from 0"}
	}
	return span{0, converterChannels - 1, "channels count from 0"}
}

// validatePoints checks every point, then that no two are alike.
func (c *checker) validatePoints(cfg *Config) {
	const path = "point"
	n := len(cfg.Points)
	switch {
	case c.wrong[path] != "":
		c.fail(path, "must be a list of tables, [[point]], not "+c.wrong[path])
	case n == 0:
		c.fail(path, "missing table [[point]], one for each measuring point")
	case n > mostPoints:
		c.fail(path, fmt.Sprintf("%d points: must be from 1 to %d", n, mostPoints))
	default:
		channels := c.channelSpan(cfg)
		for i := range cfg.Points {
			c.validatePoint(path+index(i), &cfg.Points[i], channels)
		}
		c.validateUnlike(cfg.Points)
	}
}

func (c *checker) validatePoint(path string, p *Point, channels span) {
	if kind := c.wrong[path]; kind != "" {
		c.fail(path, "must be a table, [[point]], not "+kind)
		return
	}
	s := c.section(path)
	s.text("name", required, p.Name, pointName)
	s.choice("bearing", required, p.Bearing, bearings)
	s.choice("direction", required, p.Direction, directions)
	s.whole("channel", required, p.Channel, channels)
	s.number("volts_per_g", required, p.VoltsPerG, span{0.0001, 100, "volts per standard gravity"})
	s.flag("inverted")
	s.number("highpass_hz", optional, p.HighpassHz, span{0, 10, "Hz, 0 = none"})
	s.number("full_scale_v", optional, p.FullScaleV, span{0, 100, "volts, 0 = where the converter saturates"})
}

// validateUnlike checks that names, places and channels are used once.
func (c *checker) validateUnlike(points []Point) {
	names, places, channels := taken{}, taken{}, taken{}
	for i := range points {
		p, path := &points[i], "point"+index(i)
		s := c.section(path)
		if s.sound("name") {
			s.once("name", names.claim(p.Name, path+".name"), "it ")
		}
		if s.sound("bearing") && s.sound("direction") {
			s.once("direction", places.claim(p.Bearing+" "+p.Direction, path), p.Bearing+" "+p.Direction+" ")
		}
		if s.sound("channel") {
			s.once("channel", channels.claim(strconv.Itoa(p.Channel), path+".channel"), "it ")
		}
	}
}

// once tells that a value is held already by the path first, if there is one.
func (s section) once(key, first, what string) {
	if first != "" {
		s.failAt(key, fmt.Sprintf("must be used once; %sis taken by %s in line %d", what, first, s.origin.line(first)))
	}
}

func (c *checker) validateReference(cfg *Config) {
	s, r := c.section("reference"), cfg.Reference
	volts := span{-50, 50, "volts"}
	s.whole("channel", required, r.Channel, c.channelSpan(cfg))
	s.choice("edge", required, r.Edge, edges)
	s.number("threshold_v", required, r.ThresholdV, volts)
	s.number("hysteresis_v", required, r.HysteresisV, span{0.0001, 50, "volts"})
	for i := range cfg.Points {
		p := c.section("point" + index(i))
		if s.sound("channel") && p.sound("channel") && cfg.Points[i].Channel == r.Channel {
			s.once("channel", p.path+".channel", "it ")
		}
	}
}
