package figure

import (
	"cmp"
	"image"
	"image/draw"
	"math"

	"git.sr.ht/~sbinet/gg"
	"golang.org/x/image/font"
	"golang.org/x/image/math/fixed"
)

// strip is how many rows of pixels are drawn at a time: few enough for the processor's own
// memory, and enough that few shapes lie across two.
const strip = 128

// reach is how far up and down a shape goes, in points, its strokes included.
func reach(s Shape) (above, below float64) {
	const stroke = 6 // points: more than half of any stroke, mitred corners included
	switch s := s.(type) {
	case *Line:
		above, below = heights(s.Points)
	case *Strokes:
		above, below = heights(s.Points)
	case *Area:
		above, below = heights(s.Points)
	case *Dot:
		above, below = s.At.Y-s.Radius, s.At.Y+s.Radius
	case *Text:
		_, above, _, below = s.Extent()
	}
	return above - stroke, below + stroke
}

func heights(points []Point) (above, below float64) {
	above, below = math.Inf(1), math.Inf(-1)
	for _, p := range points {
		above, below = math.Min(above, p.Y), math.Max(below, p.Y)
	}
	return above, below
}

type faceKey struct {
	heavy bool
	size  float64
}

// A canvas draws shapes in pixels, a strip at a time.
type canvas struct {
	dc    *gg.Context
	img   *image.RGBA // what dc draws on
	scale float64     // pixels a point
	top   float64     // the figure's row of pixels that is the first of img
	faces map[faceKey]font.Face
}

func newCanvas(width int, scale float64) *canvas {
	img := image.NewRGBA(image.Rect(0, 0, width, strip))
	c := &canvas{dc: gg.NewContextForRGBA(img), img: img, scale: scale, faces: map[faceKey]font.Face{}}
	c.dc.SetLineCapButt() // as strokes of an SVG end
	return c
}

// draw draws the strip that begins at a row of pixels.
func (c *canvas) draw(f *Figure, top int) {
	c.top = float64(top)
	draw.Draw(c.img, c.img.Rect, image.NewUniform(light[Paper]), image.Point{}, draw.Src)
	for _, s := range f.Shapes {
		if c.reached(reach(s)) {
			c.shape(s)
		}
	}
}

func (c *canvas) shape(s Shape) {
	switch s := s.(type) {
	case *Line:
		c.line(s)
	case *Strokes:
		c.strokes(s)
	case *Area:
		c.area(s)
	case *Dot:
		c.dot(s)
	case *Text:
		c.text(s)
	}
}

// reached tells whether some of a shape lies in the strip, given how far it goes.
func (c *canvas) reached(above, below float64) bool {
	return below*c.scale >= c.top && above*c.scale <= c.top+strip
}

// y is where a height of the figure lies in the strip.
func (c *canvas) y(points float64) float64 { return points*c.scale - c.top }

func (c *canvas) x(points float64) float64 { return points * c.scale }

func (c *canvas) trace(points []Point) {
	for i, p := range points {
		if i == 0 {
			c.dc.MoveTo(c.x(p.X), c.y(p.Y))
			continue
		}
		c.dc.LineTo(c.x(p.X), c.y(p.Y))
	}
}

func (c *canvas) stroke(p Paint, width float64, dash []float64) {
	if width == 0 {
		width = 1
	}
	scaled := make([]float64, len(dash))
	for i, d := range dash {
		scaled[i] = d * c.scale
	}
	c.dc.SetDash(scaled...)
	c.dc.SetLineWidth(width * c.scale)
	c.dc.SetColor(light[p])
	c.dc.Stroke()
}

func (c *canvas) line(s *Line) {
	if c.level(s) {
		return
	}
	c.trace(s.Points)
	c.stroke(s.Paint, s.Width, s.Dash)
}

// level draws a line that runs along the pixels in whole ones, and tells whether it is
// such a line: it is sharper, and sooner done.
func (c *canvas) level(s *Line) bool {
	if len(s.Points) != 2 {
		return false
	}
	a, b := s.Points[0], s.Points[1]
	dx, dy := cmp.Compare(b.X, a.X), cmp.Compare(b.Y, a.Y)
	if dx != 0 && dy != 0 {
		return false
	}
	width := s.Width
	if width == 0 {
		width = 1
	}
	at := func(along float64) image.Point {
		return image.Pt(whole(c.x(a.X+float64(dx)*along)), whole(c.y(a.Y+float64(dy)*along)))
	}
	paint := image.NewUniform(light[s.Paint])
	dashes(math.Hypot(b.X-a.X, b.Y-a.Y), s.Dash, func(from, to float64) {
		r := image.Rectangle{at(from), at(to)}.Canon()
		if dx == 0 {
			r.Min.X, r.Max.X = c.thick(c.x(a.X), width)
		} else {
			r.Min.Y, r.Max.Y = c.thick(c.y(a.Y), width)
		}
		draw.Draw(c.img, r, paint, image.Point{}, draw.Src)
	})
	return true
}

