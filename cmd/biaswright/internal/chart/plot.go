package chart

import (
	"math"
	"strings"

	"biaswright/cmd/biaswright/internal/figure"
)

// A Curve is one quantity over the plot's axis. A NaN in Y is a gap.
type Curve struct {
	Name string
	X, Y []float64
	// Doubtful marks points that cannot be stable; nil where all may be.
	Doubtful []bool
	// Look says which strokes, shape and paint the curve has: those of the Look-th.
	Look int
}

// A Mark is a value of the horizontal axis at which something ends.
type Mark struct {
	X    float64
	Text string // its value
	// High tells that what lies above X is lost, otherwise what lies below.
	High bool
}

// A Range is an interval of values; its ends may be infinite.
type Range struct{ Low, High float64 }

// A Plot is one or more curves over one axis.
type Plot struct {
	XName, XUnit string
	YName, YUnit string
	Log          bool
	// Steps draws the points alone, for an axis that counts.
	Steps  bool
	Curves []Curve
	// Focus, where it is there, is as far as Y is shown besides the bands.
	Focus  Range
	Bands  []Range // of Y: where it may be
	Barred []Range // of Y: where it must not be
	// Stated is the range of X that the file states; NaN where there is none.
	Stated Range
	Marks  []Mark
	// Notes stand below, one after the other.
	Notes []string
}

// NoRange is a Range that is not there.
var NoRange = Range{math.NaN(), math.NaN()}

func (r Range) there() bool { return !math.IsNaN(r.Low) }

// finite gives the ends of all values, and false where there are none.
func finite(values ...[]float64) (low, high float64, ok bool) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, list := range values {
		for _, v := range list {
			if !math.IsNaN(v) && !math.IsInf(v, 0) {
				low, high = math.Min(low, v), math.Max(high, v)
			}
		}
	}
	return low, high, low <= high
}

// drawable tells whether any curve has a point.
func (p *Plot) drawable() bool {
	for _, c := range p.Curves {
		if _, _, ok := finite(c.Y); ok {
			return true
		}
	}
	return false
}

// spans finds what the axes must show.
func (p *Plot) spans() (x, y Range) {
	var xs, ys [][]float64
	for _, c := range p.Curves {
		xs, ys = append(xs, c.X), append(ys, c.Y)
	}
	x.Low, x.High, _ = finite(xs...)
	low, high, _ := finite(ys...)
	if f := p.Focus; f.there() {
		low, high = math.Max(low, f.Low), math.Min(high, f.High)
	}
	for _, b := range p.Bands {
		low, high, _ = finite([]float64{low, high, b.Low, b.High})
	}
	for _, b := range p.Barred { // its edge is of interest where it is near
		edge := b.Low
		if math.IsInf(edge, 0) {
			edge = b.High
		}
		const near = 3 // times the height of what is shown anyway
		if edge < high+near*(high-low) && edge > low-near*(high-low) {
			low, high = math.Min(low, edge), math.Max(high, edge)
		}
	}
	const margin = 0.06 // of the height, above and below
	width := high - low
	if least := 1e-6 * math.Max(math.Abs(low), math.Abs(high)); width <= least {
		// A level line stands in the middle of a range that shows it level.
		const about = 0.05
		width = math.Max(about*math.Abs(high), math.SmallestNonzeroFloat32)
		low, high = low-width, high+width
	}
	// A curve that starts at 0 and does not cross it stands on the axis.
	y = Range{low - margin*width, high + margin*width}
	if low == 0 {
		y.Low = 0
	}
	if x.Low == x.High {
		pad := math.Max(math.Abs(x.Low)*margin, 1e-9)
		x = Range{x.Low - pad, x.High + pad}
	}
	return x, y
}

// tints explains those that the plot uses.
func (p *Plot) tints() []swatch {
	var out []swatch
	if len(p.Bands) > 0 {
		out = append(out, swatch{figure.Band, "where it is to be"})
	}
	if len(p.Marks) > 0 {
		out = append(out, swatch{figure.Forbidden, "where it does not hold"})
	}
	if len(p.Barred) > 0 {
		out = append(out, swatch{figure.Forbidden, "where the file wants it not to be"})
	}
	if p.Stated.there() {
		out = append(out, swatch{figure.Outside, "beyond the range that the file states (the heavy part of an axis)"})
	}
	return out
}

