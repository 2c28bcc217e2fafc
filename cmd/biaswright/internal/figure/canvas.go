package figure

import (
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
	upright := a.X == b.X
	if !upright && a.Y != b.Y {
		return false
	}
	width := s.Width
	if width == 0 {
		width = 1
	}
	paint := image.NewUniform(light[s.Paint])
	dashes(math.Abs(b.X-a.X)+math.Abs(b.Y-a.Y), s.Dash, func(from, to float64) {
		stroke := image.Rect(0, 0, 0, 0)
		if upright {
			y := a.Y
			if b.Y < a.Y {
				from, to = -from, -to
			}
			stroke.Min.X, stroke.Max.X = c.thick(c.x(a.X), width)
			stroke.Min.Y, stroke.Max.Y = whole(c.y(y+from)), whole(c.y(y+to))
		} else {
			if b.X < a.X {
				from, to = -from, -to
			}
			stroke.Min.X, stroke.Max.X = whole(c.x(a.X+from)), whole(c.x(a.X+to))
			stroke.Min.Y, stroke.Max.Y = c.thick(c.y(a.Y), width)
		}
		draw.Draw(c.img, stroke.Canon(), paint, image.Point{}, draw.Src)
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

func whole(pixels float64) int { return int(math.Round(pixels)) }

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
	fill := s.Fill
	if box, level := c.box(s); level && fill != None { // whole pixels: sharper, and sooner done
		draw.Draw(c.img, box, image.NewUniform(light[fill]), image.Point{}, draw.Src)
		fill = None
	}
	c.trace(s.Points)
	c.dc.ClosePath()
	c.fill(fill, s.Edge, s.Width)
}

// box is the area in pixels, if its edges are level.
func (c *canvas) box(s *Area) (image.Rectangle, bool) {
	p := s.Points
	if len(p) != 4 || p[0].Y != p[1].Y || p[1].X != p[2].X || p[2].Y != p[3].Y || p[3].X != p[0].X {
		return image.Rectangle{}, false
	}
	return image.Rect(whole(c.x(p[0].X)), whole(c.y(p[0].Y)), whole(c.x(p[2].X)), whole(c.y(p[2].Y))), true
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

const (
	unit = 64       // of 26.6 fixed point, a pixel
	step = unit / 4 // at which glyphs are drawn, across: no eye sees less
)

// glyphs are a face that draws each letter once, at each of four places in a pixel;
// figures come again and again. Baselines lie on whole pixels.
type glyphs struct {
	font.Face
	known map[glyphKey]glyph
}

type glyphKey struct {
	r     rune
	place fixed.Int26_6 // in a pixel, across
}

// A glyph is a letter's ink, with where it stands about its place.
type glyph struct {
	ink     *image.Alpha
	about   image.Rectangle
	advance fixed.Int26_6
	ok      bool
}

// Glyph is font.Face's.
func (g *glyphs) Glyph(dot fixed.Point26_6, r rune) (at image.Rectangle, ink image.Image, from image.Point, advance fixed.Int26_6, ok bool) {
	x := (dot.X + step/2) / step * step
	k := glyphKey{r, x & (unit - 1)}
	known, seen := g.known[k]
	if !seen {
		known = g.draw(k)
		g.known[k] = known
	}
	return known.about.Add(image.Pt(x.Floor(), dot.Y.Floor())), known.ink, image.Point{}, known.advance, known.ok
}

func (g *glyphs) draw(k glyphKey) glyph {
	about, ink, from, advance, ok := g.Face.Glyph(fixed.Point26_6{X: k.place}, k.r)
	own := image.NewAlpha(image.Rectangle{Max: about.Size()})
	if of, alpha := ink.(*image.Alpha); ok && alpha { // the face uses its own again
		for y := range about.Dy() {
			copy(own.Pix[y*own.Stride:(y+1)*own.Stride], of.Pix[of.PixOffset(from.X, from.Y+y):])
		}
	} else if ok {
		draw.Draw(own, own.Rect, ink, from, draw.Src)
	}
	return glyph{own, about, advance, ok}
}
