package chart

import (
	"math"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/solve"
)

// A picture is a headroom picture: the volts of one or more points to one scale, a
// column for each path, each element a block as tall as its drop.
type picture struct {
	title string
	s     *stack
	from  int // columns [from, to) of the stack
	to    int
	tall  float64 // points of the scale
	low   float64 // V, shared by the pictures of a sheet
	high  float64
}

// Measures of the picture, in points.
const (
	blockWidth = 34.0
	laneWidth  = 14.0 // of a block beside the path's own place
	labelRoom  = 12.0 // from a block to its text
	columnGap  = 14.0
	headRoom   = 2*normal*line + 8
)

// labelSize is the room for the texts of a column.
func (c *column) labelSize() float64 {
	w := 0.0
	for _, l := range c.labels() {
		w = math.Max(w, textRoom(l.text, small, false))
	}
	return w
}

func (c *column) width() float64 {
	return blockWidth + float64(c.lanes()-1)*(laneWidth+2) + labelRoom + c.labelSize() + columnGap
}

// scaleRoom is what the volts at the left take, levelRoom the levels' names at the
// right.
func (p *picture) scaleRoom() float64 {
	return p.axis().labelWidth() + 2*tickRoom + columnGap
}

func (p *picture) levelRoom() float64 {
	w := 0.0
	for _, l := range p.s.levels {
		w = math.Max(w, textRoom(levelText(l), small, true))
	}
	return w + tickRoom
}

func levelText(l level) string {
	if l.name == "gnd" {
		return "gnd"
	}
	return l.name + " " + volts(l.volts)
}

func (p *picture) axis() *axis {
	const perRow = 30 // points that a number wants
	return newAxis(p.low, p.high, "V", false, max(2, int(p.tall/perRow)))
}

// natural is the width the picture wants.
func (p *picture) natural() float64 {
	w := p.scaleRoom() + p.levelRoom()
	for i := p.from; i < p.to; i++ {
		w += p.s.columns[i].width()
	}
	return math.Max(w, textRoom(p.title, normal, true))
}

func (p *picture) height(float64) float64 { return headRoom + p.tall + 2*small }

// draw puts the picture; columns keep their own widths, whatever there is.
func (p *picture) draw(f *figure.Figure, left, top, _ float64) {
	heading(f, left, top+normal, p.title)
	top += headRoom
	bottom := top + p.tall
	y := p.axis()
	y.from, y.to = bottom, top
	x := left + p.scaleRoom()
	right := left + p.natural() - p.levelRoom()
	for i, v := range y.ticks {
		at := y.place(v)
		f.Add(figure.Segment(x-columnGap, at, right, at, figure.Grid))
		note(f, x-columnGap-tickRoom, at+small/3, figure.End, y.labels[i])
	}
	note(f, left, top-headRoom+normal+normal*line, figure.Start, "["+y.symbol+"]")
	p.levels(f, y, x-columnGap, right)
	places := make([]float64, p.to-p.from) // the left edges of the columns
	for i := range places {
		places[i] = x
		x += p.s.columns[p.from+i].width()
	}
	p.joins(f, y, places)
	for i, at := range places {
		p.column(f, y, &p.s.columns[p.from+i], at, top, bottom)
	}
}

// levels draws the rails and gnd across, their names at the right and apart.
func (p *picture) levels(f *figure.Figure, y *axis, left, right float64) {
	levels := append([]level(nil), p.s.levels...)
	sortBy(levels, func(l level) float64 { return -l.volts })
	var wanted []float64
	for _, l := range levels {
		wanted = append(wanted, y.clamp(l.volts))
	}
	places := apart(wanted, small*line, y.to-small/2, y.from+small)
	for i, l := range levels {
		s := figure.Segment(left, wanted[i], right, wanted[i], figure.Ink)
		s.Width = 1.5
		f.Add(s)
		f.Add(&figure.Text{At: figure.Point{X: right + tickRoom, Y: places[i] + small/3}, Text: levelText(l), Size: small, Bold: true, Paint: figure.Ink})
	}
}