// A frame is a plot being drawn.
type frame struct {
	f                        *figure.Figure
	p                        *Plot
	x, y                     *axis
	left, top, right, bottom float64
}

// Room kept around a plot, in points.
const (
	tickRoom = 6.0  // between an axis and its numbers
	leader   = 14.0 // from a curve's end to its name
	widest   = 150.0
)

// plotHeight is the height of a plot without its notes.
const plotHeight = 300.0

// notesOf wraps the notes to a width.
func (p *Plot) notesOf(width float64) []string {
	var out []string
	for _, n := range p.Notes {
		out = append(out, wrapped(n, small, width)...)
	}
	return out
}

// height is what the plot takes at a width, its notes included.
func (p *Plot) height(width float64) float64 {
	return plotHeight + float64(len(p.notesOf(width)))*small*line
}

// draw puts the plot into a box whose height is p.height(width).
func (p *Plot) draw(f *figure.Figure, left, top, width float64) {
	x, y := p.spans()
	fr := &frame{f: f, p: p}
	const perLabel, perRow = 70, 34 // points that a tick wants, across and down
	names := p.names()
	fr.top = top + normal*line + small*line + 6
	fr.bottom = top + plotHeight - small*line - normal*line - 2*tickRoom
	fr.y = newAxis(y.Low, y.High, p.YUnit, false, int((fr.bottom-fr.top)/perRow))
	fr.left = left + fr.y.labelWidth() + 2*tickRoom
	fr.right = left + width - names - tickRoom
	fr.x = newAxis(x.Low, x.High, p.XUnit, p.Log, max(2, int((fr.right-fr.left)/perLabel)))
	fr.x.from, fr.x.to = fr.left, fr.right
	fr.y.from, fr.y.to = fr.bottom, fr.top

	fr.regions()
	fr.grid()
	fr.edges()
	fr.curves()
	fr.marks()
	heading(f, left, top+normal, fr.y.title(p.YName))
	f.Add(&figure.Text{
		At: figure.Point{X: fr.right, Y: fr.bottom + tickRoom + small*line + normal}, Text: fr.x.title(p.XName),
		Anchor: figure.End, Size: normal, Bold: true, Paint: figure.Ink,
	})
	for i, n := range p.notesOf(width) {
		note(f, left, top+plotHeight+float64(i)*small*line+small, figure.Start, n)
	}
}

// names is the room that the curves' names take at the right.
func (p *Plot) names() float64 {
	if len(p.Curves) < 2 {
		return tickRoom
	}
	w := 0.0
	for _, c := range p.Curves {
		w = math.Max(w, textRoom(cut(c.Name), small, false))
	}
	return w + leader + tickRoom
}

// cut shortens a text to the widest room for a name.
func cut(s string) string { return cutTo(s, widest) }

// cutTo shortens a small text to a room.
func cutTo(s string, room float64) string {
	if textRoom(s, small, false) <= room {
		return s
	}
	runes := []rune(s)
	for len(runes) > 1 && textRoom(string(runes)+"…", small, false) > room {
		runes = runes[:len(runes)-1]
	}
	return strings.TrimSpace(string(runes)) + "…"
}

// wrapped breaks a text into lines of at most a width.
func wrapped(text string, size, width float64) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		longer := strings.TrimSpace(line + " " + word)
		if line != "" && textRoom(longer, size, false) > width {
			lines = append(lines, line)
			longer = word
		}
		line = longer
	}
	return append(lines, line)
}

