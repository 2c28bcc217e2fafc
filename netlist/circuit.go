// Package netlist resolves a parsed text into a Circuit: names bound, numbers
// in SI units, paths expanded into elements between nodes, requirements bound
// to quantities, and the topology checked.
//
// Every number of a circuit is a slot. A slot has its own number or follows
// others: an element's parameter its part's, a value that a given name stands for
// the given value, a given value the expression that defines it. Followers are
// kept in an order in which each comes behind what it depends on, so that one pass
// brings all of them up to date (Propagate) and one pass backwards carries
// derivatives to what they follow (Chain).
//
// Which kinds of part exist, and what may be stated of them, the language learns
// from a Catalogue; it knows no models. What it says of a text are the values of
// package diag: all errors in one run, in the order of the text, without those
// that only follow from others.
package netlist

import (
	"math"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// Indices into a Circuit's tables. NodeID 0 is gnd; None means "not there".
type (
	NodeID int
	SlotID int
)

// None is the absent SlotID, element, rail or part index.
const None = -1

// Gnd is the reference node.
const Gnd NodeID = 0

// A Circuit is what a text says, ready to be solved. It is never changed after it
// was made, so that any number of goroutines may use it; With makes a changed copy,
// which shares tables with it. Callers must not modify what its fields hold.
type Circuit struct {
	File  string
	Title string

	Nodes    []Node
	Rails    []Rail
	Parts    []Part
	Elements []Element
	Paths    []Path
	Placed   []int // elements put by place, in file order

	// Slots is the table of every number that the circuit's behaviour depends
	// on. Elements, rails and parts refer to it by SlotID.
	Slots []Slot
	// Ambient is the slot of the ambient temperature, in degC.
	Ambient SlotID
	// Givens are the given names, in file order.
	Givens []SlotID

	Load []int // elements, in the order of their path
	// LoadHeld tells that HoldLoad put an ideal voltage in the load's place, whose
	// slot is LoadVolts.
	LoadHeld  bool
	LoadVolts SlotID

	Hold     *Hold // nil where none is written
	Targets  []Target
	Keeps    []Keep
	Hands    []Hand
	Measured []Measured
	Assumed  []Assumption
	Batches  [][]int

	Warnings diag.List

	priv private
}

// A Node is a point of the circuit.
type Node struct {
	Name string
	// Rail is the index of the rail that holds the node, or None.
	Rail int
	// Made tells a node that no word of the file names: "D1:D2", or one
	// between the members of a row ("LAMP.1:LAMP.2").
	Made bool
	Span diag.Span
}

// A Rail holds a node at a voltage against gnd.
type Rail struct {
	Name  string
	Node  NodeID
	Volts SlotID
	Span  diag.Span
}

// A Part is a kind with its stated parameters. Params follows Kind.Params; a
// slot whose value is NaN is not stated (a rival is).
type Part struct {
	Name   string
	Kind   *Kind
	Params []SlotID
	Span   diag.Span
	// Shelf tells that `use` brought it in.
	Shelf bool
}

// An ElementKind is what an element is.
type ElementKind int

// The kinds of element.
const (
	Resistor       ElementKind = iota // Value in ohm, > 0
	Link                              // a resistance of 0
	CurrentSource                     // Value in A, flows along the arrow
	Drop                              // Value in V, falls along the arrow
	Cell                              // Value in V, rises along the arrow
	JunctionPart                      // a part of Shape Junction
	TransistorPart                    // a part of Shape Transistor
	Open                              // a resistance still to be chosen (? E24)
)

// An Element is one designator of the file. A row of n is one Element with n
// members in series.
type Element struct {
	Name string
	Kind ElementKind
	Part int // index into Parts, or None

	// From and To are the ends along the arrow. For a transistor npn: From is
	// the collector, To the emitter; pnp: From the emitter, To the collector.
	// For a reversed junction From is the cathode.
	From, To NodeID
	Base     NodeID // transistors only
	Reversed bool

	// Chain has Row+1 nodes from From to To.
	Row   int
	Chain []NodeID

	Value  SlotID // resistor, source, drop, cell; else None
	TC     SlotID // resistor's temperature coefficient in 1/K, or None
	Rating SlotID // resistor's rating in W, or None
	Size   SlotID // junctions and transistors; value 1 when not stated
	// Params are the element's own parameter slots, following Kind.Params.
	// They follow the part's until set ("Q1.betaF=100").
	Params []SlotID
	Beside int    // element whose temperature it shares, or None
	Series string // Open: the series asked for

	Path int // index of the path it stands on, or None (placed)
	Span diag.Span
}

// A Path is a row of steps in file order.
type Path struct {
	Steps []Step
	Span  diag.Span
}

// A Step is a node, or an element (Element >= 0) between two nodes.
type Step struct {
	Node    NodeID // valid where Element is None
	Element int
}

// A Slot is one number of a circuit.
type Slot struct {
	// Name is what --set and an axis write: "VCC", "RE", "gp.betaF",
	// "Q1.betaF", "ambient", "RE.TC", "Q1.size", a given name.
	Name string
	Unit quantity.Unit
	// Value is the number as set, in SI units (degC for ambient and T0); +Inf
	// for infinite, NaN for a parameter that is not stated.
	Value float64
	// Stated tells that the file (or a setting) states it, not a default.
	Stated bool
	Bounds Bounds
	// def is nil for a number of its own, otherwise how it follows others.
	def  slotDef
	Span diag.Span
}

// Spread says how values lie between bounds.
type Spread int

// The spreads.
const (
	Uniform Spread = iota
	Normal         // bounds are ±3 sigma about their middle
	Pick           // one of Picks
)

// Bounds are a value's tolerance and range.
type Bounds struct {
	Stated bool
	// Relative is the tolerance as a fraction; Low and High then follow the
	// value. Where it is 0 the ends were stated as numbers.
	Relative  float64
	Low, High float64
	Spread    Spread
	Picks     []float64
}

// A Ref names a quantity of a solution, SUBJECT.SYMBOL.
type Ref struct {
	Subject Subject
	Index   int    // into Nodes, Elements or Rails; unused for the load
	Member  int    // 1.. for one of a row, 0 for the whole element
	Symbol  string // "V", "I", "P", "Ic", "Vbe", …
	Unit    quantity.Unit
	Text    string // as written: "Q1.Vce"
}

// A Subject is what a quantity is of.
type Subject int

// The subjects.
const (
	OfNode Subject = iota
	OfElement
	OfRail
	OfLoad
)

// Hold is the regulated quantity and how far it may move.
type Hold struct {
	Q        *Expr
	Within   float64 // a fraction if Relative, otherwise in Q's unit
	Relative bool
	Span     diag.Span
}

// A Target is an absolute value that the design must meet.
type Target struct {
	Q        *Expr
	Value    float64
	Within   float64
	Relative bool
	Span     diag.Span
}

// Band is what the target allows, in Q's unit.
func (t *Target) Band() (low, high float64) {
	w := t.Within
	if t.Relative {
		w *= math.Abs(t.Value)
	}
	return t.Value - w, t.Value + w
}

// A Keep is a bound: Left < Right, or Left > Right where Greater.
type Keep struct {
	Left, Right *Expr
	Greater     bool
	Text        string
	Span        diag.Span
}

// A Hand line is what the hand calculation says a quantity is.
type Hand struct {
	Q     *Expr
	Value *Expr // quantities in it mean that quantity's own hand line
	Span  diag.Span
}

// A Measured line is what the bench says a quantity is.
type Measured struct {
	Q     *Expr
	Value float64
	Span  diag.Span
}

// An Assumption is one idealisation of the hand calculation: Key as written
// ("Vbe", "drop", "betaF", "VA", "ambient", "Vz"), Part None where it holds for
// all. Value is +Inf for infinite.
type Assumption struct {
	Key   string
	Part  int
	Value float64
	Span  diag.Span
}
