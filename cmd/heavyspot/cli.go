package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"syscall"
	"time"

	"github.com/alecthomas/kong"

	"heavyspot/config"
)

// The exit statuses.
const (
	statusDone    = 0
	statusFailed  = 1
	statusUsage   = 2
	statusDoubted = 3 // done, but something in the data was wrong
)

// commands are the program's commands and flags.
type commands struct {
	Run    runCommand    `cmd:"" help:"Watch the machine: the daemon."`
	Demo   demoCommand   `cmd:"" help:"Show the whole program at work on a simulated fan."`
	Replay replayCommand `cmd:"" help:"Lead a recording through the same steps and print what would be published."`
	Check  checkCommand  `cmd:"" help:"Check a configuration, what it names, or a recording; say what to mend."`

	Version kong.VersionFlag `help:"Print the version and exit."`
}

// examples are the examples for the help of a command; "" is the program.
var examples = map[string][]string{
	"": {
		"heavyspot demo                                see what it does",
		"heavyspot check -c kiln-fan-2.toml            before the first run",
		"heavyspot run -c kiln-fan-2.toml              watch the machine",
		"heavyspot replay -c kiln-fan-2.toml fan.csv   what a recording shows",
	},
	"run": {
		"heavyspot run -c /etc/heavyspot/kiln-fan-2.toml",
	},
	"demo": {
		"heavyspot demo",
		"heavyspot demo --speed 2 --seed 7",
		"heavyspot demo --json > messages.jsonl",
	},
	"check": {
		"heavyspot check -c kiln-fan-2.toml",
		"heavyspot check -c kiln-fan-2.toml fan.csv",
	},
	"replay": {
		"heavyspot replay -c kiln-fan-2.toml fan.csv",
		"heavyspot replay -c kiln-fan-2.toml fan.wav --full-scale-v 1.2 --json",
		"heavyspot replay -c kiln-fan-2.toml fan.csv --start 2026-03-01T06:31:00Z",
	},
}

// environment is what a command works with.
type environment struct {
	ctx context.Context
	// out takes data, talk what is said beside them.
	out, talk io.Writer
}

// usageError is an error of usage or configuration.
type usageError struct{ err error }

func (e usageError) Error() string { return e.err.Error() }
func (e usageError) Unwrap() error { return e.err }

// doubtError says what in the data was wrong of a command that is done.
type doubtError struct{ reasons []string }

func (e doubtError) Error() string {
	text := "done, but something in the data was wrong:"
	for _, r := range e.reasons {
		text += "\n  " + r
	}
	return text
}

// execute runs the program and returns its exit status.
func execute(args []string, out, talk io.Writer) int {
	ctx, stop := withSignals()
	defer stop()
	if len(args) == 0 {
		args = []string{"--help"}
	}
	exited := false
	parser, err := kong.New(&commands{},
		kong.Name("heavyspot"),
		kong.Description("Advisory monitor of unbalance: no machine protection, never the only thing that stops a fan."),
		kong.Vars{"version": version()},
		kong.Writers(out, talk),
		kong.Exit(func(int) { exited = true }),
		kong.Help(printHelp),
		kong.ConfigureHelp(kong.HelpOptions{Compact: true, WrapUpperBound: screenWidth}),
	)
	if err != nil {
		fmt.Fprintf(talk, "heavyspot: %v\n", err)
		return statusFailed
	}
	parsed, err := parser.Parse(args)
	switch {
	case exited:
		return statusDone
	case err != nil:
		fmt.Fprintf(talk, "heavyspot: %v\nRun \"heavyspot --help\" for the commands and their flags.\n", err)
		return statusUsage
	}
	err = parsed.Run(&environment{ctx: ctx, out: out, talk: talk})
	if err != nil {
		fmt.Fprintf(talk, "heavyspot: %v\n", err)
	}
	return statusOf(err)
}

// sameWish is how close together signals count as one: shells and make send a
// signal to a process and once more to its group.
const sameWish = 500 * time.Millisecond

// withSignals returns a context that ends with the first SIGINT or SIGTERM, by
// which a command ends cleanly. Another one ends the program at once.
func withSignals() (ctx context.Context, stop func()) {
	ctx, cancel := context.WithCancel(context.Background())
	signals := make(chan os.Signal, 4)
	signal.Notify(signals, syscall.SIGINT, syscall.SIGTERM)
	done := make(chan struct{})
	go func() {
		defer close(done)
		var first time.Time
		for range signals {
			if !first.IsZero() && time.Since(first) > sameWish {
				os.Exit(statusFailed)
			}
			if first.IsZero() {
				first = time.Now()
				cancel()
			}
		}
	}()
	return ctx, func() {
		signal.Stop(signals)
		close(signals)
		<-done
		cancel()
	}
}

// statusOf is the exit status that an error means.
func statusOf(err error) int {
	var usage usageError
	var doubt doubtError
	switch {
	case err == nil:
		return statusDone
	case errors.As(err, &usage):
		return statusUsage
	case errors.As(err, &doubt):
		return statusDoubted
	}
	return statusFailed
}

// printHelp prints the examples and then the usual help.
func printHelp(options kong.HelpOptions, ctx *kong.Context) error {
	name := ""
	if node := ctx.Selected(); node != nil {
		name = node.Name
	}
	fmt.Fprintln(ctx.Stdout, "Examples:")
	for _, line := range examples[name] {
		fmt.Fprintln(ctx.Stdout, "  "+line)
	}
	fmt.Fprintln(ctx.Stdout)
	return kong.DefaultHelpPrinter(options, ctx)
}

// version is the version from the build information, with the revision when it
// was built from a checkout.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "heavyspot, version unknown"
	}
	text := "heavyspot " + info.Main.Version
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision":
			text += ", revision " + s.Value[:min(12, len(s.Value))]
		case s.Key == "vcs.modified" && s.Value == "true":
			text += " with changes"
		}
	}
	return text + ", " + info.GoVersion
}

// loadConfig reads a configuration; whatever is wrong with it is a usage error.
func loadConfig(path string) (*config.Config, error) {
	cfg, err := config.Load(path)
	if err == nil {
		return cfg, nil
	}
	var problems *config.Errors
	if errors.As(err, &problems) {
		return nil, usageError{fmt.Errorf("the configuration is not accepted:\n%w", err)}
	}
	return nil, usageError{err}
}
