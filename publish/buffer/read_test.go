package buffer

import (
	"bytes"
	"errors"
	"fmt"
	"slices"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"heavyspot/publish"
	"heavyspot/rules/alarm"
)

// TestModel compares the buffer with a plain list, over stores with a clock that
// jumps, acknowledgements and restarts.
func TestModel(t *testing.T) {
	dir := t.TempDir()
	files := 0
	rapid.Check(t, func(t *rapid.T) {
		files++
		path := fmt.Sprintf("%s/%d.db", dir, files)
		b, err := Open(path, Options{KeepMinutes: 1 << 62})
		if err != nil {
			t.Fatal(err)
		}
		defer func() { b.Close() }()
		var all, waiting []Record
		at := 0
		for range rapid.IntRange(1, 8).Draw(t, "steps") {
			switch rapid.SampledFrom([]string{"store", "store", "acknowledge", "restart"}).Draw(t, "step") {
			case "store":
				at += rapid.SampledFrom([]int{1, 1, 0, -50, 300}).Draw(t, "jump")
				k := &Tick{}
				for i := range rapid.IntRange(1, 200).Draw(t, "minutes") {
					m := minute(at + i)
					m.Points = nil
					k.Messages = append(k.Messages, m)
				}
				at += len(k.Messages)
				if err := b.Store(k); err != nil {
					t.Fatal(err)
				}
				for _, m := range k.Messages {
					r := Record{Sequence: m.Head().Sequence, Time: m.Head().Time.Time}
					all, waiting = append(all, r), append(waiting, r)
				}
			case "acknowledge":
				n := rapid.IntRange(0, len(waiting)).Draw(t, "n")
				if err := b.Ack(sequences(waiting[:n])...); err != nil {
					t.Fatal(err)
				}
				waiting = waiting[n:]
			case "restart":
				if err := b.Close(); err != nil {
					t.Fatal(err)
				}
				if b, err = Open(path, Options{KeepMinutes: 1 << 62}); err != nil {
					t.Fatal(err)
				}
			}
		}
		compare(t, b, all, waiting)
	})
}

func compare(t *rapid.T, b *Buffer, all, waiting []Record) {
	pending, err := b.Pending(0, 1<<20)
	if err != nil || !slices.Equal(sequences(pending), sequences(waiting)) {
		t.Fatalf("pending %v, want %v: %v", sequences(pending), sequences(waiting), err)
	}
	from := start.Add(time.Duration(rapid.IntRange(-100, 3000).Draw(t, "from")) * time.Minute)
	to := from.Add(time.Duration(rapid.IntRange(0, 2000).Draw(t, "length")) * time.Minute)
	var want, got []Record
	for _, r := range all {
		if !r.Time.Before(from) && !r.Time.After(to) {
			want = append(want, r)
		}
	}
	if err := b.Range(publish.KindMinute, from, to, func(r Record) error { got = append(got, r); return nil }); err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(sequences(got), sequences(want)) {
		t.Fatalf("from %v to %v: %v, want %v", from, to, sequences(got), sequences(want))
	}
}

func TestStanding(t *testing.T) {
	b := opened(t, file(t), Options{})
	mustStore(t, b,
		&Tick{Messages: []publish.Message{finding(0), alarmMessage(0, "de-h", alarm.Unacknowledged)}},
		&Tick{Messages: []publish.Message{finding(1), alarmMessage(1, "de-h", alarm.Normal), alarmMessage(1, "", alarm.Unacknowledged)}},
		&Tick{Messages: []publish.Message{finding(2)}})
	standing := func() []uint64 {
		s, err := b.Standing()
		if err != nil {
			t.Fatal(err)
		}
		return sequences(s)
	}
	if got := standing(); got != nil {
		t.Errorf("%v stand though all wait in the outbox", got)
	}
	if err := b.Ack(1, 2, 3, 4, 5); err != nil {
		t.Fatal(err)
	}
	if got := standing(); !slices.Equal(got, []uint64{4, 5}) {
		t.Errorf("%v stand, want 4 and 5", got)
	}
	if err := b.Ack(6, 6, 99); err != nil {
		t.Fatal(err)
	}
	if got := standing(); !slices.Equal(got, []uint64{4, 5, 6}) || b.Waiting() != 0 {
		t.Errorf("%v stand, want 4, 5 and 6; %d waiting", got, b.Waiting())
	}
}

