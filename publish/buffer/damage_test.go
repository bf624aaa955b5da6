package buffer

import (
	"bytes"
	"encoding/binary"
	"errors"
	"hash/crc32"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.etcd.io/bbolt"

	"heavyspot/publish"
	"heavyspot/rules/alarm"
)

// filledFile returns the bytes of a file with n ticks in it.
func filledFile(t testing.TB, n int) []byte {
	t.Helper()
	path := file(t)
	b, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for i := range n {
		k := tick(i)
		if i%50 == 0 {
			k.Messages = append(k.Messages, alarmMessage(i, "de-h", alarm.Unacknowledged))
		}
		mustStore(t, b, k)
		if i%4 == 3 {
			if err := b.Ack(k.Messages[0].Head().Sequence); err != nil {
				t.Fatal(err)
			}
		}
	}
	if err := b.Close(); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return data
}

// use opens a file that may be damaged and does all that can be done. Whatever
// is wrong with it, no call may panic, and no message may leave that is not
// whole.
func use(t *testing.T, path string) *Buffer {
	t.Helper()
	b := opened(t, path, Options{})
	for i := range 3 {
		mustStore(t, b, tick(1000+i))
	}
	pending, err := b.Pending(0, 1<<20)
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range pending {
		if _, err := publish.Decode(r.JSON); err != nil {
			t.Errorf("message %d: %v", r.Sequence, err)
		}
	}
	for _, k := range []publish.Kind{publish.KindMinute, publish.KindFinding, publish.KindAlarm} {
		if err := b.Range(k, time.Time{}, start.AddDate(100, 0, 0), func(r Record) error {
			_, err := publish.Decode(r.JSON)
			return err
		}); err != nil {
			t.Error(err)
		}
	}
	if _, err := b.Standing(); err != nil {
		t.Error(err)
	}
	return b
}

func TestDamagedFileIsSetAside(t *testing.T) {
	whole := filledFile(t, 60)
	size := len(whole)
	for name, damage := range map[string]func([]byte) []byte{
		"garbage":           func(b []byte) []byte { return []byte(strings.Repeat("not a buffer\n", 5000)) },
		"one byte":          func(b []byte) []byte { return b[:1] },
		"half a page":       func(b []byte) []byte { return b[:2048] },
		"cut in the middle": func(b []byte) []byte { return b[:5*4096] },
		"metas only":        func(b []byte) []byte { return b[:8192] },
		"all zero":          func(b []byte) []byte { return make([]byte, size) },
		"metas zero":        func(b []byte) []byte { return append(make([]byte, 8192), b[8192:]...) },
		"data zero":         func(b []byte) []byte { return append(b[:8192:8192], make([]byte, size-8192)...) },
		"pages swapped": func(b []byte) []byte {
			return bytes.Join([][]byte{b[:8192], b[8192*4 : 8192*5], b[8192*2 : 8192*4], b[8192 : 8192*2], b[8192*5:]}, nil)
		},
	} {
		t.Run(name, func(t *testing.T) {
			path := file(t)
			bad := damage(bytes.Clone(whole))
			if err := os.WriteFile(path, bad, 0o640); err != nil {
				t.Fatal(err)
			}
			if _, err := Open(path, Options{ReadOnly: true}); err == nil {
				t.Error("opened for reading")
			}
			b := use(t, path)
			o := b.Opened()
			if !strings.HasPrefix(o.SetAside, path+".corrupt-") || o.Why == "" {
				t.Fatalf("not set aside: %+v", o)
			}
			kept, err := os.ReadFile(o.SetAside)
			if err != nil || !bytes.Equal(kept, bad) {
				t.Errorf("the file set aside is not the damaged one: %v", err)
			}
			from := salvage(bytes.NewReader(bad))
			if o.Sequence != from.sequence || o.Boot != from.boot+1 {
				t.Errorf("goes on from %+v, the old file says %+v", o, from)
			}
		})
	}
}

// The new file's numbers must lie above those of the old one, or receivers
// would drop them as repeats.
func TestNumbersGoOnAfterDamage(t *testing.T) {
	path := file(t)
	bad := filledFile(t, 60) // sequence 122, first start
	clear(bad[:8192])
	if err := os.WriteFile(path, bad, 0o640); err != nil {
		t.Fatal(err)
	}
	b := opened(t, path, Options{})
	if o := b.Opened(); o.Sequence != 122+skipped || o.Boot != 2 {
		t.Errorf("%+v, want sequence %d and start 2", o, 122+skipped)
	}
}