// regions tints what is allowed, barred, beyond the stated range or lost.
func (fr *frame) regions() {
	box := func(left, top, right, bottom float64, p figure.Paint) {
		if right > left && bottom > top {
			fr.f.Add(figure.Box(left, top, right, bottom, p, figure.None))
		}
	}
	if s := fr.p.Stated; s.there() {
		box(fr.left, fr.top, fr.x.clamp(s.Low), fr.bottom, figure.Outside)
		box(fr.x.clamp(s.High), fr.top, fr.right, fr.bottom, figure.Outside)
	}
	for _, b := range fr.p.Bands {
		box(fr.left, fr.y.clamp(b.High), fr.right, fr.y.clamp(b.Low), figure.Band)
	}
	for _, b := range fr.p.Barred {
		box(fr.left, fr.y.clamp(b.High), fr.right, fr.y.clamp(b.Low), figure.Forbidden)
	}
	for _, m := range fr.p.Marks {
		if m.High {
			box(fr.x.clamp(m.X), fr.top, fr.right, fr.bottom, figure.Forbidden)
		} else {
			box(fr.left, fr.top, fr.x.clamp(m.X), fr.bottom, figure.Forbidden)
		}
	}
}

func (fr *frame) grid() {
	for i, v := range fr.y.ticks {
		at := fr.y.place(v)
		fr.f.Add(figure.Segment(fr.left, at, fr.right, at, figure.Grid))
		note(fr.f, fr.left-tickRoom, at+small/3, figure.End, fr.y.labels[i])
	}
	for i, v := range fr.x.ticks {
		at := fr.x.place(v)
		fr.f.Add(figure.Segment(at, fr.top, at, fr.bottom, figure.Grid))
		note(fr.f, at, fr.bottom+tickRoom+small, figure.Middle, fr.x.labels[i])
	}
	for _, b := range fr.p.Bands { // its edges, for those who see no tint
		for _, v := range []float64{b.Low, b.High} {
			if v > fr.y.low && v < fr.y.high {
				l := figure.Segment(fr.left, fr.y.place(v), fr.right, fr.y.place(v), figure.Frame)
				l.Dash = []float64{1, 3}
				fr.f.Add(l)
			}
		}
	}
	for _, b := range fr.p.Barred {
		for _, v := range []float64{b.Low, b.High} {
			if v > fr.y.low && v < fr.y.high {
				l := figure.Segment(fr.left, fr.y.place(v), fr.right, fr.y.place(v), figure.Alarm)
				l.Dash = []float64{4, 3}
				fr.f.Add(l)
			}
		}
	}
}

// edges draws the axes, and the stated range as a heavier stretch of the lower one.
func (fr *frame) edges() {
	fr.f.Add(figure.Segment(fr.left, fr.bottom, fr.right, fr.bottom, figure.Frame))
	fr.f.Add(figure.Segment(fr.left, fr.top, fr.left, fr.bottom, figure.Frame))
	if s := fr.p.Stated; s.there() {
		l := figure.Segment(fr.x.clamp(s.Low), fr.bottom, fr.x.clamp(s.High), fr.bottom, figure.Ink)
		l.Width = 3
		fr.f.Add(l)
	}
}

// strokes tell curves apart without colour: the first six are told by them and by
// their points' shapes, the next six by both anew.
var strokes = [][]float64{nil, {7, 3}, {2, 3}, {10, 3, 2, 3}, {5, 2, 1, 2, 1, 2}, {14, 4}}

func (fr *frame) curves() {
	for i := range fr.p.Curves {
		fr.curve(i)
	}
	if len(fr.p.Curves) > 1 {
		fr.curveNames()
	}
}

