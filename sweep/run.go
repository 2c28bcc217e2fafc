package sweep

import (
	"context"
	"math"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// A Status is what became of a point.
type Status string

// The statuses.
const (
	OK       Status = "ok"
	Unstable Status = "unstable" // a point that cannot be stable is all there is
	Failed   Status = "failed"   // no operating point
)

// A Row is one point of a sweep.
type Row struct {
	At     []float64 // by axis
	Values []float64 // by shown expression; NaN where there is no number
	Status Status
	// Inside tells that the point lies in the stated ranges; Unmet then counts
	// the targets, keeps and the hold that it does not meet.
	Inside bool
	Unmet  int
}

// A Plan is what to sweep and what to show.
type Plan struct {
	Circuit *netlist.Circuit
	Axes    []Axis // the first is outermost
	// Show are texts of quantities or expressions, as ParseExpr reads them.
	Show []string
	// Workers is how many goroutines share the outer axes; 0 is one.
	Workers int
	// Nominal, where set, is the nominal point that hold is judged against.
	Nominal *solve.Point
	// Near, where set, are node voltages in V that the first point of the innermost
	// axis is to be near; the others follow it, as long as its branch goes on.
	Near map[netlist.NodeID]float64
	// From, where set, is a point of this circuit at the first value of the innermost axis,
	// to begin with sooner than Near does; one with another number of unknowns is passed
	// over.
	From *solve.Point
}

// Points is how many rows the plan has, math.MaxInt where that is more.
func (p *Plan) Points() int {
	n := 1
	for i := range p.Axes {
		values := len(p.Axes[i].Values)
		if values > 0 && n > math.MaxInt/values {
			return math.MaxInt
		}
		n *= values
	}
	return n
}

// chunk is how many rows are handed on at a time: enough to make handing cheap,
// few enough to end soon.
const chunk = 256

// ahead is how many chunks a run may be ahead of the reader.
const ahead = 8

// Run solves every point and hands the rows to emit in input order, from the
// calling goroutine; rows are not modified afterwards. It ends early with emit's
// error, or with ctx's. A point that fails is a row, not an error; the error is an
// *Error where an axis or an expression does not fit the circuit.
func Run(ctx context.Context, p Plan, emit func(Row) error) error {
	if len(p.Axes) == 0 {
		return wrong("add --over VCC=5V..15V", "nothing to sweep over")
	}
	if _, err := bindAll(p.Circuit, p.Show); err != nil {
		return err
	}
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	inner := len(p.Axes[len(p.Axes)-1].Values)
	runs := p.Points() / max(inner, 1)
	workers := max(min(p.Workers, runs), 1)
	// Each run has its own channel, and they are read in order; a slot is taken
	// before a run starts, so that at most that many are ahead.
	slots := make(chan struct{}, workers)
	lines := make(chan chan []Row, workers)
	go func() {
		defer close(lines)
		for k := range runs {
			select {
			case slots <- struct{}{}:
			case <-ctx.Done():
				return
			}
			line := make(chan []Row, ahead)
			select {
			case lines <- line:
			case <-ctx.Done():
				return
			}
			go func() {
				defer func() { <-slots }()
				defer close(line)
				r := runner{plan: &p, ctx: ctx, out: line}
				r.run(k)
			}()
		}
	}()
	for line := range lines {
		for rows := range line {
			for _, row := range rows {
				if err := ctx.Err(); err != nil {
					return err
				}
				if err := emit(row); err != nil {
					return err
				}
			}
		}
	}
	return ctx.Err()
}

func bindAll(c *netlist.Circuit, texts []string) ([]*netlist.Expr, error) {
	out := make([]*netlist.Expr, len(texts))
	for i, text := range texts {
		e, list := c.ParseExpr(text)
		if list.HasErrors() {
			return nil, wrong(list[0].Hint, "%s: %s", text, list[0].Message)
		}
		out[i] = e
	}
	return out, nil
}

// A runner solves one run: the inner axis at one combination of the outer ones.
type runner struct {
	plan *Plan
	ctx  context.Context
	out  chan<- []Row
	rows []Row

	at      []float64 // of the outer axes
	outside bool      // an outer axis is outside its stated range
	numbers []float64 // what is left of the chunk's numbers, for rows

	c     *netlist.Circuit
	s     *mna.System
	show  []*netlist.Expr
	state *mna.State
	work  newton.Work
	past  history
}

// run solves run number k, counted with the last outer axis quickest.
func (r *runner) run(k int) {
	axes := r.plan.Axes
	outer := axes[:len(axes)-1]
	r.at = make([]float64, len(outer))
	var settings []netlist.Setting
	for i := len(outer) - 1; i >= 0; i-- {
		a := &outer[i]
		at := k % len(a.Values)
		k /= len(a.Values)
		r.at[i] = a.Values[at]
		settings = append(a.settings(at), settings...)
		r.outside = r.outside || !r.within(a, a.Values[at])
	}
	c := r.plan.Circuit
	if len(settings) > 0 { // a copy is dear beside a few points
		c, _ = c.With(settings...)
	}
	inner := &axes[len(axes)-1]
	if c == nil {
		for _, v := range inner.Values {
			r.fail(inner, v)
		}
	} else {
		done := 0
		if inner.row == "" {
			done = r.follow(c, inner)
		}
		r.each(c, inner, done)
	}
	r.flush()
}

// within tells whether a value of an axis lies in the ranges stated for all that
// it moves.
func (r *runner) within(a *Axis, v float64) bool {
	if a.row != "" {
		return a.rowInside(r.plan.Circuit, v)
	}
	for _, id := range a.slots(r.plan.Circuit) {
		if !inside(&r.plan.Circuit.Slots[id], v) {
			return false
		}
	}
	return true
}

// each solves the points of the inner axis from the given one on, each from the beginning:
// where the values change the structure.
func (r *runner) each(c *netlist.Circuit, inner *Axis, from int) {
	for i := from; i < len(inner.Values); i++ {
		if r.ctx.Err() != nil {
			return
		}
		v := inner.Values[i]
		changed, list := c.With(inner.settings(i)...)
		if list.HasErrors() || !r.compile(changed) {
			r.fail(inner, v)
			continue
		}
		r.anew(inner, v)
	}
}

// compile sets a circuit up.
func (r *runner) compile(c *netlist.Circuit) bool {
	s, err := mna.New(c)
	if err != nil {
		return false
	}
	r.c, r.s, r.state = c, s, nil
	r.past.clear()
	r.show, err = bindAll(c, r.plan.Show)
	return err == nil
}

// follow solves the inner axis along its branch, and tells how many points it did: those
// before the first value that changes the structure.
func (r *runner) follow(c *netlist.Circuit, inner *Axis) int {
	if !r.compile(c) {
		return 0
	}
	t := r.s.NewTuner(inner.slots(c)...)
	numbers := make([]float64, len(inner.names))
	x := make([]float64, r.s.Size())
	if p := r.plan.From; p != nil && len(p.Unknowns()) == len(x) {
		r.past.add(inner.Values[0], p.Unknowns())
	}
	for i, v := range inner.Values {
		if r.ctx.Err() != nil {
			return len(inner.Values)
		}
		for k := range numbers {
			numbers[k] = v
		}
		if !t.Set(numbers...) {
			return i
		}
		if r.past.predict(v, x) {
			r.s.Continue()
			// A predictor that needs more than a few steps has lost its branch.
			const few = 12
			if n := newton.Solve(r.s, x, &r.work, newton.Options{MaxSteps: few}); n.Outcome == newton.Converged {
				status := OK
				if r.s.LastSign() < 0 {
					status = Unstable
				}
				if r.state == nil {
					r.state = r.s.StateAt(x)
				} else {
					r.state.Polished(x)
				}
				if r.state.EarlyBroken() == "" {
					r.past.add(v, x)
					r.keep(inner, v, status)
					continue
				}
			}
		}
		r.anew(inner, v)
	}
	return len(inner.Values)
}

func (r *runner) refresh(x []float64) {
	if r.state == nil {
		r.state = r.s.StateAt(x)
		return
	}
	r.state.Refresh(x)
}

// anew solves a point by the whole ladder; the first of an axis near the voltages that the
// plan begins with.
func (r *runner) anew(inner *Axis, v float64) {
	r.past.clear()
	o := solve.Options{}
	if v == inner.Values[0] {
		o.Near = r.plan.Near
	}
	res, err := solve.SolveSystem(r.s, o)
	if err != nil {
		r.fail(inner, v)
		return
	}
	x := res.Point.Unknowns()
	status := OK
	if res.Point.Unstable {
		status = Unstable
	}
	r.refresh(x)
	r.past.add(v, x)
	r.keep(inner, v, status)
}

// keep adds a solved row.
func (r *runner) keep(inner *Axis, v float64, status Status) {
	row := r.row(v)
	row.Status = status
	for i, e := range r.show {
		if value, ok := e.Eval(r.state); ok {
			row.Values[i] = value
		}
	}
	if row.Inside = !r.outside && r.within(inner, v); row.Inside {
		row.Unmet = r.unmet()
	}
	r.add(row)
}

func (r *runner) unmet() int {
	var nominal netlist.Env
	if r.plan.Nominal != nil {
		nominal = r.plan.Nominal
	}
	count := 0
	for _, verdict := range solve.JudgeAt(r.c, r.state, nominal) {
		if !verdict.Met {
			count++
		}
	}
	return count
}

func (r *runner) fail(inner *Axis, v float64) {
	r.past.clear()
	row := r.row(v)
	row.Status = Failed
	row.Inside = !r.outside && r.within(inner, v)
	r.add(row)
}

// row is a row without numbers.
func (r *runner) row(v float64) Row {
	axes, size := len(r.at)+1, len(r.at)+1+len(r.plan.Show)
	if len(r.numbers) < size {
		r.numbers = make([]float64, chunk*size)
	}
	row := Row{At: r.numbers[:axes:axes], Values: r.numbers[axes:size:size]}
	r.numbers = r.numbers[size:]
	copy(row.At, r.at)
	row.At[axes-1] = v
	for i := range row.Values {
		row.Values[i] = nan
	}
	return row
}

func (r *runner) add(row Row) {
	if r.rows == nil {
		r.rows = make([]Row, 0, chunk)
	}
	if r.rows = append(r.rows, row); len(r.rows) == chunk {
		r.flush()
	}
}

func (r *runner) flush() {
	if len(r.rows) == 0 {
		return
	}
	select {
	case r.out <- r.rows:
	case <-r.ctx.Done():
	}
	r.rows = nil
}
