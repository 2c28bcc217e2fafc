package chart

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/sweep"
)

// ErrNothing says that there is nothing to draw.
var ErrNothing = errors.New("there is nothing to draw: no point has a number")

// A Sweep gathers the rows of a sweep and draws them: the innermost axis runs across,
// each value of the others is a curve, and quantities of one unit share a plot.
type Sweep struct {
	answer  *render.SweepAnswer
	nominal netlist.Env // what a hold is judged against, or nil
	log     bool
	rows    []sweep.Row
}

// NewSweep begins a chart. Nominal may be nil; log tells that the innermost axis goes by
// equal ratios.
func NewSweep(a *render.SweepAnswer, nominal *solve.Point, log bool) *Sweep {
	s := &Sweep{answer: a, log: log}
	if nominal != nil {
		s.nominal = nominal
	}
	return s
}

// Row adds a row.
func (s *Sweep) Row(r sweep.Row) { s.rows = append(s.rows, r) }

// Figure draws what was gathered; the error is ErrNothing.
func (s *Sweep) Figure() (*figure.Figure, error) {
	var panels []panel
	var tints []swatch
	for _, unit := range s.units() {
		if p := s.plot(unit); p.drawable() {
			panels = append(panels, p)
			tints = append(tints, p.tints()...)
		}
	}
	if len(panels) == 0 {
		return nil, ErrNothing
	}
	const width = 760.0 // points: one plot across
	a := s.answer
	var set []string
	for _, x := range a.Set {
		set = append(set, x.Name+" = "+x.Value)
	}
	out := newSheet(width, titleOf(a.Circuit, a.File), strings.Join(set, ", "))
	out.legend(tints...)
	for _, p := range panels {
		out.row(1, p)
	}
	return out.done(), nil
}

// units are those of the shown quantities, in their order.
func (s *Sweep) units() []quantity.Unit {
	var out []quantity.Unit
	for _, e := range s.answer.Show {
		if !slices.Contains(out, e.Unit) {
			out = append(out, e.Unit)
		}
	}
	return out
}

// plot draws the quantities of one unit.
func (s *Sweep) plot(unit quantity.Unit) *Plot {
	axes := s.answer.Axes
	inner := &axes[len(axes)-1]
	p := &Plot{
		XName: inner.Name, XUnit: inner.Unit.Symbol(), YUnit: unit.Symbol(), Log: s.log,
		Steps: strings.HasSuffix(inner.Name, ".row"), Focus: NoRange, Stated: statedRange(s.answer.Circuit, inner.Name),
	}
	var names []string
	for column, e := range s.answer.Show {
		if e.Unit != unit {
			continue
		}
		names = append(names, e.Text)
		p.Curves = append(p.Curves, s.curves(column)...)
		s.bounds(p, e)
	}
	p.YName = strings.Join(names, ", ")
	for i := range p.Curves {
		p.Curves[i].Look = i
	}
	if len(names) == 1 { // the axis says what is shown; the curves say where
		for i := range p.Curves {
			p.Curves[i].Name = strings.TrimPrefix(p.Curves[i].Name, names[0]+" ")
		}
	}
	if n := s.gaps(); n > 0 {
		p.Notes = append(p.Notes, fmt.Sprintf("%d of %d points have no operating point", n, len(s.rows)))
	}
	if shown := (len(p.Curves) + mostNames - 1) / mostNames; shown > 1 {
		p.Notes = append(p.Notes, fmt.Sprintf("%d curves; one in %d is named", len(p.Curves), shown))
	}
	return p
}

func (s *Sweep) gaps() int {
	n := 0
	for _, r := range s.rows {
		if r.Status == sweep.Failed {
			n++
		}
	}
	return n
}

// curves are one quantity at each value of the outer axes.
func (s *Sweep) curves(column int) []Curve {
	axes := s.answer.Axes
	inner := len(axes[len(axes)-1].Values)
	var out []Curve
	for from := 0; from < len(s.rows); from += inner {
		rows := s.rows[from:min(from+inner, len(s.rows))]
		c := Curve{Name: s.answer.Show[column].Text}
		for i := range len(axes) - 1 {
			c.Name += " " + outerText(&axes[i], rows[0].At[i])
		}
		for _, r := range rows {
			c.X = append(c.X, r.At[len(axes)-1])
			c.Y = append(c.Y, r.Values[column])
			c.Doubtful = append(c.Doubtful, r.Status == sweep.Unstable)
		}
		out = append(out, thinned(c))
	}
	return out
}

// outerText says where a curve stands on an outer axis.
func outerText(a *sweep.Axis, v float64) string {
	const digits = 4
	return strings.TrimSuffix(a.Name, ".V") + " " + quantity.Format(quantity.Quantity{Value: v, Unit: a.Unit}, digits)
}

// mostPoints of a curve are drawn: four to a point of width.
const mostPoints = 3000

// thinned keeps, of a long curve, the first, lowest, highest and last point of each
// stretch, so that it looks the same.
func thinned(c Curve) Curve {
	n := len(c.X)
	if n <= mostPoints {
		return c
	}
	var out Curve
	out.Name = c.Name
	const kept = 4 // points a stretch
	stretch := (n*kept + mostPoints - 1) / mostPoints
	for from := 0; from < n; from += stretch {
		to := min(from+stretch, n)
		low, high := from, from
		for k := from; k < to; k++ {
			if c.Y[k] < c.Y[low] || math.IsNaN(c.Y[low]) {
				low = k
			}
			if c.Y[k] > c.Y[high] || math.IsNaN(c.Y[high]) {
				high = k
			}
		}
		which := []int{from, low, high, to - 1}
		for k := from; k < to; k++ { // a gap stays a gap
			if math.IsNaN(c.Y[k]) {
				which = append(which, k)
				break
			}
		}
		slices.Sort(which)
		for _, k := range slices.Compact(which) {
			out.X, out.Y, out.Doubtful = append(out.X, c.X[k]), append(out.Y, c.Y[k]), append(out.Doubtful, c.Doubtful[k])
		}
	}
	return out
}

// bounds adds the bands and bars that the file states for a quantity.
func (s *Sweep) bounds(p *Plot, e *netlist.Expr) {
	c := s.answer.Circuit
	for i := range c.Targets {
		if t := &c.Targets[i]; t.Q.Text == e.Text {
			low, high := t.Band()
			p.Bands = append(p.Bands, Range{low, high})
		}
	}
	if q, within, relative := solve.HoldOf(c); len(p.Bands) == 0 && q != nil && q.Text == e.Text && s.nominal != nil {
		if v, ok := q.Eval(s.nominal); ok {
			if relative {
				within *= math.Abs(v)
			}
			p.Bands = append(p.Bands, Range{v - within, v + within})
		}
	}
	for i := range c.Keeps {
		k := &c.Keeps[i]
		if k.Left.Text != e.Text || s.nominal == nil {
			continue
		}
		bound, ok := k.Right.Eval(s.nominal)
		switch {
		case !ok:
		case k.Greater:
			p.Barred = append(p.Barred, Range{math.Inf(-1), bound})
		default:
			p.Barred = append(p.Barred, Range{bound, math.Inf(1)})
		}
	}
}
