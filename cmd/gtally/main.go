// Command gtally is the terminal program: flags, wiring, exit code.
package main

import (
	"context"
	"fmt"
	"os"
	"os/signal"
	"syscall"
	"time"

	"groundtally/app/program"
	"groundtally/app/term"
)

func main() {
	os.Exit(realMain())
}

func realMain() int {
	program.UseCores()
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	context.AfterFunc(ctx, stop) // a second interrupt ends the program at once
	p, err := program.Load()
	if err != nil {
		fmt.Fprintf(os.Stderr, "gtally: %v\n", err)
		return term.ExitUnexpected
	}
	app := &term.App{
		Out: os.Stdout, Err: os.Stderr, Terminal: isTerminal(os.Stderr),
		Create: p.Create, OpenFile: p.Open, ReadFile: p.Read, Write: p.Write,
		Catalog: p.Catalog, Params: p.Params, Tools: p.Tools, Sample: p.Sample,
		Clock: time.Now, Who: p.Who, Version: program.Version, Engines: p.Engines,
	}
	return app.Run(ctx, os.Args[1:])
}

func isTerminal(f *os.File) bool {
	st, err := f.Stat()
	return err == nil && st.Mode()&os.ModeCharDevice != 0
}
