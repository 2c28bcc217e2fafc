package chart

import (
	"math"
	"strings"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/solve"
	"biaswright/sweep/choose"
)

// Choose draws the short list: for each target and keep a line for each choice, from its
// nominal value to where it is worst. The error is ErrNothing.
func Choose(a *render.ChooseAnswer) (*figure.Figure, error) {
	if a.Found == nil {
		return nil, ErrNothing
	}
	// Points: what the axis and the verdicts want, and the names beside them.
	const least, axes, most = 760.0, 560.0, 1200.0
	var panels []*lines
	var tints []swatch
	list := render.ShortList(a.Found)
	width := least
	for _, one := range list {
		width = math.Min(most, math.Max(width, axes+textRoom(choiceName(a.Found, one), small, false)))
	}
	for i := range a.Found.Exact.Requirements {
		v := &a.Found.Exact.Requirements[i].Nominal
		switch v.Kind { // a hold is each choice's own
		case "target":
			tints = append(tints, swatch{figure.Band, "where it is to be"})
		case "keep":
			tints = append(tints, swatch{figure.Forbidden, "where it must not be"})
		default:
			continue
		}
		panels = append(panels, choicesOf(a.Found, list, i))
	}
	return stacked(newSheet(width, titleOf(a.Circuit, a.File),
		"The choices, each from its nominal value (dot) to where it is worst over the stated ranges and tolerances (bar)"), tints, panels)
}

// choicesOf is the panel of one requirement.
func choicesOf(a *choose.Answer, list []render.Listed, requirement int) *lines {
	v := &a.Exact.Requirements[requirement].Nominal
	l := &lines{name: v.Q.Text, unit: v.Q.Unit.Symbol(), says: render.RequirementText(a.Circuit, v), band: NoRange, barred: NoRange}
	switch {
	case v.Kind == "target":
		l.band = Range{v.Low, v.High}
	case !sameBounds(list, requirement): // a bound that is itself a quantity moves
	case math.IsInf(v.High, 1):
		l.barred = Range{math.Inf(-1), v.Low}
	default:
		l.barred = Range{v.High, math.Inf(1)}
	}
	for _, one := range list {
		l.list = append(l.list, choiceLine(a, one, requirement, l.unit))
	}
	return l
}

// sameBounds tells that a requirement allows every choice the same, wherever it is worst.
func sameBounds(list []render.Listed, requirement int) bool {
	var first *solve.Verdict
	for _, one := range list {
		if requirement >= len(one.Choice.Requirements) {
			continue
		}
		r := &one.Choice.Requirements[requirement]
		for _, v := range []*solve.Verdict{&r.Nominal, &r.Worst} {
			if first == nil {
				first = v
			}
			if v.Low != first.Low || v.High != first.High {
				return false
			}
		}
	}
	return true
}

// choiceName is a choice's place in the list with its values.
func choiceName(a *choose.Answer, one render.Listed) string {
	var values []string
	for i, text := range one.Values {
		values = append(values, a.Unknowns[i].Name+" "+text)
	}
	return one.Name + "  " + strings.Join(values, ", ")
}

func choiceLine(a *choose.Answer, one render.Listed, requirement int, unit string) entry {
	e := entry{what: choiceName(a, one), amount: "no value"}
	var r choose.Requirement
	if requirement < len(one.Choice.Requirements) {
		r = one.Choice.Requirements[requirement]
	} else { // it has no operating point to judge
		r.Nominal.Value, r.Worst.Value = math.NaN(), math.NaN()
	}
	nominal, worst := r.Nominal.Value, r.Worst.Value
	e.values = []float64{nominal, worst}
	if !math.IsNaN(worst) {
		e.amount = render.Measured(worst, unit) + verdictMark(&r.Worst)
	}
	e.draw = func(f *figure.Figure, x *axis, middle float64, _ bool) {
		if math.IsNaN(nominal) {
			return
		}
		at := x.clamp(nominal)
		if !math.IsNaN(worst) {
			const tall = 4.0 // points to both sides of the bar's end
			end := x.clamp(worst)
			paint := figure.Ink
			if !r.Worst.Met {
				paint = figure.Alarm
			}
			bar := figure.Segment(at, middle, end, middle, paint)
			bar.Width = 2
			stop := figure.Segment(end, middle-tall, end, middle+tall, paint)
			stop.Width = 2
			f.Add(bar, stop)
		}
		f.Add(&figure.Dot{At: figure.Point{X: at, Y: middle}, Radius: 4, Fill: figure.Ink})
	}
	return e
}

func verdictMark(v *solve.Verdict) string {
	if v.Met {
		return "  met"
	}
	return "  NOT MET"
}
