package compare

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
)

// spans finds how far the quantity moves with each kind of uncertainty.
func (t *Topology) spans() error {
	c := t.Circuit
	var rails, betas, resistors []netlist.SlotID
	transistors, ohmic := false, false
	for i := range c.Elements {
		transistors = transistors || c.Elements[i].Kind == netlist.TransistorPart
		ohmic = ohmic || c.Elements[i].Kind == netlist.Resistor
	}
	for i := range c.Rails {
		rails = varies(c, rails, c.Rails[i].Volts)
	}
	for i := range c.Slots {
		_, parameter, of := strings.Cut(c.Slots[i].Name, ".")
		switch {
		case parameter == "betaF":
			betas = varies(c, betas, netlist.SlotID(i))
		case !of && c.Slots[i].Unit == quantity.Ohm: // a resistor's, or a given one
			resistors = tolerates(c, resistors, netlist.SlotID(i))
		}
	}
	m := &mover{c: c, q: t.Target.Q, nominal: t.Limits.Nominal, value: t.Value}
	for _, part := range []struct {
		out   *Span
		slots []netlist.SlotID
		there bool // what could vary
	}{
		{&t.Supply, rails, len(c.Rails) > 0},
		{&t.Ambient, varies(c, nil, c.Ambient), true},
		{&t.Beta, betas, transistors},
		{&t.Resistors, resistors, ohmic},
	} {
		*part.out = Span{t.Value, t.Value}
		switch {
		case len(part.slots) > 0:
			var err error
			if *part.out, err = m.span(part.slots); err != nil {
				return err
			}
		case part.there: // it varies, but nobody says how much
			*part.out = Span{math.NaN(), math.NaN()}
		}
	}
	return nil
}

// varies adds a slot that has a range and does not follow another.
func varies(c *netlist.Circuit, list []netlist.SlotID, id netlist.SlotID) []netlist.SlotID {
	if c.Follows(id) {
		return list
	}
	return tolerates(c, list, id)
}

// tolerates adds a slot that has a range of its own, about whatever number it has.
func tolerates(c *netlist.Circuit, list []netlist.SlotID, id netlist.SlotID) []netlist.SlotID {
	if b := &c.Slots[id].Bounds; b.Stated && b.Low < b.High {
		list = append(list, id)
	}
	return list
}

// A mover solves the circuit with some slots moved.
type mover struct {
	c       *netlist.Circuit
	q       *netlist.Expr
	nominal *solve.Point
	value   float64 // of q at nominal
}

// span is the least and largest value with all of the slots in their ranges. With
// several, corners are taken by the sign of each one's derivative at nominal and then
// solved; along a single one, places where the derivative is zero count too.
func (m *mover) span(slots []netlist.SlotID) (Span, error) {
	if len(slots) == 1 {
		return m.along(slots[0])
	}
	_, slope, err := m.nominal.Sensitivity(m.q)
	if err != nil {
		return Span{}, err
	}
	out := Span{m.value, m.value}
	for _, up := range []bool{false, true} {
		v, _, err := m.at(slots, m.corner(slots, func(id netlist.SlotID) bool { return slope[id] >= 0 == up }))
		if err != nil {
			return Span{}, err
		}
		out = out.with(v)
	}
	return out, nil
}

// corner is the slots' values at the ends of their ranges, the high end where high says
// so: of one that follows others, about the number that they have there.
func (m *mover) corner(slots []netlist.SlotID, high func(netlist.SlotID) bool) []float64 {
	end := func(id netlist.SlotID, number float64) float64 { return m.c.Slots[id].Bounds.End(number, high(id)) }
	values := m.c.Values()
	for _, id := range slots {
		values[id] = end(id, values[id])
	}
	m.c.PropagateWith(values, func(id netlist.SlotID, number float64) float64 {
		if slices.Contains(slots, id) {
			return end(id, number)
		}
		return number
	})
	out := make([]float64, len(slots))
	for i, id := range slots {
		out[i] = values[id]
	}
	return out
}

func (s Span) with(v float64) Span { return Span{math.Min(s.Low, v), math.Max(s.High, v)} }

// pieces is how many pieces a range is cut into to find where a derivative changes its
// sign. A bias network's current has few turns; between two of them that lie closer
// than this the curve is flat.
const pieces = 16

// along follows one slot over its range: the ends, and where the derivative vanishes.
func (m *mover) along(id netlist.SlotID) (Span, error) {
	b := &m.c.Slots[id].Bounds
	slots := []netlist.SlotID{id}
	out := Span{math.Inf(1), math.Inf(-1)}
	visit := func(x float64) (slope float64, err error) {
		v, slope, err := m.at(slots, []float64{x})
		if err == nil {
			out = out.with(v)
		}
		return slope, err
	}
	lastX, lastSlope := b.Low, 0.0
	for i := 0; i <= pieces; i++ {
		f := float64(i) / pieces
		x := (1-f)*b.Low + f*b.High
		slope, err := visit(x)
		if err != nil {
			return Span{}, err
		}
		if i > 0 && slope*lastSlope < 0 {
			if err := turn(visit, lastX, x, lastSlope); err != nil {
				return Span{}, err
			}
		}
		lastX, lastSlope = x, slope
	}
	return out, nil
}

// turn halves an interval in which the derivative changes its sign: at its zero the value
// depends on the place by the square only.
func turn(visit func(float64) (float64, error), a, b, slopeA float64) error {
	const halvings = 30 // of the interval: its square is below a double's resolution
	for range halvings {
		middle := a + (b-a)/2
		slope, err := visit(middle)
		if err != nil {
			return err
		}
		if slope*slopeA > 0 {
			a = middle
		} else {
			b = middle
		}
	}
	return nil
}

// at is the quantity with the slots at these values, and its derivative by the first.
func (m *mover) at(slots []netlist.SlotID, values []float64) (value, slope float64, err error) {
	var settings []netlist.Setting
	for i, id := range slots {
		settings = append(settings, netlist.Setting{Name: m.c.Slots[id].Name, Value: fmt.Sprintf("%.17g", values[i])})
	}
	moved, list := m.c.With(settings...)
	if list.HasErrors() {
		return 0, 0, errors.New(list[0].Message)
	}
	res, err := solve.Solve(moved, solve.Options{Near: m.nominal.Volts()})
	if err != nil {
		return 0, 0, fmt.Errorf("%s: %w", settings[0], err)
	}
	q, list := moved.ParseExpr(m.q.Text)
	if list.HasErrors() {
		return 0, 0, errors.New(list[0].Message)
	}
	value, d, err := res.Point.Sensitivity(q)
	if err != nil {
		return 0, 0, err
	}
	return value, d[slots[0]], nil
}
