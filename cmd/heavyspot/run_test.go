package main

import (
	"bufio"
	"bytes"
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"heavyspot/publish"
	"heavyspot/publish/buffer"

	"github.com/coreos/go-systemd/v22/daemon"
)

// patient bounds what a test waits for; it never passes because of it.
const patientFor = 60 * time.Second

// rigConfig is a configuration of the simulated machine in a folder.
func rigConfig(t *testing.T, rig string) (path, folder string) {
	t.Helper()
	folder = t.TempDir()
	text := strings.Replace(fanConfig, `driver = "ads131m08"`, `driver = "rig"`, 1) +
		fmt.Sprintf("[rig]\n%s\n[buffer]\npath = %q\nmax_mb = 16\n[mqtt]\nembedded_listen = %q\n", rig, filepath.Join(folder, "fan.db"), listenAddress(t))
	path = filepath.Join(folder, "fan.toml")
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path, folder
}

func listenAddress(t *testing.T) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	return l.Addr().String()
}

// child is the program in a process of its own.
type child struct {
	*exec.Cmd
	out   *bufio.Scanner
	print bytes.Buffer // what was read of its standard output
	talk  bytes.Buffer
}

func startChild(t *testing.T, env []string, args ...string) *child {
	t.Helper()
	c := &child{Cmd: exec.Command(os.Args[0], args...)}
	c.Env = append(append(os.Environ(), childVariable+"=1"), env...)
	c.Stderr = &c.talk
	pipe, err := c.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	c.out = bufio.NewScanner(pipe)
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	stop := time.AfterFunc(patientFor, func() { c.Process.Kill() })
	t.Cleanup(func() {
		stop.Stop()
		c.Process.Kill()
	})
	return c
}

// until reads standard output up to a line that holds text.
func (c *child) until(t *testing.T, text string) {
	t.Helper()
	for c.out.Scan() {
		c.print.WriteString(c.out.Text() + "\n")
		if strings.Contains(c.out.Text(), text) {
			return
		}
	}
	t.Fatalf("the output ended without %q:\n%s%s", text, &c.print, &c.talk)
}

// end sends a signal and returns the exit status.
func (c *child) end(t *testing.T, s syscall.Signal) int {
	t.Helper()
	if err := c.Process.Signal(s); err != nil {
		t.Fatal(err)
	}
	for c.out.Scan() {
		c.print.WriteString(c.out.Text() + "\n")
	}
	c.Wait()
	return c.ProcessState.ExitCode()
}

// manager is a service manager's notify socket.
type manager struct{ *net.UnixConn }

func newManager(t *testing.T) (m manager, path string) {
	t.Helper()
	path = filepath.Join(t.TempDir(), "notify")
	c, err := net.ListenUnixgram("unixgram", &net.UnixAddr{Name: path, Net: "unixgram"})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return manager{c}, path
}

// next returns the next state that begins with one of the prefixes.
func (m manager) next(t *testing.T, prefixes ...string) string {
	t.Helper()
	m.SetReadDeadline(time.Now().Add(patientFor))
	b := make([]byte, 4096)
	for {
		n, err := m.Read(b)
		if err != nil {
			t.Fatalf("waiting for %v: %v", prefixes, err)
		}
		for _, p := range prefixes {
			if strings.HasPrefix(string(b[:n]), p) {
				return string(b[:n])
			}
		}
	}
}

