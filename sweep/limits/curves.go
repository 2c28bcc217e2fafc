package limits

import (
	"context"
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
// of limit i, at its nominal value and at its limits.
func (a *Answer) Curve(i, points int) (Curve, error) {
	c, l := a.Nominal.Circuit, &a.Limits[i]
	name := l.Axis
	if name == netlist.LoadName {
		c = c.HoldLoad(a.Nominal.LoadV)
	}
	axis, err := sweep.NewAxis(c, name, steps(l, points))
	if err != nil {
		return Curve{}, err
	}
	var out Curve
	err = sweep.Run(context.Background(), sweep.Plan{Circuit: c, Axes: []sweep.Axis{axis}, Show: []string{a.Hold.Q.Text}}, func(r sweep.Row) error {
		out.X = append(out.X, r.At[0])
		out.Q = append(out.Q, r.Values[0])
		out.Unstable = append(out.Unstable, r.Status == sweep.Unstable)
		return nil
	})
	return out, err
}

// steps are even, with the nominal value and the limits among them.
func steps(l *Limit, points int) []float64 {
	xs := []float64{l.Nominal}
	for i := range points {
		f := float64(i) / float64(points-1)
		xs = append(xs, (1-f)*l.From+f*l.To)
	}
	for _, s := range []Side{l.Low, l.High} {
		if s.Reason != End {
			xs = append(xs, s.At)
		}
	}
	slices.Sort(xs)
	return slices.Compact(xs)
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
		if res, err := solve.Solve(at, solve.Options{}); err == nil {
			out = append(out, Extreme{e.where, res.Point})
		}
	}
	return out
}
