package buffer

import (
	"fmt"
	"testing"
	"time"

	"go.etcd.io/bbolt"

	"heavyspot/publish"
	"heavyspot/rules/alarm"
)

func collect(t *testing.T, b *Buffer, k publish.Kind, from, to time.Time) []Record {
	t.Helper()
	var out []Record
	if err := b.Range(k, from, to, func(r Record) error { out = append(out, r); return nil }); err != nil {
		t.Fatal(err)
	}
	return out
}

func everything(t *testing.T, b *Buffer, k publish.Kind) []Record {
	return collect(t, b, k, time.Time{}, start.AddDate(1000, 0, 0))
}

func gapless(t *testing.T, what string, records []Record, step uint64) {
	t.Helper()
	for i := 1; i < len(records); i++ {
		if records[i].Sequence != records[i-1].Sequence+step {
			t.Fatalf("%s: %d follows %d", what, records[i].Sequence, records[i-1].Sequence)
		}
	}
}

// A full file goes on working with nobody reading the outbox: the oldest
// minutes and findings go, alarms stay, the newest are all there.
func TestFullFile(t *testing.T) {
	path := file(t)
	const size = 2 << 20
	b := opened(t, path, Options{MaxSize: size})
	const ticks = 2400 // half as many again as fit
	mustStore(t, b, &Tick{Messages: []publish.Message{alarmMessage(0, "de-h", alarm.Unacknowledged)}})
	for i := 0; i < ticks; i += 6 {
		k := &Tick{}
		for j := range 6 {
			k.Messages = append(k.Messages, tick(i+j).Messages...)
		}
		mustStore(t, b, k)
	}
	info, used, err := b.Usage()
	if err != nil || info > size || used > size {
		t.Errorf("file %d bytes, %d used, at most %d allowed: %v", info, used, size, err)
	}
	minutes, findings := everything(t, b, publish.KindMinute), everything(t, b, publish.KindFinding)
	gapless(t, "minutes", minutes, 2)
	gapless(t, "findings", findings, 2)
	if n := len(minutes); n == ticks || n < 300 || n-len(findings) > 1 || len(findings)-n > 1 {
		t.Errorf("%d minutes and %d findings left of %d", n, len(findings), ticks)
	}
	if last := minutes[len(minutes)-1].Sequence; last != 2*ticks {
		t.Errorf("newest minute is %d, want %d", last, 2*ticks)
	}
	if n := len(everything(t, b, publish.KindAlarm)); n != 1 {
		t.Errorf("%d alarms, want 1", n)
	}
	pending, err := b.Pending(0, 1<<20)
	if err != nil || len(pending) != b.Waiting() || len(pending) != 1+len(minutes)+len(findings) {
		t.Errorf("%d pending, %d waiting, %d kept: %v", len(pending), b.Waiting(), 1+len(minutes)+len(findings), err)
	}
	if pending[0].Kind != publish.KindAlarm {
		t.Error("the alarm has left the outbox")
	}
	t.Logf("%d minutes in %d bytes, %d used", len(minutes), info, used)
	runs := 0
	if err := b.view(func(tx *bbolt.Tx) error {
		return tx.Bucket(shelves[0].runs).ForEach(func(_, _ []byte) error { runs++; return nil })
	}); err != nil || runs > 2*len(minutes)/runLength+2 {
		t.Errorf("%d runs for %d minutes: %v", runs, len(minutes), err)
	}
}

// The watermark normally keeps the file from filling up; here it is filled by
// force, so that a commit meets the limit.
func TestCommitAtTheLimit(t *testing.T) {
	path := file(t)
	b := opened(t, path, Options{MaxSize: 2 << 20})
	for i := range 200 {
		mustStore(t, b, tick(i))
	}
	filler := make([]byte, 3000)
	for i, n := uint64(0), 16; n > 0; i++ {
		err := b.db.Update(func(tx *bbolt.Tx) error {
			for j := range n {
				if err := tx.Bucket(bucketState).Put(fmt.Appendf(nil, "%d-%d", i, j), filler); err != nil {
					return err
				}
			}
			return nil
		})
		if full(err) {
			n /= 4
		} else if err != nil {
			t.Fatal(err)
		}
	}
	for i := range 100 {
		mustStore(t, b, tick(200+i))
	}
	minutes := everything(t, b, publish.KindMinute)
	gapless(t, "minutes", minutes, 2)
	if last := minutes[len(minutes)-1]; last.Sequence != 599 || minutes[0].Sequence == 1 {
		t.Errorf("minutes from %d to %d", minutes[0].Sequence, last.Sequence)
	}
	if pending, err := b.Pending(0, 1<<20); err != nil || len(pending) != b.Waiting() {
		t.Errorf("%d pending, %d counted: %v", len(pending), b.Waiting(), err)
	}
}

