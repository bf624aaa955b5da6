package main

import (
	"net"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"heavyspot/publish/buffer"
	"heavyspot/publish/mqtt"
)

// checkCase is a configuration, what the command must say of it and how it ends.
type checkCase struct {
	name   string
	config string
	status int
	says   []string
}

func (c checkCase) run(t *testing.T, args ...string) {
	t.Run(c.name, func(t *testing.T) {
		status, out, talk := heavyspot(append([]string{"check", "-c", c.config}, args...)...)
		if status != c.status {
			t.Errorf("status %d, want %d\n%s%s", status, c.status, out, talk)
		}
		// Lines are broken anywhere.
		flat := strings.Join(strings.Fields(out), " ")
		for _, s := range c.says {
			if !strings.Contains(flat, s) {
				t.Errorf("%q is not said:\n%s", s, out)
			}
		}
		if len(args) == 0 {
			plainOutput(t, out)
		}
	})
}

// TestCheck checks what the command says of brokers, buffer and source, and
// that it leaves nothing behind.
func TestCheck(t *testing.T) {
	cfg, folder := rigConfig(t, "fault = \"static\"\nspeed_up = 1000")
	text, err := os.ReadFile(cfg)
	if err != nil {
		t.Fatal(err)
	}
	edit := func(name, old, with string) string {
		if !strings.Contains(string(text), old) {
			t.Fatalf("%q is not in the configuration", old)
		}
		return writeFile(t, name, strings.Replace(string(text), old, with, 1))
	}
	_, rest, _ := strings.Cut(string(text), "embedded_listen = ")
	embedded := "embedded_listen = " + strings.TrimSpace(rest)
	broker, err := mqtt.StartBroker("127.0.0.1:0", nil)
	if err != nil {
		t.Fatal(err)
	}
	defer broker.Close()
	taken, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer taken.Close()
	url := `"` + broker.URL() + `"`
	for _, c := range []checkCase{
		{"all well", cfg, statusDone, []string{"ok limits own: alarm from 7.1, trip from 9", "r/min by the phase reference", "ok nde-h good", "ok buffer", "ok broker"}},
		{"a broker", edit("a.toml", embedded, "brokers = ["+url+"]"), statusDone, []string{"lets this client in"}},
		{"one broker of two", edit("b.toml", embedded, `brokers = ["tcp://127.0.0.1:1", `+url+"]"), statusDone, []string{"note broker tcp://127.0.0.1:1", "lets this client in"}},
		{"no broker", edit("c.toml", embedded, `brokers = ["tcp://127.0.0.1:1"]`), statusFailed, []string{"mend broker"}},
		{"no password", edit("d.toml", embedded, "brokers = ["+url+"]\nuser = \"fan\"\npassword_file = \"nowhere\""), statusFailed, []string{"mend broker", "password_file"}},
		{"port taken", edit("e.toml", embedded, `embedded_listen = "`+taken.Addr().String()+`"`), statusFailed, []string{"mend broker", "embedded_listen"}},
		{"no folder", edit("f.toml", "fan.db", "nowhere/fan.db"), statusFailed, []string{"mend buffer"}},
		{"undrivable rate", edit("g.toml", "rate_hz = 500", "rate_hz = 333"), statusUsage, nil},
	} {
		c.run(t)
	}
	checkCase{"as JSON Lines", cfg, statusDone, []string{`"kind":"check"`, `"step":"nde-h","outcome":"ok"`}}.run(t, "--json")
	if files, _ := filepath.Glob(filepath.Join(folder, "*")); len(files) != 1 {
		t.Errorf("left behind: %v", files)
	}
}

// TestCheckBeside checks beside a running daemon and a damaged buffer.
func TestCheckBeside(t *testing.T) {
	cfg, folder := rigConfig(t, "speed_up = 1000")
	db := filepath.Join(folder, "fan.db")
	box, err := buffer.Open(db, buffer.Options{MaxSize: 16 << 20})
	if err != nil {
		t.Fatal(err)
	}
	checkCase{"held", cfg, statusDone, []string{"heavyspot runs for this machine"}}.run(t)
	box.Close()
	checkCase{"at rest", cfg, statusDone, []string{"up to number 0 of 1 start"}}.run(t)
	if err := os.WriteFile(db, []byte(strings.Repeat("damage", 10000)), 0o644); err != nil {
		t.Fatal(err)
	}
	checkCase{"damaged", cfg, statusFailed, []string{"mend buffer", "begins a new one"}}.run(t)
	if files, _ := filepath.Glob(filepath.Join(folder, "*")); len(files) != 2 {
		t.Errorf("left behind: %v", files)
	}
}

// TestCheckRecording looks at recordings.
func TestCheckRecording(t *testing.T) {
	cfg := writeFile(t, "fan.toml", fanConfig)
	good := fanRecording(t)
	checkCase{"good", cfg, statusDone, []string{"no sample missing", "1500.0 r/min by the phase reference", "ok nde-h good"}}.run(t, good)
	text, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.SplitAfter(string(text), "\n")[:10000]
	for i := range lines {
		if f := strings.Split(lines[i], ","); i > 0 {
			f[7] = "0" // the reference
			lines[i] = strings.Join(f, ",")
		}
	}
	dead := writeFile(t, "dead.csv", strings.Join(lines, ""))
	checkCase{"no pulses", cfg, statusDoubted, []string{"mend speed", "by the vibration, since the phase reference gives no usable pulses"}}.run(t, dead)
	checkCase{"nothing there", cfg, statusFailed, nil}.run(t, "nowhere.csv")
}
