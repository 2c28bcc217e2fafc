// Package chart draws answers: curves with their bands and limits, and the headroom
// picture, which stands every path's volts to scale. It makes figures of them, and
// a sketch of the picture for terminals.
package chart

import (
	"math"
	"sort"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
)

// textRoom is the room kept for a text: its width and a little more, since a viewer may
// have another font and may not heed the width that it is told.
func textRoom(text string, size float64, bold bool) float64 {
	const reserve = 1.16 // common sans-serif fonts are at most this much wider
	return reserve * figure.TextWidth(text, size, bold)
}

// heading writes the name of a panel.
func heading(f *figure.Figure, x, y float64, text string) {
	f.Add(&figure.Text{At: figure.Point{X: x, Y: y}, Text: text, Size: normal, Bold: true, Paint: figure.Ink})
}

// note writes small text that stands back.
func note(f *figure.Figure, x, y float64, anchor figure.Anchor, text string) {
	f.Add(&figure.Text{At: figure.Point{X: x, Y: y}, Text: text, Anchor: anchor, Size: small, Paint: figure.Soft})
}

// A panel is what stands on a sheet.
type panel interface {
	height(width float64) float64
	draw(f *figure.Figure, left, top, width float64)
}

// Margins and distances of a sheet, in points.
const (
	margin  = 20.0
	between = 28.0
)

// A sheet is a figure with a title and panels below it.
type sheet struct {
	f   *figure.Figure
	top float64 // where the next row begins
}

// newSheet begins a sheet: the title, and lines of text under it.
func newSheet(width float64, title string, under ...string) *sheet {
	s := &sheet{f: &figure.Figure{Width: width, Title: title}}
	room := width - 2*margin
	s.top = margin
	for _, l := range wrapped(title, large, room/boldness) {
		s.f.Add(&figure.Text{At: figure.Point{X: margin, Y: s.top + large}, Text: l, Size: large, Bold: true, Paint: figure.Ink})
		s.top += large * line
	}
	for _, text := range under {
		if s.f.Says != "" {
			s.f.Says += "; "
		}
		s.f.Says += text
		for _, l := range wrapped(text, normal, room) {
			s.f.Add(&figure.Text{At: figure.Point{X: margin, Y: s.top + normal}, Text: l, Size: normal, Paint: figure.Soft})
			s.top += normal * line
		}
	}
	s.top += margin / 2
	return s
}

// A swatch explains a tint.
type swatch struct {
	paint figure.Paint
	text  string
}

// legend puts swatches in a line below what is there.
func (s *sheet) legend(list ...swatch) {
	x := margin
	told := map[swatch]bool{}
	for _, w := range list {
		if told[w] {
			continue
		}
		told[w] = true
		const size, air = 11.0, 5.0 // of the swatch, and to its text, in points
		end := x + size + air + textRoom(w.text, small, false)
		if end > s.f.Width-margin && x > margin {
			x, s.top = margin, s.top+small*line
			end = x + size + air + textRoom(w.text, small, false)
		}
		s.f.Add(figure.Box(x, s.top, x+size, s.top+size, w.paint, figure.Frame))
		note(s.f, x+size+air, s.top+size-1, figure.Start, w.text)
		x = end + margin
	}
	if len(told) > 0 {
		s.top += small*line + margin/2
	}
}

// boldness is how much wider bold text is than regular, at most.
const boldness = 1.12

// row puts panels side by side in columns of equal width.
func (s *sheet) row(columns int, panels ...panel) {
	width := (s.f.Width - 2*margin - float64(columns-1)*between) / float64(columns)
	tallest := 0.0
	for i, p := range panels {
		p.draw(s.f, margin+float64(i)*(width+between), s.top, width)
		tallest = math.Max(tallest, p.height(width))
	}
	s.top += tallest + between
}

// done ends the sheet.
func (s *sheet) done() *figure.Figure {
	s.f.Height = math.Ceil(s.top - between + margin)
	return s.f
}

// sortBy sorts stably. What package slices has for that would be compiled anew for each
// type, into a larger program.
func sortBy[T any](list []T, key func(T) float64) {
	sort.SliceStable(list, func(i, j int) bool { return key(list[i]) < key(list[j]) })
}

func volts(v float64) string { return render.Measured(v, "V") }
