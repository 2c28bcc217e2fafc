package figure

import (
	"encoding/binary"
	"image/color"
	"math"
)

// A palette gives a picture an index of its colours, which makes it smaller and sooner
// written: the paints as they are, and what lies between them at an edge
// in sixteen steps a channel. It fills as colours come.
type palette struct {
	colours []color.NRGBA
	at      map[uint32]uint8 // the place of a colour as it is shown
	// recent are the places of colours as they are drawn, by a hash of theirs: an edge
	// comes in few.
	recent [1 << recentBits]struct {
		rgb   uint32 // and known, an upper byte that is not 0
		place uint8
	}
}

const (
	recentBits = 10
	known      = 1 << 24
)

func packed(r, g, b uint8) uint32 { return uint32(r)<<16 | uint32(g)<<8 | uint32(b) }

// common is how many places are the same in all palettes: the paints', and some that are
// not used, to make a power of two.
const common = 32

// newPalette has the paints at their places, paper at 0.
func newPalette() *palette {
	p := &palette{colours: make([]color.NRGBA, common, 2*common), at: make(map[uint32]uint8, 2*common)}
	for i := range p.colours {
		p.colours[i] = light[Paper]
	}
	for i, c := range light[Paper:] {
		p.colours[i] = c
		p.at[packed(c.R, c.G, c.B)] = uint8(i)
	}
	return p
}

// index fills out with the places of as many pixels, opaque RGBA. Most pixels are those
// before them, so four are looked at in one stroke.
func (p *palette) index(out, pix []uint8) {
	const opaque, bits = 0xff << 24, 32 // of a pixel read as one little-endian number
	last, place := uint64(opaque), p.of(0)
	twice := last<<bits | last
	for i := 0; i < len(out); i++ {
		for ; i+4 <= len(out); i += 4 {
			px := pix[4*i : 4*i+16]
			if binary.LittleEndian.Uint64(px) != twice || binary.LittleEndian.Uint64(px[8:]) != twice {
				break
			}
			four := out[i : i+4]
			four[0], four[1], four[2], four[3] = place, place, place, place
		}
		if i == len(out) {
			return
		}
		if px := uint64(binary.LittleEndian.Uint32(pix[4*i:])); px != last {
			last, twice = px, px<<bits|px
			place = p.of(packed(uint8(px), uint8(px>>8), uint8(px>>16)))
		}
		out[i] = place
	}
}

// of is the place of a colour.
func (p *palette) of(rgb uint32) uint8 {
	const spread = 0x9e3779b1 // 2^32 over the golden ratio (Knuth's multiplicative hash)
	r := &p.recent[rgb*spread>>(32-recentBits)]
	if r.rgb != rgb|known {
		r.rgb, r.place = rgb|known, p.shown(rgb)
	}
	return r.place
}

// shown is the place of what a colour is shown as: itself, where it has a place.
func (p *palette) shown(rgb uint32) uint8 {
	if at, ok := p.at[rgb]; ok {
		return at
	}
	const high = 0xf0f0f0 // the upper half of each channel
	return p.add(rgb&high | rgb&high>>4)
}

// add is the place of a colour, a new one while there is room, then the nearest.
func (p *palette) add(rgb uint32) uint8 {
	at, ok := p.at[rgb]
	if ok {
		return at
	}
	const most = 256 // entries of a palette
	if len(p.colours) < most {
		at = uint8(len(p.colours))
		p.colours = append(p.colours, color.NRGBA{uint8(rgb >> 16), uint8(rgb >> 8), uint8(rgb), 0xff})
	} else {
		at = p.nearest(rgb)
	}
	p.at[rgb] = at
	return at
}

// nearest is the place of the colour with the least sum of squares from another.
func (p *palette) nearest(rgb uint32) uint8 {
	at, least := 0, math.MaxInt
	for i, c := range p.colours {
		r, g, b := int(c.R)-int(rgb>>16), int(c.G)-int(rgb>>8&0xff), int(c.B)-int(rgb&0xff)
		if d := r*r + g*g + b*b; d < least {
			at, least = i, d
		}
	}
	return uint8(at)
}

// join adds another's colours and tells the places they have here.
func (p *palette) join(other *palette) []uint8 {
	const most = 256 // the places a byte can name, so that none needs looking after
	places := make([]uint8, most)
	for i := range common {
		places[i] = uint8(i)
	}
	for i, c := range other.colours[common:] {
		places[common+i] = p.add(packed(c.R, c.G, c.B))
	}
	return places
}

// rename gives pixels their places in another palette.
func rename(pixels, places []uint8) {
	const (
		stroke = 8                  // pixels looked at together
		beyond = 0xe0e0e0e0e0e0e0e0 // the bits of places from common on
	)
	for len(pixels) >= stroke {
		if binary.LittleEndian.Uint64(pixels)&beyond != 0 {
			for i, at := range pixels[:stroke] {
				pixels[i] = places[at]
			}
		}
		pixels = pixels[stroke:]
	}
	for i, at := range pixels {
		pixels[i] = places[at]
	}
}
