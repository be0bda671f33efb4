package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"
	"time"
)

// A verb is one thing this command does.
type verb struct {
	name string
	args string
	does string
	run  func(ctx context.Context, w workshop, args []string) error
}

// errUsage says that the call was wrong; the flag package or the verb has said how.
var errUsage = errors.New("wrong usage")

var verbs = []verb{
	{"start", "[-study FILE] [-terminal]", "installs what is missing, builds, opens the sample study", runStart},
	{"test", "[-limit 30m] [PACKAGES]", "installs what is missing, then formatting, build, vet, all tests", runTest},
	{"doctor", "", "lists what is found and what is missing; changes nothing", runDoctor},
	{"lint", "[PACKAGES]", "runs the linter at its pinned version", runLint},
	{"bench", "[-time 1s] [-match .] [PACKAGES]", "runs the benchmarks", runBench},
	{"race", "[PACKAGES]", "runs the tests under the race detector", runRace},
	{"fuzz", "[-time 20s] [-match TEXT]", "gives each fuzz target its time", runFuzz},
	{"kill", "[-rounds 5]", "kills the program while it writes, over and over (tests TestKill...)", runKill},
	{"soak", "[-time 10m]", "works for a long time on one study (tests TestSoak..., build tag soak)", runSoak},
	{"scale", "", "works on large districts (tests TestScale..., build tag scale)", runScale},
	{"overlay", "[-parcels 20000] [-cores N]", "times the overlay of the hard set beside a C program's", runOverlay},
	{"memory", "", "lists the numbers that still rest on memory", runMemory},
	{"sample", "", "makes the files of the sample study anew", runSample},
}

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	code := run(ctx, os.Args[1:], os.Stdout, os.Stderr)
	stop()
	os.Exit(code)
}

// run carries out one call and gives its exit code: 0 done, 1 not done, 2 wrong usage, 130
// stopped by the user.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	out, errOut := &sharedWriter{w: stdout}, &sharedWriter{w: stderr}
	if len(args) == 0 {
		usage(errOut)
		return 2
	}
	switch args[0] {
	case "help", "-h", "-help", "--help":
		usage(out)
		return 0
	}
	for _, v := range verbs {
		if v.name != args[0] {
			continue
		}
		err := call(ctx, v, args[1:], out, errOut)
		switch {
		case err == nil:
			return 0
		case errors.Is(err, flag.ErrHelp):
			return 0
		case errors.Is(err, errUsage):
			fmt.Fprintf(errOut, "usage: go run ./cmd/dev %s %s\n", v.name, v.args)
			return 2
		case ctx.Err() != nil:
			fmt.Fprintln(errOut, err)
			return 130
		}
		fmt.Fprintf(errOut, "%s: %v\n", v.name, err)
		return 1
	}
	fmt.Fprintf(errOut, "there is no command %q\n", args[0])
	usage(errOut)
	return 2
}

func call(ctx context.Context, v verb, args []string, out, errOut io.Writer) error {
	dir, err := os.Getwd()
	if err != nil {
		return fmt.Errorf("find the current folder: %w", err)
	}
	root, err := findRoot(dir)
	if err != nil {
		return err
	}
	return v.run(ctx, workshop{m: thisMachine{}, root: root, stdout: out, stderr: errOut, every: 5 * time.Second}, args)
}

func usage(out io.Writer) {
	fmt.Fprintln(out, "usage: go run ./cmd/dev COMMAND")
	for _, v := range verbs {
		fmt.Fprintf(out, "  %-7s %-33s %s\n", v.name, v.args, v.does)
	}
	fmt.Fprintln(out, "system packages are installed by:")
	for _, g := range managers {
		fmt.Fprintf(out, "  %s\n", g)
	}
}

// parse reads the flags of a verb; the rest are packages, all of them when none is named.
func parse(w workshop, name string, args []string, set func(*flag.FlagSet)) ([]string, error) {
	fs := flag.NewFlagSet(name, flag.ContinueOnError)
	fs.SetOutput(w.stderr)
	set(fs)
	if err := fs.Parse(args); err != nil {
		if errors.Is(err, flag.ErrHelp) {
			return nil, err
		}
		return nil, errUsage
	}
	if fs.NArg() == 0 {
		return []string{"./..."}, nil
	}
	return fs.Args(), nil
}

// parseAlone reads the flags of a verb that takes nothing else.
func parseAlone(w workshop, name string, args []string, set func(*flag.FlagSet)) error {
	rest, err := parse(w, name, args, set)
	if err != nil {
		return err
	}
	if len(rest) != 1 || rest[0] != "./..." {
		fmt.Fprintf(w.stderr, "%s takes no argument %q\n", name, rest[0])
		return errUsage
	}
	return nil
}

