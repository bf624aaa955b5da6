package main

import (
	_ "embed"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"net"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/recording"
	"heavyspot/acquire/rig"
	"heavyspot/config"
	"heavyspot/publish/mqtt"
	"heavyspot/rules/alarm"
)

// demoSpeed is how many times faster than life the demo runs by default, so
// that the story takes about a minute.
const demoSpeed = 22

//go:embed demo.toml
var demoConfig string

// demoCommand shows the whole program at work.
type demoCommand struct {
	Speed float64 `default:"1" help:"Times faster than usual, which is about a minute for the whole story; 0 is as fast as it goes."`
	Seed  uint64  `default:"1" help:"Seed of everything that is random; the same seed shows the same readings."`
	JSON  bool    `name:"json" help:"Print the messages as JSON Lines."`
	Short bool    `hidden:"" help:"Tell the story in fewer minutes."`
}

// Run does it.
func (c *demoCommand) Run(env *environment) error {
	if !(c.Speed >= 0 && c.Speed <= 1000) {
		return usageError{fmt.Errorf("--speed is %v: must be from 0 to 1000", c.Speed)}
	}
	d, err := newDemo(c, env)
	if err != nil {
		return err
	}
	d.greet(env)
	d.view.began = time.Now()
	d.view.drawn = d.view.began
	d.delivery.start()
	err = d.pipeline.run(env.ctx, d.src)
	d.view.screen.show("")
	if err = errors.Join(err, d.view.err, d.close()); err != nil {
		return err
	}
	return d.conclude(env)
}

// demo is all that runs in it.
type demo struct {
	cfg      *config.Config
	folder   string
	file     string // configuration
	src      acquire.Source
	pipeline *pipeline
	delivery *delivery
	view     *demoView
	wave     *waveform
}

// newDemo sets the stage; on an error nothing stays open.
func newDemo(c *demoCommand, env *environment) (d *demo, err error) {
	d = &demo{view: &demoView{screen: newScreen(env.out, env.talk), json: c.JSON}}
	if err := d.settle(); err != nil {
		return nil, err
	}
	alarms, err := alarm.New(d.cfg.Alarms())
	if err != nil {
		return nil, err
	}
	if d.delivery, err = openDelivery(d.cfg, alarms, slog.New(slog.DiscardHandler)); err != nil {
		return nil, err
	}
	visits := story()
	if c.Short {
		visits = shortStory()
	}
	plan := newPlan(visits, d.cfg.Source.RateHz)
	if d.src, err = d.stage(plan, c.Speed*demoSpeed, c.Seed); err != nil {
		return nil, errors.Join(err, d.close())
	}
	if d.pipeline, err = newPipeline(d.cfg, d.src.Format(), true, alarms, d.delivery); err != nil {
		return nil, errors.Join(err, d.close())
	}
	last := len(visits) - 1
	d.wave, err = newWaveform(filepath.Join(d.folder, "last-minutes.wav"), d.src.Format(), plan.first[last]+plan.leap(last))
	if err != nil {
		return nil, errors.Join(err, d.close())
	}
	d.view.rateHz = d.src.Format().RateHz
	d.delivery.onStored = d.view.stored
	d.pipeline.onBlock = func(b *acquire.Block) {
		d.view.block(b, d.src.Format().Channels)
		d.wave.block(b)
	}
	return d, nil
}

// settle makes the folder of the demo and writes its configuration there.
func (d *demo) settle() error {
	listen, err := freeAddress()
	if err != nil {
		return err
	}
	if d.folder, err = os.MkdirTemp("", "heavyspot-demo-"); err != nil {
		return fmt.Errorf("cannot make a folder for the demo: %w", err)
	}
	d.file = filepath.Join(d.folder, "kiln-fan-2.toml")
	text := demoConfig + fmt.Sprintf("path   = %s\nsocket = %s\n\n[mqtt]\nembedded_listen = %s\n",
		strconv.Quote(filepath.Join(d.folder, "heavyspot.db")), strconv.Quote(filepath.Join(d.folder, "heavyspot.sock")), strconv.Quote(listen))
	if err := os.WriteFile(d.file, []byte(text), 0o644); err != nil {
		return fmt.Errorf("cannot write the demo's configuration: %w", err)
	}
	d.cfg, err = config.Load(d.file)
	return err
}

// freeAddress is where the demo's broker listens: the usual address, or another
// port when that is taken.
func freeAddress() (string, error) {
	for _, address := range []string{mqtt.DefaultListen, "127.0.0.1:0"} {
		l, err := net.Listen("tcp", address)
		if err != nil {
			continue
		}
		address = l.Addr().String()
		return address, l.Close()
	}
	return "", errors.New("cannot find a free port on 127.0.0.1 for the demo's broker")
}

