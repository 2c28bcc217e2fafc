package render

import (
	"fmt"
	"io"
	"math"
	"strings"

	"biaswright/netlist"
	"biaswright/solve"
)

// The columns of the requirements.
const (
	reqVerdict = iota
	reqText
	reqValue
	reqAllowed
	reqMargin
	reqCols
)

func printVerdicts(w io.Writer, a *Answer, l Look) {
	if len(a.Verdicts) == 0 {
		return
	}
	t := table{
		numeric: make([]bool, reqCols),
		// A long requirement pushes its figures to the next line.
		most: []int{reqText: 44, reqMargin: 0},
	}
	t.numeric[reqValue] = true
	h := make([]cell, reqCols)
	h[reqVerdict] = cell{"Requirements", bold}
	h[reqValue] = cell{"value", faint}
	h[reqAllowed] = cell{"allowed", faint}
	h[reqMargin] = cell{"margin", faint}
	// The heading is wider than the verdicts; it stands over the text too.
	t.add(row{head: true, cells: h})
	for i := range a.Verdicts {
		t.add(row{cells: verdictCells(a, &a.Verdicts[i], l)})
	}
	t.blank()
	t.print(w, l)
}

func verdictCells(a *Answer, v *solve.Verdict, l Look) []cell {
	r := make([]cell, reqCols)
	r[reqVerdict] = cell{"  met", good}
	if !v.Met {
		r[reqVerdict] = cell{"  NOT MET", bad}
	}
	unit := v.Q.Unit.Symbol()
	r[reqText] = cell{l.text(RequirementText(a.Circuit, v)), noInk}
	if math.IsNaN(v.Value) {
		r[reqValue] = cell{"no value", noInk}
		return r
	}
	f := figuresOf(v, unit)
	r[reqValue] = cell{l.text(f.value(v.Value)), noInk}
	r[reqAllowed] = cell{l.text(f.allowed(v)), noInk}
	side := " inside"
	if v.Margin < 0 {
		side = " beyond"
	}
	if !math.IsNaN(v.Margin) && !math.IsInf(v.Margin, 0) {
		r[reqMargin] = cell{l.text(f.margin(math.Abs(v.Margin)) + side), noInk}
	}
	return r
}

// A verdictFigures writes the numbers of one verdict: in one prefix, unless value
// and bounds are further apart than that; with digits enough to tell the bounds
// apart.
type verdictFigures struct {
	unit          string
	actual, bound scale
	digits        int
}

func figuresOf(v *solve.Verdict, unit string) verdictFigures {
	f := verdictFigures{unit: unit, digits: digits}
	if Prefixable(unit) {
		f.actual = scaleFor(v.Value, v.Low, v.High)
		f.bound = f.actual
		const apart = 0.01 // the smaller would have lost two of its digits
		if value, bound := math.Abs(v.Value), largest(v.Low, v.High); min(value, bound) < apart*max(value, bound) && value > 0 {
			f.actual, f.bound = scaleFor(v.Value), scaleFor(v.Low, v.High)
		}
	}
	if width := v.High - v.Low; width > 0 && !math.IsInf(width, 1) {
		// Two digits of the band's width, and as many as it lies below the bound.
		ratio := largest(v.Low, v.High) / width
		const most = 15 // all that a float64 surely has
		f.digits = min(max(digits, int(math.Ceil(math.Log10(ratio)))+1), most)
	}
	return f
}

// largest is the larger magnitude of two bounds, of which one may be infinite.
func largest(low, high float64) float64 {
	switch {
	case math.IsInf(low, 0):
		return math.Abs(high)
	case math.IsInf(high, 0):
		return math.Abs(low)
	default:
		return max(math.Abs(low), math.Abs(high))
	}
}

func (f verdictFigures) write(x float64, s scale) string {
	text := number(s.in(x))
	if f.digits > digits && x != 0 {
		text = significant(s.in(x), f.digits)
	}
	return text
}

func (f verdictFigures) With(text string, s scale) string {
	return strings.TrimSpace(text + " " + s.prefix + f.unit)
}

func (f verdictFigures) value(x float64) string { return f.With(f.write(x, f.actual), f.actual) }

func (f verdictFigures) margin(x float64) string { return f.With(number(f.actual.in(x)), f.actual) }

func (f verdictFigures) allowed(v *solve.Verdict) string {
	low, high := f.write(v.Low, f.bound), f.write(v.High, f.bound)
	switch {
	case math.IsInf(v.Low, -1) && math.IsInf(v.High, 1):
		return ""
	case math.IsInf(v.Low, -1):
		return f.With("below "+high, f.bound)
	case math.IsInf(v.High, 1):
		return f.With("above "+low, f.bound)
	default:
		return f.With(low+" .. "+high, f.bound)
	}
}

// RequirementText writes a requirement as the file does: "target LAMP.I = 15 mA
// within 10 %".
func RequirementText(c *netlist.Circuit, v *solve.Verdict) string {
	unit := v.Q.Unit.Symbol()
	switch v.Kind {
	case "target":
		t := &c.Targets[v.Index]
		return fmt.Sprintf("target %s = %s within %s", t.Q.Text, stated(t.Value, unit), withinText(t.Within, t.Relative, unit))
	case "hold":
		q, within, relative := solve.HoldOf(c)
		text := fmt.Sprintf("hold %s within %s", q.Text, withinText(within, relative, unit))
		if nominal := (v.Low + v.High) / 2; !math.IsNaN(nominal) {
			text += " of nominal " + Measured(nominal, unit)
		}
		return text
	default:
		k := &c.Keeps[v.Index]
		if k.Text != "" {
			return "keep " + strings.TrimPrefix(k.Text, "keep ")
		}
		sign := " < "
		if k.Greater {
			sign = " > "
		}
		return "keep " + k.Left.Text + sign + k.Right.Text
	}
}

func withinText(x float64, relative bool, unit string) string {
	if relative {
		return percent(x)
	}
	return stated(x, unit)
}

// Prefixable tells the units that the trade writes with SI prefixes.
func Prefixable(unit string) bool {
	switch unit {
	case "V", "A", "W", "Ω", "S", "V/K":
		return true
	}
	return false
}
