package publish

import (
	"bytes"
	"encoding/json"
	"flag"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"heavyspot/dsp"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

var update = flag.Bool("update", false, "write the golden files anew")

var start = time.Date(2026, 3, 1, 6, 31, 0, 0, time.UTC)

// The reading of the contract's example, with a point that is not good and a
// neighbour beside it.
func exampleMinute() *dsp.Minute {
	return &dsp.Minute{
		Start: start, ClockSet: true, Seconds: 60, Coverage: 1,
		Speed: dsp.Speed{State: dsp.Steady, Mean: 988.42, Min: 987.9, Max: 989.00004, Turns: 988, Reference: dsp.ReferenceGood},
		Points: []dsp.PointReading{{
			Name: "de-v", State: dsp.PointGood, Overall: 3.61, Share: 0.9, Wander: 1.204,
			Order: [dsp.Orders]dsp.Vector{
				{RMS: 3.42, Lag: 117.2, RMSSD: 0.02, LagSD: 0.4},
				{RMS: 0.31, Lag: 20}, {RMS: 0.1, Lag: 359.997},
			},
		}, {Name: "nde-v", State: dsp.PointClipped}},
		Lines: []dsp.Line{{RPM: 981.25, RMS: []float64{0.77777, 0}}},
	}
}

func stopped() *dsp.Minute {
	m := exampleMinute()
	m.Start, m.ClockSet, m.Lines = time.Time{}, false, nil
	m.Seconds, m.Coverage = 12.3456, 59999./60000
	m.Speed = dsp.Speed{State: dsp.Stopped, Reference: dsp.ReferenceNone, Missing: 2, Extra: 1}
	m.LagFrom = "de-v"
	m.Points[0].Overall = 0.00004
	m.Points[0].Order = [dsp.Orders]dsp.Vector{}
	return m
}

func exampleFinding() *rules.Finding {
	return &rules.Finding{
		Start: start, Verdict: rules.DynamicUnbalance,
		Severity: rules.Severity{Standard: "iso-14694", Level: rules.Alarm, WorstPoint: "nde-h", MMS: 7.9, Limit: 7.1},
		Evidence: []rules.Evidence{
			{Test: "ends-phase", Measured: 96, SD: 1.23456, Unit: "deg", Expected: "30 to 150", Holds: true, Margin: 54},
			{Test: "axial-share", Unit: "share", Expected: "under 0.5", Missing: "no axial point"},
			{Test: "broken", Measured: math.NaN(), Unit: "share", Expected: "under 0.5", Holds: true},
		},
		Advice: "two-plane balance; isolate & lock out before opening the casing",
	}
}

func exampleAlarm() *alarm.Event {
	return &alarm.Event{
		Alarm: alarm.HighOverall, Point: "de-h", Priority: alarm.High, State: alarm.Unacknowledged, Condition: true,
		Value: 8.3000001, Limit: 7.1, Unit: "mm/s rms", Time: start.Add(2 * time.Minute), Since: start,
		Text: "kiln-fan-2: de-h: vibration 8.3 mm/s rms is over the alarm limit of 7.1",
	}
}

func stamped(m Message) Message {
	h := m.Head()
	h.Site, h.Machine, h.Sequence, h.Boot = "north-works", "kiln-fan-2", 4711, 3
	return m
}

func examples() map[string]Message {
	whole := exampleAlarm()
	whole.Alarm, whole.Point, whole.State, whole.Condition = alarm.Rundown, "", alarm.Normal, false
	return map[string]Message{
		"minute":         stamped(MinuteMessage(exampleMinute())),
		"minute-stopped": stamped(MinuteMessage(stopped())),
		"finding":        stamped(FindingMessage(exampleFinding())),
		"alarm":          stamped(AlarmMessage(exampleAlarm())),
		"alarm-machine":  stamped(AlarmMessage(whole)),
		"link":           stamped(LinkMessage(Online, start.In(time.FixedZone("", 3600)).Add(1234567))),
	}
}

func TestGolden(t *testing.T) {
	for name, m := range examples() {
		got, err := Encode(m)
		if err != nil {
			t.Fatal(err)
		}
		path := filepath.Join("testdata", name+".json")
		if *update {
			if err := os.WriteFile(path, append(got, '\n'), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(string(bytes.TrimSpace(want)), string(got)); d != "" {
			t.Errorf("%s: %s", name, d)
		}
		back, err := Decode(got)
		if err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(m, back); d != "" {
			t.Errorf("%s: decoded: %s", name, d)
		}
	}
}

// Every key of the contract's examples is there, with a value of the same JSON
// type; the text is copied from the contract.
func TestContractExamples(t *testing.T) {
	for name, text := range map[string]string{
		"minute": `{"schema":1,"kind":"minute","site":"north-works","machine":"kiln-fan-2",
 "time":"2026-03-01T06:31:00.000Z","seconds":60.0,"coverage":1.0,"clock":"set","sequence":4711,"boot":3,
 "speed":{"state":"steady","mean_rpm":988.42,"min_rpm":987.9,"max_rpm":989.0,"turns":988,"reference":"good"},
 "points":[{"point":"de-v","state":"good",
   "order1":{"mm_s_rms":3.42,"lag_deg":117.2,"mm_s_rms_sd":0.02,"lag_deg_sd":0.4},
   "order2":{"mm_s_rms":0.31,"lag_deg":20.0},"order3":{"mm_s_rms":0.10,"lag_deg":0.0},
   "overall_mm_s_rms":3.61,"order1_share":0.90}]}`,
		"finding": `{"schema":1,"kind":"finding","time":"2026-03-01T06:31:00.000Z","verdict":"dynamic-unbalance","sequence":4711,"boot":3,
 "severity":{"standard":"iso-14694","level":"alarm","worst_point":"nde-h","mm_s_rms":7.9,"limit_mm_s_rms":7.1},
 "suspects":[],
 "evidence":[{"test":"ends-phase","measured":96.0,"unit":"deg","expected":"30 to 150","holds":true}]}`,
		"alarm": `{"kind":"alarm","alarm":"high-overall","point":"de-h","priority":"high","state":"unacknowledged","condition":true,
 "value":8.3,"limit":7.1,"unit":"mm/s rms","since":"2026-03-01T06:31:00.000Z","sequence":4711,"boot":3}`,
	} {
		body, err := Encode(examples()[name])
		if err != nil {
			t.Fatal(err)
		}
		var want, got any
		if err := json.Unmarshal([]byte(text), &want); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(body, &got); err != nil {
			t.Fatal(err)
		}
		contains(t, name, want, got)
	}
}

// contains fails where got lacks something of want.
func contains(t *testing.T, path string, want, got any) {
	t.Helper()
	switch w := want.(type) {
	case map[string]any:
		g, ok := got.(map[string]any)
		if !ok {
			t.Errorf("%s: %v is no object", path, got)
			return
		}
		for k, v := range w {
			if _, ok := g[k]; !ok {
				t.Errorf("%s: no %q", path, k)
				continue
			}
			contains(t, path+"."+k, v, g[k])
		}
	case []any:
		g, ok := got.([]any)
		if !ok || len(g) < len(w) {
			t.Errorf("%s: %v, want %v", path, got, want)
			return
		}
		for i, v := range w {
			contains(t, path, v, g[i])
		}
	default:
		if want != got {
			t.Errorf("%s: %v, want %v", path, got, want)
		}
	}
}

// Whatever the numbers, a message can be encoded, a lag is from 0 to below 360,
// and decoding and encoding give the same bytes.
func TestAnyMinute(t *testing.T) {
	number := rapid.OneOf(rapid.Float64(), rapid.Float64Range(-1e4, 1e4),
		rapid.SampledFrom([]float64{0, math.Copysign(0, -1), 359.995, 359.99999, 360, -0.001, math.NaN(), math.Inf(1), math.MaxFloat64}))
	rapid.Check(t, func(t *rapid.T) {
		m := exampleMinute()
		v := &m.Points[0]
		for i, p := range []*float64{&m.Seconds, &m.Coverage, &m.Speed.Mean, &m.Speed.Min, &v.Overall, &v.Share, &v.Wander,
			&v.Order[0].RMS, &v.Order[0].Lag, &v.Order[0].RMSSD, &v.Order[0].LagSD, &v.Order[1].Lag, &v.Order[2].RMS, &m.Lines[0].RPM, &m.Lines[0].RMS[0]} {
			*p = number.Draw(t, string(rune('a'+i)))
		}
		m.Start = start.Add(time.Duration(rapid.Int64().Draw(t, "start")))
		body, err := Encode(MinuteMessage(m))
		if err != nil {
			t.Fatal(err)
		}
		for _, bad := range []string{":-0,", ":-0}", `lag_deg":360`, `lag_deg":-`} {
			if strings.Contains(string(body), bad) {
				t.Fatalf("%s in %s", bad, body)
			}
		}
		stable(t, body)
	})
}

type failer interface {
	Helper()
	Fatalf(format string, args ...any)
}

func stable(t failer, body []byte) {
	t.Helper()
	m, err := Decode(body)
	if err != nil {
		t.Fatalf("%s: %v", body, err)
	}
	again, err := Encode(m)
	if err != nil {
		t.Fatalf("%s: %v", body, err)
	}
	if !bytes.Equal(again, body) {
		t.Fatalf("%s became %s", body, again)
	}
}

func TestRounding(t *testing.T) {
	for in, want := range map[float64]float64{0: 0, 359.994: 359.99, 359.995001: 0, 360: 0, -0.004: 0, -90: 270, 725: 5, 117.204: 117.2} {
		if got := lag(in); got != want {
			t.Errorf("lag %v: %v, want %v", in, got, want)
		}
	}
	for in, want := range map[float64]float64{1: 1, 0.99999999: 0.999999, 59999. / 60000: 0.999983, 0.9: 0.9, 0.3: 0.3, -1: 0, 2: 1, math.NaN(): 0} {
		if got := share(in); got != want {
			t.Errorf("share %v: %v, want %v", in, got, want)
		}
	}
	if got := Counted(60_000, 1000); !got.Equal(time.Unix(60, 0)) {
		t.Errorf("sample 60000 at 1000 Hz is at %v", got)
	}
}

func TestDecodeErrors(t *testing.T) {
	for _, bad := range []string{
		``, `{`, `[]`, `{"schema":2,"kind":"minute"}`, `{"schema":1,"kind":"news"}`, `{"schema":1}`,
		`{"schema":1,"kind":"minute","time":"yesterday"}`, `{"schema":1,"kind":"minute","sequence":-1}`,
		`{"schema":1,"kind":"minute","points":{}}`, `{"schema":1,"kind":"link","time":"9999-12-31T23:59:59-12:00"}`,
	} {
		if _, err := Decode([]byte(bad)); err == nil {
			t.Errorf("%s: no error", bad)
		}
	}
}

func TestTopics(t *testing.T) {
	topic := func(m Message) string { return Topic("heavyspot", "north-works", "kiln-fan-2", m.Levels()...) }
	for name, want := range map[string]string{
		"minute": "minute", "finding": "finding", "alarm": "alarm/high-overall/de-h", "alarm-machine": "alarm/rundown", "link": "link",
	} {
		m := examples()[name]
		if got := topic(m); got != "heavyspot/north-works/kiln-fan-2/"+want || CheckTopic(got) != nil {
			t.Errorf("%s goes to %s", name, got)
		}
		if m.Retained() != (name != "minute") {
			t.Errorf("%s: retained %v", name, m.Retained())
		}
	}
	for _, bad := range []string{"", "/a", "a/", "a//b", "a/+/b", "#", "$SYS/a", "a\x00b", "a\nb", "\xff", strings.Repeat("a", 65536)} {
		if CheckTopic(bad) == nil {
			t.Errorf("%.20q passes", bad)
		}
	}
}

// What decodes must encode, and then stay as it is.
func FuzzDecode(f *testing.F) {
	for _, m := range examples() {
		body, err := Encode(m)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(body)
	}
	f.Add([]byte(`{"schema":1,"kind":"link","time":"2026-03-01T06:31:00+01:00","x":1}`))
	f.Fuzz(func(t *testing.T, data []byte) {
		m, err := Decode(data)
		if err != nil {
			return
		}
		body, err := Encode(m)
		if err != nil {
			t.Fatalf("%s: %v", data, err)
		}
		stable(t, body)
	})
}
