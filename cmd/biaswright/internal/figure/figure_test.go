package figure_test

import (
	"bytes"
	"encoding/xml"
	"image"
	"image/color"
	"image/png"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"biaswright/cmd/biaswright/internal/figure"
)

func svg(t testing.TB, f *figure.Figure) string {
	t.Helper()
	var b bytes.Buffer
	if err := figure.WriteSVG(&b, f); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func raster(t testing.TB, f *figure.Figure) *picture {
	t.Helper()
	var b bytes.Buffer
	if err := figure.WritePNG(&b, f); err != nil {
		t.Fatal(err)
	}
	img, err := png.Decode(&b)
	if err != nil {
		t.Fatal(err)
	}
	scale := figure.Pixels(f)
	if got, want := img.Bounds().Size(), image.Pt(int(math.Round(f.Width*scale)), int(math.Round(f.Height*scale))); got != want {
		t.Fatalf("the picture is %v pixels, want %v", got, want)
	}
	return &picture{img, scale}
}

// elements decodes an SVG, strictly, into its elements and the texts they hold.
func elements(t testing.TB, text string) (all []xml.StartElement, held []string) {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(text))
	for {
		token, err := d.Token()
		if err == io.EOF {
			return all, held
		}
		if err != nil {
			t.Fatalf("no XML: %v\n%s", err, text)
		}
		switch token := token.(type) {
		case xml.StartElement:
			all, held = append(all, token), append(held, "")
		case xml.CharData:
			if n := len(held); n > 0 {
				held[n-1] += string(token)
			}
		}
	}
}

func attr(e xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if a.Name.Local == name {
			return a.Value
		}
	}
	return ""
}

func number(t testing.TB, e xml.StartElement, name string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(attr(e, name), 64)
	if err != nil {
		t.Fatalf("%s of %v: %v", name, e, err)
	}
	return v
}

// TestHostileText writes texts that would end an element, an attribute or the file,
// and those that XML does not allow at all.
func TestHostileText(t *testing.T) {
	for _, text := range []string{
		"<script>alert(1)</script>", `"quoted" & 'so'`, "Ω µ °C ±5 % → 温度", "]]>", "<!-- -->", "&amp;",
	} {
		f := &figure.Figure{Width: 100, Height: 50, Title: text, Says: text}
		f.Add(&figure.Text{Text: text, Size: 12, Paint: figure.Ink})
		all, held := elements(t, svg(t, f))
		found := 0
		for i, e := range all {
			if e.Name.Local == "script" {
				t.Errorf("%q became an element", text)
			}
			if strings.TrimSpace(held[i]) == text {
				found++
			}
		}
		if found != 3 { // title, description, text
			t.Errorf("%q: found %d times, want 3", text, found)
		}
	}
	rapid.Check(t, func(rt *rapid.T) { // bytes of all kinds: it stays XML
		text := string(rapid.SliceOf(rapid.Byte()).Draw(rt, "text"))
		f := &figure.Figure{Width: 10, Height: 10, Title: text}
		f.Add(&figure.Text{Text: text, Size: 12, Paint: figure.Ink})
		elements(t, svg(t, f))
	})
}

// luminance is the relative luminance of WCAG 2.2.
func luminance(hex string) float64 {
	sum := 0.0
	for i, weight := range []float64{0.2126, 0.7152, 0.0722} {
		n, err := strconv.ParseUint(hex[1+2*i:3+2*i], 16, 8)
		if err != nil {
			panic(err)
		}
		c := float64(n) / 255
		if c <= 0.04045 {
			c /= 12.92
		} else {
			c = math.Pow((c+0.055)/1.055, 2.4)
		}
		sum += weight * c
	}
	return sum
}

func contrast(a, b string) float64 {
	x, y := luminance(a), luminance(b)
	return (math.Max(x, y) + 0.05) / (math.Min(x, y) + 0.05)
}

