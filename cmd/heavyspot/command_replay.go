package main

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/recording"
	"heavyspot/config"
	"heavyspot/rules/alarm"
)

// replayCommand leads a recording through the pipeline.
type replayCommand struct {
	Config     string    `short:"c" required:"" placeholder:"FILE" help:"Configuration of the machine."`
	Recording  string    `arg:"" help:"CSV or WAV recording."`
	JSON       bool      `name:"json" help:"Print the messages as JSON Lines."`
	Start      startTime `placeholder:"TIME" help:"Wall time of the first sample, as 2026-03-01T06:31:00Z; without it the time that the file carries, else minutes count from the first sample."`
	FullScaleV float64   `name:"full-scale-v" placeholder:"V" help:"Volts of a WAV file's full scale."`
}

// startTime is a time on the command line.
type startTime struct{ time.Time }

// UnmarshalText reads an RFC 3339 time.
func (t *startTime) UnmarshalText(text []byte) error {
	at, err := time.Parse(time.RFC3339, string(text))
	if err != nil {
		return fmt.Errorf("%q: must be like 2026-03-01T06:31:00Z", text)
	}
	t.Time = at.UTC()
	return nil
}

// Run does it.
func (c *replayCommand) Run(env *environment) error {
	cfg, err := loadConfig(c.Config)
	if err != nil {
		return err
	}
	opt := recording.Options{FullScaleV: c.FullScaleV, Start: c.Start.Time}
	src, err := openRecording(cfg, c.Recording, opt)
	if err != nil {
		return err
	}
	defer src.Close()
	screen := newScreen(env.out, env.talk)
	out := bufio.NewWriter(screen)
	sum := &summary{}
	var shown sink = &jsonSink{machine: &cfg.Machine, out: out}
	if !c.JSON {
		shown = newTextSink(cfg, out)
	}
	alarms, err := alarm.New(cfg.Alarms())
	if err != nil {
		return usageError{err}
	}
	p, err := newPipeline(cfg, src.Format(), fromConverter(cfg, c.Recording, opt), alarms, shown, sum, flusher{out})
	if err != nil {
		return usageError{err}
	}
	progress := newProgress(screen, src)
	p.onBlock = func(b *acquire.Block) {
		sum.gap(b, p.format.RateHz)
		progress.block(p)
	}
	err = p.run(env.ctx, src)
	screen.show("")
	if err == nil && !c.JSON {
		sum.print(out)
	}
	if ferr := out.Flush(); err == nil {
		err = ferr
	}
	return c.verdict(env.ctx, err, cfg, sum)
}

// verdict says how a replay ended.
func (c *replayCommand) verdict(ctx context.Context, err error, cfg *config.Config, sum *summary) error {
	var damage *recording.Error
	reasons := sum.doubts(cfg)
	switch {
	case errors.As(err, &damage) && sum.minutes > 0:
		reasons = append(reasons, damage.Error())
	case err != nil:
		return err
	case ctx.Err() != nil:
		return errors.New("interrupted; what is printed is not the whole recording")
	}
	if len(reasons) > 0 {
		return doubtError{reasons}
	}
	return nil
}

// openRecording opens a recording that fits the configuration; one that does
// not is a usage error.
func openRecording(cfg *config.Config, path string, opt recording.Options) (*recording.Source, error) {
	fitting := opt
	fitting.ExpectRateHz = cfg.Source.RateHz
	for _, p := range cfg.Points {
		fitting.Channels = append(fitting.Channels, p.Channel)
	}
	if r := cfg.Reference; r != nil {
		fitting.Channels = append(fitting.Channels, r.Channel)
	}
	src, err := recording.Open(path, fitting)
	if err == nil {
		return src, nil
	}
	// Open it as it is, to tell a damaged file from one that does not fit.
	other, again := recording.Open(path, opt)
	if again != nil {
		return nil, err
	}
	defer other.Close()
	if hz := other.Format().RateHz; math.Abs(hz-cfg.Source.RateHz) > 1e-3*cfg.Source.RateHz {
		return nil, usageError{fmt.Errorf("cannot use recording %s: it is sampled at %.6g Hz and source.rate_hz is %.6g; they must agree within 0.1 %%",
			path, hz, cfg.Source.RateHz)}
	}
	if lack := checkChannels(cfg, other, path); lack != nil {
		return nil, usageError{lack}
	}
	return nil, err
}

// fromConverter says whether a recording can come from the configured converter:
// the rate is one of its rates, and nothing in the first minute is beyond its
// full scale.
func fromConverter(cfg *config.Config, path string, opt recording.Options) bool {
	if cfg.CheckSource() != nil {
		return false
	}
	src, err := openRecording(cfg, path, opt)
	if err != nil {
		return false
	}
	defer src.Close()
	f := src.Format()
	var b acquire.Block
	for src.Read(context.Background(), &b) == nil && float64(b.First) < 60*f.RateHz {
		for _, p := range cfg.Points {
			// A little more than full scale, for the rounding of written numbers.
			most := float32(1.0001 * converterV / float64(cfg.Source.Gain[p.Channel]))
			for i := p.Channel; i < len(b.Volts); i += f.Channels {
				if b.Volts[i] > most || b.Volts[i] < -most {
					return false
				}
			}
		}
	}
	return true
}

// checkChannels says which channel of the configuration a recording lacks.
func checkChannels(cfg *config.Config, src *recording.Source, path string) error {
	for _, p := range cfg.Points {
		if !src.Has(p.Channel) {
			return fmt.Errorf("cannot use recording %s: it has no channel %d, which the configuration gives to point %s", path, p.Channel, p.Name)
		}
	}
	if r := cfg.Reference; r != nil && !src.Has(r.Channel) {
		return fmt.Errorf("cannot use recording %s: it has no channel %d, which the configuration gives to the phase reference", path, r.Channel)
	}
	return nil
}

// flusher is the last sink: it lets each minute be seen at once.
type flusher struct{ out *bufio.Writer }

func (f flusher) take(*tick) error { return f.out.Flush() }

// progress tells on a terminal how far a replay is.
type progress struct {
	screen *screen
	src    *recording.Source
	began  time.Time
	shown  time.Time
}

func newProgress(s *screen, src *recording.Source) *progress {
	now := time.Now()
	return &progress{screen: s, src: src, began: now, shown: now}
}

func (r *progress) block(p *pipeline) {
	if !r.screen.live || time.Since(r.shown) < 200*time.Millisecond {
		return
	}
	r.shown = time.Now()
	done, total := r.src.Progress()
	data := float64(p.minutes.reached-p.minutes.origin) / p.format.RateHz
	r.screen.show(fmt.Sprintf("%3.0f %%  %d minutes  %.0f times real time",
		math.Floor(100*float64(done)/float64(max(total, 1))), p.given, data/r.shown.Sub(r.began).Seconds()))
}
