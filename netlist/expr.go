package netlist

import (
	"math"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// An Expr is a bound, unit-checked expression. It is never modified, so any
// number of goroutines may evaluate one.
type Expr struct {
	Text string // canonical text
	Unit quantity.Unit
	Span diag.Span

	// ops is the expression as a row of steps, operands before their operator;
	// the last one is the value. There is no recursion, so that no expression is
	// too deep to evaluate.
	ops  []op
	refs []Ref
}

// An Env gives the numbers that an expression needs.
type Env interface {
	// Slot gives a slot's number in the slot's unit.
	Slot(SlotID) float64
	// Quantity gives a quantity of the solution in SI units (Tj in degC); false
	// where it has no number.
	Quantity(Ref) (float64, bool)
}

// An opcode is what a step of an expression does.
type opcode uint8

const (
	opNumber   opcode = iota // x
	opSlot                   // the slot a
	opQuantity               // refs[a]
	opNegate                 // -a
	opAdd
	opSubtract
	opMultiply
	opDivide
	opPower
	opParallel // ab/(a+b)
	opSqrt
	opLn
	opExp
)

// An op is one step; a and b are the steps that it works on.
type op struct {
	code opcode
	a, b int32
	x    float64
}

// shortExpr is the number of steps that are evaluated without allocating. Longer
// expressions than this do not occur in hand-written files.
const shortExpr = 48

// Eval gives the expression's value in its unit; false, with NaN, where a
// quantity in it has no number or the value is none (the root of a negative
// number). It allocates nothing for expressions of ordinary length.
func (e *Expr) Eval(env Env) (float64, bool) {
	var short [shortExpr]float64
	vals := short[:]
	if len(e.ops) > shortExpr {
		vals = make([]float64, len(e.ops))
	}
	return e.run(vals, nil, env)
}

// Grad evaluates, and calls slot and quantity with the partial derivative
// with respect to each that occurs (several calls for one add up). The
// derivatives are exact, by one backward pass over the steps. Nothing is called
// where there is no value.
func (e *Expr) Grad(env Env, slot func(SlotID, float64), quantity func(Ref, float64)) (float64, bool) {
	var short, shortSlopes [shortExpr]float64
	vals, slopes := short[:], shortSlopes[:]
	if len(e.ops) > shortExpr {
		vals, slopes = make([]float64, len(e.ops)), make([]float64, len(e.ops))
	}
	value, ok := e.run(vals, nil, env)
	if !ok {
		return value, false
	}
	e.slopes(vals, slopes)
	for i := range e.ops {
		switch o := &e.ops[i]; o.code {
		case opSlot:
			slot(SlotID(o.a), slopes[i])
		case opQuantity:
			quantity(e.refs[o.a], slopes[i])
		}
	}
	return value, true
}

// Ref returns the quantity where the expression is a single one.
func (e *Expr) Ref() (Ref, bool) {
	if len(e.ops) != 1 || e.ops[0].code != opQuantity {
		return Ref{}, false
	}
	return e.refs[0], true
}

// constant tells that no slot and no quantity occurs.
func (e *Expr) constant() bool {
	for i := range e.ops {
		if c := e.ops[i].code; c == opSlot || c == opQuantity {
			return false
		}
	}
	return true
}

// run evaluates the steps into vals. Slots come from slots, or from env where
// slots is nil.
func (e *Expr) run(vals, slots []float64, env Env) (float64, bool) {
	for i := range e.ops {
		o := &e.ops[i]
		switch o.code {
		case opNumber:
			vals[i] = o.x
		case opSlot:
			if slots != nil {
				vals[i] = slots[o.a]
			} else {
				vals[i] = env.Slot(SlotID(o.a))
			}
		case opQuantity:
			v, ok := env.Quantity(e.refs[o.a])
			if !ok {
				return math.NaN(), false
			}
			vals[i] = v
		case opNegate:
			vals[i] = -vals[o.a]
		case opAdd:
			vals[i] = vals[o.a] + vals[o.b]
		case opSubtract:
			vals[i] = vals[o.a] - vals[o.b]
		case opMultiply:
			vals[i] = vals[o.a] * vals[o.b]
		case opDivide:
			vals[i] = vals[o.a] / vals[o.b]
		case opPower:
			vals[i] = math.Pow(vals[o.a], vals[o.b])
		case opParallel:
			vals[i] = parallel(vals[o.a], vals[o.b])
		case opSqrt:
			vals[i] = math.Sqrt(vals[o.a])
		case opLn:
			vals[i] = math.Log(vals[o.a])
		case opExp:
			vals[i] = math.Exp(vals[o.a])
		}
	}
	value := vals[len(e.ops)-1]
	return value, !math.IsNaN(value)
}

// parallel is ab/(a+b), written so that an infinite resistance beside a finite
// one leaves the finite one, and two links are a link.
func parallel(a, b float64) float64 {
	switch {
	case a == 0 || b == 0:
		return 0
	case math.IsInf(a, 0):
		return b
	case math.IsInf(b, 0):
		return a
	}
	return a * (b / (a + b))
}

// shares are a/(a+b) and b/(a+b), with the limits for infinite branches; two links
// share alike.
func shares(a, b float64) (ofA, ofB float64) {
	switch {
	case math.IsInf(a, 0):
		return 1, 0
	case math.IsInf(b, 0):
		return 0, 1
	case a == 0 && b == 0:
		return 0.5, 0.5
	}
	return a / (a + b), b / (a + b)
}

// slopes fills slopes with the derivative of the value with respect to each step,
// given the steps' values.
func (e *Expr) slopes(vals, slopes []float64) {
	for i := range e.ops {
		slopes[i] = 0
	}
	slopes[len(e.ops)-1] = 1
	for i := len(e.ops) - 1; i >= 0; i-- {
		o, s := &e.ops[i], slopes[i]
		if s == 0 {
			continue
		}
		a, b := vals[o.a], vals[o.b]
		switch o.code {
		case opNegate:
			slopes[o.a] -= s
		case opAdd:
			slopes[o.a] += s
			slopes[o.b] += s
		case opSubtract:
			slopes[o.a] += s
			slopes[o.b] -= s
		case opMultiply:
			slopes[o.a] += s * b
			slopes[o.b] += s * a
		case opDivide:
			slopes[o.a] += s / b
			slopes[o.b] -= s * vals[i] / b
		case opPower:
			slopes[o.a] += s * b * math.Pow(a, b-1)
			if e.ops[o.b].code != opNumber { // ln a has no number for a below 0, where only whole powers go
				slopes[o.b] += s * vals[i] * math.Log(a)
			}
		case opParallel:
			shareA, shareB := shares(a, b)
			slopes[o.a] += s * shareB * shareB
			slopes[o.b] += s * shareA * shareA
		case opSqrt:
			slopes[o.a] += s / (2 * vals[i]) // d sqrt(a) = da / (2 sqrt(a))
		case opLn:
			slopes[o.a] += s / a
		case opExp:
			slopes[o.a] += s * vals[i]
		}
	}
}
