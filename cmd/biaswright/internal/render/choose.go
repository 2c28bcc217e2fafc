package render

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
	"biaswright/sweep/choose"
)

// A ChooseAnswer is what the choose command has to show of one file.
type ChooseAnswer struct {
	File     string
	Circuit  *netlist.Circuit // with its resistances open
	Set      []netlist.Setting
	Found    *choose.Answer // nil with a Failure
	Failure  *solve.Failure
	Warnings diag.List
	// Written is the file that got the best choice; "" where none was asked for or it
	// could not be written.
	Written string
}

// ChooseScreen prints the answer for people.
func ChooseScreen(w io.Writer, a *ChooseAnswer, l Look) error {
	p := &writer{w: w}
	printTitle(p, &Answer{File: a.File, Circuit: a.Circuit, Set: a.Set}, l)
	if a.Failure != nil {
		printFailure(p, a.Failure, l)
		return p.err
	}
	found := a.Found
	printOpen(p, found, l)
	wrap(p, "", l.text(fitText(found)))
	if !found.Reached {
		fmt.Fprintln(p)
		printReach(p, found, l)
		return p.err
	}
	fmt.Fprintln(p)
	printChoices(p, found, l)
	fmt.Fprintln(p)
	printChosen(p, found, l)
	if a.Written != "" {
		fmt.Fprintln(p)
		wrap(p, "", l.text(writtenText(a)))
	}
	return p.err
}

// writtenText says where the best choice went, and what of this run did not.
func writtenText(a *ChooseAnswer) string {
	says := "Choice 1 is written to " + a.Written + "."
	if len(a.Set) == 0 {
		return says
	}
	var set []string
	for _, s := range a.Set {
		set = append(set, s.String())
	}
	return says + " It was chosen with " + strings.Join(set, ", ") + ", which is not written: the copy has the file's own values."
}

// The columns of the open values.
const (
	opnName = iota
	opnExact
	opnUnit
	opnSeries
	opnSearched
	opnCols
)

func printOpen(w io.Writer, a *choose.Answer, l Look) {
	t := table{numeric: make([]bool, opnCols), most: make([]int, opnCols)}
	t.numeric[opnExact] = true
	h := make([]cell, opnCols)
	h[opnName] = cell{"Open values", bold}
	h[opnExact] = cell{exactHeading(a), faint}
	h[opnSeries] = cell{"series", faint}
	if a.Reached {
		h[opnSearched] = cell{"searched", faint}
	}
	t.add(row{head: true, cells: h})
	for i := range a.Unknowns {
		u := &a.Unknowns[i]
		r := make([]cell, opnCols)
		r[opnName] = cell{"  " + u.Name, noInk}
		exact, unit, _ := strings.Cut(exactText(u.Exact), " ")
		r[opnExact], r[opnUnit] = cell{exact, noInk}, cell{l.text(unit), noInk}
		r[opnSeries] = cell{u.Series, noInk}
		if a.Reached {
			r[opnSearched] = cell{l.text(fmt.Sprintf("%s .. %s, %s", stated(u.Low, "Ω"), stated(u.High, "Ω"), count(u.Count, "value"))), noInk}
		}
		t.add(row{cells: r})
	}
	t.print(w, l)
}

// exactText writes a resistance that is no preferred value. Below an ohm the trade
// writes no prefix.
func exactText(ohms float64) string {
	if ohms < 1 {
		return number(ohms) + " Ω"
	}
	return Measured(ohms, "Ω")
}

func exactHeading(a *choose.Answer) string {
	if !a.Reached || a.Fit == choose.Nearest {
		return "nearest"
	}
	return "exact"
}

