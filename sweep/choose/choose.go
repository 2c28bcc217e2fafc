// Package choose finds the resistances that a circuit still leaves open: first the
// exact values at which its targets are met, then the best combination of preferred
// values (IEC 60063) around them.
//
// Every combination is judged by solving the circuit itself: at the nominal point,
// at every combination of the ends of the stated rail and ambient ranges, and at
// each of these with the tolerances turned against each requirement in turn (the
// corner that the signs of the exact derivatives show, and then the one that they show
// there; where a quantity turns round within its tolerances, as at the edge of
// saturation, yet another corner may be a little worse). What is best is decided in this order:
//
//  1. no stated rating is exceeded at any end of the ranges;
//  2. targets, keeps and hold are met there, or else at the nominal point at least;
//  3. the largest miss of a target or keep there, and then that of the hold, so that a hold
//     that no values can keep does not drive the targets away: nothing where all are met;
//     otherwise how far a quantity lies beyond its band, in units of the band, or beyond
//     the bound of a keep, as a fraction of the bound;
//  4. where all are met, fewer resistors;
//  5. the largest deviation of a target there, in units of its band: |Q - target|
//     over the width that the file states, 1 at the band's edge;
//  6. the distance from the exact values, Σ ln²(R/R_exact), where two combinations
//     deviate alike;
//  7. the lower values.
//
// The grid is every value of each series from a tenth of the exact value to ten times
// it, in all combinations. All of it is searched: the deviation at the nominal point is a
// lower bound of the worst one, so that most combinations need one solution only, and
// none is passed over that could still be among the best.
//
// Two resistors in series or parallel stand for one value where that was asked for and
// no combination of single ones meets everything. The pairs tried are those nearest to
// the values, preferred or not, whose worst deviation is least.
package choose

