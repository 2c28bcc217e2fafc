package limits

import (
	"math"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
)

// A Regulation is how the held quantity moves with one axis at the nominal point,
// exactly.
type Regulation struct {
	Axis string
	Unit quantity.Unit
	// Absolute is dQ/dx, Relative that over Q; Resistance |dx/dQ| in ohm for a
	// current Q and a voltage x, else NaN.
	Absolute, Relative, Resistance float64
	Carrier
}

// regulate fills in the regulation of every axis that was searched.
func (a *Answer) regulate(c *netlist.Circuit) error {
	for i := range c.Rails {
		if err := a.slope(c.Rails[i].Name+".V", a.Nominal, c.Rails[i].Volts); err != nil {
			return err
		}
	}
	if err := a.slope("ambient", a.Nominal, c.Ambient); err != nil {
		return err
	}
	for i := range a.Limits {
		if a.Limits[i].Axis != netlist.LoadName {
			continue
		}
		held, start, err := a.heldLoad(c)
		if err != nil {
			return err
		}
		return a.slope(netlist.LoadName, start, held.LoadVolts)
	}
	return nil
}

func (a *Answer) slope(name string, p *solve.Point, slot netlist.SlotID) error {
	q := a.Hold.Q
	unit := p.Circuit.Slots[slot].Unit
	value, d, err := p.Sensitivity(q)
	if err != nil { // such as at the root of 0: there is no slope, and all else stands
		none := math.NaN()
		a.Regulation = append(a.Regulation, Regulation{Axis: name, Unit: unit, Absolute: none, Relative: none, Resistance: none, Carrier: Carrier{Share: none}})
		return nil
	}
	r := Regulation{Axis: name, Unit: unit, Absolute: d[slot], Relative: d[slot] / value, Resistance: math.NaN()}
	if q.Unit == quantity.Ampere && r.Unit == quantity.Volt {
		r.Resistance = math.Abs(1 / d[slot])
	}
	shares, err := p.Contributions(q, slot)
	if err != nil {
		return err
	}
	r.Carrier = carrier(p.Circuit, shares, d[slot])
	a.Regulation = append(a.Regulation, r)
	return nil
}