// joins draws the nodes that columns share.
func (p *picture) joins(f *figure.Figure, y *axis, places []float64) {
	for _, j := range p.s.joins(p.from, p.to) {
		first, last := math.Inf(1), math.Inf(-1)
		for _, i := range append(append([]int(nil), j.columns...), j.bases...) {
			at := places[i-p.from] + blockWidth/2
			first, last = math.Min(first, at), math.Max(last, at)
		}
		l := figure.Segment(first, y.clamp(j.volts), last, y.clamp(j.volts), figure.Ink)
		l.Dash = []float64{2, 3}
		f.Add(l)
	}
}

func (p *picture) column(f *figure.Figure, y *axis, c *column, left, top, bottom float64) {
	for i := range c.blocks {
		drawBlock(f, y, &c.blocks[i], left)
	}
	for i := range c.nodes {
		if n := &c.nodes[i]; !n.held {
			f.Add(&figure.Dot{At: figure.Point{X: left + blockWidth/2, Y: y.clamp(n.volts)}, Radius: 2.5, Fill: figure.Ink})
		}
	}
	edge := left + blockWidth + float64(c.lanes()-1)*(laneWidth+2)
	labels := c.labels()
	var wanted []float64
	for _, l := range labels {
		wanted = append(wanted, y.clamp(l.volts))
	}
	places := apart(wanted, small*line, top+small, bottom-small)
	if high, low := c.ends(y); float64(len(labels))*small*line < low-high { // room between its own ends
		places = apart(wanted, small*line, high+small, low-small)
	}
	for i, l := range labels {
		from := edge
		if l.node {
			from = left + blockWidth/2 + 4
		} else if c.lanes() > 1 && l.lane == 0 {
			from = left + blockWidth
		}
		paint := figure.Ink
		if l.node {
			paint = figure.Soft
		}
		end := edge + labelRoom
		f.Add(&figure.Line{Points: []figure.Point{{X: from, Y: wanted[i]}, {X: edge + 1, Y: wanted[i]}, {X: end - 2, Y: places[i]}}, Paint: figure.Frame, Width: 0.75})
		f.Add(&figure.Text{At: figure.Point{X: end, Y: places[i] + small/3}, Text: l.text, Size: small, Paint: paint, Plate: true})
	}
}

// ends are where a column begins and ends, from above: texts between them cross no rail.
func (c *column) ends(y *axis) (high, low float64) {
	high, low = math.Inf(1), math.Inf(-1)
	for i := range c.blocks {
		b := &c.blocks[i]
		high, low = math.Min(high, y.clamp(b.top())), math.Max(low, y.clamp(b.bottom()))
	}
	return high, low
}

// drawBlock draws an element: as tall as its drop, members of a row parted by lines,
// a transistor's spare volts hatched.
func drawBlock(f *figure.Figure, y *axis, b *block, left float64) {
	right := left + blockWidth
	if b.lane > 0 {
		left = right + 2 + float64(b.lane-1)*(laneWidth+2)
		right = left + laneWidth
	}
	top, bottom := y.clamp(b.top()), y.clamp(b.bottom())
	const least = 1.5 // points: what has next to no drop is still seen
	if bottom-top < least {
		middle := (top + bottom) / 2
		top, bottom = middle-least/2, middle+least/2
	}
	f.Add(figure.Box(left, top, right, bottom, b.kind, figure.None))
	if spare := b.spare(); spare > 0 {
		a, z := y.clamp(b.edge), y.clamp(b.collector)
		hatch(f, left, math.Min(a, z), right, math.Max(a, z))
		f.Add(figure.Segment(left, a, right, a, figure.Ink))
	}
	for k := 1; k < b.row; k++ {
		at := top + (bottom-top)*float64(k)/float64(b.row)
		f.Add(figure.Segment(left, at, right, at, figure.Frame))
	}
	f.Add(figure.Box(left, top, right, bottom, figure.None, figure.Ink))
	if !math.IsNaN(b.base) { // the base's height, on the block's left edge
		f.Add(&figure.Dot{At: figure.Point{X: left, Y: y.clamp(b.base)}, Radius: 3, Fill: figure.Paper, Edge: figure.Ink})
	}
}

