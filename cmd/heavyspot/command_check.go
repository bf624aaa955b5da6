package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"strings"

	"heavyspot/acquire/recording"
	"heavyspot/config"
	"heavyspot/publish"
)

// checkCommand tries all that a configuration names.
type checkCommand struct {
	Config     string  `short:"c" required:"" placeholder:"FILE" help:"Configuration of the machine."`
	Recording  string  `arg:"" optional:"" help:"CSV or WAV recording to look at instead of the source."`
	JSON       bool    `name:"json" help:"Print the findings as JSON Lines."`
	FullScaleV float64 `name:"full-scale-v" placeholder:"V" help:"Volts of a WAV file's full scale."`
}

// Run does it.
func (c *checkCommand) Run(env *environment) error {
	cfg, err := loadConfig(c.Config)
	if err != nil {
		return err
	}
	l := &checkList{out: env.out, json: c.JSON, machine: &cfg.Machine}
	l.facts(cfg, c.Config)
	if c.Recording != "" {
		opt := recording.Options{FullScaleV: c.FullScaleV}
		if err := l.recording(env.ctx, cfg, c.Recording, opt); err != nil {
			return err
		}
	} else {
		if err := cfg.CheckSource(); err != nil {
			return usageError{err}
		}
		l.clock()
		held := l.buffer(cfg)
		l.broker(env.ctx, cfg, held)
		l.source(env.ctx, cfg, held)
	}
	if env.ctx.Err() != nil {
		return errors.New("interrupted; the checks are not complete")
	}
	return l.result()
}

// outcome is how a step of a check came out.
type outcome string

// The outcomes. A note is neither good nor bad.
const (
	isOK   outcome = "ok"
	isNote outcome = "note"
	toMend outcome = "mend"
	// dataWrong is shown as toMend; the fault lies in what was measured.
	dataWrong outcome = "data"
)

// checkList prints steps as they are made and remembers what is to mend.
type checkList struct {
	out     io.Writer
	json    bool
	machine *config.Machine
	mend    int
	data    []string
}

// step prints one step.
func (l *checkList) step(o outcome, what, format string, args ...any) {
	text := fmt.Sprintf(format, args...)
	switch o {
	case toMend:
		l.mend++
	case dataWrong:
		l.data = append(l.data, what+": "+text)
		o = toMend
	}
	if !l.json {
		io.WriteString(l.out, wrap(fmt.Sprintf("%-5s %-10s ", o, what), text))
		return
	}
	line, _ := json.Marshal(struct {
		Schema  int     `json:"schema"`
		Kind    string  `json:"kind"`
		Site    string  `json:"site"`
		Machine string  `json:"machine"`
		Step    string  `json:"step"`
		Outcome outcome `json:"outcome"`
		Text    string  `json:"text"`
	}{publish.Schema, "check", l.machine.Site, l.machine.Name, what, o, text})
	l.out.Write(append(line, '\n'))
}

// result is the error that says how the whole check came out.
func (l *checkList) result() error {
	switch {
	case l.mend > 0:
		return fmt.Errorf("%s to mend", several(l.mend+len(l.data), "thing"))
	case len(l.data) > 0:
		return doubtError{l.data}
	}
	return nil
}

// facts says what the configuration means.
func (l *checkList) facts(cfg *config.Config, path string) {
	m := &cfg.Machine
	l.step(isOK, "machine", "%s/%s from %s: rotor %s, turns %s seen from the drive end, %g r/min", m.Site, m.Name, path, m.Rotor, m.Rotation, m.RatedRPM)
	limits := cfg.Rules().Limits
	text := fmt.Sprintf("%s: alarm from %g", limits.Standard, limits.Alarm)
	if limits.Acceptable > 0 {
		text = fmt.Sprintf("%s: good below %g, alarm from %g", limits.Standard, limits.Acceptable, limits.Alarm)
	}
	if limits.Trip > 0 {
		text += fmt.Sprintf(", trip from %g", limits.Trip)
	}
	l.step(isOK, "limits", "%s mm/s rms; 1x is quiet under %.4g. Starting points for the plant's own; a qualified person decides", text, cfg.Limits.QuietShare*limits.Alarm)
	l.points(cfg)
	if r := cfg.Reference; r != nil {
		l.step(isOK, "reference", "channel %d, %s edge through %g V, %g V hysteresis", r.Channel, r.Edge, r.ThresholdV, r.HysteresisV)
	} else {
		l.step(isNote, "reference", "none; the turn rate is found from the vibration, and no vector is compared with a baseline")
	}
}

// points lists the measuring points, and what cannot be tested without those
// that are missing.
func (l *checkList) points(cfg *config.Config) {
	have := map[string]bool{}
	for _, p := range cfg.Points {
		have[p.Bearing+" "+p.Direction] = true
		text := fmt.Sprintf("channel %d, %s %s, %g V/g", p.Channel, p.Bearing, p.Direction, p.VoltsPerG)
		if p.Inverted {
			text += ", inverted"
		}
		if p.HighpassHz > 0 {
			text += fmt.Sprintf(", high pass %g Hz", p.HighpassHz)
		}
		l.step(isOK, p.Name, "%s", text)
	}
	var lack []string
	for _, b := range []string{"drive-end", "non-drive-end"} {
		for _, d := range []string{"vertical", "horizontal", "axial"} {
			if !have[b+" "+d] {
				lack = append(lack, b+" "+d)
			}
		}
	}
	if len(lack) > 0 {
		l.step(isNote, "points", "none at %s: what needs them is not tested, and verdicts may stay undetermined", strings.Join(lack, ", "))
	}
}

// clock says whether the wall clock can be believed.
func (l *checkList) clock() {
	if wallClockSet() {
		l.step(isOK, "clock", "set")
		return
	}
	l.step(isNote, "clock", "not known to be set; until it is, minutes count from the first sample and are marked so")
}
