package figure

import (
	"sync"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/gobold"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
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
		const fixed = 64 // 26.6 fixed point
		w = float64(font.MeasureString(measure.faces[heavy], text)) / fixed / measureSize
		measure.widths[k] = w
	}
	return w * size
}
