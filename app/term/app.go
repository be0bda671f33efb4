package term

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"runtime/debug"
	"slices"
	"sort"
	"strings"
	"time"

	"groundtally/app/run"
	"groundtally/app/study"
)

// App is the terminal program with what it is wired to.
type App struct {
	Out, Err io.Writer
	Terminal bool // Err is a terminal: progress may be shown
	Create   func(ctx context.Context, path string) (study.Store, error)
	OpenFile func(ctx context.Context, path string) (study.Store, error)
	ReadFile func(ctx context.Context, path string, o study.ReadOptions) (study.Import, error)
	Write    func(path string, data []byte) error // atomically
	Catalog  *study.Catalog
	Params   *run.Params
	Tools    func() (study.Tools, func())
	Sample   func(ctx context.Context, s *study.Study, tools study.Tools, report func(study.LayerRecord)) error
	Clock    func() time.Time
	Who      string
	Version  string
	Engines  []string // libraries and editions that take part in results
}

// verb is one verb of the terminal program.
type verb struct {
	name    string
	usage   string
	summary string
	more    string // what else the help of the verb says
	options []option
	places  [2]int // least and most words besides options
	run     func(c *call) (int, error)
}

// call is one run of a verb.
type call struct {
	*App
	ctx  context.Context
	verb verb
	args arguments
	json bool
	calm bool
	out  *watched
}

// watched remembers the first error of a writer, so that an answer that did not arrive is not called done.
type watched struct {
	w   io.Writer
	err error
}

func (w *watched) Write(p []byte) (int, error) {
	n, err := w.w.Write(p)
	if err != nil && w.err == nil {
		w.err = err
	}
	return n, err
}

var (
	common = []option{
		{name: "json", help: "answer as JSON"},
		{name: "quiet", help: "no progress and no notices"},
	}
	frozenOption = option{name: "frozen", value: "NAME", help: "answer for this frozen state, not for the present one"}
	coresOption  = option{name: "cores", value: "N", help: "how many processor cores to use; the digits do not depend on it"}
	reasonOption = option{name: "reason", value: "TEXT", help: "why, for the journal"}
)

func verbs() []verb {
	return []verb{verbNew, verbAdd, verbJoin, verbRemove, verbGroup, verbDraw, verbPlace, verbTurbine, verbSet, verbGet, verbUndo, verbRedo, verbJournal, verbFreeze,
		verbCheck, verbCompute, verbTable, verbWhy, verbMethods, verbRegister, verbLeft, verbTerrain, verbRequests, verbCoverage, verbOrder, verbAppendix, verbVerify, verbExport, verbConvert}
}

func findVerb(name string) (verb, bool) {
	for _, v := range verbs() {
		if v.name == name {
			return v, true
		}
	}
	return verb{}, false
}

// Run runs one verb and gives the exit code.
func (a *App) Run(ctx context.Context, words []string) int {
	if len(words) == 0 {
		a.overview(a.Err)
		return ExitUsage
	}
	v, ok := findVerb(words[0])
	c := &call{App: a, ctx: ctx, verb: v, json: slices.Contains(words, "--json"), calm: slices.Contains(words, "--quiet"), out: &watched{w: a.Out}}
	switch {
	case words[0] == "help" || words[0] == "--help" || words[0] == "-h":
		if len(words) == 1 {
			a.overview(c.out)
			return c.finish(ExitDone, nil)
		}
		if v, ok = findVerb(words[1]); ok {
			v.help(c.out)
			return c.finish(ExitDone, nil)
		}
		return c.finish(0, usagef("there is no verb %q; gtally help lists the verbs", words[1]))
	case words[0] == "--version" || words[0] == "version":
		fmt.Fprintln(c.out, "gtally, "+a.Version)
		for _, e := range a.Engines {
			fmt.Fprintln(c.out, e)
		}
		return c.finish(ExitDone, nil)
	case !ok:
		return c.finish(0, usagef("there is no verb %q; gtally help lists the verbs", words[0]))
	case slices.Contains(words[1:], "--help") || slices.Contains(words[1:], "-h"):
		v.help(c.out)
		return c.finish(ExitDone, nil)
	}
	var err error
	if c.args, err = parse(words[1:], append(slices.Clone(v.options), common...)); err != nil {
		return c.finish(0, err)
	}
	c.json, c.calm = c.args.has("json"), c.args.has("quiet")
	if len(c.args.places) < v.places[0] || len(c.args.places) > v.places[1] {
		return c.finish(0, usagef("usage: gtally %s", v.usage))
	}
	return c.finish(c.guarded())
}

