// Package cli is the command line: it reads options and files, has them solved,
// and gives the answers to package render. One file a command.
package cli

import (
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/diag"
)

// What the program exits with.
const (
	exitOK          = 0
	exitNotMet      = 1   // solved, but a requirement is not met
	exitUsage       = 2   // the command line or a file's text is wrong
	exitNoPoint     = 3   // no operating point
	exitFile        = 4   // a file could not be read or written
	exitInterrupted = 130 // 128 and SIGINT's number, as shells have it
)

// A runner is one run of the program: its streams and what it will exit with.
type runner struct {
	in       io.Reader
	out, err io.Writer
	code     int
	plain    bool // --plain: ASCII only
	// texts are those read in this run, by name, for messages to quote.
	texts map[string][]byte
	// partial is a file being written, removed when the run is interrupted.
	partial partialFile
}

// raise notes an exit code; the largest of a run counts.
func (r *runner) raise(code int) { r.code = max(r.code, code) }

// complain says something on standard error.
func (r *runner) complain(format string, args ...any) {
	fmt.Fprintf(r.err, "biaswright: "+format+"\n", args...)
}

// A usageError is a command line that says nothing sensible.
type usageError struct{ message, hint string }

func (e *usageError) Error() string { return e.message }

func usagef(format string, args ...any) error {
	return &usageError{message: fmt.Sprintf(format, args...)}
}

// A writeError is an answer that could not be printed.
type writeError struct{ err error }

func (e *writeError) Error() string { return "cannot write the answer: " + e.err.Error() }
func (e *writeError) Unwrap() error { return e.err }

// Main runs the program with its arguments, args[0] being its name, and returns
// the exit code.
func Main(args []string, in io.Reader, out, errs io.Writer) int {
	if os.Getenv("GOGC") == "" {
		// A command holds little and lives for milliseconds: some of them would go
		// into collecting what the system takes back at its end.
		const seldom = 400 // percent of growth before the next collection
		debug.SetGCPercent(seldom)
	}
	r := &runner{in: in, out: out, err: errs, texts: map[string][]byte{}}
	interrupted := make(chan os.Signal, 1)
	signal.Notify(interrupted, os.Interrupt)
	defer signal.Stop(interrupted)
	go func() {
		<-interrupted
		r.partial.remove()
		os.Exit(exitInterrupted)
	}()
	return r.run(args)
}

func (r *runner) run(args []string) int {
	app := r.app()
	args, err := arrange(args, valued(app, commandIn(app, args[1:])))
	if err == nil {
		err = app.Run(args)
	}
	if err != nil {
		r.fail(args, err)
	}
	return r.code
}

// fail reports an error that ended the run.
func (r *runner) fail(args []string, err error) {
	var usage *usageError
	var write *writeError
	switch {
	case errors.As(err, &write):
		r.raise(exitFile)
		r.complain("%v", err)
		return
	case !errors.As(err, &usage): // what the option parser says
		usage = &usageError{message: err.Error()}
	}
	r.raise(exitUsage)
	if wantsJSON(args) {
		_ = render.WriteJSON(r.out, render.Problem("", "usage", usage.message, usage.hint))
		return
	}
	r.complain("%s", usage.message)
	if usage.hint != "" {
		fmt.Fprintln(r.err, "  hint: "+usage.hint)
	}
}

// wantsJSON tells whether --json stands among the options.
func wantsJSON(args []string) bool {
	for _, a := range args {
		switch a {
		case "--":
			return false
		case "--json", "-json":
			return true
		}
	}
	return false
}

func (r *runner) app() *cli.App {
	app := &cli.App{
		Name:                      "biaswright",
		Usage:                     "find where every volt and milliamp of a bias network goes",
		UsageText:                 "biaswright COMMAND [options] [FILE...]",
		HideHelpCommand:           true,
		DisableSliceFlagSeparator: true, // a setting may hold a comma
		Reader:                    r.in,
		Writer:                    r.out,
		ErrWriter:                 r.err,
		ExitErrHandler:            func(*cli.Context, error) {}, // Main alone ends the program
		Commands: []*cli.Command{
			r.solveCommand(),
			r.sweepCommand(),
			r.limitsCommand(),
			r.compareCommand(),
			r.handcheckCommand(),
			r.chooseCommand(),
			r.tidyCommand(),
			r.partsCommand(),
			r.schemaCommand(),
			r.versionCommand(),
		},
	}
	app.Action = func(c *cli.Context) error {
		if c.NArg() == 0 {
			return &usageError{"no command given", "one of " + strings.Join(commandNames(app), ", ") + "; biaswright --help tells more"}
		}
		return unknownCommand(app, c.Args().First())
	}
	onUsage := func(c *cli.Context, err error, _ bool) error { return optionError(c, err) }
	app.OnUsageError = onUsage
	for _, c := range app.Commands {
		c.OnUsageError = onUsage
		c.HideHelpCommand = true
	}
	return app
}

func commandNames(app *cli.App) []string {
	var names []string
	for _, c := range app.Commands {
		names = append(names, c.Name)
	}
	return names
}

func unknownCommand(app *cli.App, name string) error {
	e := &usageError{message: fmt.Sprintf("there is no command %q", name)}
	if e.hint = diag.DidYouMean(name, commandNames(app)); e.hint == "" {
		e.hint = "the commands are " + strings.Join(commandNames(app), ", ")
	}
	return e
}

// optionError rewords what the standard library's flag parser says of an option.
func optionError(c *cli.Context, err error) error {
	const unknown = "flag provided but not defined: -"
	name, ok := strings.CutPrefix(err.Error(), unknown)
	if !ok {
		return &usageError{message: err.Error()}
	}
	name = strings.TrimLeft(name, "-")
	var known []string
	flags := c.App.Flags
	if c.Command != nil {
		flags = c.Command.Flags
	}
	for _, f := range flags {
		known = append(known, f.Names()...)
	}
	e := &usageError{message: "there is no option --" + name}
	if near := diag.Nearest(name, known); near != "" {
		e.hint = "did you mean --" + near + "?"
	}
	return e
}