import (
	"fmt"
	"math"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

// A Reopening takes a stated resistance back and has it chosen anew.
type Reopening struct {
	Name   string // an element
	Series string // "E3" to "E192"
}

// Options steer a search.
type Options struct {
	// Reopen are stated resistances that are to be chosen as well; for an open one it
	// replaces the series.
	Reopen []Reopening
	// List is how many choices are wanted; 0 is 5.
	List int
	// Near, where set, chooses among several nominal points, as solve.Options does.
	Near map[netlist.NodeID]float64
	// Workers is how many goroutines share the grid; 0 is one. The answer is the same.
	Workers int
	// Pair admits two resistors for a value where one will not do.
	Pair bool
	// Progress, where set, is told now and then how many combinations of all were tried,
	// from the calling goroutine.
	Progress func(done, all int)
	// Most bounds the combinations tried. The grid is narrowed about the exact values
	// where it is larger. 0 is 8 million for up to three unknowns, which holds three
	// values of E96 over two decades each, and 300 000, some seconds, for more.
	Most int
}

func (o *Options) fill(unknowns int) {
	const list, three, mostOfThree, mostOfMore = 5, 3, 8_000_000, 300_000
	if o.List <= 0 {
		o.List = list
	}
	switch {
	case o.Most > 0:
	case unknowns <= three:
		o.Most = mostOfThree
	default:
		o.Most = mostOfMore
	}
}

// An Unknown is a resistance to be chosen.
type Unknown struct {
	Element int
	Name    string
	Series  string
	// Exact is the resistance in ohms at which the targets are met.
	Exact float64
	// Low and High are the least and largest value searched, in ohms, and Count how
	// many there are.
	Low, High float64
	Count     int

	slot   netlist.SlotID
	stated float64 // of a reopened one, else NaN
	grid   []float64
}

// Fit is how far the targets fix the values.
type Fit string

// The fits.
const (
	Fixed      Fit = "fixed"      // as many targets as values
	Free       Fit = "free"       // fewer targets: other values would meet them too
	Compromise Fit = "compromise" // more targets: the largest deviation is least
	Nearest    Fit = "nearest"    // the targets are not met exactly by any value
)

// An Answer is all that was found.
type Answer struct {
	// Circuit has every open resistance at its exact value.
	Circuit  *netlist.Circuit
	Unknowns []Unknown
	Fit      Fit
	// Exact is the circuit at the exact values.
	Exact Choice
	// Reached tells that every target lies in its band at the exact values; if not,
	// nothing was searched, and Exact is the nearest that the targets come.
	Reached bool
	// Combinations is the size of the grid; Whole tells that it spans a decade to
	// each side of every exact value.
	Combinations int
	Whole        bool
	// Ideal is the circuit at the values, preferred or not, whose worst deviation is
	// least, where pairs were tried because no single resistors would do; else nil.
	Ideal   *Choice
	Choices []Choice // the best first

	how start // how the circuit is solved from nothing
}

// A Choice is a value for each unknown, and what the circuit does with them.
type Choice struct {
	Ohms []float64 // by unknown
	// Pairs are the two resistors that make up a value, by unknown: nil for one, and
	// nil altogether where every value is one resistor.
	Pairs []*Pair
	// Unmet counts the requirements that are not met somewhere in the stated ranges
	// and tolerances, and Miss is by how much the worst of them is missed: in units of the
	// band beyond it, or of the bound of a keep. Score is the largest deviation of a target there, in units of
	// its band; +Inf where some corner has no operating point.
	Unmet       int
	Miss, Score float64
	// Nominal is the nominal point; Requirements are in the order of solve.Judge.
	Nominal      *solve.Point
	Requirements []Requirement
	// Draw is the current in A that the rails deliver at the nominal point.
	Draw float64
	// Ratings are those exceeded at some end of the ranges.
	Ratings []Rating
	// Failed is a corner without an operating point; nil where every one has one.
	Failed *[]End
}

// A Rating is one that is exceeded, and where by most.
type Rating struct {
	solve.Caution
	At []End
}

// A Requirement is a target, keep or hold judged where it is worst.
type Requirement struct {
	Nominal solve.Verdict // a hold's is against itself
	Worst   solve.Verdict // Met tells of all corners
	At      []End         // where it is worst; empty for the nominal point
}

// An End is a value taken at one end of its range or tolerance.
type End struct {
	Name  string // as settings call it: "VCC", "ambient", "RE", "Q1.betaF"
	Slot  netlist.SlotID
	Value float64 // in the slot's unit
	High  bool
	Range bool // a rail's or the ambient's range, not a tolerance
}

// An Error is what a file or an option can mend.
type Error struct {
	Code, Message, Hint string
	Span                diag.Span
}

func (e *Error) Error() string { return e.Message }

func wrong(code string, at diag.Span, hint, format string, args ...any) error {
	return &Error{Code: code, Message: fmt.Sprintf(format, args...), Hint: hint, Span: at}
}

// Find chooses a circuit's open resistances. The error is an *Error where the file
// must be mended, a *solve.Failure where no values give an operating point, or says
// what went wrong.
func Find(c *netlist.Circuit, o Options) (*Answer, error) {
	unknowns, err := unknownsOf(c, o.Reopen)
	if err != nil {
		return nil, err
	}
	o.fill(len(unknowns))
	if len(c.Targets) == 0 {
		return nil, wrong("no-target", diag.Span{File: c.File}, "add: target LAMP.I = 15 mA within 10%", "there is no target that the open values could meet")
	}
	start := make([]float64, len(unknowns))
	for i := range start {
		if start[i] = unknowns[i].stated; !(start[i] > 0) {
			start[i] = unremarkable
		}
	}
	a := &Answer{Unknowns: unknowns, Whole: true}
	if a.Circuit, err = withValues(c, unknowns, start); err != nil {
		return nil, err
	}
	if a.how, err = startFor(a.Circuit, o.Near); err != nil {
		return nil, err
	}
	t, err := newTrial(a.Circuit, unknowns, a.how)
	if err != nil {
		return nil, err
	}
	ohms, err := a.exact(t)
	if err != nil {
		return nil, err
	}
	if a.Circuit, err = withValues(c, unknowns, ohms); err != nil {
		return nil, err
	}
	for i := range unknowns {
		unknowns[i].Exact = ohms[i]
	}
	if a.Exact, err = a.detail(ohms); err != nil {
		return nil, err
	}
	a.Reached = a.Exact.NominalScore() <= 1
	if !a.Reached {
		return a, nil
	}
	a.layGrid(o.Most)
	if err := a.search(o); err != nil {
		return nil, err
	}
	return a, nil
}

// NominalScore is the largest deviation of a target at the nominal point, in units of
// its band.
func (c *Choice) NominalScore() float64 {
	score := 0.0
	for i := range c.Requirements {
		if v := &c.Requirements[i].Nominal; v.Kind == "target" {
			score = math.Max(score, Deviation(v))
		}
	}
	return score
}

// Deviation is how far a target's quantity lies from its middle, in units of its
// band: 1 at the edge. It is +Inf where the quantity has no number.
func Deviation(v *solve.Verdict) float64 {
	d := math.Abs(2*v.Value-v.Low-v.High) / (v.High - v.Low)
	if math.IsNaN(d) {
		return math.Inf(1)
	}
	return d
}

// Met tells that every requirement is met everywhere and no rating is exceeded.
func (c *Choice) Met() bool { return c.Unmet == 0 && len(c.Ratings) == 0 }
