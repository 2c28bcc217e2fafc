package netlist

import (
	"fmt"

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

// bind binds one expression. It returns false where something in it was refused;
// the expression then has no steps.
func (b *binder) bind(x syntax.Expr) (*Expr, bool) {
	b.e = Expr{Span: x.Where()}
	_, unit, ok := b.walk(x, 0)
	if !ok {
		return nil, false
	}
	e := b.e
	e.Unit, e.Text = unit, syntax.ExprText(x)
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
	// The rules of units look at no numbers but an exponent.
	l, r := quantity.Quantity{Value: 1, Unit: lu}, quantity.Quantity{Value: 1, Unit: ru}
	code, rule := opAdd, quantity.Add
	switch x.Op {
	case '-':
		code, rule = opSubtract, quantity.Sub
	case '*':
		code, rule = opMultiply, quantity.Mul
	case '/':
		code, rule = opDivide, quantity.Div
	case '^':
		code, rule = opPower, quantity.Pow
		if lu != quantity.One {
			value, constant := b.constantAt(right)
			if !constant {
				b.errorf("unit", x.Y.Where(), "", "the exponent of what is in %s must be a number", noun(lu))
				return 0, quantity.One, false
			}
			r.Value, right = value, b.push(op{code: opNumber, x: value})
		}
	}
	result, err := rule(l, r)
	if err != nil {
		b.errorf("unit", x.Span, unitRuleHint(x.Op, lu, ru), "%v", err)
		return 0, quantity.One, false
	}
	return b.push(op{code: code, a: left, b: right}), result.Unit, true
}

// unitRuleHint tells how degrees Celsius are reckoned with.
func unitRuleHint(operator byte, a, b quantity.Unit) string {
	switch {
	case operator == '+' && a.Absolute && b.Absolute:
		return "add a difference in K instead"
	case a.Absolute || b.Absolute:
		return "a difference of two temperatures is in K"
	}
	return ""
}

// constantAt is the number at a step, or minus the number that it negates.
func (b *binder) constantAt(at int32) (float64, bool) {
	o := b.e.ops[at]
	if o.code == opNegate && b.e.ops[o.a].code == opNumber {
		return -b.e.ops[o.a].x, true
	}
	return o.x, o.code == opNumber
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
	if name == "parallel" {
		return b.parallel(x, steps, units)
	}
	code, rule := opSqrt, quantity.Sqrt
	switch name {
	case "ln":
		code, rule = opLn, quantity.Ln
	case "exp":
		code, rule = opExp, quantity.Exp
	}
	result, err := rule(quantity.Quantity{Value: 1, Unit: units[0]})
	if err != nil {
		b.errorf("unit", x.Args[0].Where(), "", "%v", err)
		return 0, quantity.One, false
	}
	return b.push(op{code: code, a: steps[0]}), result.Unit, true
}

func (b *binder) parallel(x *syntax.Call, steps []int32, units []quantity.Unit) (int32, quantity.Unit, bool) {
	at := steps[0]
	for i := 1; i < len(steps); i++ {
		if _, err := quantity.Parallel(quantity.Quantity{Value: 1, Unit: units[0]}, quantity.Quantity{Value: 1, Unit: units[i]}); err != nil {
			b.errorf("unit", x.Args[i].Where(), "", "%v", err)
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
