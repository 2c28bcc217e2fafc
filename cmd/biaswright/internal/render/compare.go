package render

import (
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/sweep/compare"
	"biaswright/sweep/limits"
)

// A CompareAnswer is what the compare command has to show of several files.
type CompareAnswer struct {
	Files      []string
	Topologies []*compare.Topology
	Set        []netlist.Setting
	Warnings   diag.List
}

// names are the topologies' heads: the files' base names, or as much of the paths as
// tells them apart.
func (a *CompareAnswer) names() []string {
	out := make([]string, len(a.Files))
	seen := map[string]int{}
	for i, f := range a.Files {
		out[i] = strings.TrimSuffix(filepath.Base(f), ".bias")
		seen[out[i]]++
	}
	for i, f := range a.Files {
		if seen[out[i]] > 1 {
			out[i] = strings.TrimSuffix(f, ".bias")
		}
	}
	return out
}

// Name is topology i's name in tables and figures.
func (a *CompareAnswer) Name(i int) string { return a.names()[i] }

// rowLabels are how the screen calls the rows.
var rowLabels = map[string]string{
	"error": "off target", "supply": "over supply", "ambient": "over ambient", "beta": "over beta",
	"resistors": "over tolerance", "load": "load holds over", "output": "output resistance", "tempco": "drift",
	"current": "supply current", "efficiency": "into the load", "hottest": "hottest part", "points": "operating points", "parts": "parts",
}

// label names a row with its unit.
func (a *CompareAnswer) label(r *compare.Row, sc scale) string {
	what := rowLabels[r.Key]
	switch r.Key {
	case "value":
		what = a.quantity()
	case "dropout":
		what = r.Axis + " holds from"
	case "line":
		what = "with " + r.Axis
	}
	switch {
	case r.Key == "parts" || r.Key == "points":
		return what
	case r.Key == "line":
		return what + " [%/V]"
	case r.Key == "tempco":
		return what + " [ppm/K]"
	case r.Unit == quantity.One:
		return what + " [%]"
	}
	return heading(what, sc, r.Unit.Symbol())
}

func (a *CompareAnswer) quantity() string {
	name := ""
	for _, t := range a.Topologies {
		switch {
		case t.Target == nil:
		case name == "":
			name = t.Target.Q.Text
		case name != t.Target.Q.Text:
			return "attained"
		}
	}
	return name
}

// shownIn gives a row's numbers the factor or the prefix that the screen has.
func shownIn(r *compare.Row) (func(float64) float64, scale) {
	const percent, ppm = 100, 1e6
	switch {
	case r.Key == "parts" || r.Key == "points":
		return func(v float64) float64 { return v }, noScale
	case r.Key == "tempco":
		return func(v float64) float64 { return v * ppm }, noScale
	case r.Unit == quantity.One:
		return func(v float64) float64 { return v * percent }, noScale
	}
	sc := scaleFor(append(append([]float64(nil), r.Low...), r.High...)...)
	return sc.in, sc
}

// cellText is topology i's figure in a row.
func (a *CompareAnswer) cellText(r *compare.Row, i int, in func(float64) float64) string {
	low, high := r.Low[i], r.High[i]
	text := "-"
	switch t := a.Topologies[i]; {
	case math.IsNaN(low):
	case r.Key == "parts":
		text = fmt.Sprint(t.Parts)
	case r.Key == "points":
		text = fmt.Sprint(t.Points)
	case r.Key == "hottest":
		text = t.Hottest + " " + brief(in(low))
	case r.Key == "output":
		text = brief(in(low))
		if low > beyondMeasure {
			text = "beyond measure"
		}
	case r.Key == "load":
		text = brief(in(low)) + " .. " + brief(in(high))
	case r.Low[i] != r.High[i]:
		text = plus(in(low)) + " .. " + plus(in(high))
	case r.Key == "error" || r.Key == "line" || r.Key == "tempco":
		text = plus(in(low))
	case r.Key == "supply" || r.Key == "ambient" || r.Key == "beta" || r.Key == "resistors":
		text = "0"
	default:
		text = number(in(low))
	}
	if r.Best[i] {
		return text + " *"
	}
	return text + "  "
}

// brief writes a number with three significant digits, for a table of many columns.
func brief(x float64) string {
	const few = 3
	const least = 1e-3 // what is smaller does not count beside the others
	if math.Abs(x) < least {
		return "0"
	}
	return significant(x, few)
}

func plus(x float64) string {
	text := brief(x)
	if x > 0 && text != "0" {
		return "+" + text
	}
	return text
}

// CompareScreen prints the comparison for people.
func CompareScreen(w io.Writer, a *CompareAnswer, l Look) error {
	p := &writer{w: w}
	fmt.Fprintln(p, l.paint(l.text(CompareTitle(a)), bold))
	wrap(p, "", l.text(CompareJob(a)))
	fmt.Fprintln(p)
	rows := compare.Table(a.Topologies)
	labels := make([]string, len(rows))
	widest := 0
	for i := range rows {
		_, sc := shownIn(&rows[i])
		labels[i] = l.text(a.label(&rows[i], sc))
		widest = max(widest, width(labels[i]))
	}
	names := a.names()
	for from := 0; from < len(names); {
		from = a.block(p, l, rows, labels, widest, from)
	}
	fmt.Fprintln(p, l.text("* best of its row"))
	fmt.Fprintln(p)
	for i := range a.Topologies {
		wrap(p, "", l.text(names[i]+": "+a.Says(i, rows)))
	}
	return p.err
}

