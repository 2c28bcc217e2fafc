package netlist

import (
	"slices"

	"biaswright/netlist/quantity"
)

// LoadName is the slot that holds the load's voltage once HoldLoad put one there.
const LoadName = "load.V"

// HoldLoad returns a copy of c in which the declared load is an ideal voltage, in V
// along the load's path: what a compliance run does. The voltage is a slot of its
// own, "load.V", which Lookup and With know. The load's current stays the I of its
// elements; their other quantities have no number any more. Without a load, c itself is
// returned.
func (c *Circuit) HoldLoad(volts float64) *Circuit {
	if len(c.Load) == 0 {
		return c
	}
	out := c.copy()
	if c.LoadHeld {
		out.Slots[out.LoadVolts].Value = volts
		return out
	}
	out.LoadHeld, out.LoadVolts = true, SlotID(len(out.Slots))
	out.Slots = append(out.Slots, Slot{Name: LoadName, Unit: quantity.Volt, Value: volts, Stated: true})
	none := SlotID(len(out.Slots)) // the resistance of what is left of the load
	out.Slots = append(out.Slots, Slot{Unit: quantity.Ohm})
	out.priv.rules = append(slices.Clone(c.priv.rules), rule{}, rule{})
	out.Elements = slices.Clone(c.Elements)
	first := c.Load[0]
	for _, i := range c.Load {
		e := &out.Elements[i]
		e.Kind, e.Part, e.Params = Link, None, nil
		e.Value, e.TC, e.Rating, e.Size, e.Beside = none, None, None, None, None
	}
	// The first of them carries all the voltage; nodes within a row that is gone
	// hang in the air.
	e := &out.Elements[first]
	e.Kind, e.Value, e.Row, e.Chain = Drop, out.LoadVolts, 1, []NodeID{e.From, e.To}
	return out
}
