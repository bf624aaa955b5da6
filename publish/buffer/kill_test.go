package buffer

import (
	"bufio"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"strings"
	"testing"
	"time"
)

// childEnv names the file that a child process of this test binary fills.
const childEnv = "HEAVYSPOT_TEST_FILL"

func TestMain(m *testing.M) {
	if path := os.Getenv(childEnv); path != "" {
		fill(path)
	}
	os.Exit(m.Run())
}

// fill stores ticks and takes messages out of the outbox until it is killed; it
// writes a line after each commit has returned.
func fill(path string) {
	b, err := Open(path, Options{MaxSize: 3 << 20})
	if err != nil {
		fmt.Println("error", err)
		os.Exit(1)
	}
	fmt.Println("opened", b.Opened().Sequence, b.Opened().SetAside)
	for n := 0; ; n++ {
		k := tick(n)
		k.AlarmState = fmt.Appendf(nil, "%d", b.sequence.Load()+2)
		if err := b.Store(k); err != nil {
			fmt.Println("error", err)
			os.Exit(1)
		}
		fmt.Println("stored", k.Messages[1].Head().Sequence)
		if n%3 != 0 {
			continue
		}
		pending, err := b.Pending(0, 4)
		if err == nil {
			err = b.Ack(sequences(pending)...)
		}
		if err != nil {
			fmt.Println("error", err)
			os.Exit(1)
		}
		if len(pending) > 0 {
			fmt.Println("acked", pending[len(pending)-1].Sequence)
		}
	}
}

// TestKilled kills the process in the middle of its work, again and again, and
// looks for every tick that it said was stored.
func TestKilled(t *testing.T) {
	rounds := 10
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		rounds = 200
	}
	path := file(t)
	for round := range rounds {
		stored, acked := killedChild(t, path)
		if stored == 0 {
			t.Fatalf("round %d: the child stored nothing", round)
		}
		checkAfterKill(t, path, uint64(round+1), stored, acked)
	}
}

// killedChild runs a child for a moment and returns the last numbers it told.
func killedChild(t *testing.T, path string) (stored, acked uint64) {
	t.Helper()
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), childEnv+"="+path)
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	lines := bufio.NewScanner(out)
	kill := 3 + rand.IntN(40)
	for n := 0; lines.Scan(); n++ {
		var s uint64
		switch line := lines.Text(); {
		case strings.HasPrefix(line, "error"), strings.Contains(line, "corrupt"):
			t.Fatalf("child: %s", line)
		case scanned(line, "stored %d", &s):
			stored = s
		case scanned(line, "acked %d", &s):
			acked = s
		}
		if n == kill {
			time.Sleep(time.Duration(rand.IntN(3000)) * time.Microsecond)
			if err := cmd.Process.Kill(); err != nil {
				t.Fatal(err)
			}
		}
	}
	cmd.Wait() // killed: the error says so
	return stored, acked
}

func scanned(line, format string, v *uint64) bool {
	n, _ := fmt.Sscanf(line, format, v)
	return n == 1
}

func checkAfterKill(t *testing.T, path string, boot, stored, acked uint64) {
	t.Helper()
	consistent(t, path)
	b, err := Open(path, Options{MaxSize: 3 << 20, ReadOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close()
	o := b.Opened()
	if o.Boot != boot {
		t.Errorf("start %d, want %d", o.Boot, boot)
	}
	// One more tick than told may be there: it was killed before it could tell.
	if o.Sequence != stored && o.Sequence != stored+2 {
		t.Errorf("sequence %d, but %d was told", o.Sequence, stored)
	}
	state, err := b.AlarmState()
	if err != nil || string(state) != fmt.Sprint(o.Sequence) {
		t.Errorf("alarm state %q of the tick that ended with %d: %v", state, o.Sequence, err)
	}
	pending, err := b.Pending(0, 1<<20)
	if err != nil {
		t.Fatal(err)
	}
	next := acked + 1
	if len(pending) > 0 && pending[0].Sequence > next {
		next = acked + 5 // an Ack that was not told
	}
	for _, r := range pending {
		if r.Sequence != next {
			t.Fatalf("outbox goes from %d to %d (told: %d acknowledged, %d stored)", next-1, r.Sequence, acked, stored)
		}
		next++
	}
	if next != o.Sequence+1 {
		t.Errorf("outbox ends with %d, the last number is %d", next-1, o.Sequence)
	}
}