// fitText says how far the targets fix the values, and how much was searched.
func fitText(a *choose.Answer) string {
	var says string
	values, targets := count(len(a.Unknowns), "open value"), count(len(a.Circuit.Targets), "target")
	switch a.Fit {
	case choose.Fixed:
		says = fmt.Sprintf("%s, fixed by %s.", values, targets)
	case choose.Free:
		says = fmt.Sprintf("%s and %s: other values would meet the targets too.", values, targets)
	case choose.Compromise:
		says = fmt.Sprintf("%s for %s: the exact values are those whose largest deviation is least.", values, targets)
	case choose.Nearest:
		says = "No values meet every target exactly; these come nearest."
	}
	if !a.Reached {
		return says
	}
	says += fmt.Sprintf(" All %s were tried", count(a.Combinations, "combination"))
	if a.Whole {
		return says + ", from a tenth of the exact values to ten times them."
	}
	return says + "; a decade to both sides would have been too many."
}

// printReach tells how near the targets come.
func printReach(w io.Writer, a *choose.Answer, l Look) {
	fmt.Fprintln(w, l.paint("Out of reach", bad))
	for i := range a.Exact.Requirements {
		if says := ReachText(a, i); says != "" {
			wrap(w, "  ", l.text(says))
		}
	}
}

// ReachText says how near one requirement comes at the nearest values; "" for one that
// is no target.
func ReachText(a *choose.Answer, requirement int) string {
	v := &a.Exact.Requirements[requirement].Nominal
	if v.Kind != "target" {
		return ""
	}
	var at []string
	for i := range a.Unknowns {
		u := &a.Unknowns[i]
		text := u.Name + " " + exactText(u.Exact)
		if end := endOfRange(u.Exact); end != "" {
			text += ", the " + end + " tried"
		}
		at = append(at, text)
	}
	met := ""
	if v.Met {
		met = ", which is near enough"
	}
	t := &a.Circuit.Targets[v.Index]
	unit := t.Q.Unit.Symbol()
	return fmt.Sprintf("%s comes to %s at %s; wanted is %s within %s%s", t.Q.Text, Measured(v.Value, unit), strings.Join(at, ", "),
		stated(t.Value, unit), withinText(t.Within, t.Relative, unit), met)
}

// endOfRange tells that a value stands at an end of the range in which values are
// looked for.
func endOfRange(ohms float64) string {
	const near = 1.001 // the search ends near the end, not on it
	switch {
	case ohms < choose.LeastOhms*near:
		return "least"
	case ohms > choose.MostOhms/near:
		return "most"
	}
	return ""
}

// A Listed is a line of the short list: "exact", "nearest", "ideal" or a number, and what
// each value is called.
type Listed struct {
	Name   string
	Choice *choose.Choice
	Values []string // by unknown
}

// ShortList is the short list, the exact values above it.
func ShortList(a *choose.Answer) []Listed {
	exact := func(name string, c *choose.Choice) Listed {
		out := Listed{Name: name, Choice: c}
		for _, ohms := range c.Ohms {
			out.Values = append(out.Values, exactText(ohms))
		}
		return out
	}
	out := []Listed{exact(exactHeading(a), &a.Exact)}
	if a.Ideal != nil {
		out = append(out, exact("ideal", a.Ideal))
	}
	for k := range a.Choices {
		one := Listed{Name: strconv.Itoa(k + 1), Choice: &a.Choices[k]}
		for i := range a.Unknowns {
			one.Values = append(one.Values, valueText(a, one.Choice, i))
		}
		out = append(out, one)
	}
	return out
}

