package mqtt

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"heavyspot/publish"
	"heavyspot/publish/buffer"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

const (
	base     = "heavyspot/north-works/kiln-fan-2/"
	linkName = base + "link"
)

func linkState(t *testing.T, s *subscriber) publish.LinkState {
	t.Helper()
	body := s.get(linkName)
	if body == "" {
		return ""
	}
	m, err := publish.Decode([]byte(body))
	if err != nil {
		t.Fatal(err)
	}
	l, ok := m.(*publish.Link)
	if !ok || l.Site != "north-works" || l.Machine != "kiln-fan-2" || l.Boot != 1 {
		t.Fatalf("link message %s", body)
	}
	return l.State
}

func TestLinkOnlineAndOffline(t *testing.T) {
	box := newBox(t)
	b := startBroker(t, "127.0.0.1:0", nil)
	px := newProxy(t, listen(t), b.Addr())
	before := subscribe(t, b.URL())
	cfg := config(px.url())
	cfg.MinBackoff, cfg.MaxBackoff = time.Second, time.Second
	_, stop := run(t, cfg, box)
	until(t, "online", func() bool { return linkState(t, before) == publish.Online })
	later := subscribe(t, b.URL())
	until(t, "online for one who comes later", func() bool { return linkState(t, later) == publish.Online })
	px.cut() // as when the board loses its power
	until(t, "offline by last will", func() bool { return linkState(t, before) == publish.Offline })
	until(t, "online again", func() bool { return linkState(t, before) == publish.Online })
	stop()
	until(t, "offline after a clean end", func() bool { return linkState(t, before) == publish.Offline })
	last := subscribe(t, b.URL())
	until(t, "offline kept", func() bool { return linkState(t, last) == publish.Offline })
}

func standingTick(n int, s alarm.State) *buffer.Tick {
	at := time.Date(2026, 3, 1, 6, n, 0, 0, time.UTC)
	return &buffer.Tick{Messages: []publish.Message{
		publish.FindingMessage(&rules.Finding{Start: at, Verdict: rules.StaticUnbalance, Advice: string(rune('a' + n))}),
		publish.AlarmMessage(&alarm.Event{Alarm: alarm.HighOverall, Point: "de-h", State: s, Time: at, Since: at}),
	}}
}

// A broker that has forgotten everything shows what stands as soon as the
// publisher has connected, and the newest of it in the end.
func TestFreshBrokerShowsWhatStands(t *testing.T) {
	box, addr := newBox(t), freeAddr(t)
	b := startBroker(t, addr, nil)
	_, stop := run(t, config("tcp://"+addr), box)
	for n, s := range []alarm.State{alarm.Unacknowledged, alarm.Normal, alarm.Unacknowledged} {
		if err := box.Store(standingTick(n, s)); err != nil {
			t.Fatal(err)
		}
	}
	until(t, "an empty outbox", func() bool { return box.Waiting() == 0 })
	b.Close()
	if err := box.Store(&buffer.Tick{Messages: standingTick(3, alarm.Normal).Messages[:1]}); err != nil {
		t.Fatal(err)
	}
	b = startBroker(t, addr, nil)
	until(t, "an empty outbox", func() bool { return box.Waiting() == 0 })
	screen := subscribe(t, b.URL())
	until(t, "finding and alarm", func() bool {
		return sequence(screen.get(base+"finding")) == 7 && sequence(screen.get(base+"alarm/high-overall/de-h")) == 6
	})
	if a := screen.get(base + "alarm/high-overall/de-h"); !strings.Contains(a, `"state":"unacknowledged"`) {
		t.Errorf("alarm %s", a)
	}
	stop()
}

func sequence(body string) uint64 {
	var e publish.Envelope
	if json.Unmarshal([]byte(body), &e) != nil {
		return 0
	}
	return e.Sequence
}

// A finding that was left out of the outbox must not overtake the alarms that
// wait in it: a receiver that drops lower numbers would miss them.
func TestWhatStandsOvertakesNothing(t *testing.T) {
	box, err := buffer.Open(filepath.Join(t.TempDir(), "box.db"), buffer.Options{OutboxMax: 3})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { box.Close() })
	first, second := standingTick(0, alarm.Unacknowledged).Messages, standingTick(1, alarm.Normal).Messages
	third := standingTick(2, alarm.Unacknowledged).Messages
	for _, messages := range [][]publish.Message{{first[1], first[0]}, {second[1], third[1]}} {
		if err := box.Store(&buffer.Tick{Messages: messages}); err != nil {
			t.Fatal(err)
		}
	}
	standing, err := box.Standing()
	if err != nil || len(standing) != 1 || standing[0].Sequence != 2 || box.Waiting() != 3 {
		t.Fatalf("%v stands, %d wait: %v", standing, box.Waiting(), err)
	}
	rec := &recorder{kind: "finding"}
	b := startBroker(t, "127.0.0.1:0", rec)
	_, stop := run(t, config(b.URL()), box)
	until(t, "an empty outbox", func() bool { return box.Waiting() == 0 })
	stop()
	if len(rec.numbers) != 0 {
		t.Errorf("the finding was sent ahead")
	}
}

// More stands than the window holds.
func TestManyStanding(t *testing.T) {
	box := newBox(t)
	b := startBroker(t, "127.0.0.1:0", nil)
	var k buffer.Tick
	for i := range 50 {
		k.Messages = append(k.Messages, publish.AlarmMessage(&alarm.Event{
			Alarm: alarm.PointFault, Point: "p" + string(rune('a'+i%26)) + string(rune('a'+i/26)), State: alarm.Normal,
		}))
	}
	if err := box.Store(&k); err != nil {
		t.Fatal(err)
	}
	pending, err := box.Pending(0, 50)
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range pending {
		if err := box.Ack(r.Sequence); err != nil {
			t.Fatal(err)
		}
	}
	run(t, config(b.URL()), box)
	screen := subscribe(t, b.URL())
	until(t, "all fifty", func() bool {
		screen.mu.Lock()
		defer screen.mu.Unlock()
		return len(screen.newest) == 51
	})
}
