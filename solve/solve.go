// Package solve finds the operating point of a circuit, with its evidence.
package solve

import (
	"biaswright/netlist"
)

// CONTRACT STUBS: to be replaced by real files; signatures stay.

// Options steer a solve. The zero value is the ordinary one.
type Options struct {
	// Near starts the solver with these node voltages and picks the point
	// nearest to them.
	Near map[netlist.NodeID]float64
	// Trace, where set, is told each step in one line of text.
	Trace func(line string)
}

// Solve finds the operating point of c. The error is a *Failure where there is
// none.
func Solve(c *netlist.Circuit, o Options) (*Result, error) { panic("contract") }

// A Result is the point chosen and what was seen on the way.
type Result struct {
	Point  *Point
	Others []*Point // other points that the ladder came by, the best first
	Tried  []Attempt
}

// An Attempt is one rung of the ladder.
type Attempt struct {
	Way   string // "direct", "shunt ramp", "source ramp", "gain ramp", "supply arc"
	Steps int    // Newton steps
	Ended string // "point", "same point", or why it failed, in words
}

// A Failure says that no operating point was found, and what is known.
type Failure struct {
	Tried []Attempt
	Worst string // the balance that is worst: "current balance at tail"
	By    float64
	Says  string
}

func (f *Failure) Error() string { return f.Says }

// A Point is one operating point, with every quantity and its evidence. It is
// not modified after it was returned.
type Point struct {
	Circuit  *netlist.Circuit
	NodeV    []float64 // V, by NodeID
	Rails    []RailPoint
	Elements []ElementPoint
	// LoadV and LoadI are of the declared load; NaN without one.
	LoadV, LoadI float64
	// Unstable is true for a point that cannot be stable (determinant sign -1).
	Unstable bool
	Evidence Evidence
}

// A RailPoint is what a rail delivers.
type RailPoint struct{ V, I, P float64 }

// An ElementPoint is an element's quantities; V and I run along its arrow.
type ElementPoint struct {
	V, I, P float64
	Tj      float64       // degC; NaN for elements without a junction
	Members []MemberPoint // of a row of 2 or more
	// Transistors only; otherwise zero.
	Ic, Ib, Ie, Vbe, Vce float64 // pnp: Veb in Vbe, Vec in Vce
	State                string  // "active", "saturated", "off", "reverse"; "" otherwise
}

// A MemberPoint is one member of a row.
type MemberPoint struct{ V, I, P, Tj float64 }

// Evidence is why a point is believed.
type Evidence struct {
	Residual    float64 // A, the largest remaining balance
	Where       string  // its name
	LastStep    float64 // V, the largest voltage step of the last iteration
	Steps       int     // Newton steps of the way that found it
	Way         string
	Determinant int // +1 or -1
	Attempts    int
	Fallbacks   int // steps that needed the pivoting factorisation
}

// Slot and Quantity make a Point an environment for expressions.
func (p *Point) Slot(id netlist.SlotID) float64 { return p.Circuit.Slots[id].Value }

// Quantity gives a quantity of the point in SI units (Tj in degC); false where it
// has no number.
func (p *Point) Quantity(r netlist.Ref) (float64, bool) { panic("contract") }

// Sensitivity returns dQ/d(slot) for every slot, in Q's unit per the slot's, at the
// point, by the adjoint of the balances; followers are chained to what they follow.
func (p *Point) Sensitivity(q *netlist.Expr) (value float64, d []float64, err error) {
	panic("contract")
}

// A Verdict is a requirement judged at a point.
type Verdict struct {
	Kind string // "target", "keep", "hold"
	Q    *netlist.Expr
	// Index into Targets or Keeps; 0 for hold.
	Index int
	Met   bool
	// Value is the quantity (a keep's left side), Low and High what is allowed
	// (infinite where there is no bound), Margin the distance to the nearer
	// bound in the quantity's unit, negative when not met. NaN where Value is
	// missing, and then Met is false.
	Value, Low, High, Margin float64
}

// Judge judges targets and keeps at p; with nominal, hold against it too.
func Judge(p, nominal *Point) []Verdict { panic("contract") }

// A Caution is something an engineer should be told about a point. Kind is one of
// "high-voltage", "rating", "zener-forward", "beta-current", "slip", "hot",
// "bright"; Subject an element, rail or node name (Other a second one).
type Caution struct {
	Kind, Subject, Other string
	Rating               string  // "Pmax", …
	Value, Limit         float64 // SI
}

// Cautions lists them in a fixed order.
func Cautions(p *Point) []Caution { panic("contract") }
