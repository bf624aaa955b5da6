package mqtt

import (
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	paho "github.com/eclipse/paho.mqtt.golang"
)

// mosquitto is a broker of another make, run as a process.
type mosquitto struct {
	addr, conf, bin string
	cmd             *exec.Cmd
}

// newMosquitto prepares one; lines are added to its configuration.
func newMosquitto(t *testing.T, lines ...string) *mosquitto {
	t.Helper()
	bin, err := exec.LookPath("mosquitto")
	if err != nil {
		bin = "/usr/sbin/mosquitto" // not in everybody's path
		_, err = os.Stat(bin)
	}
	if err != nil {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatal("mosquitto is not installed")
		}
		t.Skip("mosquitto is not installed")
	}
	dir := t.TempDir()
	m := &mosquitto{addr: freeAddr(t), conf: filepath.Join(dir, "mosquitto.conf"), bin: bin}
	_, port, err := net.SplitHostPort(m.addr)
	if err != nil {
		t.Fatal(err)
	}
	lines = append([]string{
		"listener " + port + " 127.0.0.1", "persistence true", "persistence_location " + dir + "/",
		"max_queued_messages 0", "max_inflight_messages 10", "log_dest none",
	}, lines...)
	if os.Getuid() == 0 {
		lines = append(lines, "user root") // it could not write into the folder
	}
	if err := os.WriteFile(m.conf, []byte(strings.Join(lines, "\n")+"\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { m.stop(t) })
	return m
}

func (m *mosquitto) url() string { return "tcp://" + m.addr }

func (m *mosquitto) start(t *testing.T) {
	t.Helper()
	m.cmd = exec.Command(m.bin, "-c", m.conf)
	if err := m.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	until(t, "mosquitto listens", func() bool {
		c, err := net.Dial("tcp", m.addr)
		if err == nil {
			c.Close()
		}
		return err == nil
	})
}

// stop ends it in good order, so that it keeps its sessions.
func (m *mosquitto) stop(t *testing.T) {
	t.Helper()
	if m.cmd == nil {
		return
	}
	if err := m.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Error(err)
	}
	m.cmd.Wait()
	m.cmd = nil
}

// receive subscribes with a session that the broker keeps.
func (m *mosquitto) receive(t *testing.T) *recorder {
	t.Helper()
	r := &recorder{}
	c := paho.NewClient(paho.NewClientOptions().AddBroker(m.url()).SetClientID("receiver").
		SetCleanSession(false).SetAutoReconnect(true).SetMaxReconnectInterval(50 * time.Millisecond).
		SetDefaultPublishHandler(func(_ paho.Client, msg paho.Message) { r.take(msg.Topic(), msg.Payload()) }))
	if token := c.Connect(); !token.WaitTimeout(5*time.Second) || token.Error() != nil {
		t.Fatalf("receiver: %v", token.Error())
	}
	if token := c.Subscribe("heavyspot/#", 1, nil); !token.WaitTimeout(5*time.Second) || token.Error() != nil {
		t.Fatalf("receiver: %v", token.Error())
	}
	t.Cleanup(func() { c.Disconnect(250) })
	return r
}

func TestMosquittoRestarted(t *testing.T) {
	const n = 2000
	m, box := newMosquitto(t, "allow_anonymous true"), newBox(t)
	m.start(t)
	rec := m.receive(t)
	_, stop := run(t, config(m.url()), box)
	store(t, box, n/2)
	for i := 1; i <= 2; i++ {
		until(t, "some delivery", func() bool { return rec.has(i * n / 4) })
		m.stop(t)
		if i == 1 {
			store(t, box, n/2)
		}
		m.start(t)
	}
	until(t, "all delivered", func() bool { return rec.has(n) && box.Waiting() == 0 })
	stop()
	// Mosquitto repeats up to 10 of its own to the receiver.
	t.Logf("%d repeats", rec.check(t, n, 16+10))
}

func TestMosquittoCutAndMuted(t *testing.T) {
	n := fewer(2000)
	m, box := newMosquitto(t, "allow_anonymous true"), newBox(t)
	m.start(t)
	rec := m.receive(t)
	px := newProxy(t, listen(t), m.addr)
	cfg := config(px.url())
	cfg.Patience = 300 * time.Millisecond
	p, stop := run(t, cfg, box)
	go store(t, box, n)
	for i := 1; i <= 6; i++ {
		until(t, "some delivery", func() bool { return rec.has(i * n / 8) })
		if i%2 == 0 {
			px.cut()
			continue
		}
		connections := p.Status().Connections
		px.setMute(true)
		until(t, "the connection given up", func() bool { s := p.Status(); return !s.Connected || s.Connections > connections })
		px.setMute(false)
	}
	until(t, "all delivered", func() bool { return rec.has(n) && box.Waiting() == 0 })
	stop()
	t.Logf("%d repeats", rec.check(t, n, 16))
}

func TestMosquittoPassword(t *testing.T) {
	if _, err := exec.LookPath("mosquitto_passwd"); err != nil {
		t.Skip("mosquitto_passwd is not installed")
	}
	dir := t.TempDir()
	users, secret := filepath.Join(dir, "users"), filepath.Join(dir, "password")
	if out, err := exec.Command("mosquitto_passwd", "-b", "-c", users, "fan", "open sesame").CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	m := newMosquitto(t, "allow_anonymous false", "password_file "+users)
	m.start(t)
	cfg := config(m.url())
	cfg.User, cfg.PasswordFile = "fan", secret
	for password, want := range map[string]string{"open sesame": "connected", "guess": "refuses"} {
		if err := os.WriteFile(secret, []byte(password+"\r\n"), 0o600); err != nil {
			t.Fatal(err)
		}
		if got := attempt(t, cfg); !strings.Contains(got, want) {
			t.Errorf("password %q: %s, want %s", password, got, want)
		}
	}
	cfg.User, cfg.PasswordFile = "", ""
	if got := attempt(t, cfg); !strings.Contains(got, "refuses") {
		t.Errorf("no user: %s", got)
	}
}

// Retained messages and the last will with a broker of another make.
func TestMosquittoLink(t *testing.T) {
	m, box := newMosquitto(t, "allow_anonymous true"), newBox(t)
	m.start(t)
	px := newProxy(t, listen(t), m.addr)
	cfg := config(px.url())
	cfg.MinBackoff, cfg.MaxBackoff = time.Second, time.Second
	_, stop := run(t, cfg, box)
	screen := subscribe(t, m.url())
	for i, step := range []func(){func() {}, px.cut, func() {}, stop} {
		step()
		want := "online"
		if i%2 == 1 {
			want = "offline"
		}
		until(t, fmt.Sprintf("step %d: %s", i, want), func() bool { return string(linkState(t, screen)) == want })
	}
}
