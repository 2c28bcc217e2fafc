package chart

import (
	"math"

	"biaswright/cmd/biaswright/internal/figure"
)

// lines is a panel with a line for each of several things, their values along one axis
// below them.
type lines struct {
	name, unit string
	says       string // behind the name
	band       Range  // where the values are to be
	barred     Range  // where they must not be; one end is infinite
	list       []entry
}

// An entry is one line: a name at the left, an amount at the right, and what is drawn
// between them.
type entry struct {
	what, amount string
	bold         bool
	values       []float64 // that the axis is to show; NaN for one that is not there
	// draw puts the line's own drawing at a height; more tells of a line below.
	draw func(f *figure.Figure, x *axis, middle float64, more bool)
}

// stacked puts panels of lines below each other on a sheet. The error is ErrNothing.
func stacked(s *sheet, tints []swatch, panels []*lines) (*figure.Figure, error) {
	if len(panels) == 0 {
		return nil, ErrNothing
	}
	s.legend(tints...)
	for _, p := range panels {
		s.row(1, p)
	}
	return s.done(), nil
}

// lineHeight is how tall a line is, in points.
const lineHeight = 24.0

func (l *lines) height(float64) float64 {
	return normal*line + float64(len(l.list))*lineHeight + 2*small*line + tickRoom
}

func (l *lines) draw(f *figure.Figure, left, top, width float64) {
	names, amounts := 0.0, 0.0
	for i := range l.list {
		e := &l.list[i]
		names = math.Max(names, textRoom(cutTo(e.what, width/2), small, e.bold))
		amounts = math.Max(amounts, textRoom(e.amount, small, e.bold))
	}
	low, high := l.extent(width)
	const perLabel = 90 // points that a tick wants
	x := newAxis(low, high, l.unit, false, max(2, int((width-names-amounts)/perLabel)))
	x.from, x.to = left+names+2*tickRoom, left+width-amounts-2*tickRoom
	title := cutTo(x.title(l.name), width/2)
	behind := margin + textRoom(title, normal, true)
	heading(f, left, top+normal, title)
	note(f, left+behind, top+normal, figure.Start, cutTo(l.says, width-behind))
	top += normal * line
	bottom := top + float64(len(l.list))*lineHeight
	if l.band.there() {
		f.Add(figure.Box(x.clamp(l.band.Low), top, x.clamp(l.band.High), bottom, figure.Band, figure.None))
	}
	if l.barred.there() {
		f.Add(figure.Box(x.clamp(l.barred.Low), top, x.clamp(l.barred.High), bottom, figure.Forbidden, figure.None))
	}
	for i, v := range x.ticks {
		f.Add(figure.Segment(x.place(v), top, x.place(v), bottom, figure.Grid))
		note(f, x.place(v), bottom+tickRoom+small, figure.Middle, x.labels[i])
	}
	for i := range l.list {
		e := &l.list[i]
		from := top + float64(i)*lineHeight
		base := from + 0.65*lineHeight // of texts that stand in a line's middle
		f.Add(&figure.Text{At: figure.Point{X: left, Y: base}, Text: cutTo(e.what, width/2), Size: small, Bold: e.bold, Paint: figure.Ink})
		e.draw(f, x, from+lineHeight/2, i+1 < len(l.list))
		f.Add(&figure.Text{At: figure.Point{X: left + width, Y: base}, Text: e.amount, Anchor: figure.End, Size: small, Bold: e.bold, Paint: figure.Ink})
	}
}

// extent is what the axis shows: the values, and the band and the bar's edge unless they
// are far off.
func (l *lines) extent(width float64) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for i := range l.list {
		for _, v := range l.list[i].values {
			if !math.IsNaN(v) && !math.IsInf(v, 0) {
				low, high = math.Min(low, v), math.Max(high, v)
			}
		}
	}
	const far = 2 // widths of what the values take
	least, most := low-far*(high-low), high+far*(high-low)
	if l.band.there() && l.band.Low > least && l.band.High < most {
		low, high = math.Min(low, l.band.Low), math.Max(high, l.band.High)
	}
	for _, edge := range []float64{l.barred.Low, l.barred.High} {
		if edge > least && edge < most { // not of a bar that is not there
			low, high = math.Min(low, edge), math.Max(high, edge)
		}
	}
	pad := math.Max(margin/width*(high-low), 1e-6*math.Max(math.Abs(low), math.Abs(high)))
	if pad == 0 { // all of it is 0
		pad = 1
	}
	return low - pad, high + pad
}
