package publish

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// Topic joins the levels of a topic: root/site/machine/level...
func Topic(root, site, machine string, levels ...string) string {
	return strings.Join(append([]string{root, site, machine}, levels...), "/")
}

// CheckTopic says what a topic to publish to may not hold: wildcards, empty
// levels, a first "$" (reserved for brokers), control characters, more than
// 65535 bytes (MQTT 3.1.1, sections 1.5.3 and 4.7).
func CheckTopic(topic string) error {
	switch {
	case topic == "" || len(topic) > 65535:
		return fmt.Errorf("publish: topic of %d bytes: must have from 1 to 65535", len(topic))
	case !utf8.ValidString(topic):
		return fmt.Errorf("publish: topic %q: must be UTF-8", topic)
	case strings.ContainsAny(topic, "#+"):
		return fmt.Errorf("publish: topic %q: may not hold # or +", topic)
	case topic[0] == '$':
		return fmt.Errorf("publish: topic %q: may not begin with $", topic)
	case strings.HasPrefix(topic, "/") || strings.HasSuffix(topic, "/") || strings.Contains(topic, "//"):
		return fmt.Errorf("publish: topic %q: no level may be empty", topic)
	}
	for _, r := range topic {
		if r < ' ' || r == 0x7f {
			return fmt.Errorf("publish: topic %q: may not hold control characters", topic)
		}
	}
	return nil
}
