package figure

import (
	"encoding/binary"
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"io"
	"math"

	"git.sr.ht/~sbinet/gg"
	"golang.org/x/image/font"
	"golang.org/x/image/math/fixed"
)

// Scale is how many pixels of a PNG stand for a point: enough for print and for
// fine screens.
const Scale = 2

// strip is how many rows of pixels are drawn at a time: what the processor's own memory
// holds of an ordinary figure.
const strip = 128

// WritePNG writes the figure as PNG (ISO/IEC 15948) in the light scheme, Scale pixels a
// point.
func WritePNG(w io.Writer, f *Figure) error {
	width, height := int(math.Round(f.Width*Scale)), int(math.Round(f.Height*Scale))
	out := image.NewPaletted(image.Rect(0, 0, width, height), nil)
	img := image.NewRGBA(image.Rect(0, 0, width, strip))
	c := &canvas{dc: gg.NewContextForRGBA(img), img: img, faces: map[faceKey]font.Face{}}
	p := newPalette()
	paper := image.NewUniform(light[Paper])
	for top := 0; top < height; top += strip {
		draw.Draw(img, img.Rect, paper, image.Point{}, draw.Src)
		c.top = float64(top)
		for _, s := range f.Shapes {
			if above, below := reach(s); below*Scale >= c.top && above*Scale <= c.top+strip {
				c.shape(s)
			}
		}
		rows := out.Pix[top*width : min(top+strip, height)*width]
		p.index(rows, img.Pix)
	}
	out.Palette = p.colours
	encoder := png.Encoder{CompressionLevel: png.BestSpeed}
	return encoder.Encode(w, out)
}

// reach is how far up and down a shape goes, in points, its strokes included.
func reach(s Shape) (above, below float64) {
	const stroke = 6 // points: more than half of any stroke, mitred corners included
	switch s := s.(type) {
	case *Line:
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

// A canvas draws shapes in pixels.
type canvas struct {
	dc    *gg.Context
	img   *image.RGBA // what dc draws on
	top   float64     // the figure's row of pixels that is the first of img
	faces map[faceKey]font.Face
}

func (c *canvas) shape(s Shape) {
	switch s := s.(type) {
	case *Line:
		c.line(s)
	case *Area:
		c.area(s)
	case *Dot:
		c.dot(s)
	case *Text:
		c.text(s)
	}
}

// y is where a height of the figure lies in the strip.
func (c *canvas) y(points float64) float64 { return points*Scale - c.top }

func (c *canvas) trace(points []Point) {
	for i, p := range points {
		if i == 0 {
			c.dc.MoveTo(p.X*Scale, c.y(p.Y))
			continue
		}
		c.dc.LineTo(p.X*Scale, c.y(p.Y))
	}
}

func (c *canvas) stroke(p Paint, width float64, dash []float64) {
	if width == 0 {
		width = 1
	}
	scaled := make([]float64, len(dash))
	for i, d := range dash {
		scaled[i] = d * Scale
	}
	c.dc.SetDash(scaled...)
	c.dc.SetLineWidth(width * Scale)
	c.dc.SetColor(light[p])
	c.dc.Stroke()
}

func (c *canvas) line(s *Line) {
	c.trace(s.Points)
	c.stroke(s.Paint, s.Width, s.Dash)
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
	at := func(pixels float64) int { return int(math.Round(pixels)) }
	return image.Rect(at(p[0].X*Scale), at(c.y(p[0].Y)), at(p[2].X*Scale), at(c.y(p[2].Y))), true
}

func (c *canvas) dot(s *Dot) {
	c.dc.DrawCircle(s.At.X*Scale, c.y(s.At.Y), s.Radius*Scale)
	c.fill(s.Fill, s.Edge, 0)
}

func (c *canvas) text(s *Text) {
	if s.Text == "" {
		return
	}
	if s.Plate {
		c.area(s.plate())
	}
	k := faceKey{s.Bold, s.Size * Scale}
	if c.faces[k] == nil {
		c.faces[k] = face(k.heavy, k.size)
	}
	const unit = 64 // 26.6 fixed point
	left, _ := s.span()
	d := font.Drawer{
		Dst: c.img, Src: image.NewUniform(light[s.Paint]), Face: c.faces[k],
		Dot: fixed.Point26_6{X: fixed.Int26_6(math.Floor(left * Scale * unit)), Y: fixed.Int26_6(math.Floor(c.y(s.At.Y) * unit))},
	}
	d.DrawString(s.Text)
}

// A palette gives a picture an index of its colours, which makes it a third as large and
// much sooner written: the paints as they are, and what lies between them at an edge
// in sixteen steps a channel. It fills as colours come.
type palette struct {
	colours color.Palette
	at      map[uint32]uint8
	exact   map[uint32]bool
}

func newPalette() *palette {
	p := &palette{at: map[uint32]uint8{}, exact: map[uint32]bool{}}
	for _, c := range light[Paper:] {
		p.exact[uint32(c.R)<<16|uint32(c.G)<<8|uint32(c.B)] = true
	}
	return p
}

// index fills out with the places of as many pixels, opaque RGBA. Most pixels are those
// before them, so two are looked at in one stroke.
func (p *palette) index(out, pix []uint8) {
	const opaque, bits = 0xff << 24, 32 // of a pixel read as one little-endian number
	last, index := uint64(opaque), p.of(0)
	for i := 0; i < len(out); i++ {
		if i+1 < len(out) && binary.LittleEndian.Uint64(pix[4*i:]) == last|last<<bits {
			out[i], out[i+1] = index, index
			i++
			continue
		}
		if px := uint64(binary.LittleEndian.Uint32(pix[4*i:])); px != last {
			last = px
			index = p.of(uint32(px)&0xff<<16 | uint32(px)&0xff00 | uint32(px)>>16&0xff)
		}
		out[i] = index
	}
}

// of is the place of a colour.
func (p *palette) of(rgb uint32) uint8 {
	if at, ok := p.at[rgb]; ok {
		return at
	}
	shown := rgb
	if !p.exact[rgb] {
		const high = 0xf0f0f0 // the upper half of each channel
		shown = rgb&high | rgb&high>>4
	}
	at, ok := p.at[shown]
	if !ok {
		c := color.RGBA{uint8(shown >> 16), uint8(shown >> 8), uint8(shown), 0xff}
		const most = 256 // entries of a palette
		if len(p.colours) < most {
			at = uint8(len(p.colours))
			p.colours = append(p.colours, c)
			p.at[shown] = at
		} else {
			at = uint8(p.colours.Index(c))
		}
	}
	p.at[rgb] = at
	return at
}
