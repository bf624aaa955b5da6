package main

import (
	"bufio"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"heavyspot/publish"
)

// realFan holds recordings of a real fan with known weights on its blades (UCI
// Machine Learning Repository, "Accelerometer", CC BY 4.0; Scalabrini Sampaio et
// al., Sensors 2019, 19(19), 4342), beside the repository.
const realFan = "../../../shared/data/fan-weights"

// TestRealFan: from three axes at one place no kind of unbalance is concluded,
// and the recordings that reach the end of the sensor's range are named.
func TestRealFan(t *testing.T) {
	if _, err := os.Stat(realFan); err != nil {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatal(err)
		}
		t.Skip("recordings of a real fan are not beside the repository")
	}
	clipped := map[string]bool{"layout1-80": true, "layout1-90": true, "layout1-100": true, "layout2-90": true, "layout2-100": true}
	files, _ := filepath.Glob(realFan + "/*.csv")
	if len(files) != 12 {
		t.Fatalf("%d recordings, want 12", len(files))
	}
	for _, f := range files {
		status, out, talk := heavyspot("replay", "-c", "testdata/three-axes.toml", "--json", f)
		name := strings.TrimSuffix(filepath.Base(f), ".csv")
		want := 0
		if clipped[name] {
			want = 3
		}
		if status != want || clipped[name] != strings.Contains(talk, "clipped") {
			t.Errorf("%s: exit status %d, want %d: %s", name, status, want, talk)
		}
		minutes := 0
		for lines := bufio.NewScanner(strings.NewReader(out)); lines.Scan(); {
			var m struct {
				Kind    publish.Kind
				Verdict string
			}
			if err := json.Unmarshal(lines.Bytes(), &m); err != nil {
				t.Fatalf("%s: %v: %s", name, err, lines.Text())
			}
			if m.Kind == publish.KindMinute {
				minutes++
			}
			if m.Kind == publish.KindFinding && m.Verdict != "undetermined" && m.Verdict != "quiet" {
				t.Errorf("%s: %s from three axes at one place", name, m.Verdict)
			}
		}
		if minutes != 1 {
			t.Errorf("%s: %d minutes, want 1", name, minutes)
		}
	}
}
