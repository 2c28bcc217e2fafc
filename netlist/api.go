package netlist

import (
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// CONTRACT STUBS: to be replaced by real files; signatures stay.

type (
	private struct{}
	slotDef interface{}
)

// A Source gives the texts that `use` names.
type Source interface {
	// Open returns the text of the file that `use "path"` names in the file
	// from, and the name it is known by from then on (circles are found by it).
	Open(from, path string) (name string, text []byte, err error)
	// Shelf returns the text of the shelf of that name (use generic).
	Shelf(name string) (text []byte, ok bool)
}

// Read parses and resolves a text. The circuit is nil if the list has errors.
func Read(name string, text []byte, cat *Catalogue, src Source) (*Circuit, diag.List) {
	panic("contract")
}

// Resolve binds a tree. The circuit is nil if the list has errors.
func Resolve(f *syntax.File, cat *Catalogue, src Source) (*Circuit, diag.List) { panic("contract") }

// A Setting is NAME=VALUE of --set or --at, both as typed.
type Setting struct{ Name, Value string }

// With returns a copy of c with values set, as --set does: "VCC=9", "R1=47k",
// "gp.betaF=infinite", "Q1.Vbe=0.66 V at 1 mA", "ambient=-40 degC",
// "LAMP.row=3". A set slot no longer follows another; percent tolerances
// follow; a competing parameter replaces the stated one; a count of a row or a
// resistance that becomes or stops being 0 rebuilds the structure.
func (c *Circuit) With(settings ...Setting) (*Circuit, diag.List) { panic("contract") }

// At returns a copy at stated ends: Value is "low", "high" or "nominal"; Name a
// rail or ambient. The ends are algebraic.
func (c *Circuit) At(ends ...Setting) (*Circuit, diag.List) { panic("contract") }

// Lookup finds the slot that a name means: "VCC" or "VCC.V", "RE", "gp.betaF",
// "Q1.betaF", "ambient", a given name.
func (c *Circuit) Lookup(name string) (SlotID, bool) { panic("contract") }

// Names lists what Lookup knows, for the spelling helper, in file order.
func (c *Circuit) Names() []string { panic("contract") }

// Value returns a slot's number.
func (c *Circuit) Value(id SlotID) float64 { return c.Slots[id].Value }

// Values returns a copy of the numbers of all slots, index by index.
func (c *Circuit) Values() []float64 { panic("contract") }

// Propagate recomputes in place every slot of values that follows others. It
// allocates nothing. The caller owns values (length len(c.Slots)).
func (c *Circuit) Propagate(values []float64) { panic("contract") }

// Chain turns derivatives of some quantity with respect to each slot alone
// (length len(c.Slots), owned by the caller) into total ones, in place: what
// followers contribute is added to what they follow.
func (c *Circuit) Chain(d []float64) { panic("contract") }

// ParseExpr binds an expression of quantities, names and numbers, as typed
// after --show or in a keep line.
func (c *Circuit) ParseExpr(text string) (*Expr, diag.List) { panic("contract") }

// An Expr is a bound, unit-checked expression.
type Expr struct {
	Text string // canonical text
	Unit quantity.Unit
	Span diag.Span
}

// An Env gives the numbers that an expression needs.
type Env interface {
	Slot(SlotID) float64
	// Quantity gives a quantity of the solution; false where it has no number.
	Quantity(Ref) (float64, bool)
}

// Eval gives the expression's value in its unit; false where a quantity in it
// has no number.
func (e *Expr) Eval(env Env) (float64, bool) { panic("contract") }

// Grad evaluates, and calls slot and quantity with the partial derivative
// with respect to each that occurs (several calls for one add up).
func (e *Expr) Grad(env Env, slot func(SlotID, float64), quantity func(Ref, float64)) (float64, bool) {
	panic("contract")
}

// Ref returns the quantity where the expression is a single one.
func (e *Expr) Ref() (Ref, bool) { panic("contract") }