// curve draws one curve, a piece at a time between its gaps. Points that cannot be
// stable are dotted.
func (fr *frame) curve(i int) {
	c := &fr.p.Curves[i]
	paint := figure.Curve(c.Look)
	var piece []figure.Point
	doubtful := false
	flush := func() {
		switch {
		case len(piece) == 0:
		case len(piece) == 1 || fr.p.Steps:
			for _, pt := range piece {
				fr.shape(c.Look, pt)
			}
		default:
			l := &figure.Line{Points: straightened(piece), Paint: paint, Width: 2, Dash: strokes[c.Look%len(strokes)]}
			if doubtful {
				l.Width, l.Dash = 1, []float64{1, 2}
			}
			fr.f.Add(l)
		}
		piece = nil
	}
	for k, y := range c.Y {
		if math.IsNaN(y) || math.IsInf(y, 0) || fr.p.Log && c.X[k] <= 0 {
			flush()
			continue
		}
		at := figure.Point{X: fr.x.place(c.X[k]), Y: fr.y.place(y)}
		if y < fr.y.low || y > fr.y.high { // beyond what is shown
			if len(piece) > 0 {
				piece = append(piece, fr.cut(piece[len(piece)-1], at))
			}
			flush()
			continue
		}
		if len(piece) == 0 && k > 0 && !math.IsNaN(c.Y[k-1]) && (c.Y[k-1] < fr.y.low || c.Y[k-1] > fr.y.high) {
			piece = append(piece, fr.cut(at, figure.Point{X: fr.x.place(c.X[k-1]), Y: fr.y.place(c.Y[k-1])}))
		}
		if c.Doubtful != nil && c.Doubtful[k] != doubtful {
			flush()
			doubtful = c.Doubtful[k]
		}
		piece = append(piece, at)
	}
	flush()
	if len(fr.p.Curves) > 1 && !fr.p.Steps {
		fr.points(i)
	}
}

// straightened leaves out the points of a line that no eye would miss: those that lie on
// the line without them, to a twentieth of a point (the way of Ramer, 1972, and Douglas
// and Peucker, 1973, from memory).
func straightened(line []figure.Point) []figure.Point {
	const unseen = 0.05 // points
	if len(line) < 3 {
		return line
	}
	first, last := line[0], line[len(line)-1]
	dx, dy := last.X-first.X, last.Y-first.Y
	along := math.Hypot(dx, dy)
	far, at := 0.0, 0
	for i, p := range line[1 : len(line)-1] {
		// Off the chord, or from its start where it comes back to that.
		off := math.Hypot(p.X-first.X, p.Y-first.Y)
		if along > 0 {
			off = math.Abs((p.X-first.X)*dy-(p.Y-first.Y)*dx) / along
		}
		if off > far {
			far, at = off, i+1
		}
	}
	if far <= unseen {
		return []figure.Point{first, last}
	}
	out := straightened(line[:at+1])
	return append(out[:len(out):len(out)], straightened(line[at:])[1:]...)
}

// cut is where the way from a point inside to one outside leaves the plot.
func (fr *frame) cut(in, out figure.Point) figure.Point {
	edge := fr.top
	if out.Y > fr.bottom {
		edge = fr.bottom
	}
	share := (edge - in.Y) / (out.Y - in.Y)
	return figure.Point{X: in.X + share*(out.X-in.X), Y: edge}
}

// points puts a few shapes on a curve, at other places for each.
func (fr *frame) points(i int) {
	c := &fr.p.Curves[i]
	const some = 3 // on a curve: enough to follow it through a crossing
	n := len(c.X)
	for k := range some {
		at := (2*k+1)*n/(2*some) + i*n/(2*some*max(1, len(fr.p.Curves)))
		if at < n && c.Y[at] >= fr.y.low && c.Y[at] <= fr.y.high && !(fr.p.Log && c.X[at] <= 0) {
			fr.shape(c.Look, figure.Point{X: fr.x.place(c.X[at]), Y: fr.y.place(c.Y[at])})
		}
	}
}

// shape draws the i-th look's own shape: six of them, filled for the first six looks
// and hollow for the next.
func (fr *frame) shape(i int, at figure.Point) {
	paint := figure.Curve(i)
	fill := paint
	if i/figure.Curves%2 == 1 {
		fill = figure.Paper
	}
	const r = 4.0 // points
	corners := shapes[i%figure.Curves]
	if corners == nil {
		fr.f.Add(&figure.Dot{At: at, Radius: r - 0.5, Fill: fill, Edge: paint})
		return
	}
	a := &figure.Area{Fill: fill, Edge: paint, Width: 1.5}
	for _, c := range corners {
		a.Points = append(a.Points, figure.Point{X: at.X + r*c.X, Y: at.Y + r*c.Y})
	}
	fr.f.Add(a)
}