func noFlags(*flag.FlagSet) {}

func (w workshop) setup() setup { return setup{m: w.m, out: w.stderr, every: w.every} }

func runStart(ctx context.Context, w workshop, args []string) error {
	var study string
	var terminal bool
	err := parseAlone(w, "start", args, func(fs *flag.FlagSet) {
		fs.StringVar(&study, "study", "", "the study `file`; made when it is not there (default: "+sampleStudy()+")")
		fs.BoolVar(&terminal, "terminal", false, "use the terminal program even where there is a screen")
	})
	if err != nil {
		return err
	}
	if err := w.setup().ready(ctx, false); err != nil {
		return err
	}
	return w.start(ctx, study, terminal)
}

func runTest(ctx context.Context, w workshop, args []string) error {
	var limit time.Duration
	packages, err := parse(w, "test", args, func(fs *flag.FlagSet) {
		fs.DurationVar(&limit, "limit", 30*time.Minute, "how long the tests may take in all, once everything is compiled")
	})
	if err != nil {
		return err
	}
	if err := w.setup().ready(ctx, true); err != nil {
		return err
	}
	return w.test(ctx, packages, limit)
}

func runDoctor(ctx context.Context, w workshop, args []string) error {
	if err := parseAlone(w, "doctor", args, noFlags); err != nil {
		return err
	}
	if n := doctor(ctx, w.m, w.stdout); n > 0 {
		return &failure{what: fmt.Sprintf("missing: %d", n), advice: "let it be installed: go run ./cmd/dev start, or for the tests: go run ./cmd/dev test"}
	}
	return nil
}

func runLint(ctx context.Context, w workshop, args []string) error {
	packages, err := parse(w, "lint", args, noFlags)
	if err != nil {
		return err
	}
	return w.lint(ctx, packages)
}

func runBench(ctx context.Context, w workshop, args []string) error {
	var each time.Duration
	var match string
	packages, err := parse(w, "bench", args, func(fs *flag.FlagSet) {
		fs.DurationVar(&each, "time", time.Second, "how long each benchmark runs")
		fs.StringVar(&match, "match", ".", "run the benchmarks whose name matches this `pattern`")
	})
	if err != nil {
		return err
	}
	return w.bench(ctx, packages, each, match)
}

func runRace(ctx context.Context, w workshop, args []string) error {
	packages, err := parse(w, "race", args, noFlags)
	if err != nil {
		return err
	}
	return w.race(ctx, packages)
}

func runFuzz(ctx context.Context, w workshop, args []string) error {
	var each time.Duration
	var match string
	err := parseAlone(w, "fuzz", args, func(fs *flag.FlagSet) {
		fs.DurationVar(&each, "time", 20*time.Second, "how long each target runs")
		fs.StringVar(&match, "match", "", "run only targets with this `text` in package or name")
	})
	if err != nil {
		return err
	}
	return w.fuzz(ctx, match, each)
}

func runKill(ctx context.Context, w workshop, args []string) error {
	var rounds int
	err := parseAlone(w, "kill", args, func(fs *flag.FlagSet) {
		fs.IntVar(&rounds, "rounds", 5, "how often each test is run")
	})
	if err != nil {
		return err
	}
	return w.special(ctx, special{prefix: "TestKill", args: []string{"-count", fmt.Sprint(rounds)}})
}

func runSoak(ctx context.Context, w workshop, args []string) error {
	var long time.Duration
	err := parseAlone(w, "soak", args, func(fs *flag.FlagSet) {
		fs.DurationVar(&long, "time", 10*time.Minute, "how long each test works; given to it as GROUNDTALLY_SOAK_TIME")
	})
	if err != nil {
		return err
	}
	return w.special(ctx, special{prefix: "TestSoak", tag: "soak", env: []string{"GROUNDTALLY_SOAK_TIME=" + long.String()}, args: []string{"-count", "1"}})
}

func runScale(ctx context.Context, w workshop, args []string) error {
	if err := parseAlone(w, "scale", args, noFlags); err != nil {
		return err
	}
	return w.special(ctx, special{prefix: "TestScale", tag: "scale", args: []string{"-count", "1"}})
}

func runMemory(_ context.Context, w workshop, args []string) error {
	if err := parseAlone(w, "memory", args, noFlags); err != nil {
		return err
	}
	_, err := memory(os.DirFS(w.root), w.stdout)
	return err
}

func runSample(ctx context.Context, w workshop, args []string) error {
	if err := parseAlone(w, "sample", args, noFlags); err != nil {
		return err
	}
	return w.regenerate(ctx)
}
