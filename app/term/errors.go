package term

import (
	"context"
	"errors"
	"fmt"
	"os"
	"regexp"
	"strings"

	"groundtally/app/present"
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

// usageError is wrong usage: exit code 2.
type usageError struct{ text string }

func (e *usageError) Error() string { return e.text }

func usagef(format string, args ...any) error { return &usageError{fmt.Sprintf(format, args...)} }

// questionsError says that a study waits for answers before it can be computed.
type questionsError struct{ questions []study.Question }

func (e *questionsError) Error() string {
	var b strings.Builder
	b.WriteString("nothing was computed; please answer:")
	for _, q := range e.questions {
		fmt.Fprintf(&b, "\n  %s\n    %s", q.Text, strings.ReplaceAll(q.Option, "\n", "\n    "))
	}
	return b.String()
}

// inputError says that the steps cannot use the data or settings of the study as they are.
type inputError struct{ err error }

func (e *inputError) Error() string { return e.err.Error() }
func (e *inputError) Unwrap() error { return e.err }

// faultError is a fault of the program itself.
type faultError struct{ what, details string }

func (e *faultError) Error() string { return "fault of the program: " + e.what }

// exitCode tells which exit code belongs to an error.
func (c *call) exitCode(err error) int {
	var usage *usageError
	var question *study.QuestionError
	var questions *questionsError
	var anchor *run.AnchorError
	var input *inputError
	var file *study.FileError
	var key *study.UnknownKeyError
	var value *study.ValueError
	var fault *faultError
	switch {
	case errors.Is(err, context.Canceled) || c.ctx.Err() != nil:
		return ExitInterrupted
	case errors.As(err, &fault):
		return ExitUnexpected
	case errors.As(err, &usage), errors.As(err, &question), errors.As(err, &questions), errors.As(err, &anchor), errors.As(err, &key), errors.As(err, &value):
		return ExitUsage
	case errors.Is(err, study.ErrNewerStudy), errors.Is(err, study.ErrNotAStudy), errors.Is(err, study.ErrDamaged):
		return ExitUnreadable
	case errors.Is(err, study.ErrReadOnly), errors.Is(err, study.ErrDiskFull), errors.Is(err, study.ErrBusy):
		return ExitUnexpected
	case errors.As(err, &file) && !errors.Is(err, study.ErrNotThere):
		return ExitNo
	case errors.Is(err, os.ErrNotExist) && file == nil && c.verb.name != "new":
		return ExitUnreadable
	case errors.Is(err, study.ErrNotThere), errors.Is(err, study.ErrNameInUse), errors.Is(err, study.ErrRaster), errors.As(err, &input):
		return ExitUsage
	case errors.Is(err, study.ErrNothingToDo):
		return ExitNo
	}
	return ExitUnexpected
}

// undone says of a verb that reads a file that it did nothing.
var undone = map[string]string{"add": "nothing was added", "join": "nothing was joined", "convert": "nothing was written", "turbine": "nothing was added"}

// explain writes an error for people: what is wrong, and the cure.
func (c *call) explain(err error, code int) string {
	text := c.explained(err, code)
	// The database driver writes its number behind its words.
	var driver interface {
		error
		Code() int
	}
	if errors.As(err, &driver) {
		text = strings.ReplaceAll(text, driver.Error(), driverCode.ReplaceAllString(driver.Error(), ""))
	}
	return text
}

var driverCode = regexp.MustCompile(`( \(\d+\)| \(SQLITE_\w+\))+$`)

func (c *call) explained(err error, code int) string {
	path := ""
	if len(c.args.places) > 0 {
		path = c.args.places[0]
	}
	var file *study.FileError
	var fault *faultError
	var question *study.QuestionError
	switch {
	case code == ExitInterrupted && c.verb.name == "new":
		return "stopped; nothing was made"
	case code == ExitInterrupted:
		return "stopped; the study is as it was"
	case errors.As(err, &fault):
		return c.explainFault(fault)
	case errors.As(err, &question) && undone[c.verb.name] != "":
		return strings.Replace(question.Error(), "please answer first:", undone[c.verb.name]+"; please answer:", 1)
	case errors.As(err, &file):
		if errors.Is(err, study.ErrNameInUse) {
			file.Cure = "choose another name, or say --replace to put it in the place of what is there"
		}
		text := file.File
		if file.Where != "" {
			text += ", " + file.Where
		}
		text += ": " + strings.TrimSuffix(file.What, ".") + "."
		if file.Cure != "" {
			text += " " + present.Upper(strings.TrimSuffix(file.Cure, ".")) + "."
		}
		if words := undone[c.verb.name]; words != "" {
			text += " " + present.Upper(words) + "."
		}
		return text
	case errors.Is(err, study.ErrNameInUse) && c.verb.name == "new":
		return fmt.Sprintf("%s is there already and was left as it is. Choose another name.", path)
	case errors.Is(err, study.ErrNameInUse) && c.verb.name == "freeze":
		return fmt.Sprintf("there is a frozen state %q already; frozen states cannot be changed. Choose another name.", c.args.places[1])
	case errors.Is(err, study.ErrNotThere) && c.verb.name == "new":
		return fmt.Sprintf("the folder for %s is not there. Make it first, or choose another.", path)
	case code == ExitUnreadable && errors.Is(err, os.ErrNotExist):
		return fmt.Sprintf("there is no study %s. Check the name, or make it with: gtally new %s", path, shellWord(path))
	case errors.Is(err, study.ErrNewerStudy):
		return err.Error() + ". Use the newer version of the program; nothing was changed."
	case errors.Is(err, study.ErrNotAStudy):
		return err.Error() + ". Nothing was changed."
	case errors.Is(err, study.ErrDamaged):
		return err.Error() + ". Go back to a copy of the study; nothing was changed."
	case errors.Is(err, study.ErrDiskFull):
		return err.Error() + ". Free some space, or use another disk; what was saved before is unharmed."
	case errors.Is(err, study.ErrReadOnly):
		return err.Error() + ". Change its permissions, or choose a folder that you may write to; nothing was changed."
	case errors.Is(err, study.ErrBusy):
		return err.Error() + ". Try again when the other program is done; nothing was changed."
	case errors.Is(err, study.ErrNothingToDo):
		return "nothing to " + c.verb.name + "."
	case errors.Is(err, run.ErrNoParcels), errors.Is(err, run.ErrNoPlants):
		return c.named(err.Error())
	}
	return c.named(err.Error())
}

// explainFault keeps the details of a fault in a file of its own and says where.
func (c *call) explainFault(f *faultError) string {
	text := fmt.Sprintf("%v. This is a mistake in the program, not in your data. The study is as it was after the last change that was reported as done (gtally journal lists them).", f)
	file, err := os.CreateTemp("", "gtally-fault-*.txt")
	if err == nil {
		_, err = fmt.Fprintf(file, "%s\n%s %v\n%v\n%s\n", c.Version, c.verb.name, c.args.places, f, f.details)
		err = errors.Join(err, file.Close())
	}
	if err != nil {
		return text + " The details could not be kept: " + err.Error()
	}
	return text + " The details are in " + file.Name()
}

// named puts the study's name in place of the one in examples.
func (c *call) named(text string) string {
	if len(c.args.places) == 0 || strings.HasPrefix(text, "usage:") {
		return text
	}
	return strings.ReplaceAll(text, "STUDY.gpkg", shellWord(c.args.places[0]))
}

// finish writes an error and gives the exit code that belongs to it.
func (c *call) finish(code int, err error) int {
	if err == nil && c.out.err != nil {
		err = fmt.Errorf("the answer could not be written: %w", c.out.err)
	}
	if err == nil {
		return code
	}
	code = c.exitCode(err)
	text := c.explain(err, code)
	if c.json {
		out := map[string]any{"error": text, "exit": code}
		var question *study.QuestionError
		var questions *questionsError
		var anchor *run.AnchorError
		switch {
		case errors.As(err, &question):
			out["questions"] = question.Questions
		case errors.As(err, &questions):
			out["questions"] = questions.questions
		case errors.As(err, &anchor):
			out["questions"] = []study.Question{{Text: fmt.Sprintf("what are the ends of the value scale of %s?", anchor.Key),
				Option: fmt.Sprintf("gtally set %s anchor.%s.worst NUMBER", c.args.places[0], anchor.Key)}}
		}
		c.printJSON(out)
	}
	name := "gtally"
	if c.verb.name != "" {
		name += " " + c.verb.name
	}
	fmt.Fprintf(c.Err, "%s: %s\n", name, text)
	return code
}

// shellWord quotes a word where a shell would part it.
func shellWord(s string) string {
	if s != "" && !strings.ContainsAny(s, " \t\n'\"\\$`*?[]{}()<>|&;!#~") {
		return s
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}