// guarded runs the verb; a fault of the program comes back as an error.
func (c *call) guarded() (code int, err error) {
	defer func() {
		if p := recover(); p != nil {
			err = &faultError{what: fmt.Sprint(p), details: string(debug.Stack())}
		}
	}()
	return c.verb.run(c)
}

func (a *App) overview(w io.Writer) {
	fmt.Fprintln(w, "gtally compares the parcels of a district for community wind or solar.\n\nVerbs:")
	for _, v := range verbs() {
		fmt.Fprintf(w, "  %-10s %s\n", v.name, v.summary)
	}
	fmt.Fprint(w, `
Type gtally help VERB for the options of a verb, gtally --version for versions.

Exit codes: 0 done; 1 the answer is no (check found errors, verify found a difference, a file cannot
be added); 2 wrong usage, or a question that only you can answer (nothing is done); 3 done, but some
of the file was left out; 4 the study cannot be read, or was made by a newer version; 5 unexpected
(disk full, no right to write, a fault of the program); 130 interrupted.

A screening: it replaces no permit, no survey, no grid operator's study and no licensed engineer.
`)
}

func (v verb) help(w io.Writer) {
	fmt.Fprintf(w, "gtally %s\n  %s\n", v.usage, v.summary)
	if v.more != "" {
		fmt.Fprintf(w, "  %s\n", strings.ReplaceAll(v.more, "\n", "\n  "))
	}
	fmt.Fprintln(w, "options:")
	for _, o := range append(slices.Clone(v.options), common...) {
		name := "--" + o.name
		if o.value != "" {
			name += " " + o.value
		}
		if o.many {
			name += " ..."
		}
		fmt.Fprintf(w, "  %-28s %s\n", name, o.help)
	}
}

func (c *call) printJSON(v any) {
	enc := json.NewEncoder(c.out)
	enc.SetEscapeHTML(false)
	enc.SetIndent("", " ")
	if err := enc.Encode(v); err != nil && c.out.err == nil {
		c.out.err = err
	}
}

// answer prints v when JSON is asked for, else text.
func (c *call) answer(v any, format string, args ...any) {
	if c.json {
		c.printJSON(v)
		return
	}
	c.say(format, args...)
}

// done answers a verb whose answer is only that it was done.
func (c *call) done(text string) {
	c.answer(map[string]any{"study": c.args.places[0], "done": text}, "%s", text)
}

func (c *call) say(format string, args ...any) {
	if !c.json {
		fmt.Fprintf(c.out, format+"\n", args...)
	}
}

func (c *call) note(format string, args ...any) {
	if !c.calm {
		fmt.Fprintf(c.Err, format+"\n", args...)
	}
}

// open opens the study named by the first word.
func (c *call) open() (*study.Study, error) {
	store, err := c.OpenFile(c.ctx, c.args.places[0])
	if err != nil {
		return nil, err
	}
	s, err := study.Open(c.ctx, store, c.Catalog, study.Options{Who: c.Who, Clock: c.Clock})
	if err != nil {
		_ = store.Close() // the first error is the one to tell
		return nil, err
	}
	return s, nil
}

// with opens the study, calls f and closes the study.
func (c *call) with(f func(s *study.Study) (int, error)) (code int, err error) {
	s, err := c.open()
	if err != nil {
		return 0, err
	}
	defer func() {
		if cerr := s.Close(); err == nil && cerr != nil {
			err = cerr
		}
	}()
	return f(s)
}

func sortedKeys[V any](m map[string]V) []string {
	out := make([]string, 0, len(m))
	for k := range m {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}
