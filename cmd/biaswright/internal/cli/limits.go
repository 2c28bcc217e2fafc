package cli

import (
	"errors"
	"fmt"
	"runtime"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

func (r *runner) limitsCommand() *cli.Command {
	return &cli.Command{
		Name:      "limits",
		Usage:     "find where each file stops holding, and why",
		UsageText: "biaswright limits [options] FILE...",
		Flags: []cli.Flag{
			setFlag(),
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: take the nominal point nearest to these voltages; may be repeated"},
			&cli.StringFlag{Name: "within", Usage: "`WIDTH`: how far the held quantity may move, such as 2% or 10mV, in place of the file's"},
			chartFlag("the curves, their limits and the headroom"),
			sketchFlag(),
			&cli.IntFlag{Name: "workers", Usage: "`N` axes at a time; the answer is the same", Value: runtime.NumCPU()},
			jsonFlag(),
			plainFlag(),
		},
		Action: r.limits,
	}
}

// A limitsRequest is what the options of limits ask for.
type limitsRequest struct {
	request
	within  *quantity.Reading
	workers int
}

func (r *runner) limits(c *cli.Context) error {
	r.plain = c.Bool("plain")
	base, err := r.request(c)
	if err != nil {
		return err
	}
	q := &limitsRequest{request: *base, workers: c.Int("workers")}
	if q.workers < 1 {
		return usagef("--workers %d: at least one must work", q.workers)
	}
	if text := c.String("within"); c.IsSet("within") {
		reading, err := quantity.Parse(text)
		if err != nil || !(reading.Value > 0) {
			return &usageError{fmt.Sprintf("--within %q is no width", text), "write --within 2% or --within 10mV"}
		}
		q.within = &reading
	}
	return perFile(r, c, q.chart, func(name string) (*render.LimitsAnswer, *trouble) { return r.limitsOf(name, q) }, form[*render.LimitsAnswer]{
		json: render.LimitsJSON, screen: render.LimitsScreen, warnings: func(a *render.LimitsAnswer) diag.List { return a.Warnings },
	})
}

// limitsOf answers for one file and notes the exit code it earns.
func (r *runner) limitsOf(name string, q *limitsRequest) (*render.LimitsAnswer, *trouble) {
	in, unread := r.open(name, &q.request, closed)
	if unread != nil {
		return nil, unread
	}
	c := in.actual
	refuse := func(found diag.List) (*render.LimitsAnswer, *trouble) { return nil, r.refuse(in.name, found) }
	o := limits.Options{Near: in.near, Workers: q.workers}
	var wrong diag.List
	if o.Within, wrong = widthFor(c, q.within); wrong.HasErrors() {
		return refuse(wrong)
	}
	a := &render.LimitsAnswer{File: in.name, Circuit: c, Set: q.set, Within: o.Within, Warnings: in.warnings}
	var err error
	a.Limits, err = limits.Find(c, o)
	switch {
	case errors.Is(err, limits.ErrNoHold):
		return refuse(diag.List{{Code: "no-hold", Span: diag.Span{File: in.name}, Message: err.Error(), Hint: "add: hold LAMP.I within 5%"}})
	case errors.Is(err, limits.ErrZeroHold):
		found := diag.Diagnostic{Code: "zero-hold", Span: diag.Span{File: in.name}, Message: err.Error(), Hint: "state an absolute width: within 10 mV"}
		if c.Hold != nil {
			found.Span = c.Hold.Span
		}
		return refuse(diag.List{found})
	case err != nil:
		r.raise(exitNoPoint)
		a.Failure = failure(err)
		return a, nil
	}
	r.illustrateLimits(q, a)
	for i := range a.Limits.Limits {
		l := &a.Limits.Limits[i]
		low, high := a.Short(l)
		if low || high {
			r.raise(exitNotMet)
		}
		if low && !l.Low.Limited() || high && !l.High.Limited() { // lost on the way
			r.raise(exitNoPoint)
		}
	}
	return a, nil
}

// widthFor checks the width of --within against what the file holds.
func widthFor(c *netlist.Circuit, within *quantity.Reading) (*limits.Within, diag.List) {
	if within == nil {
		return nil, nil
	}
	if within.Percent() {
		return &limits.Within{Value: within.Value, Relative: true}, nil
	}
	q := held(c)
	if q == nil { // Find says so
		return nil, nil
	}
	want := q.Unit
	want.Absolute = false // a width of a temperature is in kelvin
	if within.Unit != want {
		return nil, diag.List{{
			Code: "within", Message: fmt.Sprintf("--within is in %s, and %s in %s", within.Unit.Words(), q.Text, q.Unit.Words()),
			Hint: "a percentage fits any quantity: --within 2%",
		}}
	}
	return &limits.Within{Value: within.Value}, nil
}

// held is the quantity that the file holds, nil where it holds none.
func held(c *netlist.Circuit) *netlist.Expr {
	q, _, _ := solve.HoldOf(c)
	return q
}