// printChoices prints the short list. Values that are too wide for columns stand below
// it.
func printChoices(w io.Writer, a *choose.Answer, l Look) {
	lines := ShortList(a)
	beside := besides(lines)
	n := 0
	if beside {
		n = len(a.Unknowns)
	}
	nominal, worst, drawn, verdict, cols := n+1, n+2, n+3, n+4, n+5
	t := table{numeric: make([]bool, cols), most: make([]int, cols)}
	h := make([]cell, cols)
	h[0] = cell{"Choices", bold}
	for i := range n {
		h[i+1] = cell{a.Unknowns[i].Name, faint}
	}
	var draws []float64
	for _, line := range lines {
		draws = append(draws, line.Choice.Draw)
	}
	s := scaleFor(draws...)
	h[nominal], h[worst] = cell{"nominal", faint}, cell{"worst", faint}
	h[drawn] = cell{l.text(heading("drawn", s, "A")), faint}
	t.numeric[nominal], t.numeric[worst], t.numeric[drawn] = true, true, true
	t.add(row{head: true, cells: h})
	for _, line := range lines {
		r := make([]cell, cols)
		r[0] = cell{"  " + line.Name, noInk}
		for i := range n {
			r[i+1] = cell{l.text(line.Values[i]), noInk}
		}
		r[nominal], r[worst] = cell{bands(line.Choice.NominalScore()), noInk}, cell{bands(line.Choice.Score), noInk}
		r[drawn] = cell{number(s.in(line.Choice.Draw)), noInk}
		r[verdict] = verdictCell(line.Choice)
		t.add(row{cells: r})
	}
	t.print(w, l)
	if !beside {
		for _, line := range lines {
			var words []string
			for i, v := range line.Values {
				words = append(words, a.Unknowns[i].Name+" "+v+",")
			}
			last := len(words) - 1
			words[last] = strings.TrimSuffix(words[last], ",")
			for i := range words {
				words[i] = l.text(words[i])
			}
			flow(w, fmt.Sprintf("  %-7s", line.Name), words)
		}
	}
	says := "Nominal and worst: the largest deviation of a target, where 1 is the edge of its band."
	if slices.ContainsFunc(lines, func(line Listed) bool { return line.Choice.Unmet > 0 }) {
		says += " By: the largest miss, beyond a band or, of a keep, as a share of its bound."
	}
	wrap(w, "", l.text(says+" Behind a value: the coarsest series that has it; E24 is no part of E48 to E192."))
	if a.Ideal != nil {
		says = "No single resistors meet everything, so pairs were tried: + in series, ∥ in parallel. Ideal: the values, preferred or not, whose worst deviation is least"
		if !a.Ideal.Met() {
			says += "; even they do not meet everything"
		}
		wrap(w, "", l.text(says+"."))
	}
}

// besides tells that the values leave room for the figures beside them.
func besides(lines []Listed) bool {
	const figures = 50 // columns
	sum := 0
	for i := range lines[0].Values {
		widest := 0
		for _, line := range lines {
			widest = max(widest, width(line.Values[i]))
		}
		sum += widest + gap
	}
	return sum <= Columns-figures
}

// bands writes a deviation in units of a band.
func bands(x float64) string {
	if math.IsInf(x, 1) {
		return "none"
	}
	const decimals = 3
	return strconv.FormatFloat(x, 'f', decimals, 64)
}

func verdictCell(c *choose.Choice) cell {
	switch {
	case c.Met():
		return cell{"met", good}
	case len(c.Ratings) > 0:
		return cell{"RATING EXCEEDED", bad}
	}
	return cell{fmt.Sprintf("%d NOT MET, by %s", c.Unmet, bands(c.Miss)), bad}
}

// valueText writes a chosen value, or the two that make it up, each with the coarsest
// series of its family that has it.
func valueText(a *choose.Answer, c *choose.Choice, i int) string {
	one := func(ohms float64) string {
		return stated(ohms, "Ω") + " " + coarsest(ohms, a.Unknowns[i].Series)
	}
	switch p := c.Pair(i); {
	case p == nil:
		return one(c.Ohms[i])
	case p.Parallel:
		return one(p.A) + " ∥ " + one(p.B)
	default:
		return one(p.A) + " + " + one(p.B)
	}
}

// coarsest is the coarsest of the series in which the one asked for is nested that has
// a value: E3 to E24, or E48 to E192.
func coarsest(ohms float64, asked string) string {
	fine := []string{"E48", "E96", "E192"}
	for _, s := range choose.SeriesOf(ohms) {
		if slices.Contains(fine, s) == slices.Contains(fine, asked) {
			return s
		}
	}
	return asked
}

