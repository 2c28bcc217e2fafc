package netlist

import (
	"math"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// roomTemperature in degC holds where a file states no ambient, and is the
// temperature at which resistances hold.
const roomTemperature = 25

// zeroKelvin in degC bounds every temperature from below.
const zeroKelvin = -273.15

// deepest is how many values may stand behind each other, each defined by the
// next: far more than any design has, and few enough for the stack.
const deepest = 200

func (r *resolver) newSlot(s Slot, keep rule) SlotID {
	c := r.c
	c.Slots = append(c.Slots, s)
	c.priv.rules = append(c.priv.rules, keep)
	return SlotID(len(c.Slots) - 1)
}

// follow makes a slot a copy of another one, or of an expression.
func (r *resolver) follow(id, from SlotID, e *Expr) {
	s := &r.c.Slots[id]
	s.def = slotDef{follows: true, from: from, expr: e}
	r.c.priv.followers = append(r.c.priv.followers, follower{slot: id, from: from, expr: e})
	if e != nil {
		r.c.priv.exprs++
	}
}

// valueOf resolves the value of a rail, an element or a given value, after those
// that it depends on. It returns false where there is none, which was said then.
func (r *resolver) valueOf(t *thing) (SlotID, bool) {
	switch {
	case t.state == done:
		return t.slot, t.slot != None
	case t.state == busy:
		r.circle(t)
		return None, false
	case len(r.busy) >= deepest:
		r.errorf("circle", t.span, "", "%s stands behind more than %d values that are each defined by the next", t.name, deepest)
		t.state = done
		return None, false
	}
	t.state = busy
	r.busy = append(r.busy, t)
	switch t.sort {
	case aRail:
		r.railVolts(t)
	case aGiven:
		r.givenValue(t)
	case anElement:
		if t.element != nil {
			r.elementValue(t.element)
		}
	}
	r.busy = r.busy[:len(r.busy)-1]
	t.state = done
	return t.slot, t.slot != None
}

func (r *resolver) railVolts(t *thing) {
	id := r.newSlot(Slot{Name: t.name, Unit: quantity.Volt, Value: math.NaN(), Span: t.span}, rule{})
	if r.set(id, t.value, t.name, r.local) {
		t.slot = id
	}
	r.c.Rails[t.index].Volts = id
}

func (r *resolver) givenValue(t *thing) {
	b := r.binder(t.home)
	b.quantity = func(q *syntax.QuantityExpr) (Ref, bool) {
		r.errorf("wrong-place", q.Span, "", "%s is a quantity of the solution, and a given value is known before", quantityText(q))
		return Ref{}, false
	}
	e, ok := b.bind(t.given.Value)
	if !ok {
		return
	}
	slot := Slot{Name: t.name, Unit: e.Unit, Stated: true, Span: t.span}
	slot.Value, _ = e.Eval(slotTable{r.c})
	if !r.finite(slot.Value, e, t.name) {
		return
	}
	id := r.newSlot(slot, rule{})
	if !e.constant() {
		r.follow(id, None, e)
	}
	r.bounds(id, t.given.Bounds, t.name)
	t.slot = id
}

// finite tells whether the value of an expression is a number, and says so where
// it is none. The value of an open resistance is not known yet, and neither is
// what depends on it.
func (r *resolver) finite(value float64, e *Expr, what string) bool {
	if !math.IsNaN(value) && !math.IsInf(value, 0) {
		return true
	}
	for i := range e.ops {
		if o := &e.ops[i]; o.code == opSlot && math.IsNaN(r.c.Slots[o.a].Value) {
			return true
		}
	}
	r.errorf("no-number", e.Span, "", "%s has no value: %s", what, notFinite(value))
	return false
}

func notFinite(value float64) string {
	if math.IsNaN(value) {
		return "a root or logarithm of a negative number, or zero by zero"
	}
	return "a division by zero, or a number too large"
}

// A slotTable is an environment of slots alone.
type slotTable struct{ c *Circuit }

func (t slotTable) Slot(id SlotID) float64       { return t.c.Slots[id].Value }
func (t slotTable) Quantity(Ref) (float64, bool) { return math.NaN(), false }

// set gives a slot the stated value, with its bounds, and tells whether it has got
// one. what is the subject of the messages. The slot's unit says what is wanted.
func (r *resolver) set(id SlotID, v *syntax.Value, what string, home *scope) bool {
	if v.At != nil {
		r.errorf("wrong-place", v.At.Span, "", "%s is one number, not a point of a curve", what)
		return false
	}
	if !r.setNumber(id, v, what, home) {
		return false
	}
	r.bounds(id, v.Bounds, what) // the value counts whatever its bounds are
	return true
}

// setNumber is set without the bounds and the second co-ordinate.
func (r *resolver) setNumber(id SlotID, v *syntax.Value, what string, home *scope) bool {
	s := &r.c.Slots[id]
	s.Stated = true
	if v.Span != (diag.Span{}) {
		s.Span = v.Span
	}
	keep := r.c.priv.rules[id]
	if v.Name == nil {
		value, ok := r.number(v.Literal, s.Unit, keep, what)
		s.Value = value
		return ok
	}
	from, ok := r.givenNamed(*v.Name, home)
	if !ok {
		return false
	}
	s = &r.c.Slots[id] // the table may have moved
	if unit := r.c.Slots[from].Unit; unit != s.Unit {
		r.errorf("unit", v.Name.Span, "", "%s is in %s, but %s is in %s", what, noun(s.Unit), v.Name.Text, noun(unit))
		return false
	}
	s.Value = r.c.Slots[from].Value
	r.follow(id, from, nil)
	if says := keep.breach(s.Unit, s.Value); says != "" {
		r.errorf("sign", v.Name.Span, "", "%s %s: %s is %s", what, says, v.Name.Text, show(s.Value, s.Unit))
		return false
	}
	return true
}

// givenNamed is the slot of the given value that a word names.
func (r *resolver) givenNamed(w syntax.Word, home *scope) (SlotID, bool) {
	t := r.find(home, w)
	switch {
	case t == nil:
		r.unknown(w, home.nearer(aGiven), "there is no given value %s", w.Text)
		return None, false
	case t.sort != aGiven:
		d := r.errorf("wrong-place", w.Span, "", "%s is %s; a number or a given value belongs here", w.Text, t.sort)
		d.Related = []diag.Related{{Span: t.span, Message: "declared here"}}
		return None, false
	}
	t.used = true
	return r.valueOf(t)
}

// number checks a literal against the unit and the sign that are wanted.
func (r *resolver) number(l *syntax.Literal, want quantity.Unit, keep rule, what string) (float64, bool) {
	if l.Infinite {
		if !keep.infinite {
			r.errorf("sign", l.Span, "", "%s cannot be infinite", what)
		}
		return l.Value, keep.infinite
	}
	value := l.Value
	if ohms, ok := asOhms(l); ok && want == quantity.Ohm && !l.Bare {
		value = ohms
	} else if l.Unit != want || l.Bare && want != quantity.One {
		r.errorf("unit", l.Span, unitHint(l, want), "%s", unitMessage(l, want, what))
		return math.NaN(), false
	}
	if says := keep.breach(want, value); says != "" {
		r.errorf("sign", l.Span, "", "%s %s", what, says)
		return math.NaN(), false
	}
	return value, true
}

// unitMessage says that a literal has the wrong unit, or none.
func unitMessage(l *syntax.Literal, want quantity.Unit, what string) string {
	if l.Bare {
		return what + " has no unit"
	}
	if want == quantity.One {
		return what + " is " + noun(want) + ", but is given in " + noun(l.Unit)
	}
	return what + " is in " + noun(want) + ", but is given in " + noun(l.Unit)
}

func unitHint(l *syntax.Literal, want quantity.Unit) string {
	switch {
	case l.Bare:
		return "write " + l.Text + " " + want.String()
	case want == quantity.Celsius && l.Unit == quantity.Kelvin:
		return "write " + show(l.Value+zeroKelvin, want)
	case want == quantity.Kelvin && l.Unit == quantity.Celsius:
		return "a difference of temperatures is in K"
	}
	return ""
}

// breach says what a number does wrong, as the end of a sentence, or "".
func (k rule) breach(u quantity.Unit, value float64) string {
	switch {
	case math.IsNaN(value):
		return "" // not stated, or not known yet
	case math.IsInf(value, 1) && !k.infinite:
		return "cannot be infinite"
	case math.IsInf(value, -1):
		return "cannot be infinite"
	case u == quantity.Celsius && value <= zeroKelvin:
		return "must lie above absolute zero"
	case k.sign == Positive && value <= 0:
		return "must be greater than 0"
	case k.sign == NotNegative && value < 0:
		return "cannot be negative"
	}
	return ""
}

// bounds gives a slot that has its value its tolerance or range.
func (r *resolver) bounds(id SlotID, b *syntax.Bounds, what string) bool {
	if b == nil {
		return true
	}
	s := &r.c.Slots[id]
	if s.Bounds.Stated {
		r.errorf("duplicate-statement", b.Span, "", "%s has two tolerances", what)
		return false
	}
	out := Bounds{Stated: true, Spread: Spread(b.Spread), Low: math.Inf(1), High: math.Inf(-1)}
	keep := r.c.priv.rules[id]
	switch {
	case b.Relative != nil:
		if !r.relative(b.Relative, s, what) {
			return false
		}
		out.Relative = b.Relative.Value
		out.Low, out.High = ends(s.Value, out.Relative)
	case b.Low != nil && b.High != nil:
		low, ok := r.bound(b.Low, s.Unit, "the lower end of "+what)
		if !ok {
			return false // what is wrong with one end is so with the other
		}
		high, ok := r.bound(b.High, s.Unit, "the upper end of "+what)
		if !ok {
			return false
		}
		if low > high {
			r.errorf("bounds", b.Span, "the lower end comes first", "%s runs from %s down to %s", what, show(low, s.Unit), show(high, s.Unit))
			return false
		}
		out.Low, out.High = low, high
	}
	for i := range b.Picks {
		value, ok := r.bound(&b.Picks[i], s.Unit, "a choice of "+what)
		if !ok {
			return false
		}
		out.Picks = append(out.Picks, value)
		if b.Relative == nil && b.Low == nil {
			out.Low, out.High = math.Min(out.Low, value), math.Max(out.High, value)
		} else if value < out.Low || value > out.High {
			r.errorf("bounds", b.Picks[i].Span, "", "%s lies outside %s", show(value, s.Unit), span(out, s.Unit))
			return false
		}
	}
	if s.Value < out.Low || s.Value > out.High {
		r.errorf("bounds", b.Span, "", "%s is %s, outside its own bounds %s", what, show(s.Value, s.Unit), span(out, s.Unit))
		return false
	}
	if says := keep.breach(s.Unit, out.Low); says != "" {
		r.errorf("sign", b.Span, "", "%s %s: its bounds begin at %s", what, says, show(out.Low, s.Unit))
		return false
	}
	s.Bounds = out
	return true
}

// relative checks a tolerance in percent.
func (r *resolver) relative(l *syntax.Literal, s *Slot, what string) bool {
	switch {
	case l.Unit != quantity.One:
		r.errorf("unit", l.Span, "", "a tolerance is in percent, but this one is given in %s", noun(l.Unit))
		return false
	case s.Unit.Absolute:
		r.errorf("unit", l.Span, "state both ends: (15 degC .. 35 degC)", "a percentage of degrees Celsius means nothing")
		return false
	case l.Value < 0:
		r.errorf("sign", l.Span, "", "the tolerance of %s cannot be negative", what)
		return false
	}
	return true
}

// bound reads one end of a range. A bare number is taken in a resistance's place
// alone, as it is for the resistance itself.
func (r *resolver) bound(l *syntax.Literal, want quantity.Unit, what string) (float64, bool) {
	if want == quantity.Ohm {
		if ohms, ok := asOhms(l); ok {
			return ohms, true
		}
	}
	return r.number(l, want, rule{}, what)
}

// span shows bounds as they are written.
func span(b Bounds, u quantity.Unit) string {
	return "(" + show(b.Low, u) + " .. " + show(b.High, u) + ")"
}

// asOhms reads a literal in a resistance's place, where a bare number is in ohms
// and the letter K, behind the number, is the point of a code: 10K is 10 kohm.
func asOhms(l *syntax.Literal) (float64, bool) {
	const kilo = 1000
	switch {
	case l.Unit == quantity.Ohm:
		return l.Value, true
	case l.Bare:
		return l.Value, true
	case l.Unit == quantity.Kelvin && len(l.Text) > 1 && l.Text[len(l.Text)-1] == 'K' && l.Text[len(l.Text)-2] >= '0' && l.Text[len(l.Text)-2] <= '9':
		return l.Value * kilo, true
	}
	return math.NaN(), false
}