// TestContrast computes the contrasts that WCAG 2.2 asks for, 4.5 for text (1.4.3) and
// 3 for what carries meaning (1.4.11), in both schemes as the SVG has them.
func TestContrast(t *testing.T) {
	f := &figure.Figure{Width: 10, Height: 10}
	paints := map[string]figure.Paint{
		"paper": figure.Paper, "ink": figure.Ink, "soft": figure.Soft, "frame": figure.Frame, "alarm": figure.Alarm,
		"band": figure.Band, "forbidden": figure.Forbidden, "outside": figure.Outside,
		"ohmic": figure.Ohmic, "junction": figure.Junction, "active": figure.Active, "ideal": figure.Ideal,
	}
	for i := range figure.Curves {
		paints["curve "+strconv.Itoa(i)] = figure.Curve(i)
	}
	colours := map[bool]map[string]string{false: {}, true: {}}
	for name, p := range paints {
		g := *f
		g.Add(&figure.Dot{Radius: 1, Fill: p})
		text := svg(t, &g)
		all, _ := elements(t, text)
		dot := all[len(all)-1]
		colours[false][name] = attr(dot, "fill")
		rule := "." + attr(dot, "class") + "{fill:"
		at := strings.Index(text, rule)
		if at < 0 {
			t.Fatalf("%s has no colour in the dark scheme", name)
		}
		colours[true][name] = text[at+len(rule) : at+len(rule)+len("#000000")]
	}
	for dark, c := range colours {
		check := func(a, b string, least float64) {
			if got := contrast(c[a], c[b]); got < least {
				t.Errorf("dark %v: %s on %s has a contrast of %.2f, want %.1f", dark, a, b, got, least)
			}
		}
		for _, ground := range []string{"paper", "band", "forbidden", "outside"} {
			for i := range figure.Curves {
				check("curve "+strconv.Itoa(i), ground, 3)
			}
			check("ink", ground, 4.5)
			check("alarm", ground, 4.5)
		}
		check("soft", "paper", 4.5)
		check("frame", "paper", 3)
		for i := range figure.Curves { // their names stand on paper
			check("curve "+strconv.Itoa(i), "paper", 4.5)
		}
		for _, block := range []string{"ohmic", "junction", "active", "ideal"} {
			check("ink", block, 4.5)
		}
	}
}

// A picture is a figure's pixels, so many a point.
type picture struct {
	image.Image
	scale float64
}

// at is the colour of a place given in points.
func (p *picture) at(x, y float64) color.RGBA {
	r, g, b, a := p.At(int(x*p.scale), int(y*p.scale)).RGBA()
	return color.RGBA{uint8(r >> 8), uint8(g >> 8), uint8(b >> 8), uint8(a >> 8)}
}

func parse(t testing.TB, hex string) color.RGBA {
	t.Helper()
	n, err := strconv.ParseUint(strings.TrimPrefix(hex, "#"), 16, 32)
	if err != nil {
		t.Fatal(err)
	}
	return color.RGBA{uint8(n >> 16), uint8(n >> 8), uint8(n), 0xff}
}

// TestWritersAgree reads places and colours back from the SVG and looks there in the
// PNG: areas and dots in their middles, thick lines along their course, texts within
// the width they are told.
func TestWritersAgree(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		f := &figure.Figure{Width: 300, Height: 200}
		x := rapid.Float64Range(20, 100).Draw(rt, "x")
		y := rapid.Float64Range(20, 60).Draw(rt, "y")
		if rapid.IntRange(0, 9).Draw(rt, "large") == 0 { // a large one has fewer pixels a point
			f.Width, f.Height = 1300, 900
			x, y = 10*x, 10*y
		}
		size := rapid.Float64Range(9, 20).Draw(rt, "size")
		f.Add(figure.Box(x, y, x+40, y+30, figure.Band, figure.Ink))
		f.Add(&figure.Dot{At: figure.Point{X: x + 90, Y: y + 20}, Radius: 6, Fill: figure.Curve(2)})
		line := figure.Segment(x, y+70, x+150, y+110, figure.Curve(1))
		line.Width = 4
		f.Add(line)
		anchor := rapid.SampledFrom([]figure.Anchor{figure.Start, figure.Middle, figure.End}).Draw(rt, "anchor")
		f.Add(&figure.Text{At: figure.Point{X: f.Width / 2, Y: y + 130}, Text: "VCC 12.0 V Ω", Anchor: anchor, Size: size, Paint: figure.Alarm})
		img := raster(t, f)
		all, held := elements(t, svg(t, f))
		seen := 0
		for i, e := range all {
			switch e.Name.Local {
			case "circle":
				seen++
				if got, want := img.at(number(t, e, "cx"), number(t, e, "cy")), parse(t, attr(e, "fill")); got != want {
					rt.Fatalf("dot: %v, want %v", got, want)
				}
			case "path":
				seen++
				samePath(t, rt, img, e)
			case "text":
				seen++
				sameText(t, rt, img, e, strings.TrimRight(held[i], "\n"))
			}
		}
		if seen != 5 { // the paper too
			rt.Fatalf("saw %d shapes, want 5", seen)
		}
	})
}