// The columns of the best choice's requirements.
const (
	chsVerdict = iota
	chsText
	chsNominal
	chsWorst
	chsAllowed
	chsCols
)

// printChosen prints the best choice's requirements, and where each is worst.
func printChosen(w io.Writer, a *choose.Answer, l Look) {
	c := &a.Choices[0]
	const widest = 40 // a longer requirement pushes its figures to the next line
	t := table{numeric: make([]bool, chsCols), most: []int{chsText: widest, chsAllowed: 0}}
	h := make([]cell, chsCols)
	h[chsVerdict] = cell{"Choice 1", bold}
	for i, what := range map[int]string{chsNominal: "nominal", chsWorst: "worst", chsAllowed: "allowed"} {
		h[i] = cell{what, faint}
	}
	t.numeric[chsNominal], t.numeric[chsWorst] = true, true
	t.add(row{head: true, cells: h})
	for i := range c.Requirements {
		r := &c.Requirements[i]
		cells := make([]cell, chsCols)
		cells[chsVerdict] = cell{"  met", good}
		if !r.Worst.Met {
			cells[chsVerdict] = cell{"  NOT MET", bad}
		}
		cells[chsText] = cell{l.text(RequirementText(a.Circuit, &r.Worst)), noInk}
		f := figuresOf(&r.Worst, r.Worst.Q.Unit.Symbol())
		cells[chsNominal] = cell{l.text(orNone(r.Nominal.Value, f)), noInk}
		cells[chsWorst] = cell{l.text(orNone(r.Worst.Value, f)), noInk}
		cells[chsAllowed] = cell{l.text(f.allowed(&r.Worst)), noInk}
		t.add(row{cells: cells})
	}
	t.print(w, l)
	for _, says := range worstTexts(a, c) {
		wrap(w, "  ", l.text(says))
	}
	for _, r := range c.Ratings {
		unit := ratingUnit(r.Rating)
		wrap(w, "  ", l.text(fmt.Sprintf("%s exceeds its %s: %s, where %s is rated, at %s", r.Subject, ratingName(r.Rating),
			Measured(r.Value, unit), stated(r.Limit, unit), EndsText(a.Circuit, r.At, shownEnds))))
	}
	if c.Failed != nil {
		wrap(w, "  ", l.text("no operating point at "+EndsText(a.Circuit, *c.Failed, shownEnds)))
	}
}

// worstTexts says where the requirements are worst, those at one place together.
func worstTexts(a *choose.Answer, c *choose.Choice) []string {
	var places, whose []string
	for i := range c.Requirements {
		r := &c.Requirements[i]
		place, who := EndsText(a.Circuit, r.At, shownEnds), r.Worst.Q.Text
		at := slices.Index(places, place)
		switch {
		case at < 0:
			places, whose = append(places, place), append(whose, who)
		case !slices.Contains(strings.Split(whose[at], ", "), who):
			whose[at] += ", " + who
		}
	}
	for i := range places {
		places[i] = "worst for " + whose[i] + ": " + places[i]
	}
	return places
}

func orNone(x float64, f verdictFigures) string {
	if math.IsNaN(x) {
		return "no value"
	}
	return f.value(x)
}

// shownEnds is how many tolerances a sentence names.
const shownEnds = 4

// EndsText says where something is worst: the ranges' ends, then the first so many
// tolerances.
func EndsText(c *netlist.Circuit, ends []choose.End, most int) string {
	if len(ends) == 0 {
		return "nominal"
	}
	var said []string
	tolerances := 0
	for _, e := range ends {
		if e.Range {
			said = append(said, e.Name+" "+stated(e.Value, c.Slots[e.Slot].Unit.Symbol()))
			continue
		}
		if tolerances++; tolerances <= most {
			side := "low"
			if e.High {
				side = "high"
			}
			said = append(said, e.Name+" "+side)
		}
	}
	if more := tolerances - most; more > 0 {
		said = append(said, count(more, "more tolerance"))
	}
	return strings.Join(said, ", ")
}
