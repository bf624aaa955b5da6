package main

import (
	"encoding/json"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"heavyspot/acquire/recording"
	"heavyspot/acquire/rig"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

var update = flag.Bool("update", false, "write the golden files anew")

// golden compares with a golden file, which -update writes anew.
func golden(t *testing.T, name, got string) string {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(want)
}

// lines decodes JSON Lines.
func jsonLines(t *testing.T, text string) []map[string]any {
	t.Helper()
	var list []map[string]any
	for _, line := range strings.Split(strings.TrimSpace(text), "\n") {
		if line == "" {
			continue
		}
		var m map[string]any
		if err := json.Unmarshal([]byte(line), &m); err != nil {
			t.Fatalf("%v: %s", err, line)
		}
		list = append(list, m)
	}
	return list
}

func TestReplayText(t *testing.T) {
	cfg := writeFile(t, "fan.toml", fanConfig)
	status, out, talk := heavyspot("replay", "-c", cfg, fanRecording(t), "--start", "2026-03-01T23:58:30Z")
	if status != statusDoubted || !strings.Contains(talk, "750 sample rows missing: read too late") {
		t.Errorf("status %d, want %d: %s", status, statusDoubted, talk)
	}
	plainOutput(t, out+talk)
	if d := cmp.Diff(golden(t, "replay.txt", out), out); d != "" {
		t.Errorf("output (-want +got); -update writes it anew:\n%s", d)
	}
}

// TestReplayJSON compares the messages with the golden ones, their figures
// within what a better estimate may change.
func TestReplayJSON(t *testing.T) {
	cfg := writeFile(t, "fan.toml", fanConfig)
	status, out, talk := heavyspot("replay", "--json", "-c", cfg, fanRecording(t), "--start", "2026-03-01T23:58:30Z")
	if status != statusDoubted {
		t.Errorf("status %d, want %d: %s", status, statusDoubted, talk)
	}
	got, want := jsonLines(t, out), jsonLines(t, golden(t, "replay.jsonl", out))
	if d := cmp.Diff(want, got, cmpopts.EquateApprox(0.01, 0.05)); d != "" {
		t.Errorf("messages (-want +got); -update writes them anew:\n%s", d)
	}
	for i, m := range got {
		if m["sequence"] != float64(i+1) || m["schema"] != 1.0 || m["site"] != "north-works" || m["machine"] != "fan-1" {
			t.Errorf("message %d: envelope %v %v %v %v", i, m["schema"], m["site"], m["machine"], m["sequence"])
		}
	}
}

// TestReplayKnown leads the shared recordings with known truth through the
// command and compares verdict, speed and vectors.
func TestReplayKnown(t *testing.T) {
	type order struct {
		MMS float64 `json:"mm_s_rms"`
		Lag float64 `json:"lag_deg"`
	}
	type truth struct {
		MeanRPM float64 `json:"mean_rpm"`
		Points  map[string]struct {
			Order1 order `json:"order1"`
		} `json:"points"`
		Kind string `json:"kind"`
	}
	for _, name := range []string{"clean", "slow-highpass", "falling-edge", "neighbour", "static", "dynamic", "overhung", "bent"} {
		t.Run(name, func(t *testing.T) {
			text, err := os.ReadFile(shared(t, "known/"+name+".truth.json"))
			if err != nil {
				t.Fatal(err)
			}
			var want truth
			if err := json.Unmarshal(text, &want); err != nil {
				t.Fatal(err)
			}
			status, out, talk := heavyspot("replay", "--json", "-c", shared(t, "known/"+name+".toml"), shared(t, "known/"+name+".csv"))
			if status != statusDone {
				t.Errorf("status %d: %s", status, talk)
			}
			list := jsonLines(t, out)
			if len(list) < 2 || list[0]["kind"] != "minute" || list[1]["kind"] != "finding" {
				t.Fatalf("no minute and finding first: %s", out)
			}
			if kind, _, _ := strings.Cut(want.Kind, " "); kind != "" && kind != list[1]["verdict"] {
				t.Errorf("verdict %v, want %v", list[1]["verdict"], want.Kind)
			}
			minute := struct {
				Speed struct {
					MeanRPM float64 `json:"mean_rpm"`
				} `json:"speed"`
				Points []struct {
					Point  string `json:"point"`
					Order1 order  `json:"order1"`
				} `json:"points"`
			}{}
			line, _, _ := strings.Cut(out, "\n")
			if err := json.Unmarshal([]byte(line), &minute); err != nil {
				t.Fatal(err)
			}
			if d := minute.Speed.MeanRPM/want.MeanRPM - 1; d > 2e-4 || d < -2e-4 {
				t.Errorf("%v r/min, want %v", minute.Speed.MeanRPM, want.MeanRPM)
			}
			for _, p := range minute.Points {
				w := want.Points[p.Point].Order1
				lag := p.Order1.Lag - w.Lag
				for lag > 180 {
					lag -= 360
				}
				for lag < -180 {
					lag += 360
				}
				if d := p.Order1.MMS - w.MMS; max(d, -d) > 0.01*w.MMS+0.02 || max(lag, -lag) > 1.5 {
					t.Errorf("%s: %v @%v, want %v @%v", p.Point, p.Order1.MMS, p.Order1.Lag, w.MMS, w.Lag)
				}
			}
		})
	}
}

// TestReplayTimes checks what begins a recording's minutes.
func TestReplayTimes(t *testing.T) {
	cfg := writeFile(t, "fan.toml", fanConfig)
	path := filepath.Join(t.TempDir(), "fan.wav")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	src := phasors(t, 3, 1, rig.Sampling{Duration: 50 * time.Second, Start: at("06:31:30")})
	w, err := recording.NewWAVWriter(f, src.Format())
	if err != nil {
		t.Fatal(err)
	}
	write(t, w, src, 0)
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	f.Close()
	for _, test := range []struct {
		args []string
		want string
	}{
		{nil, "[2026-03-01T06:31:30.000Z set 2026-03-01T06:32:00.000Z set]"},
		{[]string{"--start", "2030-01-01T00:00:05+01:00"}, "[2029-12-31T23:00:05.000Z set]"},
	} {
		status, out, talk := heavyspot(append([]string{"replay", "--json", "-c", cfg, path}, test.args...)...)
		var got []string
		for _, m := range jsonLines(t, out) {
			if m["kind"] == "minute" {
				got = append(got, fmt.Sprint(m["time"]), fmt.Sprint(m["clock"]))
			}
		}
		if status != statusDone || fmt.Sprint(got) != test.want {
			t.Errorf("%v: status %d, minutes %v, want %v; %s", test.args, status, got, test.want, talk)
		}
	}
}

// TestExitStatus checks what the program says to whoever started it.
func TestExitStatus(t *testing.T) {
	cfg := writeFile(t, "fan.toml", fanConfig)
	good := fanRecording(t)
	text, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.SplitAfter(string(text), "\n")
	minute := strings.Join(lines[:30001], "")
	damaged := writeFile(t, "damaged.csv", minute+"60.0,broken,0,0,0,0,0,0,,\n")
	begin := writeFile(t, "begin.csv", lines[0]+strings.Join(lines[1:40], "")+"x,1,2,3,4,5,6,7,,\n")
	short := writeFile(t, "short.csv", strings.Join(lines[:100], ""))
	other := writeFile(t, "other.toml", strings.Replace(fanConfig, "rate_hz = 500", "rate_hz = 1000", 1))
	channel := writeFile(t, "channel.toml", strings.Replace(fanConfig, "channel = 4", "channel = 7", 1))
	flat := strings.Builder{}
	for i, l := range lines[:30001] {
		if f := strings.Split(l, ","); i > 0 {
			f[5] = "0.01"
			l = strings.Join(f, ",")
		}
		flat.WriteString(l)
	}
	for _, test := range []struct {
		name   string
		args   []string
		status int
		says   []string
	}{
		{"good", []string{"replay", "-c", cfg, writeFile(t, "minute.csv", minute)}, statusDone, nil},
		{"dead point", []string{"replay", "-c", cfg, writeFile(t, "flat.csv", flat.String())}, statusDoubted, []string{"nde-h was flat in 1 of 1 minute"}},
		{"damaged after a minute", []string{"replay", "-c", cfg, damaged}, statusDoubted, []string{"line 30002", "column 2", "ch0"}},
		{"damaged before a minute", []string{"replay", "-c", cfg, begin}, statusFailed, []string{"line 41"}},
		{"too short", []string{"replay", "-c", cfg, short}, statusDoubted, []string{"no minute"}},
		{"no recording", []string{"replay", "-c", cfg, "nowhere.csv"}, statusFailed, []string{"nowhere.csv"}},
		{"other rate", []string{"replay", "-c", other, good}, statusUsage, []string{"500 Hz", "1000"}},
		{"no such channel", []string{"replay", "-c", channel, good}, statusUsage, []string{"channel 7", "nde-h"}},
		{"no configuration", []string{"replay", "-c", "nowhere.toml", good}, statusUsage, []string{"nowhere.toml"}},
		{"bad configuration", []string{"run", "-c", writeFile(t, "bad.toml", "[machine]\nsite = 1\n")}, statusUsage, []string{"bad.toml:2", "machine.site"}},
		{"undrivable rate", []string{"run", "-c", writeFile(t, "rate.toml", strings.Replace(fanConfig, "rate_hz = 500", "rate_hz = 333", 1))}, statusUsage, []string{"rate_hz"}},
		{"bad start", []string{"replay", "-c", cfg, good, "--start", "yesterday"}, statusUsage, []string{"2026-03-01T06:31:00Z"}},
		{"no argument", []string{"replay"}, statusUsage, []string{"--help"}},
		{"no such command", []string{"look"}, statusUsage, []string{"look"}},
		{"help", []string{"replay", "--help"}, statusDone, nil},
		{"nothing", nil, statusDone, nil},
		{"version", []string{"--version"}, statusDone, nil},
	} {
		t.Run(test.name, func(t *testing.T) {
			status, out, talk := heavyspot(test.args...)
			if status != test.status {
				t.Errorf("status %d, want %d\n%s%s", status, test.status, out, talk)
			}
			for _, s := range test.says {
				if !strings.Contains(talk, s) {
					t.Errorf("%q is not said: %s", s, talk)
				}
			}
			plainOutput(t, out)
		})
	}
}

// TestHelp checks that examples come first and are commands that exist.
func TestHelp(t *testing.T) {
	for name, list := range examples {
		args := []string{"--help"}
		if name != "" {
			args = []string{name, "--help"}
		}
		_, out, _ := heavyspot(args...)
		if !strings.HasPrefix(out, "Examples:\n  "+list[0]+"\n") {
			t.Errorf("%s: the help does not begin with its examples: %s", name, out)
		}
	}
}

// TestForeignRecording checks that a recording which the configured converter
// cannot have made, by its voltages, is not called clipped by its full scale.
func TestForeignRecording(t *testing.T) {
	loud := strings.Replace(fanConfig, "volts_per_g = 0.1", "volts_per_g = 10", 6)
	cfg := writeFile(t, "fan.toml", loud)
	text, err := os.ReadFile(fanRecording(t))
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.SplitAfter(string(text), "\n")[30000:]
	lines[0] = "t_s,ch0,ch1,ch2,ch3,ch4,ch5,ch6\n"
	for i := 1; i < len(lines)-1; i++ {
		f := strings.Split(lines[i], ",")
		for c := 1; c <= 6; c++ {
			v, err := strconv.ParseFloat(f[c], 64)
			if err != nil {
				t.Fatal(err)
			}
			f[c] = strconv.FormatFloat(100*v, 'g', 8, 64)
		}
		lines[i] = strings.Join(f[:8], ",") + "\n"
	}
	status, out, talk := heavyspot("replay", "-c", cfg, writeFile(t, "fan.csv", strings.Join(lines[:9000], "")))
	if status != statusDone || !strings.Contains(out, "static-unbalance") {
		t.Errorf("status %d\n%s%s", status, out, talk)
	}
	if strings.Contains(out+talk, "clipped") {
		t.Error("points are called clipped")
	}
}