func samePath(t *testing.T, rt *rapid.T, img *picture, e xml.StartElement) {
	var xs, ys []float64
	for _, p := range strings.FieldsFunc(strings.TrimSuffix(attr(e, "d"), "Z"), func(r rune) bool { return r == 'M' || r == 'L' }) {
		x, y, _ := strings.Cut(p, " ")
		a, err1 := strconv.ParseFloat(x, 64)
		b, err2 := strconv.ParseFloat(y, 64)
		if err1 != nil || err2 != nil {
			t.Fatalf("path %q", attr(e, "d"))
		}
		xs, ys = append(xs, a), append(ys, b)
	}
	if len(xs) == 2 { // a line: along its course
		for _, share := range []float64{0.1, 0.5, 0.9} {
			got := img.at(xs[0]+share*(xs[1]-xs[0]), ys[0]+share*(ys[1]-ys[0]))
			if want := parse(t, attr(e, "stroke")); got != want {
				rt.Fatalf("line: %v, want %v", got, want)
			}
		}
		return
	}
	if xs[0] == 0 { // the paper
		return
	}
	want := parse(t, attr(e, "fill"))
	const inside = 2 // points, clear of the edge
	for _, corner := range [][2]float64{{xs[0] + inside, ys[0] + inside}, {xs[2] - inside, ys[2] - inside}} {
		if got := img.at(corner[0], corner[1]); got != want {
			rt.Fatalf("area at %v: %v, want %v", corner, got, want)
		}
	}
	if got := img.at(xs[0]-inside, ys[0]-inside); got == want {
		rt.Fatalf("area goes on outside")
	}
}

func sameText(t *testing.T, rt *rapid.T, img *picture, e xml.StartElement, text string) {
	left, width := number(t, e, "x"), number(t, e, "textLength")
	if want := figure.TextWidth(text, number(t, e, "font-size"), false); math.Abs(width-want) > 0.1 { // the size is told to two decimals
		rt.Fatalf("text is told %g, want %g", width, want)
	}
	switch attr(e, "text-anchor") {
	case "middle":
		left -= width / 2
	case "end":
		left -= width
	}
	// The letters' own ink lies within their advances, and reaches both ends.
	first, last := math.Inf(1), math.Inf(-1)
	base := number(t, e, "y")
	// Paper is white.
	b := img.Bounds()
	for px := b.Min.X; px < b.Max.X; px++ {
		for py := int((base - 10) * img.scale); py < int(base*img.scale); py++ {
			if r, g, b, _ := img.At(px, py).RGBA(); r&g&b != 0xffff {
				first, last = math.Min(first, float64(px)/img.scale), math.Max(last, float64(px)/img.scale)
			}
		}
	}
	const bearing = 2.5 // points: what letters leave free of their advances
	if first < left-1 || first > left+bearing || last > left+width+1 || last < left+width-bearing {
		rt.Fatalf("ink from %g to %g, told %g to %g", first, last, left, left+width)
	}
}

