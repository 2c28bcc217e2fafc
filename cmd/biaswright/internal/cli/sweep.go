package cli

import (
	"context"
	"fmt"
	"runtime"
	"slices"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
	"biaswright/sweep"
)

// defaultPoints cuts a range into a hundred steps.
const defaultPoints = 101

func (r *runner) sweepCommand() *cli.Command {
	return &cli.Command{
		Name:      "sweep",
		Usage:     "solve a file over ranges of its values",
		UsageText: "biaswright sweep [options] FILE",
		Flags: []cli.Flag{
			&cli.StringSliceFlag{Name: "over", Usage: "`AXIS`: VCC=5V..15V, VCC=5V,9V,12V, VCC+VREF=5V..15V, LAMP.row=1..6, ambient=-20degC..60degC, load.V=0V..9V; may be repeated, the first is outermost"},
			&cli.IntFlag{Name: "points", Usage: "`N` points for each range", Value: defaultPoints},
			&cli.StringSliceFlag{Name: "log", Usage: "`AXIS`: step this range by equal ratios; may be repeated"},
			&cli.StringSliceFlag{Name: "show", Usage: "`WHAT`: quantities or expressions, separated by commas; may be repeated"},
			setFlag(),
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: begin at the operating point nearest to these voltages, and follow it; may be repeated"},
			chartFlag("the rows as curves over the innermost axis"),
			&cli.IntFlag{Name: "workers", Usage: "`N` outer steps at a time; the rows are the same", Value: runtime.NumCPU()},
			&cli.BoolFlag{Name: "csv", Usage: "print comma-separated values", DisableDefaultText: true},
			jsonFlag(),
			plainFlag(),
		},
		Action: r.sweep,
	}
}

// A sweepRequest is what the options of sweep ask for.
type sweepRequest struct {
	request
	over, log, show []string
	points, workers int
	csv, json       bool
}

func (r *runner) sweep(c *cli.Context) error {
	r.plain = c.Bool("plain")
	base, err := r.request(c)
	if err != nil {
		return err
	}
	q := &sweepRequest{
		request: *base, over: c.StringSlice("over"), log: c.StringSlice("log"),
		points: c.Int("points"), workers: c.Int("workers"), csv: c.Bool("csv"), json: c.Bool("json"),
	}
	for _, list := range c.StringSlice("show") {
		q.show = append(q.show, items(list)...)
	}
	switch {
	case c.NArg() == 0:
		return &usageError{"sweep needs a file", `"-" is standard input`}
	case c.NArg() > 1:
		return usagef("sweep takes one file, and %d are named", c.NArg())
	case len(q.over) == 0:
		return &usageError{"sweep needs something to sweep over", "add --over VCC=5V..15V"}
	case q.csv && q.json:
		return usagef("--csv and --json are two answers; choose one")
	case q.workers < 1:
		return usagef("--workers %d: at least one must work", q.workers)
	}
	return r.sweepFile(c.Args().First(), q)
}

// items splits a list at its commas, but not within brackets: parallel(a, b) is
// one item.
func items(list string) []string {
	var out []string
	depth, start := 0, 0
	for i, c := range list {
		switch c {
		case '(':
			depth++
		case ')':
			depth--
		case ',':
			if depth == 0 {
				out = append(out, strings.TrimSpace(list[start:i]))
				start = i + 1
			}
		}
	}
	return append(out, strings.TrimSpace(list[start:]))
}

func (r *runner) sweepFile(name string, q *sweepRequest) error {
	a, plan, trouble := r.plan(name, q)
	if trouble != nil {
		if q.json {
			return r.writeAll([]any{trouble.json()})
		}
		r.tell(trouble)
		return nil
	}
	if !q.json {
		r.diagnose(a.Warnings)
	}
	if a.Failure != nil {
		r.raise(exitNoPoint)
		return r.finishSweep(a, q, nil)
	}
	rows := r.rowPrinter(a, q)
	progress := r.progress(plan.Points(), "points")
	var tally render.Tally
	drawn := r.sweepDrawing(q, a, plan)
	err := sweep.Run(context.Background(), *plan, func(row sweep.Row) error {
		tally.Add(row)
		drawn.add(row)
		progress.step()
		return rows.Row(row)
	})
	progress.erase()
	if e, ok := sweep.IsError(err); ok {
		return &usageError{e.Message, e.Hint}
	}
	if err != nil {
		return &writeError{err}
	}
	switch {
	case tally.Failed == tally.Rows:
		r.raise(exitNoPoint)
	case tally.Unmet > 0:
		r.raise(exitNotMet)
	}
	a.Tally = tally
	if err := r.finishSweep(a, q, rows); err != nil {
		return err
	}
	drawn.finish()
	return nil
}