// shapes are the corners of the looks' shapes, in sizes of one; the first look has a dot.
var shapes = [figure.Curves][]figure.Point{
	1: {{X: -.85, Y: -.85}, {X: .85, Y: -.85}, {X: .85, Y: .85}, {X: -.85, Y: .85}},
	2: {{X: 0, Y: -1.1}, {X: 1, Y: .8}, {X: -1, Y: .8}},
	3: {{X: 0, Y: -1.2}, {X: 1.2, Y: 0}, {X: 0, Y: 1.2}, {X: -1.2, Y: 0}},
	4: {{X: 0, Y: 1.1}, {X: 1, Y: -.8}, {X: -1, Y: -.8}},
	// An upright cross.
	5: {
		{X: -.35, Y: -1.15},
		{X: .35, Y: -1.15},
		{X: .35, Y: -.35},
		{X: 1.15, Y: -.35},
		{X: 1.15, Y: .35},
		{X: .35, Y: .35},
		{X: .35, Y: 1.15},
		{X: -.35, Y: 1.15},
		{X: -.35, Y: .35},
		{X: -1.15, Y: .35},
		{X: -1.15, Y: -.35},
		{X: -.35, Y: -.35},
	},
}

// mostNames is how many curves are named; of more, every so many.
const mostNames = 12

// curveNames puts the names beside the curves' ends.
func (fr *frame) curveNames() {
	type end struct {
		curve int
		at    figure.Point
	}
	var ends []end
	every := (len(fr.p.Curves) + mostNames - 1) / mostNames
	for i := range fr.p.Curves {
		c := &fr.p.Curves[i]
		if i%every != 0 {
			continue
		}
		for k := len(c.Y) - 1; k >= 0; k-- {
			if !math.IsNaN(c.Y[k]) && !math.IsInf(c.Y[k], 0) {
				ends = append(ends, end{i, figure.Point{X: fr.x.clamp(c.X[k]), Y: fr.y.clamp(c.Y[k])}})
				break
			}
		}
	}
	sortBy(ends, func(e end) float64 { return e.at.Y })
	var wanted []float64
	for _, e := range ends {
		wanted = append(wanted, e.at.Y)
	}
	const below = 2 * small * line // beside the numbers of the axis there is room too
	places := apart(wanted, small*line, fr.top, fr.bottom+below)
	for k, e := range ends {
		x := fr.right + leader
		l := &figure.Line{Points: []figure.Point{e.at, {X: fr.right + 3, Y: places[k]}, {X: x - 2, Y: places[k]}}, Paint: figure.Curve(fr.p.Curves[e.curve].Look), Width: 0.75}
		fr.f.Add(l)
		fr.f.Add(&figure.Text{At: figure.Point{X: x, Y: places[k] + small/3}, Text: cut(fr.p.Curves[e.curve].Name), Size: small, Paint: figure.Curve(fr.p.Curves[e.curve].Look)})
	}
}

// marks draws the limits, their values above the plot.
func (fr *frame) marks() {
	var taken []*figure.Text
	for _, m := range fr.p.Marks {
		at := fr.x.clamp(m.X)
		l := figure.Segment(at, fr.top, at, fr.bottom, figure.Alarm)
		l.Width = 1.5
		fr.f.Add(l)
		t := &figure.Text{At: figure.Point{X: at, Y: fr.top - 4}, Text: m.Text, Size: small, Bold: true, Paint: figure.Alarm, Anchor: figure.Middle}
		w := textRoom(m.Text, small, true) / 2
		t.At.X = math.Max(fr.left+w, math.Min(t.At.X, fr.right-w))
		for _, other := range taken {
			if overlap(t, other) {
				t.At.Y = other.At.Y - small*line
			}
		}
		taken = append(taken, t)
		fr.f.Add(t)
	}
}

func overlap(a, b *figure.Text) bool {
	al, at, ar, ab := a.Extent()
	bl, bt, br, bb := b.Extent()
	const air = 4 // points between two texts on a line
	return al < br+air && bl < ar+air && at < bb && bt < ab
}