// Damage that leaves every page readable.
func TestWrongStructureIsSetAside(t *testing.T) {
	whole := filledFile(t, 60)
	for name, c := range map[string]struct {
		why    string
		damage func(p []byte, id uint64)
	}{
		"keys of a leaf out of order": {"is out of order", func(p []byte, _ uint64) {
			if n := native.Uint16(p[10:]); native.Uint16(p[8:]) == pageLeaf && n >= 2 {
				at := pageHead + elementHead*(int(n)-1)
				p[at+int(native.Uint32(p[at+4:]))] = 0xff // the last key stays the last
				p[pageHead+int(native.Uint32(p[pageHead+4:]))] = 0xff
			}
		}},
		"keys of a branch out of order": {"is out of order", func(p []byte, _ uint64) {
			if native.Uint16(p[8:]) == pageBranch {
				p[pageHead+int(native.Uint32(p[pageHead:]))] = 0xff
			}
		}},
		"a key that reaches into its value": {"not where it should be", func(p []byte, _ uint64) {
			if n := native.Uint16(p[10:]); native.Uint16(p[8:]) == pageLeaf && n > 1 && native.Uint32(p[pageHead:])&leafBucket == 0 {
				p[pageHead+8] ^= 0x10 // the length of the first key
			}
		}},
		"a page in use is free": {"free and in use", func(p []byte, id uint64) {
			if native.Uint16(p[8:]) == pageFreelist && native.Uint16(p[10:]) > 0 {
				native.PutUint64(p[pageHead:], id)
			}
		}},
		"a free page is forgotten": {"neither free nor in use", func(p []byte, id uint64) {
			if n := native.Uint16(p[10:]); native.Uint16(p[8:]) == pageFreelist && n > 0 {
				native.PutUint16(p[10:], n-1)
			}
		}},
		"a branch of nothing": {"a branch of 0 keys", func(p []byte, _ uint64) {
			if native.Uint16(p[8:]) == pageBranch {
				native.PutUint16(p[10:], 0)
			}
		}},
		"a branch that is its own child": {"used twice", func(p []byte, id uint64) {
			if native.Uint16(p[8:]) == pageBranch {
				native.PutUint64(p[pageHead+8:], id)
			}
		}},
		"overflow past the end": {"past the end", func(p []byte, _ uint64) {
			if native.Uint16(p[8:]) == pageLeaf {
				native.PutUint32(p[12:], 1<<31)
			}
		}},
	} {
		t.Run(name, func(t *testing.T) {
			bad := bytes.Clone(whole)
			for at := 8192; at+4096 <= len(bad); at += 4096 {
				c.damage(bad[at:at+4096], uint64(at/4096))
			}
			if bytes.Equal(bad, whole) {
				t.Fatal("there was nothing to damage")
			}
			path := file(t)
			if err := os.WriteFile(path, bad, 0o640); err != nil {
				t.Fatal(err)
			}
			if o := use(t, path).Opened(); o.SetAside == "" || !strings.Contains(o.Why, c.why) {
				t.Errorf("not set aside: %+v", o)
			}
		})
	}
}

// Flipped bytes and zeroed or torn sectors anywhere: set aside, or the record
// left out, never a panic and never a wrong message.
func TestRandomDamage(t *testing.T) {
	rounds := 24
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		rounds = 1000
	}
	whole := filledFile(t, 60)
	used := len(bytes.TrimRight(whole, "\x00"))
	rng := rand.New(rand.NewPCG(1, 2))
	aside := 0
	for round := range rounds {
		bad := bytes.Clone(whole)
		switch round % 4 {
		case 0:
			for range 1 + rng.IntN(20) {
				bad[rng.IntN(used)] ^= 1 << rng.IntN(8)
			}
		case 1: // in the heads of pages, where it hurts
			at := 4096*rng.IntN(used/4096) + rng.IntN(64)
			bad[at] ^= byte(1 + rng.IntN(255))
		case 2:
			at := 512 * rng.IntN(used/512)
			clear(bad[at : at+512])
		case 3:
			at, from := 512*rng.IntN(used/512), 512*rng.IntN(used/512)
			copy(bad[at:at+512], whole[from:from+512])
		}
		t.Run("", func(t *testing.T) {
			path := file(t)
			if err := os.WriteFile(path, bad, 0o640); err != nil {
				t.Fatal(err)
			}
			if use(t, path).Opened().SetAside != "" {
				aside++
			}
		})
	}
	t.Logf("%d of %d set aside", aside, rounds)
	if aside == 0 || aside == rounds {
		t.Errorf("%d of %d set aside: the damage is of one kind only", aside, rounds)
	}
}

