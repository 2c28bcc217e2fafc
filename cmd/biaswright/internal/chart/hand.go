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
	var panels []panel
	var tints []swatch
	for i := range a.Hand.Rows {
		if w := newWay(a.Hand, &a.Hand.Rows[i]); w != nil {
			panels = append(panels, w)
			if w.band.there() {
				tints = append(tints, swatch{figure.Band, "where it is to be"})
			}
		}
	}
	if len(panels) == 0 {
		return nil, ErrNothing
	}
	s := newSheet(width, titleOf(a.Circuit, a.File), "From the hand calculation to the full solution")
	s.legend(tints...)
	for _, p := range panels {
		s.row(1, p)
	}
	return s.done(), nil
}

// A way is the steps of one quantity.
type way struct {
	name, unit string
	steps      []stride
	band       Range
}

// A stride is one line of a way: from one value to the next, or one value alone.
type stride struct {
	what     string
	from, to float64
	total    bool
}

// newWay reads a row; nil where it has no hand value.
func newWay(a *hand.Answer, r *hand.Row) *way {
	if math.IsNaN(r.Hand) || math.IsNaN(r.Full) {
		return nil
	}
	w := &way{name: r.Q.Text, unit: r.Q.Unit.Symbol(), band: NoRange}
	w.steps = append(w.steps, stride{"by hand", r.Hand, r.Hand, true})
	if r.Shares != nil && !math.IsNaN(r.Ideal) {
		at := r.Ideal
		w.steps = append(w.steps, stride{what: "left out", from: r.Hand, to: at})
		for i, share := range r.Shares {
			w.steps = append(w.steps, stride{what: a.Players[i].Text, from: at, to: at + share})
			at += share
		}
	}
	w.steps = append(w.steps, stride{"in full", r.Full, r.Full, true})
	if !math.IsNaN(r.Measured) {
		w.steps = append(w.steps, stride{"measured", r.Measured, r.Measured, true})
	}
	if r.Target >= 0 {
		v := &a.Verdicts[r.Target]
		w.band = Range{v.Low, v.High}
	}
	return w
}

// lineHeight is how tall one step of a way is, in points.
const lineHeight = 24.0

func (w *way) height(float64) float64 {
	return normal*line + float64(len(w.steps))*lineHeight + 2*small*line + tickRoom
}

func (w *way) draw(f *figure.Figure, left, top, width float64) {
	names, amounts := 0.0, 0.0
	low, high := math.Inf(1), math.Inf(-1)
	for i := range w.steps {
		s := &w.steps[i]
		names = math.Max(names, textRoom(cut(s.what), small, s.total))
		amounts = math.Max(amounts, textRoom(w.amount(s), small, s.total))
		low, high = math.Min(low, math.Min(s.from, s.to)), math.Max(high, math.Max(s.from, s.to))
	}
	if w.band.there() && w.band.Low > low-2*(high-low) && w.band.High < high+2*(high-low) {
		low, high = math.Min(low, w.band.Low), math.Max(high, w.band.High)
	}
	pad := math.Max(margin/width*(high-low), 1e-6*math.Max(math.Abs(low), math.Abs(high)))
	const perLabel = 90 // points that a tick wants
	x := newAxis(low-pad, high+pad, w.unit, false, int((width-names-amounts)/perLabel))
	x.from, x.to = left+names+2*tickRoom, left+width-amounts-2*tickRoom
	f.Add(&figure.Text{At: figure.Point{X: left, Y: top + normal}, Text: x.title(w.name), Size: normal, Bold: true, Paint: figure.Ink})
	top += normal * line
	bottom := top + float64(len(w.steps))*lineHeight
	if w.band.there() {
		f.Add(figure.Box(x.clamp(w.band.Low), top, x.clamp(w.band.High), bottom, figure.Band, figure.None))
	}
	for i, v := range x.ticks {
		f.Add(figure.Segment(x.place(v), top, x.place(v), bottom, figure.Grid))
		f.Add(&figure.Text{At: figure.Point{X: x.place(v), Y: bottom + tickRoom + small}, Text: x.labels[i], Anchor: figure.Middle, Size: small, Paint: figure.Soft})
	}
	for i := range w.steps {
		w.step(f, x, &w.steps[i], left, top+float64(i)*lineHeight, i+1 < len(w.steps))
		s := &w.steps[i]
		f.Add(&figure.Text{At: figure.Point{X: left + width, Y: top + (float64(i)+0.65)*lineHeight}, Text: w.amount(s), Anchor: figure.End, Size: small, Bold: s.total, Paint: figure.Ink})
	}
}

// amount is what stands at a step's right: a value, or by how much it moves.
func (w *way) amount(s *stride) string {
	if s.total {
		return render.Measured(s.from, w.unit)
	}
	d := s.to - s.from
	const rounding = 1e-7 // of the value: what the idealised circuit leaves
	if math.Abs(d) < rounding*math.Abs(s.from) {
		return "0"
	}
	if d > 0 {
		return "+" + render.Measured(d, w.unit)
	}
	return render.Measured(d, w.unit)
}

// step draws one line: a bar as long as the step, or a dot, and a thread down to the next.
func (w *way) step(f *figure.Figure, x *axis, s *stride, left, top float64, more bool) {
	const bar = 12.0 // points, of a line's height
	middle := top + lineHeight/2
	f.Add(&figure.Text{At: figure.Point{X: left, Y: top + 0.65*lineHeight}, Text: cut(s.what), Size: small, Bold: s.total, Paint: figure.Ink})
	a, b := x.clamp(s.from), x.clamp(s.to)
	if more {
		thread := figure.Segment(b, middle, b, middle+lineHeight, figure.Frame)
		thread.Width = 0.75
		f.Add(thread)
	}
	if s.total {
		f.Add(&figure.Dot{At: figure.Point{X: a, Y: middle}, Radius: 4, Fill: figure.Ink})
		return
	}
	paint := figure.Curve(0)
	if s.to < s.from { // told by the sign beside it too
		paint = figure.Curve(1)
	}
	f.Add(figure.Box(math.Min(a, b), middle-bar/2, math.Max(math.Max(a, b), math.Min(a, b)+1), middle+bar/2, paint, figure.None))
}