// stage puts the fan behind the simulated converter and the driver before it.
func (d *demo) stage(p *plan, speed float64, seed uint64) (acquire.Source, error) {
	fan, err := plant(d.cfg)
	if err != nil {
		return nil, err
	}
	fan.Unbalances = unbalances(p.visits[0].deposits...)
	m, err := rig.New(*fan, seed)
	if err != nil {
		return nil, err
	}
	s := newScene(m, p)
	dc := d.cfg.ADS131M08()
	dc.Blocks = 4 // what waits in the source must be less than the time to settle
	src, c, err := openChip(s, dc, speed, seed, storyBegins)
	if err != nil {
		return nil, err
	}
	return &storySource{Source: &liveSource{src, []func() error{c.Close}}, plan: p, scene: s, tell: d.view.tell}, nil
}

// close closes what is open.
func (d *demo) close() error {
	var err error
	if d.src != nil {
		err = d.src.Close()
	}
	if d.wave != nil {
		err = errors.Join(err, d.wave.close())
	}
	return errors.Join(err, d.delivery.close())
}

// subscription is a command that shows the demo's messages, in two lines.
func (d *demo) subscription(indent string) string {
	host, port, _ := net.SplitHostPort(d.cfg.MQTT.EmbeddedListen)
	m := &d.cfg.Machine
	return fmt.Sprintf("%smosquitto_sub -h %s -p %s -v \\\n%s  -t '%s/%s/%s/#'\n", indent, host, port, indent, d.cfg.MQTT.Root, m.Site, m.Name)
}

// greet says what will be seen.
func (d *demo) greet(env *environment) {
	var b strings.Builder
	b.WriteString(wrap("", "A simulated fan, everything else as shipped: the fan's sensors stand before a simulated converter, "+
		"which the driver reads over SPI. The plant is invented: north-works, kiln-fan-2, an induced-draft fan between bearings, 6 blades, 990 r/min."))
	fmt.Fprintf(&b, "broker   %s\n%s", d.delivery.broker.URL(), d.subscription("         "))
	fmt.Fprintf(&b, "folder   %s\n", d.folder)
	b.WriteString("Ctrl-C ends the demo early.\n\n")
	io.WriteString(env.talk, b.String())
}

// safety is said wherever output leads to work on the machine.
const safety = "An advisory monitor is no machine protection. Before work on a fan: isolate and lock out, stay out of the plane of rotation " +
	"on the first start with a trial mass, fasten masses for the speed they will see, follow local codes and the maker's instructions; " +
	"a qualified person decides. Limits from a standard are starting points for the plant's own."

// conclude says what was seen and what to try next.
func (d *demo) conclude(env *environment) error {
	out := env.out
	if d.view.json {
		out = env.talk
	} else {
		d.view.summary.print(out)
	}
	var b strings.Builder
	fmt.Fprintf(&b, "\nbuffer   %s\n", d.cfg.BufferPath())
	b.WriteString("next\n")
	if d.wave.rows > 0 {
		fmt.Fprintf(&b, "  heavyspot replay -c %s \\\n    %s\n", d.file, d.wave.path)
	}
	fmt.Fprintf(&b, "  heavyspot check -c %s\n  heavyspot run -c %s\n", d.file, d.file)
	b.WriteString(d.subscription("  ") + "    shows the messages while run or demo is at work\n")
	b.WriteString("\n" + wrap("safety   ", safety))
	_, err := io.WriteString(out, b.String())
	return err
}

// waveform records the stream from a row on.
type waveform struct {
	path string
	from int64
	rows int64
	file *os.File
	out  *recording.WAVWriter
	err  error
}

func newWaveform(path string, f acquire.Format, from int64) (*waveform, error) {
	file, err := os.Create(path)
	if err != nil {
		return nil, fmt.Errorf("cannot record the demo's last minutes: %w", err)
	}
	out, err := recording.NewWAVWriter(file, f)
	if err != nil {
		return nil, errors.Join(err, file.Close())
	}
	return &waveform{path: path, from: from, file: file, out: out}, nil
}

func (w *waveform) block(b *acquire.Block) {
	if b.First < w.from || w.err != nil {
		return
	}
	first := *b
	if w.rows == 0 {
		first.Gap = acquire.Gap{}
	}
	w.rows += int64(len(b.Volts))
	w.err = w.out.Write(&first)
}

// close completes the file; one without rows is removed.
func (w *waveform) close() error {
	err := w.err
	if w.rows > 0 {
		err = errors.Join(err, w.out.Close())
	}
	err = errors.Join(err, w.file.Close())
	if w.rows == 0 {
		err = errors.Join(err, os.Remove(w.path))
	}
	return err
}
