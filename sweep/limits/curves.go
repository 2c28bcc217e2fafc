package limits

import (
	"context"
	"errors"
	"slices"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep"
)

// A Curve is the held quantity along one axis, for a picture of its limit. Values are
// NaN where the circuit has no operating point; Unstable marks points that cannot
// be stable.
type Curve struct {
	X, Q     []float64
	Unstable []bool
}

// Curve solves the circuit that the answer is about at so many even steps of the range
// of limit i, at its nominal value and at its limits: outward from the nominal point, so
// that it shows the nominal point's own branch as far as that goes.
func (a *Answer) Curve(i, points int) (Curve, error) {
	l := &a.Limits[i]
	xs, at := steps(l, points)
	down := slices.Clone(xs[:at+1])
	slices.Reverse(down)
	var halves [2]Curve
	var failed [2]error
	inTurn(len(halves), len(halves), func(k int) {
		values := xs[at:]
		if k == 0 {
			values = down
		}
		halves[k], failed[k] = a.outward(l.Axis, values)
	})
	if err := errors.Join(failed[:]...); err != nil {
		return Curve{}, err
	}
	out := halves[0]
	slices.Reverse(out.X)
	slices.Reverse(out.Q)
	slices.Reverse(out.Unstable)
	const own = 1 // both halves have the nominal point
	return Curve{
		X: append(out.X, halves[1].X[own:]...),
		Q: append(out.Q, halves[1].Q[own:]...), Unstable: append(out.Unstable, halves[1].Unstable[own:]...),
	}, nil
}

// outward solves along an axis from its nominal value.
func (a *Answer) outward(name string, values []float64) (Curve, error) {
	c := a.Nominal.Circuit
	if name == netlist.LoadName {
		c = c.HoldLoad(a.Nominal.LoadV)
	}
	axis, err := sweep.NewAxis(c, name, values)
	if err != nil {
		return Curve{}, err
	}
	plan := sweep.Plan{Circuit: c, Axes: []sweep.Axis{axis}, Show: []string{a.Hold.Q.Text}, Near: a.nominalVolts(), From: a.Nominal}
	var out Curve
	err = sweep.Run(context.Background(), plan, func(r sweep.Row) error {
		out.X = append(out.X, r.At[0])
		out.Q = append(out.Q, r.Values[0])
		out.Unstable = append(out.Unstable, r.Status == sweep.Unstable)
		return nil
	})
	return out, err
}

// nominalVolts are the node voltages of the nominal point, but for those within a row of
// the load, which are not there when the load is held.
func (a *Answer) nominalVolts() map[netlist.NodeID]float64 {
	out := a.Nominal.Volts()
	c := a.Nominal.Circuit
	for _, i := range c.Load {
		chain := c.Elements[i].Chain
		for _, within := range chain[1 : len(chain)-1] {
			delete(out, within)
		}
	}
	return out
}

// steps are even, with the nominal value and the limits among them; at is the nominal
// value's place.
func steps(l *Limit, points int) (xs []float64, at int) {
	xs = []float64{l.Nominal}
	for i := range points {
		f := float64(i) / float64(points-1)
		xs = append(xs, (1-f)*l.From+f*l.To)
	}
	for _, s := range []Side{l.Low, l.High} {
		if s.Limited() {
			xs = append(xs, s.At)
		}
	}
	slices.Sort(xs)
	xs = slices.Compact(xs)
	at, _ = slices.BinarySearch(xs, l.Nominal)
	return xs, at
}

// An Extreme is the circuit at one end of what it must work over.
type Extreme struct {
	Where string // "nominal", "low rails", "hottest"
	Point *solve.Point
}

// Extremes solves a circuit at nominal, with every rail at its stated end nearest 0, and at
// the highest stated ambient. What is not stated, or has no operating point, is
// left out.
func (a *Answer) Extremes() []Extreme {
	c := a.Nominal.Circuit
	out := []Extreme{{"nominal", a.Nominal}}
	for _, e := range []struct {
		where string
		ends  []netlist.Setting
	}{{"low rails", nearestZero(c)}, {"hottest", ambientEnd(c, "high")}} {
		if e.ends == nil {
			continue
		}
		at, list := c.At(e.ends...)
		if list.HasErrors() {
			continue
		}
		if p, err := solve.Onward(at, a.Nominal); err == nil {
			out = append(out, Extreme{e.where, p})
		}
	}
	return out
}