// TestPaletteKeepsPaints draws every paint: each is there to the last bit.
func TestPaletteKeepsPaints(t *testing.T) {
	f := &figure.Figure{Width: 400, Height: 40}
	const all = int(figure.Sixth - figure.Paper + 1)
	for i := range all {
		x := float64(20 * i)
		f.Add(figure.Box(x, 0, x+20, 20, figure.Paper+figure.Paint(i), figure.None))
		f.Add(&figure.Text{At: figure.Point{X: x, Y: 35}, Text: "Ab", Size: 12, Paint: figure.Paper + figure.Paint(i)})
	}
	img := raster(t, f)
	shapes, _ := elements(t, svg(t, f))
	boxes := 0
	for _, e := range shapes {
		if e.Name.Local != "path" {
			continue
		}
		if boxes++; boxes == 1 { // the paper
			continue
		}
		want := parse(t, attr(e, "fill"))
		if got := img.at(float64(20*(boxes-2)+10), 10); got != want {
			t.Errorf("paint %d: %v, want %v", boxes-2, got, want)
		}
	}
	if boxes != all+1 {
		t.Errorf("saw %d boxes, want %d", boxes, all+1)
	}
}

// TestSameFigureSameBytes writes twice, a figure of many strips.
func TestSameFigureSameBytes(t *testing.T) {
	f := &figure.Figure{Width: 50, Height: 900}
	for i := range 40 {
		f.Add(&figure.Dot{At: figure.Point{X: 20, Y: 22 * float64(i)}, Radius: 9, Fill: figure.Curve(i)})
	}
	f.Add(&figure.Dot{At: figure.Point{X: 20, Y: 20}, Radius: 9, Fill: figure.Curve(0), Edge: figure.Ink},
		&figure.Text{At: figure.Point{X: 5, Y: 45}, Text: "same", Size: 12, Paint: figure.Ink, Plate: true})
	for name, write := range map[string]func(io.Writer, *figure.Figure) error{"svg": figure.WriteSVG, "png": figure.WritePNG} {
		var a, b bytes.Buffer
		if err := write(&a, f); err != nil {
			t.Fatal(err)
		}
		if err := write(&b, f); err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(a.Bytes(), b.Bytes()) {
			t.Errorf("%s differs from itself", name)
		}
	}
}

// TestDashes follows dashed lines, along the pixels and across them, to and fro: paint in
// the middle of each stroke and close to its ends, paper in the gaps, as an SVG viewer
// draws them.
func TestDashes(t *testing.T) {
	const stroke, gap, length = 8.0, 6.0, 100.0
	for _, way := range [][2]float64{{1, 0}, {-1, 0}, {0, 1}, {0, -1}, {0.6, 0.8}, {-0.8, 0.6}} {
		f := &figure.Figure{Width: 300, Height: 300}
		at := func(along float64) (x, y float64) { return 150 + along*way[0], 150 + along*way[1] }
		x1, y1 := at(0)
		x2, y2 := at(length)
		l := figure.Segment(x1, y1, x2, y2, figure.Ink)
		l.Width, l.Dash = 4, []float64{stroke, gap}
		f.Add(l)
		img := raster(t, f)
		colour := func(along float64) color.RGBA { return img.at(at(along)) }
		paper := img.at(5, 5)
		for from := 0.0; from+stroke < length; from += stroke + gap {
			const near = 1.5 // points from a stroke's end, clear of half-covered pixels
			for _, along := range []float64{from + near, from + stroke/2, from + stroke - near} {
				if c := colour(along); c == paper {
					t.Errorf("along %v: paper at %g, in a stroke", way, along)
				}
			}
			for _, along := range []float64{from + stroke + near, from + stroke + gap/2, from + stroke + gap - near} {
				if c := colour(along); c != paper {
					t.Errorf("along %v: %v at %g, in a gap", way, c, along)
				}
			}
		}
		if c := colour(length + 4); c != paper {
			t.Errorf("along %v: %v beyond the end", way, c)
		}
	}
}