// rowPrinter is what takes rows as they come.
func (r *runner) rowPrinter(a *render.SweepAnswer, q *sweepRequest) render.RowPrinter {
	switch {
	case q.csv:
		return render.NewCSV(r.out, a)
	case q.json:
		return render.NewSweepJSON(r.out, a)
	default:
		return render.NewSweepScreen(r.out, a, r.look())
	}
}

func (r *runner) finishSweep(a *render.SweepAnswer, q *sweepRequest, rows render.RowPrinter) error {
	if rows == nil {
		if rows = r.rowPrinter(a, q); q.csv { // there is no row to print
			r.complain("%s", a.Failure.Says)
			return nil
		}
	}
	if err := rows.End(); err != nil {
		return &writeError{err}
	}
	return nil
}

// plan reads the file and the axes.
func (r *runner) plan(name string, q *sweepRequest) (*render.SweepAnswer, *sweep.Plan, *trouble) {
	in, unread := r.open(name, &q.request, closed)
	if unread != nil {
		return nil, nil, unread
	}
	c := in.actual
	refuse := func(found diag.List) (*render.SweepAnswer, *sweep.Plan, *trouble) {
		return nil, nil, r.refuse(in.name, found)
	}
	a := &render.SweepAnswer{File: in.name, Circuit: c, Set: q.set, Warnings: in.warnings}
	p := &sweep.Plan{Workers: q.workers, Near: in.near}
	if res, err := solve.Solve(c, solve.Options{Near: in.near}); err == nil {
		p.Nominal = res.Point // what a hold is judged against
	} else if sweepsLoad(q.over) {
		a.Failure = failure(err)
		return a, p, nil
	}
	if sweepsLoad(q.over) {
		if len(c.Load) == 0 {
			return refuse(diag.List{{Code: "no-load", Span: diag.Span{File: in.name}, Message: "there is no load whose voltage could be swept", Hint: "add: load LAMP"}})
		}
		c = c.HoldLoad(p.Nominal.LoadV)
		a.Circuit = c
	}
	p.Circuit = c
	if wrong := r.axes(p, q); wrong != nil {
		return refuse(diag.List{*wrong})
	}
	a.Axes = p.Axes
	for _, text := range shownQuantities(c, q.show) {
		e, list := c.ParseExpr(text)
		if list.HasErrors() {
			return refuse(diag.List{{Code: list[0].Code, Message: fmt.Sprintf("--show %s: %s", text, list[0].Message), Hint: list[0].Hint}})
		}
		p.Show = append(p.Show, text)
		a.Show = append(a.Show, e)
	}
	return a, p, nil
}

func sweepsLoad(over []string) bool {
	return slices.ContainsFunc(over, func(s string) bool {
		name, _, _ := strings.Cut(s, "=")
		return strings.TrimSpace(name) == netlist.LoadName
	})
}

// axes reads the axes; every --log must name one of them.
func (r *runner) axes(p *sweep.Plan, q *sweepRequest) *diag.Diagnostic {
	logs := map[string]bool{}
	for _, name := range q.log {
		logs[strings.TrimSpace(name)] = false
	}
	var names []string
	for _, text := range q.over {
		name, _, _ := strings.Cut(text, "=")
		name = strings.TrimSpace(name)
		names = append(names, name)
		_, logarithmic := logs[name]
		if logarithmic {
			logs[name] = true
		}
		axis, err := sweep.ParseAxis(p.Circuit, text, q.points, logarithmic)
		if err != nil {
			e, _ := sweep.IsError(err)
			return &diag.Diagnostic{Code: "axis", Message: "--over " + text + ": " + e.Message, Hint: e.Hint}
		}
		for i := range p.Axes {
			if axis.Overlaps(p.Circuit, &p.Axes[i]) {
				return &diag.Diagnostic{Code: "axis", Message: "--over " + text + ": " + p.Axes[i].Name + " is swept over already"}
			}
		}
		p.Axes = append(p.Axes, axis)
	}
	for _, name := range q.log {
		if name = strings.TrimSpace(name); !logs[name] {
			return &diag.Diagnostic{Code: "axis", Message: "--log " + name + ": nothing is swept over that", Hint: diag.DidYouMean(name, names)}
		}
	}
	const most = 100_000_000 // rows; a day's work, and surely a slip
	if n := p.Points(); n > most {
		return &diag.Diagnostic{Code: "axis", Message: fmt.Sprintf("more than %d rows are too many", most)}
	}
	return nil
}

// shownQuantities is what --show asks for, otherwise what is held, the first
// target, the load's current, or every rail's.
func shownQuantities(c *netlist.Circuit, asked []string) []string {
	if len(asked) > 0 {
		return asked
	}
	if q, _, _ := solve.HoldOf(c); q != nil {
		return []string{q.Text}
	}
	if len(c.Load) > 0 {
		return []string{"load.I"}
	}
	var out []string
	for i := range c.Rails {
		out = append(out, c.Rails[i].Name+".I")
	}
	return out
}
