package figure

import "image/color"

// A Paint is the role of a stroke, an area or a text. What colour it has depends on
// the scheme, light or dark; no meaning hangs on colour alone.
type Paint int

// The paints.
const (
	None Paint = iota
	Paper
	Ink       // text and outlines
	Soft      // text that stands back
	Frame     // axes
	Grid      // lines to read values by
	Band      // where a quantity may be
	Forbidden // where it must not be, or where a circuit no longer holds
	Outside   // beyond what is stated
	Alarm     // limits, and text about them
	Ohmic     // resistors in a picture of drops
	Junction  // diodes, emitters, zeners
	Active    // transistors
	Ideal     // sources, cells, ideal drops
	First     // the first curve; First+i is another
	Second
	Third
	Fourth
	Fifth
	Sixth
	paints
)

// Curves is how many paints curves have; more curves are told apart by their strokes.
const Curves = 6

// Curve is the paint of the i-th curve.
func Curve(i int) Paint { return First + Paint(i%Curves) }

// A scheme is the colours of all paints.
type scheme [paints]color.NRGBA

func rgb(hex uint32) color.NRGBA {
	return color.NRGBA{R: uint8(hex >> 16), G: uint8(hex >> 8), B: uint8(hex), A: 0xff}
}

// The two schemes. Text keeps a contrast of 4.5 and lines of 3 to everything they
// may stand on, as WCAG 2.2 asks (criteria 1.4.3 and 1.4.11); a test computes it.
var (
	light = scheme{
		Paper: rgb(0xffffff), Ink: rgb(0x1b2026), Soft: rgb(0x555e69), Frame: rgb(0x7d8791), Grid: rgb(0xe4e7eb),
		Band: rgb(0xdff1e5), Forbidden: rgb(0xfae6e1), Outside: rgb(0xf0f2f4), Alarm: rgb(0xa42a14),
		Ohmic: rgb(0xd6e3f3), Junction: rgb(0xfbe6bf), Active: rgb(0xe5daf4), Ideal: rgb(0xdfe3e6),
		First: rgb(0x1d5cab), Second: rgb(0xa84c06), Third: rgb(0x23713a), Fourth: rgb(0x87298c), Fifth: rgb(0x9d2338), Sixth: rgb(0x096d79),
	}
	dark = scheme{
		Paper: rgb(0x15181c), Ink: rgb(0xe9ecef), Soft: rgb(0xadb6c0), Frame: rgb(0x78828d), Grid: rgb(0x2b3138),
		Band: rgb(0x193526), Forbidden: rgb(0x42231d), Outside: rgb(0x1e2227), Alarm: rgb(0xffa18c),
		Ohmic: rgb(0x27384f), Junction: rgb(0x4a3a19), Active: rgb(0x3a2c52), Ideal: rgb(0x343a41),
		First: rgb(0x82b5ff), Second: rgb(0xffb36b), Third: rgb(0x80dc9a), Fourth: rgb(0xe5a0e9), Fifth: rgb(0xff97a4), Sixth: rgb(0x66d6e1),
	}
)
