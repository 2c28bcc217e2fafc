package chart

import (
	"fmt"
	"math"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

// curvePoints is how many steps a curve is solved at: a step is about two points wide, less
// than the eye asks for.
const curvePoints = 181

// sheetWidth is the width of a sheet of plots in two columns.
const sheetWidth = 1040.0

// narrowest and widestPlot are the widths of a plot beside others, in points.
const narrowest, widestPlot = 400.0, 720.0

// Limits draws the held quantity along every axis, with its band and limits, and below
// the headroom at nominal, with low rails and at the hottest.
func Limits(a *render.LimitsAnswer) (*figure.Figure, error) {
	found := a.Limits
	var panels []panel
	var tints []swatch
	for i := range found.Limits {
		curve, err := found.Curve(i, curvePoints)
		if err != nil {
			return nil, err
		}
		p := limitPlot(a, &found.Limits[i], curve)
		panels, tints = append(panels, p), append(tints, p.tints()...)
	}
	ends := found.Extremes()
	var points []*solve.Point
	var titles []string
	for _, e := range ends {
		points, titles = append(points, e.Point), append(titles, endTitle(e))
	}
	rows := pictures(points, titles)
	s := newSheet(math.Max(sheetWidth, widthOf(rows)), titleOf(a.Circuit, a.File), render.HoldText(a))
	s.legend(tints...)
	columns := max(2, min(len(panels), int(s.f.Width/narrowest)), int(s.f.Width/widestPlot))
	for from := 0; from < len(panels); from += columns {
		s.row(columns, panels[from:min(from+columns, len(panels))]...)
	}
	s.pictures(rows)
	return s.done(), nil
}

func titleOf(c *netlist.Circuit, file string) string {
	if c.Title != "" {
		return c.Title
	}
	return file
}

// endTitle says where a picture was taken.
func endTitle(e limits.Extreme) string {
	c := e.Point.Circuit
	ambient := fmt.Sprintf("%.4g °C", c.Value(c.Ambient))
	switch e.Where {
	case "low rails":
		return "Rails at their ends nearest 0"
	case "hottest":
		return "Hottest, " + ambient
	}
	return "Nominal, " + ambient
}

func limitPlot(a *render.LimitsAnswer, l *limits.Limit, c limits.Curve) *Plot {
	h := &a.Limits.Hold
	p := &Plot{
		XName: l.Axis, XUnit: l.Unit.Symbol(), YName: h.Q.Text, YUnit: h.Q.Unit.Symbol(),
		Curves: []Curve{{Name: h.Q.Text, X: c.X, Y: c.Q, Doubtful: c.Unstable}},
		Bands:  []Range{{h.Low, h.High}},
		Stated: statedRange(a.Circuit, l.Axis),
		Focus:  around(h.Nominal),
	}
	for _, high := range []bool{false, true} {
		side := l.Low
		if high {
			side = l.High
		}
		if side.Limited() {
			p.Marks = append(p.Marks, Mark{X: side.At, Text: render.With(side.At, l.Unit.Symbol()), High: high})
		}
		if says := render.SideSays(a, l, high); says != "" {
			p.Notes = append(p.Notes, says)
		}
	}
	return p
}

// around is what is shown of a quantity besides its band: from 0 to half as much again
// as it has nominally, and a little beyond 0.
func around(nominal float64) Range {
	const more, less = 1.5, -0.1
	far, near := more*nominal, less*nominal
	return Range{math.Min(far, near), math.Max(far, near)}
}

// statedRange is the range that a file states for an axis.
func statedRange(c *netlist.Circuit, axis string) Range {
	id, ok := c.Lookup(axis)
	if !ok || !c.Slots[id].Bounds.Stated {
		return NoRange
	}
	b := &c.Slots[id].Bounds
	return Range{b.Low, b.High}
}