// hatch fills a box with paper and slanting lines.
func hatch(f *figure.Figure, left, top, right, bottom float64) {
	f.Add(figure.Box(left, top, right, bottom, figure.Paper, figure.None))
	const every = 7.0 // points, down
	lines := &figure.Strokes{Paint: figure.Frame, Width: 0.6}
	width := right - left
	for at := top; at < bottom+width; at += every {
		// From (left, at) up to (right, at - width), cut at the box's edges.
		x1, y1, x2, y2 := left, at, right, at-width
		if y1 > bottom {
			x1, y1 = x1+(y1-bottom), bottom
		}
		if y2 < top {
			x2, y2 = x2-(top-y2), top
		}
		if x1 < x2 {
			lines.Points = append(lines.Points, figure.Point{X: x1, Y: y1}, figure.Point{X: x2, Y: y2})
		}
	}
	f.Add(lines)
}

// mostColumns is how many paths stand side by side in one row of pictures.
const mostColumns = 8

// heightFor is how tall the scale is: enough for the texts of the fullest column.
func heightFor(stacks ...*stack) float64 {
	const ordinary = 380.0 // points
	tall := ordinary
	for _, s := range stacks {
		for i := range s.columns {
			tall = math.Max(tall, float64(len(s.columns[i].labels())+1)*small*line)
		}
	}
	return tall
}

// pictures makes the rows of pictures of points that share one scale: those of one
// row of paths side by side. A row has as many paths as keep it no wider than a sheet
// may be, one at least, and all rows about as many.
func pictures(points []*solve.Point, titles []string) [][]*picture {
	var stacks []*stack
	low, high := 0.0, 0.0
	for _, p := range points {
		s := newStack(p)
		stacks = append(stacks, s)
		low, high = math.Min(low, s.low), math.Max(high, s.high)
	}
	if low == high { // nothing stands anywhere
		high = low + 1
	}
	tall := heightFor(stacks...)
	most := 0
	for _, s := range stacks {
		most = max(most, len(s.columns))
	}
	for parts := (most + mostColumns - 1) / mostColumns; ; parts++ {
		columns := (most + parts - 1) / max(parts, 1)
		rows := rowsOf(stacks, titles, columns, most)
		for _, row := range rows {
			for _, p := range row {
				p.tall, p.low, p.high = tall, low, high
			}
		}
		if columns <= 1 || widthOf(rows) <= widestSheet {
			return rows
		}
	}
}

// rowsOf parts the paths of pictures, the most of which a picture has, into rows of so many.
func rowsOf(stacks []*stack, titles []string, columns, most int) [][]*picture {
	var rows [][]*picture
	for from := 0; from < most; from += columns {
		var row []*picture
		for i, s := range stacks {
			row = append(row, &picture{title: titles[i], s: s, from: min(from, len(s.columns)), to: min(from+columns, len(s.columns))})
		}
		rows = append(rows, row)
	}
	return rows
}

// widestSheet is how wide a sheet of pictures may be, in points.
const widestSheet = 2400.0

// pictures puts rows of pictures on a sheet, those of one point below each other.
func (s *sheet) pictures(rows [][]*picture) {
	widths := columnWidths(rows)
	for _, row := range rows {
		x := margin
		for i, p := range row {
			p.draw(s.f, x, s.top, 0)
			x += widths[i] + between
		}
		s.top += row[0].height(0) + between
	}
}

// columnWidths are the widths that the pictures of each point want.
func columnWidths(rows [][]*picture) []float64 {
	var out []float64
	for _, row := range rows {
		for i, p := range row {
			if i == len(out) {
				out = append(out, 0)
			}
			out[i] = math.Max(out[i], p.natural())
		}
	}
	return out
}

// widthOf is the width that rows of pictures want, margins included.
func widthOf(rows [][]*picture) float64 {
	all := 2*margin - between
	for _, w := range columnWidths(rows) {
		all += w + between
	}
	return all
}

// Headroom is the headroom picture of one point.
func Headroom(a *render.Answer) *figure.Figure {
	rows := pictures([]*solve.Point{a.Result.Point}, []string{"Where the volts go"})
	const narrow = 420 // points, so that a title has room
	s := newSheet(math.Max(narrow, widthOf(rows)), titleOf(a.Circuit, a.File), render.Under(a))
	s.pictures(rows)
	return s.done()
}
