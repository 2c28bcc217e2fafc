package netlist

import (
	"fmt"
	"math"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// A binder turns the tree of an expression into an Expr. What names and
// quantities mean there, its two functions say; they report what they refuse.
type binder struct {
	say      func(diag.Diagnostic)
	slotUnit func(SlotID) quantity.Unit
	slot     func(syntax.Word) (SlotID, bool)
	quantity func(*syntax.QuantityExpr) (Ref, bool)

	e Expr
}

// deepestExpr bounds the recursion over a tree. A sum of that many terms is no
// deeper; nothing written by hand is.
const deepestExpr = 1000

// exponentLimit bounds the powers of a unit, which are held in eight bits.
const exponentLimit = 100

// bind binds one expression. It returns false where something in it was refused;
// the expression then has no steps.
func (b *binder) bind(x syntax.Expr) (*Expr, bool) {
	b.e = Expr{Span: x.Where()}
	_, unit, ok := b.walk(x, 0)
	if !ok {
		return nil, false
	}
	e := b.e
	e.Unit, e.Text = unit, exprText(x)
	return &e, true
}

func (b *binder) errorf(code string, at diag.Span, hint, format string, args ...any) {
	b.say(diag.Diagnostic{Code: code, Message: fmt.Sprintf(format, args...), Span: at, Hint: hint})
}

func (b *binder) push(o op) int32 {
	b.e.ops = append(b.e.ops, o)
	return int32(len(b.e.ops) - 1)
}

// walk binds a subtree and returns its step and unit. Both sides of an operator
// are looked at even if one is refused, so that all errors come out at once.
func (b *binder) walk(x syntax.Expr, depth int) (int32, quantity.Unit, bool) {
	if depth > deepestExpr {
		b.errorf("too-deep", x.Where(), "give parts of it names with `given`", "the expression is nested too deep")
		return 0, quantity.One, false
	}
	switch x := x.(type) {
	case *syntax.Number:
		if x.Infinite {
			b.errorf("wrong-place", x.Where(), "", "infinite stands for a parameter's value, not in an expression")
			return 0, quantity.One, false
		}
		return b.push(op{code: opNumber, x: x.Value}), x.Unit, true
	case *syntax.NameExpr:
		id, ok := b.slot(x.Word)
		if !ok {
			return 0, quantity.One, false
		}
		return b.push(op{code: opSlot, a: int32(id)}), b.slotUnit(id), true
	case *syntax.QuantityExpr:
		ref, ok := b.quantity(x)
		if !ok {
			return 0, quantity.One, false
		}
		b.e.refs = append(b.e.refs, ref)
		return b.push(op{code: opQuantity, a: int32(len(b.e.refs) - 1)}), ref.Unit, true
	case *syntax.Unary:
		at, unit, ok := b.walk(x.X, depth+1)
		if !ok || !x.Minus {
			return at, unit, ok
		}
		if unit.Absolute {
			b.errorf("unit", x.Span, "the sign of a temperature belongs to its number: -40 degC", "degrees Celsius cannot change sign")
			return 0, unit, false
		}
		return b.push(op{code: opNegate, a: at}), unit, true
	case *syntax.Binary:
		return b.binary(x, depth)
	case *syntax.Call:
		return b.call(x, depth)
	default:
		panic(fmt.Sprintf("netlist: no such expression: %T", x)) // the tree has no other
	}
}

func (b *binder) binary(x *syntax.Binary, depth int) (int32, quantity.Unit, bool) {
	left, lu, okLeft := b.walk(x.X, depth+1)
	right, ru, okRight := b.walk(x.Y, depth+1)
	if !okLeft || !okRight {
		return 0, quantity.One, false
	}
	switch x.Op {
	case '+', '-':
		unit, hint, ok := addUnits(x.Op, lu, ru)
		if !ok {
			b.errorf("unit", x.Span, hint, "%s", addMessage(x.Op, lu, ru))
			return 0, quantity.One, false
		}
		code := opAdd
		if x.Op == '-' {
			code = opSubtract
		}
		return b.push(op{code: code, a: left, b: right}), unit, true
	case '^':
		return b.power(x, left, right, lu, ru)
	}
	if lu.Absolute || ru.Absolute {
		b.errorf("unit", x.Span, "take a difference of two temperatures, which is in K",
			"degrees Celsius cannot be multiplied or divided")
		return 0, quantity.One, false
	}
	code, sign := opMultiply, 1
	if x.Op == '/' {
		code, sign = opDivide, -1
	}
	unit, ok := combine(lu, ru, sign)
	if !ok {
		b.errorf("unit", x.Span, "", "the unit of this has powers beyond %d", exponentLimit)
		return 0, quantity.One, false
	}
	return b.push(op{code: code, a: left, b: right}), unit, true
}

// addUnits is the unit of a sum or difference. A Celsius temperature moves by a
// difference in kelvin; two of them have a difference and no sum.
func addUnits(operator byte, a, b quantity.Unit) (unit quantity.Unit, hint string, ok bool) {
	switch {
	case a == quantity.Celsius && b == quantity.Celsius && operator == '-':
		return quantity.Kelvin, "", true
	case a == quantity.Celsius && b == quantity.Celsius:
		return a, "add a difference in K instead", false
	case a == quantity.Celsius && b == quantity.Kelvin:
		return a, "", true
	case a == quantity.Kelvin && b == quantity.Celsius && operator == '+':
		return b, "", true
	}
	return a, "", a == b
}

func addMessage(operator byte, a, b quantity.Unit) string {
	if operator == '+' {
		return noun(b) + " cannot be added to " + noun(a)
	}
	return noun(b) + " cannot be taken from " + noun(a)
}

// combine is the unit of a product (sign 1) or quotient (sign -1).
func combine(a, b quantity.Unit, sign int) (quantity.Unit, bool) {
	return unitOf(
		int(a.Volt)+sign*int(b.Volt), int(a.Ampere)+sign*int(b.Ampere),
		int(a.Kelvin)+sign*int(b.Kelvin), int(a.ElectronVolt)+sign*int(b.ElectronVolt))
}

func unitOf(volt, ampere, kelvin, electronVolt int) (quantity.Unit, bool) {
	for _, p := range []int{volt, ampere, kelvin, electronVolt} {
		if p > exponentLimit || p < -exponentLimit {
			return quantity.One, false
		}
	}
	return quantity.Unit{Volt: int8(volt), Ampere: int8(ampere), Kelvin: int8(kelvin), ElectronVolt: int8(electronVolt)}, true
}

// power binds a^b. Only a plain number has any power; what has a unit needs one
// that is written as a number and leaves whole powers of the units.
func (b *binder) power(x *syntax.Binary, base, exponent int32, bu, eu quantity.Unit) (int32, quantity.Unit, bool) {
	if eu != quantity.One {
		b.errorf("unit", x.Y.Where(), "", "an exponent is a plain number, not in %s", noun(eu))
		return 0, quantity.One, false
	}
	if bu == quantity.One {
		return b.push(op{code: opPower, a: base, b: exponent}), quantity.One, true
	}
	value, constant := b.constantAt(exponent)
	unit, ok := powerUnit(bu, value)
	if !constant || !ok || bu.Absolute {
		b.errorf("unit", x.Span, "the exponent of what has a unit is a whole number", "%s cannot have that power", noun(bu))
		return 0, quantity.One, false
	}
	return b.push(op{code: opPower, a: base, b: b.push(op{code: opNumber, x: value})}), unit, true
}

// constantAt is the number at a step, or minus the number that it negates.
func (b *binder) constantAt(at int32) (float64, bool) {
	o := b.e.ops[at]
	if o.code == opNegate && b.e.ops[o.a].code == opNumber {
		return -b.e.ops[o.a].x, true
	}
	return o.x, o.code == opNumber
}

func powerUnit(u quantity.Unit, p float64) (quantity.Unit, bool) {
	var powers [4]int
	for i, d := range []int8{u.Volt, u.Ampere, u.Kelvin, u.ElectronVolt} {
		whole := float64(d) * p
		if whole != math.Trunc(whole) || math.Abs(whole) > exponentLimit {
			return quantity.One, false
		}
		powers[i] = int(whole)
	}
	return unitOf(powers[0], powers[1], powers[2], powers[3])
}

func (b *binder) call(x *syntax.Call, depth int) (int32, quantity.Unit, bool) {
	steps := make([]int32, len(x.Args))
	units := make([]quantity.Unit, len(x.Args))
	all := true
	for i, a := range x.Args {
		var ok bool
		steps[i], units[i], ok = b.walk(a, depth+1)
		all = all && ok
	}
	name := x.Func.Text
	wanted, known := map[string]int{"parallel": 2, "sqrt": 1, "ln": 1, "exp": 1}[name]
	switch {
	case !known:
		b.errorf("unknown-name", x.Func.Span, didYouMean(name, []string{"parallel", "sqrt", "ln", "exp"}),
			"there is no function %s; there are parallel, sqrt, ln and exp", name)
		return 0, quantity.One, false
	case len(steps) < wanted || len(steps) > wanted && name != "parallel":
		b.errorf("wrong-place", x.Span, "", "%s takes %s, not %d", name, map[int]string{1: "one value", 2: "two values or more"}[wanted], len(steps))
		return 0, quantity.One, false
	case !all:
		return 0, quantity.One, false
	}
	unit := units[0]
	if unit.Absolute {
		b.errorf("unit", x.Args[0].Where(), "take a difference of two temperatures, which is in K", "%s of degrees Celsius means nothing", name)
		return 0, quantity.One, false
	}
	switch name {
	case "parallel":
		return b.parallel(x, steps, units)
	case "sqrt":
		root, ok := powerUnit(unit, 0.5) // the square root is the power one half
		if !ok {
			b.errorf("unit", x.Args[0].Where(), "", "%s have no square root", noun(unit))
			return 0, quantity.One, false
		}
		return b.push(op{code: opSqrt, a: steps[0]}), root, true
	}
	if unit != quantity.One {
		b.errorf("unit", x.Args[0].Where(), "divide by a value of the same unit first", "%s takes a plain number, not %s", name, noun(unit))
		return 0, quantity.One, false
	}
	code := opLn
	if name == "exp" {
		code = opExp
	}
	return b.push(op{code: code, a: steps[0]}), quantity.One, true
}

func (b *binder) parallel(x *syntax.Call, steps []int32, units []quantity.Unit) (int32, quantity.Unit, bool) {
	at := steps[0]
	for i := 1; i < len(steps); i++ {
		if units[i] != units[0] {
			b.errorf("unit", x.Args[i].Where(), "", "parallel takes values of one unit, not %s beside %s", noun(units[i]), noun(units[0]))
			return 0, quantity.One, false
		}
		at = b.push(op{code: opParallel, a: at, b: steps[i]})
	}
	return at, units[0], true
}

// binder gives the binder for expressions of the text of a scope. Its names are
// those of values, resolved as they are needed; its quantities are the solution's.
func (r *resolver) binder(s *scope) *binder {
	return &binder{
		say:      func(d diag.Diagnostic) { r.diags = append(r.diags, d) },
		slotUnit: func(id SlotID) quantity.Unit { return r.c.Slots[id].Unit },
		slot:     func(w syntax.Word) (SlotID, bool) { return r.slotNamed(s, w) },
		quantity: func(q *syntax.QuantityExpr) (Ref, bool) { return r.quantityRef(q) },
	}
}

// slotNamed is the value that a name in an expression stands for: a given value,
// a rail's volts, an element's stated value, the ambient temperature.
func (r *resolver) slotNamed(s *scope, w syntax.Word) (SlotID, bool) {
	if w.Text == "ambient" {
		return r.c.Ambient, true
	}
	t := r.find(s, w)
	if t == nil {
		r.unknown(w, s.nearer(aGiven, aRail, anElement), "there is no value %s", w.Text)
		return None, false
	}
	if t.sort == aNode || t.sort == aPart {
		d := r.errorf("wrong-place", w.Span, "", "%s is %s, which has no value of its own", w.Text, t.sort)
		if t.sort == aNode {
			d.Hint = "its voltage is " + w.Text + ".V"
		}
		d.Related = []diag.Related{{Span: t.span, Message: "declared here"}}
		return None, false
	}
	if t.sort != anElement { // an element is used by standing in the circuit
		t.used = true
	}
	id, ok := r.valueOf(t)
	if !ok && t.sort == anElement && t.element != nil && t.element.sound {
		r.errorf("wrong-place", w.Span, "its quantities are "+symbolList(w.Text, r.c.symbols(t.index)),
			"%s is %s, which has no value of its own", w.Text, r.c.describe(t.index))
	}
	return id, ok
}