// A limit that was lowered below the size of the file must not stop it.
func TestLoweredLimit(t *testing.T) {
	path := file(t)
	b, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for i := 0; i < 4000; i += 40 {
		k := &Tick{}
		for j := range 40 {
			k.Messages = append(k.Messages, tick(i+j).Messages...)
		}
		mustStore(t, b, k)
	}
	if err := b.Close(); err != nil {
		t.Fatal(err)
	}
	b = opened(t, path, Options{MaxSize: 2 << 20})
	_, before, err := b.Usage()
	if err != nil || before < 2<<20 {
		t.Fatalf("%d bytes used: not over the limit: %v", before, err)
	}
	for i := range 60 {
		mustStore(t, b, tick(4000+i))
	}
	size, used, err := b.Usage()
	if err != nil || used > before-200<<10 || size > before+8*growStep {
		t.Errorf("%d bytes, %d used, %d before: %v", size, used, before, err)
	}
}

func TestAges(t *testing.T) {
	b := opened(t, file(t), Options{KeepMinutes: 30 * time.Minute, KeepFindings: time.Hour, KeepAlarms: 2 * time.Hour})
	unset := minute(0)
	unset.Time, unset.Clock = publish.At(time.Unix(0, 0)), publish.ClockUnset
	mustStore(t, b, &Tick{Messages: []publish.Message{unset}})
	for i := range 200 {
		mustStore(t, b, &Tick{Messages: []publish.Message{minute(i), finding(i), alarmMessage(i, "", alarm.Normal)}})
		if i == 20 && len(everything(t, b, publish.KindMinute)) != 22 {
			t.Error("a minute taken with the clock unset went before its time")
		}
	}
	for k, want := range map[publish.Kind]int{publish.KindMinute: 31, publish.KindFinding: 61, publish.KindAlarm: 121} {
		if got := len(everything(t, b, k)); got != want {
			t.Errorf("%d %s messages, want %d", got, k, want)
		}
	}
	if got := b.Waiting(); got != 31+61+121 {
		t.Errorf("%d waiting: what is deleted must leave the outbox", got)
	}
}

// With the clock unset nothing is deleted by age: the age is not known.
func TestNoAgeWithoutClock(t *testing.T) {
	b := opened(t, file(t), Options{KeepMinutes: time.Minute})
	for i := range 30 {
		m := minute(1000 * i)
		m.Clock = publish.ClockUnset
		mustStore(t, b, &Tick{Messages: []publish.Message{m}})
	}
	if n := len(everything(t, b, publish.KindMinute)); n != 30 {
		t.Errorf("%d minutes, want 30", n)
	}
}

func TestOutboxThinsOut(t *testing.T) {
	b := opened(t, file(t), Options{OutboxMax: 20})
	for i := range 30 {
		mustStore(t, b, &Tick{Messages: []publish.Message{minute(i), finding(i)}})
		if i < 15 {
			mustStore(t, b, &Tick{Messages: []publish.Message{alarmMessage(i, "de-h", alarm.Normal)}})
		}
		if i >= 10 && b.Waiting() != 20 {
			t.Fatalf("%d waiting after tick %d, want 20", b.Waiting(), i)
		}
	}
	count := func() map[publish.Kind]int {
		pending, err := b.Pending(0, 100)
		if err != nil {
			t.Fatal(err)
		}
		n := map[publish.Kind]int{}
		for _, r := range pending {
			n[r.Kind]++
		}
		return n
	}
	// The 15 alarms are untouched. The minute and finding of the newest tick are
	// the last to go.
	if n := count(); n[publish.KindAlarm] != 15 || n[publish.KindMinute] != 1 || n[publish.KindFinding] != 4 {
		t.Errorf("outbox holds %v", n)
	}
	for i := range 40 {
		mustStore(t, b, &Tick{Messages: []publish.Message{alarmMessage(i, "de-v", alarm.Normal)}})
	}
	if n := count(); n[publish.KindAlarm] != 55 || len(n) != 1 {
		t.Errorf("outbox holds %v, want 55 alarms", n)
	}
	if n := len(everything(t, b, publish.KindMinute)); n != 30 {
		t.Errorf("%d minutes in the buffer, want all 30", n)
	}
}