// dashes calls stroke for each stroke of a line so long.
func dashes(length float64, dash []float64, stroke func(from, to float64)) {
	if len(dash) == 0 {
		stroke(0, length)
		return
	}
	at := 0.0
	for i := 0; at < length; i++ {
		next := at + dash[i%len(dash)]
		if i%2 == 0 {
			stroke(at, math.Min(next, length))
		}
		at = next
	}
}

// thick is where a line begins and ends across its course, a width in points apart and at
// least one pixel.
func (c *canvas) thick(course, width float64) (from, to int) {
	across := max(1, whole(width*c.scale))
	from = whole(course - float64(across)/2)
	return from, from + across
}

// whole rounds to whole pixels, halves always up: the same in every strip.
func whole(pixels float64) int { return int(math.Floor(pixels + 0.5)) }

func (c *canvas) strokes(s *Strokes) {
	for i := 0; i+1 < len(s.Points); i += 2 {
		if one := s.Points[i : i+2]; c.reached(reach(&Line{Points: one})) {
			c.trace(one)
		}
	}
	c.stroke(s.Paint, s.Width, nil)
}

func (c *canvas) fill(fill, edge Paint, width float64) {
	if fill != None {
		c.dc.SetColor(light[fill])
		c.dc.FillPreserve()
	}
	if edge != None {
		c.stroke(edge, width, nil)
	}
	c.dc.ClearPath()
}

func (c *canvas) area(s *Area) {
	if s.level() {
		c.box(s)
		return
	}
	c.trace(s.Points)
	c.dc.ClosePath()
	c.fill(s.Fill, s.Edge, s.Width)
}

// level tells an area whose edges are level: as Box makes it, from the upper left corner.
func (s *Area) level() bool {
	p := s.Points
	return len(p) == 4 && p[0].Y == p[1].Y && p[1].X == p[2].X && p[2].Y == p[3].Y && p[3].X == p[0].X
}

// box draws such an area in whole pixels: sharper, and sooner done.
func (c *canvas) box(s *Area) {
	a, b := s.Points[0], s.Points[2]
	fill := func(r image.Rectangle, p Paint) {
		draw.Draw(c.img, r, image.NewUniform(light[p]), image.Point{}, draw.Src)
	}
	if s.Fill != None {
		fill(image.Rect(whole(c.x(a.X)), whole(c.y(a.Y)), whole(c.x(b.X)), whole(c.y(b.Y))), s.Fill)
	}
	if s.Edge == None {
		return
	}
	width := s.Width
	if width == 0 {
		width = 1
	}
	var left, right, above, below [2]int // where each edge begins and ends, across it
	left[0], left[1] = c.thick(c.x(a.X), width)
	right[0], right[1] = c.thick(c.x(b.X), width)
	above[0], above[1] = c.thick(c.y(a.Y), width)
	below[0], below[1] = c.thick(c.y(b.Y), width)
	for _, r := range []image.Rectangle{
		image.Rect(left[0], above[0], right[1], above[1]), image.Rect(left[0], below[0], right[1], below[1]),
		image.Rect(left[0], above[0], left[1], below[1]), image.Rect(right[0], above[0], right[1], below[1]),
	} {
		fill(r, s.Edge)
	}
}

func (c *canvas) dot(s *Dot) {
	c.dc.DrawCircle(c.x(s.At.X), c.y(s.At.Y), s.Radius*c.scale)
	c.fill(s.Fill, s.Edge, 0)
}

func (c *canvas) text(s *Text) {
	if s.Text == "" {
		return
	}
	if s.Plate {
		c.area(s.plate())
	}
	k := faceKey{s.Bold, s.Size * c.scale}
	if c.faces[k] == nil {
		c.faces[k] = &glyphs{Face: face(k.heavy, k.size), known: map[glyphKey]glyph{}}
	}
	left, _ := s.span()
	d := font.Drawer{
		Dst: c.img, Src: image.NewUniform(light[s.Paint]), Face: c.faces[k],
		Dot: fixed.Point26_6{X: fixed.Int26_6(math.Floor(c.x(left) * unit)), Y: fixed.I(whole(c.y(s.At.Y)))},
	}
	d.DrawString(s.Text)
}