func TestAlarmState(t *testing.T) {
	path := file(t)
	b, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s, err := b.AlarmState(); s != nil || err != nil {
		t.Errorf("state %q of a new file: %v", s, err)
	}
	mustStore(t, b, &Tick{AlarmState: []byte(`{"a":1}`)}, tick(0))
	b.Close()
	b = opened(t, path, Options{})
	if s, err := b.AlarmState(); !bytes.Equal(s, []byte(`{"a":1}`)) || err != nil {
		t.Errorf("state %q: %v", s, err)
	}
	if b.Opened().Sequence != 2 {
		t.Errorf("sequence %d, want 2", b.Opened().Sequence)
	}
}

func TestRefusedTickLeavesNothing(t *testing.T) {
	b := opened(t, file(t), Options{})
	err := b.Store(&Tick{Messages: []publish.Message{minute(0), publish.LinkMessage(publish.Online, start)}})
	if err == nil {
		t.Fatal("a link message was stored")
	}
	if n := len(everything(t, b, publish.KindMinute)); n != 0 || b.Waiting() != 0 {
		t.Errorf("%d minutes, %d waiting", n, b.Waiting())
	}
	mustStore(t, b, tick(0))
	if s, _ := b.Numbers(); s != 2 {
		t.Errorf("sequence %d, want 2", s)
	}
	if err := b.Range(publish.KindLink, start, start, nil); err == nil {
		t.Error("links can be read")
	}
	stop := errors.New("stop")
	if err := b.Range(publish.KindMinute, start, start, func(Record) error { return stop }); err != stop {
		t.Errorf("%v, want the error of the function", err)
	}
}

func TestReadOnly(t *testing.T) {
	path := file(t)
	b, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	mustStore(t, b, tick(0))
	b.Close()
	b = opened(t, path, Options{ReadOnly: true})
	if o := b.Opened(); o.Boot != 1 || o.Sequence != 2 {
		t.Errorf("%+v", o)
	}
	if n := len(everything(t, b, publish.KindMinute)); n != 1 {
		t.Errorf("%d minutes", n)
	}
	if err := b.Store(tick(1)); err == nil {
		t.Error("stored into a file opened for reading")
	}
}

// Readers, a writer and an acknowledger at once, for the race detector.
func TestConcurrentUse(t *testing.T) {
	defer goleak.VerifyNone(t)
	b := opened(t, file(t), Options{MaxSize: 2 << 20})
	var wg sync.WaitGroup
	stop := make(chan struct{})
	for range 2 {
		wg.Go(func() {
			for {
				select {
				case <-stop:
					return
				default:
				}
				err := b.Range(publish.KindMinute, start, start.AddDate(1, 0, 0), func(Record) error { return nil })
				pending, err2 := b.Pending(0, 8)
				err3 := b.Ack(sequences(pending)...)
				_, err4 := b.Standing()
				if err := errors.Join(err, err2, err3, err4); err != nil {
					t.Error(err)
					return
				}
			}
		})
	}
	for i := range 150 {
		mustStore(t, b, tick(i))
	}
	close(stop)
	wg.Wait()
	select {
	case <-b.Changed():
	default:
		t.Error("no word of the change")
	}
}

// A buffer that has been closed gives errors.
func TestClosed(t *testing.T) {
	path := file(t)
	b, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if err := errors.Join(b.Close(), b.Close()); err != nil {
		t.Errorf("close: %v", err)
	}
	_, err1 := b.Pending(0, 1)
	_, err2 := b.Standing()
	for i, err := range []error{b.Store(tick(0)), b.Ack(1), err1, err2} {
		if err == nil {
			t.Errorf("call %d: no error", i)
		}
	}
}
