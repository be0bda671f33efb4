package term

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"sort"
	"strings"
	"time"

	"groundtally/app/run"
	"groundtally/app/study"
)

// Exit codes of the terminal program.
const (
	ExitDone        = 0
	ExitNo          = 1 // the answer is no
	ExitUsage       = 2 // wrong usage, or a question that only the user can answer
	ExitLeftOut     = 3 // done, but some input was left out
	ExitUnreadable  = 4 // study unreadable or newer than the program
	ExitUnexpected  = 5
	ExitInterrupted = 130
)

// App is the terminal program with what it is wired to.
type App struct {
	Out, Err io.Writer
	Terminal bool // Err is a terminal: progress may be shown
	Create   func(ctx context.Context, path string) (study.Store, error)
	OpenFile func(ctx context.Context, path string) (study.Store, error)
	ReadFile func(ctx context.Context, path string) (study.Import, error)
	Write    func(path string, data []byte) error // atomically
	Catalog  *study.Catalog
	Params   *run.Params
	Tools    func() (study.Tools, func(), error)
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
}

var common = []option{
	{name: "json", help: "answer as JSON"},
	{name: "quiet", help: "no progress and no notices"},
}

func verbs() []verb {
	return []verb{verbNew, verbAdd, verbRemove, verbGroup, verbSet, verbGet, verbUndo, verbRedo, verbJournal, verbFreeze,
		verbCheck, verbCompute, verbTable, verbWhy, verbOrder, verbAppendix, verbVerify}
}

// Run runs one verb and gives the exit code.
func (a *App) Run(ctx context.Context, words []string) int {
	if len(words) == 0 || words[0] == "help" || words[0] == "--help" || words[0] == "-h" {
		a.help(words)
		return ExitDone
	}
	if words[0] == "--version" {
		fmt.Fprintln(a.Out, "gtally "+a.Version)
		for _, e := range a.Engines {
			fmt.Fprintln(a.Out, e)
		}
		return ExitDone
	}
	for _, v := range verbs() {
		if v.name != words[0] {
			continue
		}
		if len(words) > 1 && (words[1] == "--help" || words[1] == "-h") {
			a.help([]string{"help", v.name})
			return ExitDone
		}
		args, err := parse(words[1:], append(v.options, common...))
		c := &call{App: a, ctx: ctx, verb: v, args: args, json: args.has("json"), calm: args.has("quiet")}
		if err == nil && (len(args.places) < v.places[0] || len(args.places) > v.places[1]) {
			err = usagef("usage: gtally %s", v.usage)
		}
		code := ExitDone
		if err == nil {
			code, err = v.run(c)
		}
		return c.finish(code, err)
	}
	fmt.Fprintf(a.Err, "gtally: there is no verb %q. Type gtally help.\n", words[0])
	return ExitUsage
}

// finish writes an error and gives the exit code that belongs to it.
func (c *call) finish(code int, err error) int {
	if err == nil {
		return code
	}
	var usage *usageError
	var question *study.QuestionError
	var file *study.FileError
	var key *study.UnknownKeyError
	var value *study.ValueError
	switch {
	case errors.Is(err, context.Canceled):
		code = ExitInterrupted
	case errors.As(err, &usage), errors.As(err, &question), errors.As(err, &key), errors.As(err, &value):
		code = ExitUsage
	case errors.Is(err, study.ErrNewerStudy), errors.Is(err, study.ErrNotAStudy), errors.Is(err, study.ErrDamaged):
		code = ExitUnreadable
	case errors.Is(err, os.ErrNotExist) && c.verb.name != "add":
		code = ExitUnreadable
	case errors.As(err, &file), errors.Is(err, study.ErrNotThere), errors.Is(err, study.ErrNameInUse), errors.Is(err, study.ErrNothingToDo):
		code = ExitNo
	default:
		code = ExitUnexpected
	}
	if c.json {
		out := map[string]any{"error": err.Error(), "exit": code}
		if question != nil {
			out["questions"] = question.Questions
		}
		c.printJSON(out)
	}
	fmt.Fprintf(c.Err, "gtally %s: %v\n", c.verb.name, err)
	return code
}

func (a *App) help(words []string) {
	if len(words) > 1 {
		for _, v := range verbs() {
			if v.name != words[1] {
				continue
			}
			fmt.Fprintf(a.Out, "gtally %s\n  %s\n", v.usage, v.summary)
			for _, o := range append(v.options, common...) {
				name := "--" + o.name
				if o.value != "" {
					name += " " + o.value
				}
				fmt.Fprintf(a.Out, "  %-28s %s\n", name, o.help)
			}
			return
		}
	}
	fmt.Fprintln(a.Out, "gtally compares the parcels of a district for community wind or solar.\n\nVerbs:")
	for _, v := range verbs() {
		fmt.Fprintf(a.Out, "  %-10s %s\n", v.name, v.summary)
	}
	fmt.Fprintln(a.Out, "\nType gtally help VERB for the options of a verb. A screening: it replaces no permit, no survey,\nno grid operator's study and no licensed engineer.")
}

func (c *call) printJSON(v any) {
	enc := json.NewEncoder(c.Out)
	enc.SetEscapeHTML(false)
	enc.SetIndent("", " ")
	if err := enc.Encode(v); err != nil {
		fmt.Fprintf(c.Err, "gtally: the answer cannot be written as JSON: %v\n", err)
	}
}

func (c *call) say(format string, args ...any) {
	if !c.json {
		fmt.Fprintf(c.Out, format+"\n", args...)
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
		store.Close()
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

// columns writes rows with their cells under each other.
func columns(w io.Writer, rows [][]string) {
	var width []int
	for _, r := range rows {
		for i, cell := range r {
			if i == len(width) {
				width = append(width, 0)
			}
			width[i] = max(width[i], len([]rune(cell)))
		}
	}
	for _, r := range rows {
		var b strings.Builder
		for i, cell := range r {
			b.WriteString(cell)
			if i+1 < len(r) {
				b.WriteString(strings.Repeat(" ", width[i]-len([]rune(cell))+2))
			}
		}
		fmt.Fprintln(w, strings.TrimRight(b.String(), " "))
	}
}
