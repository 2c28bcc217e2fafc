package netlist

import "math"

// A slotDef is how a slot follows others. The zero value is a number of its own.
type slotDef struct {
	follows bool
	from    SlotID // copied where expr is nil
	expr    *Expr
}

// A follower is one slot that is computed from others, in an order in which it
// comes behind all that it depends on.
type follower struct {
	slot, from SlotID
	expr       *Expr // nil: a copy of from
}

// A rule is what the number of a slot must keep to.
type rule struct {
	sign     Sign
	infinite bool // +Inf is allowed
}

// Value returns a slot's number, in the slot's unit.
func (c *Circuit) Value(id SlotID) float64 { return c.Slots[id].Value }

// Values returns a copy of the numbers of all slots, index by index, each in its
// slot's unit.
func (c *Circuit) Values() []float64 {
	values := make([]float64, len(c.Slots))
	for i := range c.Slots {
		values[i] = c.Slots[i].Value
	}
	return values
}

// Propagate recomputes in place every slot of values that follows others. It
// allocates nothing. The caller owns values (length len(c.Slots)).
func (c *Circuit) Propagate(values []float64) {
	c.PropagateWith(values, nil)
}

// PropagateWith is Propagate where some followers have a number of their own: own is
// given each follower and the number that it would take, and returns the one that it
// takes. What follows it follows that. A nil own leaves all as they are.
func (c *Circuit) PropagateWith(values []float64, own func(id SlotID, number float64) float64) {
	var short [shortExpr]float64
	for i := range c.priv.followers {
		f := &c.priv.followers[i]
		number := 0.0
		if f.expr == nil {
			number = values[f.from]
		} else {
			vals := short[:]
			if len(f.expr.ops) > shortExpr {
				vals = make([]float64, len(f.expr.ops))
			}
			number, _ = f.expr.run(vals, values, nil)
		}
		if own != nil {
			number = own(f.slot, number)
		}
		values[f.slot] = number
	}
}

// Chain turns derivatives of some quantity with respect to each slot alone
// (length len(c.Slots), owned by the caller) into total ones, in place: what
// followers contribute is added to what they follow. The derivatives of
// expressions are taken at the circuit's own numbers.
func (c *Circuit) Chain(d []float64) {
	if c.priv.exprs == 0 {
		c.ChainAt(nil, d)
		return
	}
	c.ChainAt(c.Values(), d)
}

// ChainAt is Chain with the derivatives of expressions taken at values (length
// len(c.Slots), only read), as Propagate left them.
func (c *Circuit) ChainAt(values, d []float64) {
	for i := len(c.priv.followers) - 1; i >= 0; i-- {
		f := &c.priv.followers[i]
		if d[f.slot] == 0 {
			continue
		}
		if f.expr == nil {
			d[f.from] += d[f.slot]
			continue
		}
		f.expr.chain(values, d, d[f.slot])
	}
}

// chain adds weight times the expression's derivatives to d.
func (e *Expr) chain(values, d []float64, weight float64) {
	var short, shortSlopes [shortExpr]float64
	vals, slopes := short[:], shortSlopes[:]
	if len(e.ops) > shortExpr {
		vals, slopes = make([]float64, len(e.ops)), make([]float64, len(e.ops))
	}
	e.run(vals, values, nil)
	e.slopes(vals, slopes)
	for i := range e.ops {
		if e.ops[i].code == opSlot {
			d[e.ops[i].a] += weight * slopes[i]
		}
	}
}

// settle recomputes the followers among the circuit's own slots, and the ends of
// tolerances that are a fraction of a value.
func (c *Circuit) settle() {
	if len(c.priv.followers) > 0 {
		values := c.Values()
		c.Propagate(values)
		for i := range c.priv.followers {
			f := &c.priv.followers[i]
			s := &c.Slots[f.slot]
			s.Value = values[f.slot]
			if f.expr == nil {
				s.Stated = c.Slots[f.from].Stated
			}
			if f.expr == nil && math.IsNaN(s.Value) { // a rival has come into force
				s.Bounds = Bounds{}
			}
		}
	}
	for i := range c.Slots {
		s := &c.Slots[i]
		if s.Bounds.Relative != 0 {
			s.Bounds.Low, s.Bounds.High = ends(s.Value, s.Bounds.Relative)
		}
	}
}

// ends are value ± the fraction relative of it, the lower one first.
func ends(value, relative float64) (low, high float64) {
	low, high = value*(1-relative), value*(1+relative)
	return math.Min(low, high), math.Max(low, high)
}

// End is one end of the bounds about a number, both in the slot's unit: of a percentage that
// of the number given, which the slot may have elsewhere than in its circuit; else the
// stated one.
func (b *Bounds) End(number float64, high bool) float64 {
	low, top := b.Low, b.High
	if b.Relative != 0 {
		low, top = ends(number, b.Relative)
	}
	if high {
		return top
	}
	return low
}

// Follows tells whether a slot has no number of its own, but that of others: an element's
// parameter its part's, a value the given value that stands for it.
func (c *Circuit) Follows(id SlotID) bool { return c.Slots[id].def.follows }
