// Package figure is a drawing as data: lines, areas and texts in points, each in a
// role that says what it is for. Two writers, SVG and PNG, read the same figure, so
// that they cannot disagree on what stands where.
package figure

// A Figure is a drawing. Its origin is the upper left corner, y runs down.
type Figure struct {
	// Width and Height are in points: a pixel on an ordinary screen.
	Width, Height float64
	// Title and Says are for readers that cannot see the drawing.
	Title, Says string
	Shapes      []Shape
}

// A Point is a place in a figure, in points.
type Point struct{ X, Y float64 }

// A Shape is a *Line, a *Strokes, an *Area, a *Dot or a *Text.
type Shape interface{ shape() }

// A Line joins points by straight strokes.
type Line struct {
	Points []Point
	Paint  Paint
	Width  float64 // points; 0 is 1
	// Dash alternates the lengths of strokes and gaps, in points; nil is solid.
	Dash []float64
}

// Strokes are many straight strokes alike, such as a hatch's: solid, two points each.
type Strokes struct {
	Points []Point // from, to, from, to, ...
	Paint  Paint
	Width  float64 // points; 0 is 1
}

// An Area is a closed polygon, filled, and outlined where Edge is not None.
type Area struct {
	Points []Point
	Fill   Paint
	Edge   Paint
	Width  float64 // of the edge; 0 is 1
}

// A Dot is a filled circle.
type Dot struct {
	At     Point
	Radius float64
	Fill   Paint
	Edge   Paint
}

// An Anchor is the part of a text that stands at its point.
type Anchor int

// The anchors.
const (
	Start Anchor = iota
	Middle
	End
)

// A Text is one line of text, its baseline at At.
type Text struct {
	At     Point
	Text   string
	Anchor Anchor
	Size   float64 // points; the height of a line is about 1.25 of it
	Bold   bool
	Paint  Paint
	// Plate puts paper behind the text, so that lines below do not cross it.
	Plate bool
}

func (*Line) shape()    {}
func (*Strokes) shape() {}
func (*Area) shape()    {}
func (*Dot) shape()     {}
func (*Text) shape()    {}

// Add puts shapes on top of those that are there. Inlined at its
// many calls it would make the program larger (BenchmarkChartSize prints by how much).
//
//go:noinline
func (f *Figure) Add(s ...Shape) { f.Shapes = append(f.Shapes, s...) }

// Box is an Area with level edges.
func Box(left, top, right, bottom float64, fill, edge Paint) *Area {
	return &Area{Points: []Point{{left, top}, {right, top}, {right, bottom}, {left, bottom}}, Fill: fill, Edge: edge}
}

// Segment is a Line between two points.
func Segment(x1, y1, x2, y2 float64, p Paint) *Line {
	return &Line{Points: []Point{{x1, y1}, {x2, y2}}, Paint: p}
}

// span is the left and right end of a text.
func (t *Text) span() (left, right float64) {
	w := TextWidth(t.Text, t.Size, t.Bold)
	switch t.Anchor {
	case Middle:
		return t.At.X - w/2, t.At.X + w/2
	case End:
		return t.At.X - w, t.At.X
	}
	return t.At.X, t.At.X + w
}

// How far letters reach above and below the baseline, as a share of their size
// (the Go fonts' own figures, rounded up).
const (
	ascent  = 0.95
	descent = 0.25
)

// Extent is the box a text takes.
func (t *Text) Extent() (left, top, right, bottom float64) {
	left, right = t.span()
	return left, t.At.Y - ascent*t.Size, right, t.At.Y + descent*t.Size
}

// plate is the area behind a text.
func (t *Text) plate() *Area {
	const margin = 2 // points, so that a line ends before the letter
	left, top, right, bottom := t.Extent()
	return Box(left-margin, top, right+margin, bottom, Paper, None)
}