// stored reads all that a buffer holds and checks its numbers.
func stored(t *testing.T, path string) (minutes []*publish.Minute, boot uint64) {
	t.Helper()
	box, err := buffer.Open(path, buffer.Options{ReadOnly: true, MaxSize: 16 << 20})
	if err != nil {
		t.Fatal(err)
	}
	defer box.Close()
	seen := map[uint64]bool{}
	for _, k := range []publish.Kind{publish.KindMinute, publish.KindFinding, publish.KindAlarm} {
		err := box.Range(k, time.Unix(0, 0), at("00:00:00").AddDate(100, 0, 0), func(r buffer.Record) error {
			seen[r.Sequence] = true
			m, err := publish.Decode(r.JSON)
			if minute, ok := m.(*publish.Minute); ok {
				minutes = append(minutes, minute)
			}
			return err
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	last, boot := box.Numbers()
	for i := uint64(1); i <= last; i++ {
		if !seen[i] {
			t.Errorf("%s: message %d of %d is not there", path, i, last)
		}
	}
	if state, err := box.AlarmState(); err != nil || state == nil {
		t.Errorf("%s: state of the alarms: %q, %v", path, state, err)
	}
	return minutes, boot
}

// TestRun runs the daemon twice in a process of its own and looks at what it
// leaves: ready, signs of life, a clean end, everything committed, the last
// part-minute too, and numbers that go on.
func TestRun(t *testing.T) {
	cfg, folder := rigConfig(t, "fault = \"static\"\nmm_s_rms = 8\nspeed_up = 50")
	db := filepath.Join(folder, "fan.db")
	before := 0
	for start := uint64(1); start <= 2; start++ {
		m, socket := newManager(t)
		c := startChild(t, []string{"NOTIFY_SOCKET=" + socket, "WATCHDOG_USEC=400000"}, "run", "-c", cfg)
		m.next(t, daemon.SdNotifyReady)
		m.next(t, daemon.SdNotifyWatchdog)
		status := m.next(t, "STATUS=steady")
		if !strings.Contains(status, "static-unbalance") || !strings.Contains(status, " r/min") {
			t.Errorf("status line %q", status)
		}
		if code := c.end(t, syscall.SIGTERM); code != statusDone {
			t.Errorf("exit status %d\n%s", code, &c.talk)
		}
		m.next(t, daemon.SdNotifyStopping)
		plainLog(t, c.talk.String())
		// What stands is taken over; it comes once, not with every start.
		if come := strings.Contains(c.talk.String(), "alarm=high-1x/nde-h"); come != (start == 1) {
			t.Errorf("start %d: the standing alarm came: %v\n%s", start, come, &c.talk)
		}
		minutes, boot := stored(t, db)
		if boot != start || len(minutes) <= before {
			t.Errorf("start %d: %d minutes, start %d is told", start, len(minutes), boot)
		}
		before = len(minutes)
	}
}

// plainLog fails when the log holds control characters or lacks what it must
// tell.
func plainLog(t *testing.T, log string) {
	t.Helper()
	if i := strings.IndexFunc(log, func(r rune) bool { return r < ' ' && r != '\n' }); i >= 0 {
		t.Errorf("control character in the log: %q", log)
	}
	for _, text := range []string{"msg=Starting", "Buffer opened", "verdict=static-unbalance", "msg=Stopped"} {
		if !strings.Contains(log, text) {
			t.Errorf("%q is not in the log:\n%s", text, log)
		}
	}
}

// TestRunRefuses checks that nothing starts by halves.
func TestRunRefuses(t *testing.T) {
	taken, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer taken.Close()
	cfg, folder := rigConfig(t, "")
	text, err := os.ReadFile(cfg)
	if err != nil {
		t.Fatal(err)
	}
	free := strings.Split(strings.Split(string(text), "embedded_listen = \"")[1], "\"")[0]
	busy := writeFile(t, "busy.toml", strings.Replace(string(text), free, taken.Addr().String(), 1))
	status, _, talk := heavyspot("run", "-c", busy)
	if status != statusFailed || !strings.Contains(talk, "mqtt.embedded_listen") {
		t.Errorf("a taken port: status %d: %s", status, talk)
	}
	box, err := buffer.Open(filepath.Join(folder, "fan.db"), buffer.Options{MaxSize: 16 << 20})
	if err != nil {
		t.Fatalf("the buffer stayed open: %v", err)
	}
	status, _, talk = heavyspot("run", "-c", cfg)
	if status != statusFailed || !strings.Contains(talk, "does heavyspot run already") {
		t.Errorf("a buffer that is held: status %d: %s", status, talk)
	}
	box.Close()
	real := writeFile(t, "real.toml", strings.Replace(strings.Split(string(text), "[rig]")[0], `"rig"`, `"ads131m08"`, 1)+
		fmt.Sprintf("[buffer]\npath = %q\nmax_mb = 16\n[mqtt]\nembedded_listen = %q\n", filepath.Join(folder, "real.db"), free))
	if _, err := os.Stat("/dev/spidev0.0"); err == nil {
		t.Skip("this computer has an SPI port, so its lack cannot be shown")
	}
	status, _, talk = heavyspot("run", "-c", real)
	if status != statusFailed || !strings.Contains(talk, "SPI") {
		t.Errorf("no SPI port: status %d: %s", status, talk)
	}
	l, err := net.Listen("tcp", free)
	if err != nil {
		t.Fatalf("the broker stayed: %v", err)
	}
	l.Close()
}

// TestWatchdogNeedsProgress checks that signs of life stop with the blocks.
func TestWatchdogNeedsProgress(t *testing.T) {
	m, socket := newManager(t)
	t.Setenv("NOTIFY_SOCKET", socket)
	s := newService()
	go s.live(time.Millisecond, 0)
	s.progress()
	m.next(t, daemon.SdNotifyWatchdog)
	// Many periods without a block; what is sent last must be all there is.
	time.Sleep(50 * time.Millisecond)
	s.status("still here")
	if got := m.next(t, ""); got != "STATUS=still here" {
		t.Errorf("%q came without progress", got)
	}
	s.progress()
	m.next(t, daemon.SdNotifyWatchdog)
	s.stopping()
	m.next(t, daemon.SdNotifyStopping)
}