// block prints as many columns as fit beside the labels, and returns where to go on.
func (a *CompareAnswer) block(w io.Writer, l Look, rows []compare.Row, labels []string, widest, from int) int {
	names := a.names()
	columns := make([][]string, len(names))
	widths := make([]int, len(names))
	to, used := from, widest
	for i := from; i < len(names); i++ {
		widths[i] = width(names[i]) + gap
		for k := range rows {
			in, _ := shownIn(&rows[k])
			columns[i] = append(columns[i], l.text(a.cellText(&rows[k], i, in)))
			widths[i] = max(widths[i], width(columns[i][k]))
		}
		if used += widths[i] + gap; used > Columns && i > from {
			break
		}
		to = i + 1
	}
	line := strings.Repeat(" ", widest)
	for i := from; i < to; i++ {
		name := l.text(names[i]) + strings.Repeat(" ", gap) // the mark stands behind the numbers
		line += strings.Repeat(" ", gap+widths[i]-width(name)) + l.paint(name, bold)
	}
	fmt.Fprintln(w, strings.TrimRight(line, " "))
	for k := range rows {
		line := labels[k] + strings.Repeat(" ", widest-width(labels[k]))
		for i := from; i < to; i++ {
			c := columns[i][k]
			line += strings.Repeat(" ", gap+widths[i]-width(c)) + c
		}
		fmt.Fprintln(w, strings.TrimRight(line, " "))
	}
	fmt.Fprintln(w)
	return to
}

// CompareTitle heads a comparison.
func CompareTitle(a *CompareAnswer) string {
	return fmt.Sprintf("%d topologies side by side", len(a.Topologies))
}

// CompareJob is what all topologies are to do.
func CompareJob(a *CompareAnswer) string {
	for _, t := range a.Topologies[1:] {
		if len(compare.Differences(a.Topologies[0].Circuit, t.Circuit)) > 0 {
			return "The files state different jobs; each is judged by its own."
		}
	}
	for _, t := range a.Topologies {
		if t.Target == nil {
			continue
		}
		target := t.Target
		within := stated(target.Within, target.Q.Unit.Symbol())
		if target.Relative {
			within = percent(target.Within)
		}
		says := fmt.Sprintf("target %s = %s within %s", target.Q.Text, stated(target.Value, target.Q.Unit.Symbol()), within)
		for i := range t.Circuit.Rails {
			says += ", " + rangeOf(t.Circuit, t.Circuit.Rails[i].Name, t.Circuit.Rails[i].Volts, "V")
		}
		says += ", " + rangeOf(t.Circuit, "ambient", t.Circuit.Ambient, "°C")
		for _, s := range a.Set {
			says += ", " + s.Name + " = " + s.Value
		}
		return says
	}
	return ""
}

func rangeOf(c *netlist.Circuit, name string, id netlist.SlotID, unit string) string {
	s := &c.Slots[id]
	text := name + " " + stated(s.Value, unit)
	if s.Bounds.Stated {
		text += " (" + rangeText(s.Bounds, unit) + ")"
	}
	return text
}

// bestAt are how a sentence calls the rows in which a topology is best.
var bestAt = map[string]string{
	"error": "nearest to the target", "supply": "steadiest over supply", "ambient": "steadiest over ambient",
	"beta": "least touched by beta", "resistors": "least touched by tolerances", "load": "widest at the load",
	"dropout": "down to the lowest supply", "line": "best line regulation", "output": "highest output resistance",
	"tempco": "least drift", "current": "least supply current", "efficiency": "most efficient",
	"hottest": "coolest", "points": "fewest operating points", "parts": "fewest parts",
}

// Says is a sentence on topology i: what it is best at, and what gives way first.
func (a *CompareAnswer) Says(i int, rows []compare.Row) string {
	t := a.Topologies[i]
	if t.Failure != nil {
		return "no figures: " + t.Failure.Error()
	}
	var at []string
	for k := range rows {
		if rows[k].Best[i] {
			at = append(at, bestAt[rows[k].Key])
		}
	}
	says := "best at nothing here"
	if len(at) > 0 {
		says = strings.Join(at, ", ")
	}
	l, high := t.BreaksFirst()
	if l == nil {
		return says + "; nothing breaks as far as was searched"
	}
	beyond := "below"
	if high {
		beyond = "above"
	}
	says += fmt.Sprintf("; breaks first with %s %s %s, where %s", l.Axis, beyond, With(sideOf(l, high).At, l.Unit.Symbol()), whyText(t, l, high))
	for i := range t.Limits.Limits { // then the supplies, and the load
		o := &t.Limits.Limits[i]
		up := o.Axis == netlist.LoadName || o.Nominal < 0
		if side := sideOf(o, up); o.Axis != "ambient" && side.Limited() && (o != l || up != high) {
			says += fmt.Sprintf("; %s may go to %s, where %s", o.Axis, With(side.At, o.Unit.Symbol()), whyText(t, o, up))
		}
	}
	return says
}

func sideOf(l *limits.Limit, high bool) limits.Side {
	if high {
		return l.High
	}
	return l.Low
}

// whyText says what happens at a limit: "Q1 saturates, V_CE 189.7 mV".
func whyText(t *compare.Topology, l *limits.Limit, high bool) string {
	side := sideOf(l, high)
	left := leftText(side.Cause.Left, 2)
	moved := t.Limits.Hold.Q.Text + " itself has moved"
	switch {
	case side.Reason == limits.Fold:
		return "the circuit collapses"
	case left != "":
		return left
	case side.Cause.Through != "":
		return moved + ", most of it through " + carrierText(&side.Cause.Carrier)
	}
	return moved
}
