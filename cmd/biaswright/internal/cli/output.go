package cli

import (
	"fmt"
	"io"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/diag"
)

// A form is how a command's answer is shown.
type form[A any] struct {
	json     func(A) any
	screen   func(io.Writer, A, render.Look) error
	warnings func(A) diag.List // told on standard error beside a screen
}

// perFile answers for each file named, in its order: JSON, one object or an array of them,
// or a screen each. A chart is of one file.
func perFile[A any](r *runner, c *cli.Context, drawn chartFile, answer func(name string) (A, *trouble), f form[A]) error {
	switch {
	case c.NArg() == 0:
		return &usageError{c.Command.Name + " needs a file", `"-" is standard input`}
	case c.NArg() > 1 && drawn.wanted():
		return usagef("--chart draws one file, and %d are named", c.NArg())
	}
	var all []any
	for i, name := range c.Args().Slice() {
		a, trouble := answer(name)
		switch {
		case c.Bool("json") && trouble != nil:
			all = append(all, trouble.json())
		case c.Bool("json"):
			all = append(all, f.json(a))
		case trouble != nil:
			r.tell(trouble)
		default:
			r.diagnose(f.warnings(a))
			if i > 0 {
				fmt.Fprintln(r.out)
			}
			if err := f.screen(r.out, a, r.look()); err != nil {
				return &writeError{err}
			}
		}
	}
	return r.writeAll(all)
}

// writeAll prints one JSON object, or several as an array, or nothing.
func (r *runner) writeAll(all []any) error {
	var v any = all
	switch len(all) {
	case 0:
		return nil
	case 1:
		v = all[0]
	}
	if err := render.WriteJSON(r.out, v); err != nil {
		return &writeError{err}
	}
	return nil
}
