// Package render turns answers into text: the screens people read and the JSON
// that scripts read. It computes nothing but presentation.
package render

import (
	"io"
	"strings"
	"unicode"

	"github.com/clipperhouse/displaywidth"
)

// Columns is the width that screens keep to where names allow: it fits two
// windows side by side on a common display, and a printed page.
const Columns = 100

// Look says how a screen is drawn.
type Look struct {
	Plain  bool // ASCII only
	Colour bool // ANSI colour and weight
}

// Glyphs of the drawing, each in its two forms.
var (
	wire    = glyph{"│", "|"}
	dot     = glyph{"●", "*"} // a named node: the connection dot of a schematic
	ring    = glyph{"○", "o"} // a node that no word of the file names
	supply  = glyph{"┬", "+"} // a path's start on a rail or on gnd
	ground  = glyph{"┴", "="} // a path's end on a rail or on gnd
	leaves  = glyph{"├─▸", "|->"}
	joins   = glyph{"├─◂", "|-<"}
	inward  = glyph{"◂", "<-"} // into a placed part, or out of it
	outward = glyph{"▸", "->"}
	// The last branch of a path that ends on an ordinary node.
	leavesLast = glyph{"└─▸", "'->"}
	joinsLast  = glyph{"└─◂", "'-<"}
	arrow      = glyph{"→", "->"}
)

type glyph struct{ full, plain string }

func (l Look) glyph(g glyph) string {
	if l.Plain {
		return g.plain
	}
	return g.full
}

// ascii spells what a plain screen cannot show.
var ascii = strings.NewReplacer("Ω", "ohm", "Ω", "ohm", "µ", "u", "μ", "u", "°C", "degC", "→", "->", "∥", "||", "×", "x", "±", "+-", "…", "...")

// text gives s as this look shows it. Names stay as the file has them; what a
// terminal would obey becomes '?', and in a plain look what is left beyond ASCII
// too.
func (l Look) text(s string) string {
	if l.Plain {
		s = ascii.Replace(s)
	}
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || l.Plain && r > unicode.MaxASCII {
			return '?'
		}
		return r
	}, s)
}

// An ink is the weight or colour of a stretch of text; it never carries meaning
// that the words do not.
type ink string

// ANSI select-graphic-rendition codes (ECMA-48).
const (
	noInk   ink = ""
	bold    ink = "1"
	faint   ink = "2"
	warning ink = "33" // yellow
	bad     ink = "1;31"
	good    ink = "32"
)

func (l Look) paint(s string, i ink) string {
	if !l.Colour || i == noInk || s == "" {
		return s
	}
	return "\x1b[" + string(i) + "m" + s + "\x1b[0m"
}

func width(s string) int { return displaywidth.String(s) }

// wrap prints text in lines of at most Columns, the first after head, the others
// indented by its width.
func wrap(w io.Writer, head, text string) { flow(w, head, strings.Fields(text)) }

// flow is wrap for words that may hold spaces.
func flow(w io.Writer, head string, words []string) {
	indent := strings.Repeat(" ", width(head))
	line, used := head, width(head)
	fresh := true
	for _, word := range words {
		n := width(word)
		if !fresh && used+1+n > Columns {
			io.WriteString(w, strings.TrimRight(line, " ")+"\n")
			line, used, fresh = indent, len(indent), true
		}
		if !fresh {
			line += " "
			used++
		}
		line += word
		used += n
		fresh = false
	}
	io.WriteString(w, strings.TrimRight(line, " ")+"\n")
}
