package alarm

import (
	"testing"

	"heavyspot/dsp"
	"heavyspot/rules"
)

// TestPartsOfMinutesDoNotCount: the short minutes at the begin and the end of a
// run do not count in the row of minutes that show unbalance.
func TestPartsOfMinutesDoNotCount(t *testing.T) {
	e, err := New(config())
	if err != nil {
		t.Fatal(err)
	}
	f := found(rules.StaticUnbalance, 5)
	short := func() *dsp.Minute { return with(steady(4, 5), func(m *dsp.Minute) { m.Seconds = 9 }) }
	came := -1
	for k, m := range []*dsp.Minute{short(), short(), short(), steady(4, 5), short(), steady(4, 5), steady(4, 5)} {
		for _, ev := range e.Minute(m, f) {
			if ev.Alarm == Unbalance && came < 0 {
				came = k
			}
		}
	}
	if came != 6 {
		t.Errorf("unbalance came with input %d, want 6, the third whole minute", came)
	}
}
