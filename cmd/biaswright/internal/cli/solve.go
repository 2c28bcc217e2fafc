package cli

import (
	"errors"
	"fmt"
	"runtime"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

func (r *runner) solveCommand() *cli.Command {
	return &cli.Command{
		Name:      "solve",
		Usage:     "find the operating point of each file",
		UsageText: "biaswright solve [options] FILE...",
		Flags: []cli.Flag{
			setFlag(),
			&cli.StringSliceFlag{Name: "at", Usage: "`NAME=low|high,...`: take the stated ends of rails and of ambient, and judge hold against nominal"},
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: start there, and take the nearest of several operating points; may be repeated"},
			chartFlag("where the volts go, path by path,"),
			&cli.BoolFlag{Name: "every", Usage: "find every operating point, and prove that there are no others", DisableDefaultText: true},
			&cli.DurationFlag{Name: "budget", Usage: "`TIME` after which the search for every point ends, such as 30s", Value: searchBudget},
			&cli.BoolFlag{Name: "quick", Usage: "with --every: follow branches instead of searching everywhere; proves nothing", DisableDefaultText: true},
			&cli.BoolFlag{Name: "enclose", Usage: "print intervals that surely contain the exact solution", DisableDefaultText: true},
			&cli.IntFlag{Name: "workers", Usage: "with --every: `N` boxes at a time; the answer is the same", Value: runtime.NumCPU()},
			sketchFlag(),
			&cli.BoolFlag{Name: "trace", Usage: "tell the solver's steps on standard error", DisableDefaultText: true},
			jsonFlag(),
			plainFlag(),
		},
		Action: r.solve,
	}
}

func (r *runner) solve(c *cli.Context) error {
	r.plain = c.Bool("plain")
	q, err := r.request(c)
	if err != nil {
		return err
	}
	if q.search, err = searchOptions(c); err != nil {
		return err
	}
	return perFile(r, c, q.chart, func(name string) (*render.Answer, *trouble) { return r.answer(name, q) }, form[*render.Answer]{
		json: render.JSON, screen: render.Screen, warnings: func(a *render.Answer) diag.List { return a.Warnings },
	})
}

// answer solves one file and notes the exit code it earns.
func (r *runner) answer(name string, q *request) (*render.Answer, *trouble) {
	in, trouble := r.open(name, q, closed)
	if trouble != nil {
		return nil, trouble
	}
	a := &render.Answer{File: in.name, Circuit: in.actual, Set: q.set, At: q.at, Inner: q.trace != nil, Warnings: in.warnings}
	r.fill(a, in.nominal, solve.Options{Near: in.near, Trace: q.trace}, q.search)
	if a.Failure != nil {
		return a, nil
	}
	r.illustrate(q, a)
	return a, nil
}

// fill solves and judges.
func (r *runner) fill(a *render.Answer, nominal *netlist.Circuit, o solve.Options, search searchRequest) {
	if f := points(a, nominal, o, search); f != nil {
		r.raise(exitNoPoint)
		a.Result, a.Failure = nil, f
		return
	}
	p := a.Result.Point
	a.Verdicts = solve.Judge(p, a.Nominal)
	a.Cautions = solve.Cautions(p)
	for _, v := range a.Verdicts {
		if !v.Met {
			r.raise(exitNotMet)
		}
	}
	for _, c := range a.Cautions {
		if c.Kind == "rating" || c.Kind == "impossible" {
			r.raise(exitNotMet)
		}
	}
}

// points finds the point asked for and, where ends are taken, the nominal one
// that a hold is judged against.
func points(a *render.Answer, nominal *netlist.Circuit, o solve.Options, search searchRequest) *solve.Failure {
	if err := search.solve(a, o); err != nil {
		return failure(err)
	}
	traceInner(a.Result.Point, o.Trace)
	if len(a.At) == 0 {
		return nil
	}
	if o.Trace != nil {
		o.Trace("at the nominal point:")
	}
	res, err := solve.Solve(nominal, o)
	if err != nil {
		f := *failure(err)
		f.Says = "at the nominal point: " + f.Says
		return &f
	}
	traceInner(res.Point, o.Trace)
	a.Nominal = res.Point
	return nil
}

func failure(err error) *solve.Failure {
	var f *solve.Failure
	if errors.As(err, &f) {
		return f
	}
	return &solve.Failure{Says: err.Error()}
}

// traceInner tells the voltages of nodes that the screen leaves out.
func traceInner(p *solve.Point, trace func(string)) {
	if trace == nil {
		return
	}
	for _, n := range p.Inner {
		trace(fmt.Sprintf("%s at %.6g V", n.Name, n.V))
	}
}
