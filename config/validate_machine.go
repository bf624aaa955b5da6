package config

import (
	"fmt"
	"regexp"

	"heavyspot/rules"
)

// nameForm is the form of a name that goes into topics, at most n characters.
func nameForm(n int) form {
	return form{
		pattern: regexp.MustCompile(fmt.Sprintf(`^[a-z0-9-]{1,%d}$`, n)),
		words:   fmt.Sprintf("a-z, 0-9 and hyphens, from 1 to %d characters", n),
	}
}

var (
	topicName = nameForm(63)
	pointName = nameForm(32)
)

func (c *checker) validateMachine(m *Machine) {
	s := c.section("machine")
	s.text("site", required, m.Site, topicName)
	s.text("name", required, m.Name, topicName)
	s.choice("rotor", required, m.Rotor, rotors)
	s.choice("rotation", required, m.Rotation, rotations)
	s.number("rated_rpm", required, m.RatedRPM, span{60, 6000, "r/min"})
}

func (c *checker) validateLimits(l *Limits) {
	s := c.section("limits")
	s.choice("standard", required, l.Standard, standards)
	s.number("quiet_share", optional, l.QuietShare, span{0.01, 1, "share of the alarm limit"})
	if !s.sound("standard") {
		s.choice("category", optional, l.Category, categories)
		s.choice("support", optional, l.Support, supports)
		return
	}
	owner := fmt.Sprintf("standard = %q", l.Standard)
	switch l.Standard {
	case StandardISO14694:
		s.choice("category", required, l.Category, categories)
		s.choice("support", required, l.Support, supports)
		s.foreign(`standard = "iso-20816-3"`, "group")
		s.foreign(`standard = "own"`, "alarm_mm_s_rms", "trip_mm_s_rms")
	case StandardISO208163:
		s.check("group", required, l.Group == 1 || l.Group == 2, "a whole number,", "1 (above 300 kW) or 2 (15 to 300 kW)")
		s.choice("support", required, l.Support, supports)
		s.foreign(`standard = "iso-14694"`, "category")
		s.foreign(`standard = "own"`, "alarm_mm_s_rms", "trip_mm_s_rms")
	case StandardOwn:
		s.validateOwn(l)
		return
	}
	if _, err := l.severity(); err != nil && s.sound("support") && (s.sound("category") || s.sound("group")) {
		s.failAt("standard", fmt.Sprintf("no limits for %s: %v", owner, err))
	}
}

// validateOwn checks the plant's own limits.
func (s section) validateOwn(l *Limits) {
	velocity := span{0.1, 100, "mm/s rms"}
	s.number("alarm_mm_s_rms", required, l.AlarmMMS, velocity)
	s.number("trip_mm_s_rms", required, l.TripMMS, velocity)
	if s.sound("alarm_mm_s_rms") && s.sound("trip_mm_s_rms") && l.TripMMS <= l.AlarmMMS {
		s.failAt("trip_mm_s_rms", "must be above alarm_mm_s_rms, "+plain(l.AlarmMMS))
	}
	s.foreign(`standard = "iso-14694"`, "category")
	s.foreign(`standard = "iso-20816-3"`, "group")
	s.choice("support", optional, l.Support, supports)
}

func (c *checker) validateAlarm(a *Alarm) {
	s := c.section("alarm")
	s.whole("unbalance_minutes", optional, a.UnbalanceMinutes, span{1, 60, "minutes"})
	s.whole("clear_minutes", optional, a.ClearMinutes, span{1, 60, "minutes"})
}

// severity returns the limits that l stands for.
func (l *Limits) severity() (rules.Limits, error) {
	flexible := l.Support == "flexible"
	switch l.Standard {
	case StandardISO14694:
		var category int
		if _, err := fmt.Sscanf(l.Category, "BV-%d", &category); err != nil {
			return rules.Limits{}, fmt.Errorf("category %q: must be BV-1 to BV-5", l.Category)
		}
		return rules.LimitsISO14694(category, flexible)
	case StandardISO208163:
		return rules.LimitsISO20816(l.Group, flexible)
	}
	return rules.Limits{Standard: StandardOwn, Alarm: l.AlarmMMS, Trip: l.TripMMS}, nil
}
