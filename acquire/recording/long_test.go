package recording

import (
	"context"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"sync"
	"testing"

	"heavyspot/acquire"
)

// TestProgressWhileReading needs the race detector to tell anything but the
// end.
func TestProgressWhileReading(t *testing.T) {
	data := benchFile(t, true, 8)
	s, err := openText(string(data), Options{BlockSeconds: 0.05})
	if err != nil {
		t.Fatal(err)
	}
	var wait sync.WaitGroup
	stop := make(chan struct{})
	wait.Go(func() {
		last := int64(0)
		for {
			done, total := s.Progress()
			if done < last || done > total || total != int64(len(data)) {
				t.Errorf("%d of %d bytes after %d", done, total, last)
			}
			last = done
			select {
			case <-stop:
				return
			default:
				runtime.Gosched()
			}
		}
	})
	_, err = readAll(s)
	close(stop)
	wait.Wait()
	if done, total := s.Progress(); err != io.EOF || done != total {
		t.Errorf("%d of %d bytes, %v", done, total, err)
	}
}

// TestLongRecording: memory does not grow with the file. An hour in the long
// run, half a minute otherwise.
func TestLongRecording(t *testing.T) {
	seconds := 30
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		seconds = 3600
	}
	for _, csv := range []bool{true, false} {
		path := filepath.Join(t.TempDir(), "long")
		writeLong(t, path, csv, seconds)
		s, err := Open(path, Options{ExpectRateHz: 1000})
		if err != nil {
			t.Fatal(err)
		}
		var b acquire.Block
		var before, after runtime.MemStats
		rows := 0
		runtime.ReadMemStats(&before)
		for err == nil {
			if err = s.Read(context.Background(), &b); err == nil {
				rows += b.Rows(8)
			}
		}
		runtime.ReadMemStats(&after)
		if err != io.EOF || rows != seconds*1000 {
			t.Errorf("csv %v: %d rows, %v", csv, rows, err)
		}
		if grown := after.TotalAlloc - before.TotalAlloc; grown > 1<<20 {
			t.Errorf("csv %v: %d bytes allocated for %d s", csv, grown, seconds)
		}
		if err := s.Close(); err != nil {
			t.Error(err)
		}
	}
}

// writeLong writes a recording of the same second again and again.
func writeLong(t *testing.T, path string, csv bool, seconds int) {
	t.Helper()
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	w := Writer(nil)
	if csv {
		w, err = NewCSVWriter(f, benchFormat)
	} else {
		w, err = NewWAVWriter(f, benchFormat)
	}
	b := benchBlock(0)
	for range seconds {
		if err == nil {
			err = w.Write(b)
		}
		b.First += 1000
	}
	if err == nil {
		err = w.Close()
	}
	if err != nil {
		t.Fatal(err)
	}
}
