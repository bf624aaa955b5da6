package config

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// known returns the recordings' configurations handed in beside the repository.
func known(t *testing.T) []string {
	files, err := filepath.Glob("../../shared/data/known/*.toml")
	if err != nil {
		t.Fatal(err)
	}
	if len(files) == 0 {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatal("no configurations in ../shared/data/known")
		}
		t.Skip("no configurations in ../shared/data/known")
	}
	return files
}

func TestKnownConfigurationsLoad(t *testing.T) {
	for _, file := range known(t) {
		cfg, err := Load(file)
		if err != nil {
			t.Errorf("%v", err)
			continue
		}
		if want := "fan-" + strings.TrimSuffix(filepath.Base(file), ".toml"); cfg.Machine.Name != want {
			t.Errorf("%s: machine %q, want %q", file, cfg.Machine.Name, want)
		}
		if len(cfg.Points) != 6 || cfg.Reference == nil || cfg.Reference.Channel != 6 {
			t.Errorf("%s: %d points, reference %+v; want 6 and channel 6", file, len(cfg.Points), cfg.Reference)
		}
		if err := cfg.CheckSource(); err != nil {
			t.Errorf("%s: %v", file, err)
		}
	}
}

func TestExamplesLoad(t *testing.T) {
	for _, name := range []string{"kiln-fan-2.toml", "minimal.toml"} {
		cfg, err := Load("../testdata/config/" + name)
		if err != nil {
			t.Errorf("%v", err)
			continue
		}
		if err := cfg.CheckSource(); err != nil {
			t.Error(err)
		}
	}
}

// The long example shows every key there is, so that it can be trusted as the
// list of them; keys that exclude those it uses stand in comments.
func TestLongExampleShowsEveryKey(t *testing.T) {
	data, err := os.ReadFile("../testdata/config/kiln-fan-2.toml")
	if err != nil {
		t.Fatal(err)
	}
	for _, key := range allKeys() {
		found := false
		for line := range strings.Lines(string(data)) {
			line = strings.TrimLeft(line, "# ")
			found = found || strings.HasPrefix(line, key) && strings.HasPrefix(strings.TrimLeft(line[len(key):], " "), "=")
		}
		if !found {
			t.Errorf("key %s is not shown", key)
		}
	}
}

func TestLoadTellsWhyAFileCannotBeRead(t *testing.T) {
	missing := filepath.Join(t.TempDir(), "none.toml")
	if _, err := Load(missing); !errors.Is(err, fs.ErrNotExist) || !strings.Contains(err.Error(), missing) {
		t.Errorf("error %v, want one that names the missing file", err)
	}
	if _, err := Load(t.TempDir()); err == nil {
		t.Error("a folder was read as a configuration")
	}
}

func TestLongFileIsRefused(t *testing.T) {
	path := filepath.Join(t.TempDir(), "long.toml")
	if err := os.WriteFile(path, []byte(good+strings.Repeat("#\n", mostBytes/2)), 0o600); err != nil {
		t.Fatal(err)
	}
	want := path + ":1: the file is too long: must be at most 65536 bytes"
	if _, err := Load(path); err == nil || err.Error() != want {
		t.Errorf("error %v, want %s", err, want)
	}
}

// An editor's byte order mark and line ends change nothing, lines included.
func TestEditorsMarksAreHarmless(t *testing.T) {
	dos := "\ufeff" + strings.ReplaceAll(spoil(24, "volts_per_g = 0"), "\n", "\r\n")
	_, err := Parse("f.toml", []byte(dos))
	const want = "f.toml:24: point[0].volts_per_g = 0: must be from 0.0001 to 100 (volts per standard gravity)"
	if err == nil || err.Error() != want {
		t.Errorf("error %v, want %s", err, want)
	}
}

// Tables may be written in any of TOML's ways; places are found in all.
func TestOtherWaysToWriteTables(t *testing.T) {
	const text = `machine.site = "s"
machine = 1
`
	if _, err := Parse("f.toml", []byte(text)); err == nil {
		t.Error("a key defined twice was taken")
	}
	inline := `machine = { site = "s", name = "n", rotor = "overhung", rotation = "clockwise", rated_rpm = 990 }
limits.standard = "own"
limits.alarm_mm_s_rms = 4
"limits".trip_mm_s_rms = 7
source = { driver = "rig", rate_hz = 1000 }
point = [
  { name = "a", bearing = "drive-end", direction = "axial", channel = 0, volts_per_g = 1 },
  { name = "b", bearing = "drive-end", direction = "vertical", channel = 1, volts_per_g = VOLTS },
]
`
	cfg, err := Parse("f.toml", []byte(strings.Replace(inline, "VOLTS", "0x1", 1)))
	if err != nil {
		t.Fatal(err)
	}
	if cfg.Limits.TripMMS != 7 || cfg.Points[1].VoltsPerG != 1 || cfg.Rig == nil || *cfg.Rig != *defaultRig() {
		t.Errorf("read %+v", cfg)
	}
	_, err = Parse("f.toml", []byte(strings.Replace(inline, "VOLTS", "101", 1)))
	const want = "f.toml:8: point[1].volts_per_g = 101: must be from 0.0001 to 100 (volts per standard gravity)"
	if err == nil || err.Error() != want {
		t.Errorf("error %v, want %s", err, want)
	}
}

// Files made to be slow or to fill the memory are refused like any other.
func TestHugeNestingIsRefused(t *testing.T) {
	const n = mostBytes/2 - 100
	for name, text := range map[string]string{
		"lists":   "x = " + strings.Repeat("[", 9000) + strings.Repeat("]", 9000),
		"dots":    strings.Repeat("a.", n) + "a = 1",
		"headers": "[" + strings.Repeat("a.", n) + "a]",
		"tables":  "x = " + strings.Repeat("{a=", 9000) + "1" + strings.Repeat("}", 9000),
		"too far": "x = " + strings.Repeat("[", n),
		"key":     strings.Repeat("a", 2*n) + " = 1",
		"points":  strings.Repeat("[[point]]\n", n/5),
		"gain":    "[source]\ngain = [" + strings.Repeat("0,", n-50) + "]",
		"brokers": "[mqtt]\nbrokers = [" + strings.Repeat("0,", n-50) + "]",
	} {
		if cfg, err := Parse("f.toml", []byte(text)); err == nil || !strings.HasPrefix(err.Error(), "f.toml:1") {
			t.Errorf("%s: configuration %v, error %.200v", name, cfg, err)
		}
	}
}
