package chart

import (
	"slices"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/sweep/compare"
)

// Compare draws what all topologies hold along each axis, a plot an axis; the target's
// band is in all of them. The error is ErrNothing, or says what could not be solved.
func Compare(a *render.CompareAnswer) (*figure.Figure, error) {
	var plots []*Plot
	for _, axis := range axesOf(a.Topologies) {
		p := &Plot{XName: axis, Focus: NoRange, Stated: NoRange}
		for i, t := range a.Topologies {
			if t.Failure != nil {
				continue
			}
			if err := p.topology(a.Name(i), i, t, axis); err != nil {
				return nil, err
			}
		}
		plots = append(plots, p)
	}
	if len(plots) == 0 {
		return nil, ErrNothing
	}
	const plotWidth = 520.0 // points, names of the curves included
	columns := min(len(plots), 3)
	s := newSheet(2*margin+float64(columns)*(plotWidth+between)-between, render.CompareTitle(a), render.CompareJob(a))
	var tints []swatch
	for _, p := range plots {
		tints = append(tints, p.tints()...)
	}
	s.legend(tints...)
	for from := 0; from < len(plots); from += columns {
		var row []panel
		for _, p := range plots[from:min(from+columns, len(plots))] {
			row = append(row, p)
		}
		s.row(columns, row...)
	}
	return s.done(), nil
}

func axesOf(ts []*compare.Topology) []string {
	var out []string
	for _, t := range ts {
		if t.Failure != nil {
			continue
		}
		for i := range t.Limits.Limits {
			if name := t.Limits.Limits[i].Axis; !slices.Contains(out, name) {
				out = append(out, name)
			}
		}
	}
	sortBy(out, axisRank)
	return out
}

// axisRank puts supplies first, then the load, then the temperature.
func axisRank(axis string) float64 {
	switch axis {
	case netlist.LoadName:
		return 1
	case "ambient":
		return 2
	}
	return 0
}

// topology adds a topology's curve along an axis.
func (p *Plot) topology(name string, i int, t *compare.Topology, axis string) error {
	for k := range t.Limits.Limits {
		l := &t.Limits.Limits[k]
		if l.Axis != axis {
			continue
		}
		c, err := t.Limits.Curve(k, curvePoints)
		if err != nil {
			return err
		}
		p.XUnit, p.YUnit = l.Unit.Symbol(), t.Limits.Hold.Q.Unit.Symbol()
		p.YName = t.Limits.Hold.Q.Text
		if len(p.Bands) == 0 && t.Target.Q.Text == t.Limits.Hold.Q.Text {
			low, high := t.Target.Band()
			p.Bands = append(p.Bands, Range{low, high})
		}
		if !p.Focus.there() {
			p.Focus = around(t.Limits.Hold.Nominal)
		}
		if !p.Stated.there() {
			p.Stated = statedRange(t.Circuit, axis)
		}
		// Curves of one topology look the same in every plot.
		p.Curves = append(p.Curves, Curve{Name: name, X: c.X, Y: c.Q, Doubtful: c.Unstable, Look: i})
	}
	return nil
}
