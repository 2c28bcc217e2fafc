package chart

import (
	"math"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/sweep/hand"
)

// Hand draws the way from each hand line's value to the full solution's: a step for what
// the formula left out and for each assumption, as long as its share, with the target's
// band and what was measured. The error is ErrNothing.
func Hand(a *render.HandAnswer) (*figure.Figure, error) {
	const width = 760.0 // points
	var panels []*lines
	var tints []swatch
	for i := range a.Hand.Rows {
		if w := newWay(a.Hand, &a.Hand.Rows[i]); w != nil {
			panels = append(panels, w)
			if w.band.there() {
				tints = append(tints, swatch{figure.Band, "where it is to be"})
			}
		}
	}
	return stacked(newSheet(width, titleOf(a.Circuit, a.File), "From the hand calculation to the full solution"), tints, panels)
}

// newWay is the steps of one quantity; nil where it has no hand value.
func newWay(a *hand.Answer, r *hand.Row) *lines {
	if math.IsNaN(r.Hand) || math.IsNaN(r.Full) {
		return nil
	}
	w := &lines{name: r.Q.Text, unit: r.Q.Unit.Symbol(), band: NoRange, barred: NoRange}
	w.list = append(w.list, total("by hand", r.Hand, w.unit))
	if r.Shares != nil && !math.IsNaN(r.Ideal) {
		at := r.Ideal
		w.list = append(w.list, stride("left out", r.Hand, at, w.unit))
		for i, share := range r.Shares {
			w.list = append(w.list, stride(a.Players[i].Text, at, at+share, w.unit))
			at += share
		}
	}
	w.list = append(w.list, total("in full", r.Full, w.unit))
	if !math.IsNaN(r.Measured) {
		w.list = append(w.list, total("measured", r.Measured, w.unit))
	}
	if r.Target >= 0 {
		v := &a.Verdicts[r.Target]
		w.band = Range{v.Low, v.High}
	}
	return w
}

// total is a line for a value, a dot.
func total(what string, value float64, unit string) entry {
	return entry{
		what: what, amount: render.Measured(value, unit), bold: true, values: []float64{value},
		draw: func(f *figure.Figure, x *axis, middle float64, more bool) {
			thread(f, x.clamp(value), middle, more)
			f.Add(&figure.Dot{At: figure.Point{X: x.clamp(value), Y: middle}, Radius: 4, Fill: figure.Ink})
		},
	}
}

// stride is a line from one value to the next, a bar as long as the step.
func stride(what string, from, to float64, unit string) entry {
	return entry{
		what: what, amount: stepText(from, to, unit), values: []float64{from, to},
		draw: func(f *figure.Figure, x *axis, middle float64, more bool) {
			const tall = 12.0 // points, of a line's height
			a, b := x.clamp(from), x.clamp(to)
			thread(f, b, middle, more)
			paint := figure.Curve(0)
			if to < from { // told by the sign beside it too
				paint = figure.Curve(1)
			}
			f.Add(figure.Box(math.Min(a, b), middle-tall/2, math.Max(math.Max(a, b), math.Min(a, b)+1), middle+tall/2, paint, figure.None))
		},
	}
}

// thread joins a line's value to the line below.
func thread(f *figure.Figure, at, middle float64, more bool) {
	if !more {
		return
	}
	s := figure.Segment(at, middle, at, middle+lineHeight, figure.Frame)
	s.Width = 0.75
	f.Add(s)
}

// stepText is by how much a value moves.
func stepText(from, to float64, unit string) string {
	d := to - from
	const rounding = 1e-7 // of the value: what the idealised circuit leaves
	if math.Abs(d) < rounding*math.Abs(from) {
		return "0"
	}
	if d > 0 {
		return "+" + render.Measured(d, unit)
	}
	return render.Measured(d, unit)
}
