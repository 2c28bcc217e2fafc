package figure

import (
	"image"
	"image/draw"
	"sync"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/gobold"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
)

// The Go fonts, drawn by Bigelow & Holmes for the Go project, under its licence.
var (
	regular = sync.OnceValue(func() *opentype.Font { return parsed(goregular.TTF) })
	bold    = sync.OnceValue(func() *opentype.Font { return parsed(gobold.TTF) })
)

func parsed(ttf []byte) *opentype.Font {
	f, err := opentype.Parse(ttf)
	if err != nil {
		panic("figure: a font that ships cannot be read: " + err.Error())
	}
	return f
}

// face is a font at a size in pixels. Outlines stay as they were drawn, so that
// widths scale with the size.
func face(heavy bool, size float64) font.Face {
	f := regular()
	if heavy {
		f = bold()
	}
	const perInch = 72 // at which a point is a pixel
	out, err := opentype.NewFace(f, &opentype.FaceOptions{Size: size, DPI: perInch, Hinting: font.HintingNone})
	if err != nil {
		panic("figure: a font that ships has no face: " + err.Error())
	}
	return out
}

// measureSize is the size in points at which texts are measured once and for all:
// large enough that the fonts' own units are not rounded away.
const measureSize = 256

// A measured text is asked for again and again as a figure is laid out.
type measured struct {
	text  string
	heavy bool
}

var measure = struct {
	sync.Mutex
	faces  map[bool]font.Face
	widths map[measured]float64 // at a size of 1
}{faces: map[bool]font.Face{}, widths: map[measured]float64{}}

// TextWidth is the width of a text in points, in the fonts that ship.
func TextWidth(text string, size float64, heavy bool) float64 {
	measure.Lock()
	defer measure.Unlock()
	k := measured{text, heavy}
	w, ok := measure.widths[k]
	if !ok {
		if measure.faces[heavy] == nil {
			measure.faces[heavy] = face(heavy, measureSize)
		}
		w = float64(font.MeasureString(measure.faces[heavy], text)) / unit / measureSize
		measure.widths[k] = w
	}
	return w * size
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
