package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/recording"
	"heavyspot/config"
	"heavyspot/dsp"
)

// lookSeconds is how long a source is sampled for a look at its signals, s: at
// least a few turns of a slow machine, and longer where the turn rate must be
// found from the vibration.
const lookSeconds, lookLonger = 6, 15

// source opens the source and looks at its signals for a few seconds.
func (l *checkList) source(ctx context.Context, cfg *config.Config, held bool) {
	driver := cfg.Source.Driver
	if held && driver != config.DriverRig {
		l.step(isNote, "source", "not tried, because heavyspot runs and the converter is in its hands; stop it to check the source")
		return
	}
	src, err := openSource(cfg, nil)
	if err != nil {
		l.step(toMend, "source", "%v", err)
		return
	}
	defer src.Close()
	seconds := lookSeconds
	if cfg.Reference == nil {
		seconds = lookLonger
	}
	l.look(ctx, cfg, src, driver, true, float64(seconds))
}

// recording looks at the first minute of a recording.
func (l *checkList) recording(ctx context.Context, cfg *config.Config, path string, opt recording.Options) error {
	src, err := openRecording(cfg, path, opt)
	if err != nil {
		return err
	}
	defer src.Close()
	l.look(ctx, cfg, src, path, fromConverter(cfg, path, opt), 60)
	return nil
}

// look reads a stream for some seconds and says what its signals are like.
func (l *checkList) look(ctx context.Context, cfg *config.Config, src acquire.Source, name string, converted bool, seconds float64) {
	f := src.Format()
	dc := signalPath(cfg, f, converted)
	engine, err := dsp.NewEngine(dc)
	if err != nil {
		l.step(toMend, "source", "%v", err)
		return
	}
	began := time.Now()
	var first, end, lost int64
	width := pulseWidth{reference: dc.Reference}
	var b acquire.Block
	for end-first < int64(seconds*f.RateHz) {
		if err = src.Read(ctx, &b); err != nil {
			break
		}
		if end == 0 {
			first = b.First
		}
		lost += b.Gap.Lost
		engine.Push(b.First, b.Volts)
		width.count(b.Volts, f.Channels)
		end = b.First + int64(b.Rows(f.Channels))
	}
	switch {
	case end == first:
		l.step(toMend, "source", "%s: no samples: %v", name, err)
		return
	case err != nil && !errors.Is(err, io.EOF) && ctx.Err() == nil:
		l.step(dataWrong, "source", "%s: after %.1f s: %v", name, float64(end-first)/f.RateHz, err)
	}
	text := fmt.Sprintf("%s: %d channels at %g Hz, looked at for %.1f s", name, f.Channels, f.RateHz, float64(end-first)/f.RateHz)
	if _, file := src.(*recording.Source); !file {
		text += fmt.Sprintf(" (%.1f s by this computer's clock)", time.Since(began).Seconds())
	}
	if lost > 0 {
		l.step(dataWrong, "source", "%s; %s missing", text, several(int(lost), "sample row"))
	} else {
		l.step(isOK, "source", "%s, no sample missing", text)
	}
	m := engine.Close(end, time.Time{}, false)
	l.speed(cfg, &m)
	if w := width.samples(&m); w > 0 && w < leastWidth {
		l.step(isNote, "reference", "the pulse is %.1f samples wide, which shifts the lags by some degrees; from %d on it does not: use a longer mark or a higher source.rate_hz", w, leastWidth)
	}
	for i := range m.Points {
		l.signal(&m, &m.Points[i])
	}
}

// leastWidth is the width of the pulse, in samples, from which the converter's
// filter, which is three samples long, lets its edge stand where it is.
const leastWidth = 3

// pulseWidth counts the samples past the threshold of the phase reference.
type pulseWidth struct {
	reference *dsp.Reference
	past      int
}

func (w *pulseWidth) count(volts []float32, channels int) {
	if w.reference == nil {
		return
	}
	for i := w.reference.Channel; i < len(volts); i += channels {
		if above := float64(volts[i]) > w.reference.ThresholdV; above != w.reference.Falling {
			w.past++
		}
	}
}

// samples returns the mean width of a pulse, 0 when it is not known.
func (w *pulseWidth) samples(m *dsp.Minute) float64 {
	if w.reference == nil || m.Speed.State != dsp.Steady || m.Speed.Reference == dsp.ReferenceNone {
		return 0
	}
	return float64(w.past) / (m.Speed.Mean / 60 * m.Seconds)
}

// speed says what the phase reference shows.
func (l *checkList) speed(cfg *config.Config, m *dsp.Minute) {
	s := &m.Speed
	switch {
	case s.State == dsp.Stopped:
		l.step(isNote, "speed", "the machine stands, or turns too slowly to be seen; look at the reference again when it runs")
	case s.Reference == dsp.ReferenceGood:
		l.step(isOK, "speed", "%.1f r/min by the phase reference, %d whole turns, every pulse in its place", s.Mean, s.Turns)
	case s.Reference == dsp.ReferenceDoubtful && s.Missing+s.Extra == 0:
		l.step(dataWrong, "speed", "%.1f r/min by the phase reference, whose pulses are too narrow for the sampling", s.Mean)
	case s.Reference == dsp.ReferenceDoubtful:
		l.step(dataWrong, "speed", "%.1f r/min by the phase reference, but %d pulses were missing and %d too many; look at the pick-up's distance, and at threshold and hysteresis", s.Mean, s.Missing, s.Extra)
	case cfg.Reference != nil:
		l.step(dataWrong, "speed", "%.1f r/min by the vibration, since the phase reference gives no usable pulses; look at its channel, threshold and wiring", s.Mean)
	default:
		l.step(isOK, "speed", "%.1f r/min by the vibration", s.Mean)
	}
}

// signal says what one point shows.
func (l *checkList) signal(m *dsp.Minute, p *dsp.PointReading) {
	switch {
	case p.State == dsp.PointFlat && m.Speed.State == dsp.Stopped:
		l.step(isNote, p.Name, "flat, which a sensor on a standing machine may be")
	case p.State != dsp.PointGood:
		l.step(dataWrong, p.Name, "signal is %s; look at the sensor, its supply and cable, and at channel and gain", p.State)
	case m.Speed.State == dsp.Stopped:
		l.step(isOK, p.Name, "good, overall %.2f mm/s rms", p.Overall)
	default:
		l.step(isOK, p.Name, "good, overall %.2f mm/s rms, 1x %.2f @%.0f", p.Overall, p.Order[0].RMS, wholeLag(p.Order[0].Lag))
	}
}
