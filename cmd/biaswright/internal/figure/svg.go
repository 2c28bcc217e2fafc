package figure

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf8"
)

// families are asked for in this order. Whichever a viewer has, each text is told
// its width, so that it takes the room that was kept for it.
const families = "Go, Verdana, 'DejaVu Sans', Arial, sans-serif"

// WriteSVG writes the figure as SVG 1.1 (W3C). Colours are the light scheme's;
// on a screen set to dark, viewers that follow media queries show the dark one.
func WriteSVG(w io.Writer, f *Figure) error {
	var b bytes.Buffer
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" width="%s" height="%s" viewBox="0 0 %[1]s %[2]s" role="img" font-family="%s">`,
		px(f.Width), px(f.Height), families)
	b.WriteByte('\n')
	fmt.Fprintf(&b, "<title>%s</title>\n<desc>%s</desc>\n", escape(f.Title), escape(f.Says))
	b.WriteString(style())
	svgArea(&b, Box(0, 0, f.Width, f.Height, Paper, None))
	for _, s := range f.Shapes {
		switch s := s.(type) {
		case *Line:
			svgLine(&b, s)
		case *Strokes:
			svgStrokes(&b, s)
		case *Area:
			svgArea(&b, s)
		case *Dot:
			svgDot(&b, s)
		case *Text:
			svgText(&b, s)
		}
	}
	b.WriteString("</svg>\n")
	_, err := w.Write(b.Bytes())
	return err
}

// style gives every paint its colours of the dark scheme; the light ones stand with
// the shapes, for viewers that know no styles.
func style() string {
	var b strings.Builder
	b.WriteString("<style>@media screen and (prefers-color-scheme: dark) {\n")
	for p := Paper; p < paints; p++ {
		c := hex(dark, p)
		fmt.Fprintf(&b, ".f%d{fill:%s}.s%[1]d{stroke:%[2]s}\n", p, c)
	}
	b.WriteString("}</style>\n")
	return b.String()
}

func hex(s scheme, p Paint) string {
	c := s[p]
	return fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B)
}

// px writes a length with two decimals, far finer than can be seen.
func px(x float64) string {
	s := strconv.FormatFloat(x, 'f', 2, 64)
	s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	if s == "-0" {
		return "0"
	}
	return s
}

// escape makes any text fit for XML: what the standard does not allow at all
// becomes the replacement character.
func escape(s string) string {
	var b strings.Builder
	for _, r := range s {
		if r == '\t' || r == '\n' || r == '\r' {
			r = ' '
		}
		if r < ' ' || r == utf8.RuneError || r == 0xfffe || r == 0xffff {
			r = utf8.RuneError
		}
		b.WriteRune(r)
	}
	var out bytes.Buffer
	if err := xml.EscapeText(&out, []byte(b.String())); err != nil {
		panic("figure: a buffer cannot be written: " + err.Error())
	}
	return out.String()
}

func paths(points []Point) string {
	var b strings.Builder
	for i, p := range points {
		c := "L"
		if i == 0 {
			c = "M"
		}
		b.WriteString(c + px(p.X) + " " + px(p.Y))
	}
	return b.String()
}

// ink writes the attributes of a fill and a stroke.
func ink(fill, stroke Paint, width float64) string {
	var class []string
	out := ` fill="none"`
	if fill != None {
		out = fmt.Sprintf(` fill="%s"`, hex(light, fill))
		class = append(class, "f"+strconv.Itoa(int(fill)))
	}
	if stroke != None {
		out += fmt.Sprintf(` stroke="%s"`, hex(light, stroke))
		if width != 0 && width != 1 {
			out += fmt.Sprintf(` stroke-width="%s"`, px(width))
		}
		class = append(class, "s"+strconv.Itoa(int(stroke)))
	}
	return fmt.Sprintf(` class="%s"`, strings.Join(class, " ")) + out
}

func svgLine(b *bytes.Buffer, s *Line) {
	fmt.Fprintf(b, `<path d="%s"%s stroke-linejoin="round"`, paths(s.Points), ink(None, s.Paint, s.Width))
	if len(s.Dash) > 0 {
		var dash []string
		for _, d := range s.Dash {
			dash = append(dash, px(d))
		}
		fmt.Fprintf(b, ` stroke-dasharray="%s"`, strings.Join(dash, " "))
	}
	b.WriteString("/>\n")
}

func svgStrokes(b *bytes.Buffer, s *Strokes) {
	b.WriteString(`<path d="`)
	for i := 0; i+1 < len(s.Points); i += 2 {
		b.WriteString(paths(s.Points[i : i+2]))
	}
	fmt.Fprintf(b, "\"%s/>\n", ink(None, s.Paint, s.Width))
}

func svgArea(b *bytes.Buffer, s *Area) {
	fmt.Fprintf(b, "<path d=\"%sZ\"%s/>\n", paths(s.Points), ink(s.Fill, s.Edge, s.Width))
}

func svgDot(b *bytes.Buffer, s *Dot) {
	fmt.Fprintf(b, "<circle cx=\"%s\" cy=\"%s\" r=\"%s\"%s/>\n", px(s.At.X), px(s.At.Y), px(s.Radius), ink(s.Fill, s.Edge, 0))
}

func svgText(b *bytes.Buffer, s *Text) {
	if s.Text == "" {
		return
	}
	if s.Plate {
		svgArea(b, s.plate())
	}
	fmt.Fprintf(b, `<text x="%s" y="%s" font-size="%s"`, px(s.At.X), px(s.At.Y), px(s.Size))
	switch s.Anchor {
	case Middle:
		b.WriteString(` text-anchor="middle"`)
	case End:
		b.WriteString(` text-anchor="end"`)
	}
	if s.Bold {
		b.WriteString(` font-weight="bold"`)
	}
	fmt.Fprintf(b, ` textLength="%s" lengthAdjust="spacingAndGlyphs"%s>%s</text>`,
		px(TextWidth(s.Text, s.Size, s.Bold)), ink(s.Paint, None, 0), escape(s.Text))
	b.WriteByte('\n')
}
