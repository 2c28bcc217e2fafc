package render

import (
	"fmt"
	"io"
	"math"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

// A LimitsAnswer is what the limits command has to show of one file.
type LimitsAnswer struct {
	File     string
	Circuit  *netlist.Circuit
	Set      []netlist.Setting
	Limits   *limits.Answer // nil with a Failure
	Within   *limits.Within // the width asked for on the command line
	Failure  *solve.Failure
	Sketch   []string // as Answer's
	Warnings diag.List
}

// Short tells the sides on which the hold is not met, or not shown to be, as far as the
// axis's stated range goes.
func (a *LimitsAnswer) Short(l *limits.Limit) (low, high bool) {
	id, ok := a.Circuit.Lookup(l.Axis)
	if !ok { // the load's voltage has no stated range
		return false, false
	}
	b := &a.Circuit.Slots[id].Bounds
	const rounding = 1e-9 // a limit is this near
	slack := rounding * math.Max(math.Abs(b.Low), math.Abs(b.High))
	low = b.Stated && l.Low.Reason != limits.End && l.Low.HoldsTo() > b.Low+slack
	high = b.Stated && l.High.Reason != limits.End && l.High.HoldsTo() < b.High-slack
	return low, high
}

// LimitsScreen prints the answer for people.
func LimitsScreen(w io.Writer, a *LimitsAnswer, l Look) error {
	p := &writer{w: w}
	printTitle(p, &Answer{File: a.File, Circuit: a.Circuit, Set: a.Set}, l)
	if a.Failure != nil {
		fmt.Fprintln(p)
		printFailure(p, a.Failure, l)
		return p.err
	}
	found := a.Limits
	printSketch(p, a.Sketch, l)
	wrap(p, "", l.text(HoldText(a)))
	if found.Nominal.Unstable {
		wrap(p, "", l.paint(unstableText, bad))
	}
	fmt.Fprintln(p)
	printLimits(p, a, l)
	fmt.Fprintln(p)
	fmt.Fprintln(p, l.paint("Why", bold))
	for i := range found.Limits {
		for _, side := range []bool{false, true} {
			if says := SideSays(a, &found.Limits[i], side); says != "" {
				wrap(p, "  ", l.text(says))
			}
		}
	}
	fmt.Fprintln(p)
	printRegulation(p, found, l)
	if found.Load != nil {
		fmt.Fprintln(p)
		printWindow(p, a, l)
	}
	return p.err
}

// unstableText stands where limits are those of a point that --near asked for.
const unstableText = "This point cannot be stable: no real circuit stays there, and its limits are of theory."

// HoldText says what is held.
func HoldText(a *LimitsAnswer) string {
	h := &a.Limits.Hold
	v := solve.Verdict{Q: h.Q, Value: h.Nominal, Low: h.Low, High: h.High}
	f := figuresOf(&v, h.Q.Unit.Symbol())
	half := (h.High - h.Low) / 2
	width := Measured(half, h.Q.Unit.Symbol())
	if _, within, relative := solve.HoldOf(a.Circuit); (a.Within == nil && relative) || (a.Within != nil && a.Within.Relative) {
		if a.Within != nil {
			within = a.Within.Value
		}
		const percent = 100
		width = stated(within*percent, "") + " %"
	}
	return fmt.Sprintf("Holds %s within %s of %s: %s.", h.Q.Text, width, f.value(h.Nominal), f.allowed(&v))
}

// The columns of the limits.
const (
	limAxis = iota
	limNominal
	limLow
	limHigh
	limHeadroom
	limMark
	limCols
)

func printLimits(w io.Writer, a *LimitsAnswer, l Look) {
	t := table{numeric: make([]bool, limCols), most: make([]int, limCols)}
	h := make([]cell, limCols)
	h[limAxis] = cell{"Limits", bold}
	for i, what := range map[int]string{limNominal: "nominal", limLow: "holds from", limHigh: "to", limHeadroom: "headroom"} {
		t.numeric[i] = true
		h[i] = cell{what, faint}
	}
	t.add(row{head: true, cells: h})
	for i := range a.Limits.Limits {
		lim := &a.Limits.Limits[i]
		r := make([]cell, limCols)
		unit := lim.Unit.Symbol()
		r[limAxis] = cell{l.text("  " + lim.Axis + " [" + unit + "]"), noInk}
		r[limNominal] = cell{number(lim.Nominal), noInk}
		r[limLow] = cell{number(lim.Low.HoldsTo()), noInk}
		r[limHigh] = cell{number(lim.High.HoldsTo()), noInk}
		if !math.IsNaN(lim.Headroom) {
			r[limHeadroom] = cell{number(lim.Headroom), noInk}
		}
		if low, high := a.Short(lim); low || high {
			what := "NOT MET over "
			if !(low && lim.Low.Limited()) && !(high && lim.High.Limited()) {
				what = "NOT KNOWN over " // it was lost on the way
			}
			r[limMark] = cell{l.text(what + statedRange(a.Circuit, lim)), bad}
		}
		t.add(row{cells: r})
	}
	t.print(w, l)
}

func statedRange(c *netlist.Circuit, lim *limits.Limit) string {
	id, _ := c.Lookup(lim.Axis)
	b := &c.Slots[id].Bounds
	return stated(b.Low, "") + " .. " + stated(b.High, lim.Unit.Symbol())
}

// SideSays is why one side ends, a sentence without a stop.
func SideSays(a *LimitsAnswer, lim *limits.Limit, high bool) string {
	side, beyond := lim.Low, "below"
	if high {
		side, beyond = lim.High, "above"
	}
	unit := lim.Unit.Symbol()
	switch side.Reason {
	case limits.Lost:
		return fmt.Sprintf("%s holds to %s; %s", lim.Axis, With(side.SearchedTo, unit), Says(a.Limits, lim, side))
	case limits.End:
		if side.SearchedTo == lim.Nominal {
			return ""
		}
		return fmt.Sprintf("%s holds to %s, where the search ends", lim.Axis, With(side.SearchedTo, unit))
	}
	return fmt.Sprintf("%s %s %s: %s", lim.Axis, beyond, With(side.At, unit), Says(a.Limits, lim, side))
}

// With writes a number of an axis with its unit, unscaled.
func With(x float64, unit string) string { return strings.TrimSpace(number(x) + " " + unit) }

// Says tells in words why a side ends.
func Says(a *limits.Answer, lim *limits.Limit, side limits.Side) string {
	switch side.Reason {
	case limits.End:
		return "still holds where the search ends"
	case limits.Lost:
		return "the branch could not be followed further, and nothing is known beyond"
	case limits.Fold:
		says := "the circuit collapses: its operating point ends there, and it must jump to another"
		if left := leftText(side.Cause.Left, 2); left != "" {
			says += " (" + left + ")"
		}
		return says
	}
	if left := leftText(side.Cause.Left, 3); left != "" {
		return left
	}
	return "no part leaves its region; " + driftText(a, lim, &side.Cause)
}

// leftText names the parts that left their region, the first few.
func leftText(left []limits.PartState, most int) string {
	var said []string
	for i, p := range left {
		if i == most {
			said = append(said, fmt.Sprintf("%d more", len(left)-most))
			break
		}
		symbol := "V_CE"
		if p.PNP {
			symbol = "V_EC"
		}
		switch p.State {
		case "saturated":
			said = append(said, fmt.Sprintf("%s saturates, %s %s", p.Name, symbol, Measured(p.Volts, "V")))
		case "starved":
			said = append(said, fmt.Sprintf("%s starves at %s (%s at nominal)", p.Name, Measured(p.Amps, "A"), Measured(p.Nominal, "A")))
		case "off":
			said = append(said, fmt.Sprintf("%s turns off at %s (%s at nominal)", p.Name, Measured(p.Amps, "A"), Measured(p.Nominal, "A")))
		default:
			said = append(said, fmt.Sprintf("%s works in reverse, %s %s", p.Name, symbol, Measured(p.Volts, "V")))
		}
	}
	return strings.Join(said, "; ")
}

// driftText says that the reference itself moved, how much, and through what.
func driftText(a *limits.Answer, lim *limits.Limit, c *limits.Cause) string {
	says := fmt.Sprintf("%s itself moves with %s", a.Hold.Q.Text, lim.Axis)
	if !math.IsNaN(c.Relative) {
		says += ", " + slopeText(c.Relative, lim.Unit) + " there"
	}
	if through := carrierText(&c.Carrier); through != "" {
		says += ", most of it through " + through
	}
	return says
}

// carrierText names what passes on most of a slope, and what takes much of that back.
func carrierText(c *limits.Carrier) string {
	if c.Against == "" {
		return c.Through
	}
	return c.Through + ", against " + c.Against
}

// slopeText writes a relative slope: %/V, or ppm/K for a temperature.
func slopeText(relative float64, axis quantity.Unit) string {
	if axis == quantity.Celsius || axis == quantity.Kelvin {
		const ppm = 1e6
		return signed(relative*ppm) + " ppm/K"
	}
	const percent = 100
	return signed(relative*percent) + " %/" + axis.Symbol()
}

func signed(x float64) string {
	s := number(x)
	if x > 0 {
		s = "+" + s
	}
	return s
}

// The columns of the regulation.
const (
	regAxis = iota
	regRelative
	regUnit
	regResistance
	regCarrier
	regCols
)

func printRegulation(w io.Writer, a *limits.Answer, l Look) {
	t := table{numeric: make([]bool, regCols), most: make([]int, regCols)}
	t.numeric[regRelative] = true
	h := make([]cell, regCols)
	h[regAxis] = cell{"At nominal", bold}
	h[regResistance] = cell{"resistance", faint}
	h[regCarrier] = cell{"most of it through", faint}
	t.add(row{head: true, cells: h})
	for _, g := range a.Regulation {
		r := make([]cell, regCols)
		r[regAxis] = cell{l.text("  " + g.Axis), noInk}
		slope, unit, _ := strings.Cut(slopeText(g.Relative, g.Unit), " ")
		r[regRelative], r[regUnit] = cell{slope, noInk}, cell{l.text(unit), noInk}
		if !math.IsNaN(g.Resistance) {
			r[regResistance] = cell{l.text(resistanceText(g.Resistance)), noInk}
		}
		r[regCarrier] = cell{l.text(carrierText(&g.Carrier)), noInk}
		if g.Through == "" && g.Relative != 0 && !math.IsNaN(g.Relative) {
			r[regCarrier] = cell{"no single part", noInk}
		}
		t.add(row{cells: r})
	}
	t.print(w, l)
}

// beyondMeasure is a resistance in ohm that lies beyond any insulation: what is left of
// a slope there is rounding.
const beyondMeasure = 1e15

// resistanceText writes an output resistance.
func resistanceText(ohms float64) string {
	if ohms > beyondMeasure {
		return "beyond measure"
	}
	return Measured(ohms, "Ω")
}

func printWindow(w io.Writer, a *LimitsAnswer, l Look) {
	load := a.Limits.Load
	fmt.Fprintln(w, l.paint("Load", bold))
	if !math.IsNaN(load.High) {
		says := fmt.Sprintf("holds from %s to %s at the load", With(load.Low, "V"), With(load.High, "V"))
		for _, o := range load.Outputs {
			says += fmt.Sprintf(", with %s at %s and %s", o.Node, With(o.AtLow, "V"), With(o.AtHigh, "V"))
		}
		wrap(w, "  ", l.text(says))
	}
	if !math.IsNaN(load.MaxOhms) {
		wrap(w, "  ", l.text("largest load resistance "+Measured(load.MaxOhms, "Ω")))
	}
	if load.Row != "" {
		var said []string
		for _, c := range load.Counts {
			said = append(said, countText(c))
		}
		wrap(w, "  ", l.text(load.Row+" in a row, at most: "+strings.Join(said, ", ")))
	}
}

// conditions are how the screen calls where a number was counted.
var conditions = map[string]string{
	"nominal": "at nominal", "low rails": "with the rails at their ends nearest 0",
	"coldest": "at the lowest ambient", "hottest": "at the highest ambient",
}

func countText(c limits.Count) string {
	n := fmt.Sprint(c.Most)
	switch {
	case c.Most == 0:
		n = "none"
	case c.Most < 0:
		n = "no end found"
	}
	return n + " " + conditions[c.Where]
}
