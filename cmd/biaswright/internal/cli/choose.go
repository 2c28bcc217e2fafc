package cli

import (
	"errors"
	"fmt"
	"os"
	"runtime"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/diag"
	"biaswright/sweep/choose"
)

// defaultList is how many choices are listed: enough to see what a step up or down
// costs.
const defaultList = 5

// chooseObjective says what is best, for --help.
const chooseObjective = "Finds the resistances written ? E24: first the exact values that meet the targets, then the\n" +
	"best of all combinations of preferred values (IEC 60063) from a tenth of the exact ones to ten\n" +
	"times them. Best is, in this order, over the stated ranges and tolerances: no rating exceeded;\n" +
	"targets, keeps and hold met, or else at the nominal point at least; the largest miss of a\n" +
	"target or keep smallest, then that of the hold; the largest deviation of a target smallest,\n" +
	"in units of its band. Where currents must not grow without need, say so in the file:\n" +
	"keep VCC.I < 30 mA."

func (r *runner) chooseCommand() *cli.Command {
	return &cli.Command{
		Name:        "choose",
		Usage:       "find preferred values for the resistances that a file leaves open",
		UsageText:   "biaswright choose [options] FILE",
		Description: chooseObjective,
		Flags: []cli.Flag{
			&cli.StringSliceFlag{Name: "reopen", Usage: "`NAME=SERIES`: choose a stated resistance anew, such as RE=E24; may be repeated"},
			&cli.BoolFlag{Name: "pair", Usage: "try two resistors in series or parallel where one will not do", DisableDefaultText: true},
			&cli.StringFlag{Name: "write", Usage: "`FILE2`: put the best choice into a copy of the file"},
			&cli.BoolFlag{Name: "replace", Usage: "let --write go over a file that exists", DisableDefaultText: true},
			&cli.IntFlag{Name: "list", Usage: "the best `N` choices", Value: defaultList},
			setFlag(),
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: take the nominal point nearest to these voltages; may be repeated"},
			&cli.IntFlag{Name: "workers", Usage: "`N` parts of the search at a time; the answer is the same", Value: runtime.NumCPU()},
			chartFlag("how the choices compare"),
			jsonFlag(),
			plainFlag(),
		},
		Action: r.choose,
	}
}

// A chooseRequest is what the options of choose ask for.
type chooseRequest struct {
	request
	reopen        []choose.Reopening
	pair, json    bool
	list, workers int
	write         string // a file for the copy, or ""
}

func (r *runner) choose(c *cli.Context) error {
	r.plain = c.Bool("plain")
	base, err := r.request(c)
	if err != nil {
		return err
	}
	q := &chooseRequest{request: *base, list: c.Int("list"), workers: c.Int("workers"), pair: c.Bool("pair"), json: c.Bool("json"), write: c.String("write")}
	for _, text := range c.StringSlice("reopen") {
		s, err := setting("reopen", text, "NAME=SERIES, such as RE=E24")
		if err != nil {
			return err
		}
		q.reopen = append(q.reopen, choose.Reopening{Name: s.Name, Series: s.Value})
	}
	switch {
	case c.NArg() == 0:
		return &usageError{"choose needs a file", `"-" is standard input`}
	case c.NArg() > 1:
		return usagef("choose takes one file, and %d are named", c.NArg())
	case q.list < 1:
		return usagef("--list %d: at least one choice is to be listed", q.list)
	case q.workers < 1:
		return usagef("--workers %d: at least one must work", q.workers)
	case c.IsSet("write") && (q.write == "" || q.write == standardInput):
		return &usageError{"--write needs the name of a file", "the answer itself is on standard output"}
	case q.write == "" && c.Bool("replace"):
		return &usageError{"--replace is for --write", "add --write FILE2"}
	}
	if _, err := os.Lstat(q.write); q.write != "" && err == nil && !c.Bool("replace") {
		return &usageError{fmt.Sprintf("--write %s: the file exists", q.write), "name another, or add --replace"}
	}
	return r.chooseFile(c.Args().First(), q)
}

func (r *runner) chooseFile(name string, q *chooseRequest) error {
	a, trouble := r.chosen(name, q)
	switch {
	case trouble != nil && q.json:
		return r.writeAll([]any{trouble.json()})
	case trouble != nil:
		r.tell(trouble)
		return nil
	case q.json:
		return r.writeAll([]any{render.ChooseJSON(a)})
	}
	r.diagnose(a.Warnings)
	if err := render.ChooseScreen(r.out, a, r.look()); err != nil {
		return &writeError{err}
	}
	return nil
}

// chosen answers for a file and notes the exit code it earns.
func (r *runner) chosen(name string, q *chooseRequest) (*render.ChooseAnswer, *trouble) {
	in, unread := r.open(name, &q.request, open)
	if unread != nil {
		return nil, unread
	}
	c := in.actual
	refuse := func(found diag.List) (*render.ChooseAnswer, *trouble) { return nil, r.refuse(in.name, found) }
	a := &render.ChooseAnswer{File: in.name, Circuit: c, Set: q.set, Warnings: in.warnings}
	progress := r.progress(0, "combinations")
	var err error
	a.Found, err = choose.Find(c, choose.Options{
		Reopen: q.reopen, List: q.list, Near: in.near, Workers: q.workers, Pair: q.pair,
		Progress: func(done, all int) {
			progress.rows = all
			progress.to(done)
		},
	})
	progress.erase()
	var mend *choose.Error
	switch {
	case errors.As(err, &mend):
		return refuse(diag.List{{Code: mend.Code, Span: mend.Span, Message: mend.Message, Hint: mend.Hint}})
	case err != nil:
		r.raise(exitNoPoint)
		a.Failure = failure(err)
		return a, nil
	}
	if !a.Found.Reached || !a.Found.Choices[0].Met() {
		r.raise(exitNotMet)
	}
	r.illustrateChoices(q, a)
	if q.write == "" || !a.Found.Reached {
		return a, nil
	}
	if err := r.writeChoice(a, r.texts[in.name], q); err != nil {
		return nil, &trouble{file: in.name, found: *err}
	}
	return a, nil
}

// writeChoice puts the best choice into a copy of the text. The copy is read and solved
// before it is written: it must be the circuit that was chosen.
func (r *runner) writeChoice(a *render.ChooseAnswer, text []byte, q *chooseRequest) *diag.List {
	refuse := func(format string, args ...any) *diag.List {
		r.raise(exitUsage)
		return &diag.List{{Code: "copy", Message: "--write " + q.write + ": " + fmt.Sprintf(format, args...)}}
	}
	best := &a.Found.Choices[0]
	copied, err := a.Found.Write(text, best)
	if err != nil {
		return refuse("%v", err)
	}
	c, _, wrong := r.circuit(q.write, copied, &q.request)
	if wrong.HasErrors() {
		return refuse("the copy would not stand: %s", wrong[0].Message)
	}
	if err := a.Found.Verify(best, c); err != nil {
		return refuse("the copy would be another circuit: %v", err)
	}
	if err := r.create(q.write, copied, true); err != nil {
		r.raise(exitFile)
		r.complain("cannot write %s: %v", q.write, err)
		return nil
	}
	a.Written = q.write
	return nil
}
