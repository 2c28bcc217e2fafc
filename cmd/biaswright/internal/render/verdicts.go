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
	r[reqText] = cell{l.text(requirementText(a.Circuit, v)), noInk}
	if math.IsNaN(v.Value) {
		r[reqValue] = cell{"no value", noInk}
		return r
	}
	sc := scaleFor(v.Value, v.Low, v.High)
	if !prefixable(unit) {
		sc = noScale
	}
	in := func(x float64) string { return number(sc.in(x)) }
	u := sc.prefix + unit
	r[reqValue] = cell{l.text(strings.TrimSpace(in(v.Value) + " " + u)), noInk}
	r[reqAllowed] = cell{l.text(allowedText(v, in, u)), noInk}
	side := "inside"
	if v.Margin < 0 {
		side = "beyond"
	}
	if !math.IsNaN(v.Margin) && !math.IsInf(v.Margin, 0) {
		r[reqMargin] = cell{l.text(strings.TrimSpace(in(math.Abs(v.Margin)) + " " + u + " " + side)), noInk}
	}
	return r
}

func allowedText(v *solve.Verdict, in func(float64) string, unit string) string {
	switch {
	case math.IsInf(v.Low, -1) && math.IsInf(v.High, 1):
		return ""
	case math.IsInf(v.Low, -1):
		return strings.TrimSpace("below " + in(v.High) + " " + unit)
	case math.IsInf(v.High, 1):
		return strings.TrimSpace("above " + in(v.Low) + " " + unit)
	default:
		return strings.TrimSpace(in(v.Low) + " .. " + in(v.High) + " " + unit)
	}
}

// requirementText writes a requirement as the file does: "target LAMP.I = 15 mA
// within 10 %".
func requirementText(c *netlist.Circuit, v *solve.Verdict) string {
	unit := v.Q.Unit.Symbol()
	switch v.Kind {
	case "target":
		t := &c.Targets[v.Index]
		return fmt.Sprintf("target %s = %s within %s", t.Q.Text, stated(t.Value, unit), withinText(t.Within, t.Relative, unit))
	case "hold":
		q, within, relative := solve.HoldOf(c)
		text := fmt.Sprintf("hold %s within %s", q.Text, withinText(within, relative, unit))
		if nominal := (v.Low + v.High) / 2; !math.IsNaN(nominal) {
			text += " of nominal " + measured(nominal, unit)
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

// prefixable tells the units that the trade writes with SI prefixes.
func prefixable(unit string) bool {
	switch unit {
	case "V", "A", "W", "Ω", "S", "V/K":
		return true
	}
	return false
}