func TestOtherLayoutIsSetAside(t *testing.T) {
	for name, change := range map[string]func(tx *bbolt.Tx) error{
		"newer layout":    func(tx *bbolt.Tx) error { return tx.Bucket(bucketMeta).Put(keyLayout, key(2)) },
		"missing bucket":  func(tx *bbolt.Tx) error { return tx.DeleteBucket(bucketOutbox) },
		"somebody else's": func(tx *bbolt.Tx) error { return tx.DeleteBucket(bucketMeta) },
	} {
		t.Run(name, func(t *testing.T) {
			path := file(t)
			if err := os.WriteFile(path, filledFile(t, 3), 0o640); err != nil {
				t.Fatal(err)
			}
			db, err := bbolt.Open(path, 0o640, nil)
			if err != nil {
				t.Fatal(err)
			}
			if err := errors.Join(db.Update(change), db.Close()); err != nil {
				t.Fatal(err)
			}
			if o := use(t, path).Opened(); o.SetAside == "" || !strings.Contains(o.Why, "layout") {
				t.Errorf("not set aside: %+v", o)
			}
		})
	}
}

func TestHeldFile(t *testing.T) {
	path := file(t)
	b := opened(t, path, Options{})
	mustStore(t, b, tick(0))
	for _, readOnly := range []bool{false, true} {
		if _, err := Open(path, Options{ReadOnly: readOnly, Timeout: 50 * time.Millisecond}); !errors.Is(err, ErrHeld) {
			t.Errorf("read only %v: %v, want %v", readOnly, err, ErrHeld)
		}
	}
	aside, err := filepath.Glob(path + ".corrupt*")
	if err != nil || len(aside) > 0 {
		t.Errorf("a held file was set aside: %v %v", aside, err)
	}
	mustStore(t, b, tick(1))
}

func TestOpenErrors(t *testing.T) {
	path := file(t)
	for _, o := range []Options{
		{MaxSize: 1}, {MaxSize: -1}, {MaxSize: 1 << 60}, {OutboxMax: -1}, {KeepMinutes: -1}, {Timeout: -1},
	} {
		if b, err := Open(path, o); err == nil {
			b.Close()
			t.Errorf("%+v: no error", o)
		}
	}
	if _, err := Open(filepath.Join(path, "missing", "x.db"), Options{}); err == nil {
		t.Error("no error for a missing folder")
	}
	if _, err := Open(path, Options{ReadOnly: true}); err == nil {
		t.Error("no error for reading a missing file")
	}
}

func FuzzCheck(f *testing.F) {
	f.Add([]byte("garbage"))
	f.Add(filledFile(f, 2))
	f.Fuzz(func(t *testing.T, data []byte) {
		if err := check(bytes.NewReader(data), int64(len(data))); err == nil && len(data) < 8192 {
			t.Errorf("%d bytes pass for a file", len(data))
		}
		salvage(bytes.NewReader(data))
	})
}

func FuzzRecord(f *testing.F) {
	p, err := newPacker()
	if err != nil {
		f.Fatal(err)
	}
	r := Record{Sequence: 1, Time: start, ClockSet: true, Levels: []string{"alarm", "rise", "de-h"}, JSON: []byte(`{"a":1}`)}
	f.Add(r.encode(p))
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, data []byte) {
		r, err := decode(publish.KindMinute, 1, sealed(data))
		if err != nil {
			return
		}
		again, err := decode(publish.KindMinute, 1, r.encode(p))
		if d := cmp.Diff(r, again); d != "" || err != nil {
			t.Errorf("%v %s", err, d)
		}
	})
}

// sealed puts the right checksum into a record, so that what comes after the
// check of it is tried too.
func sealed(data []byte) []byte {
	if len(data) >= recordHead {
		data = bytes.Clone(data)
		binary.BigEndian.PutUint32(data[atSum:], crc32.Checksum(data[atSequence:], castagnoli))
	}
	return data
}

// The dictionary belongs to the layout: files written with another one cannot
// be read. Whoever changes it must raise layoutVersion.
func TestDictionaryIsPinned(t *testing.T) {
	if sum := crc32.ChecksumIEEE([]byte(dictionary)); layoutVersion != 1 || sum != 0x8fc4948a {
		t.Errorf("layout %d has the dictionary %#x", layoutVersion, sum)
	}
}

func TestPacking(t *testing.T) {
	p, err := newPacker()
	if err != nil {
		t.Fatal(err)
	}
	for i, m := range []publish.Message{minute(3), finding(3), alarmMessage(3, "de-h", alarm.Normal)} {
		body, err := publish.Encode(m)
		if err != nil {
			t.Fatal(err)
		}
		packed := p.pack(body)
		if got, err := unpack(packed); !bytes.Equal(got, body) || err != nil {
			t.Errorf("message %d came back as %s: %v", i, got, err)
		}
		if 2*len(packed) > len(body) {
			t.Errorf("message %d: %d bytes become %d", i, len(body), len(packed))
		}
		t.Logf("%d bytes become %d", len(body), len(packed))
	}
	if _, err := unpack(p.pack(make([]byte, longest+1))); err == nil {
		t.Error("a message without bound was unpacked")
	}
}
