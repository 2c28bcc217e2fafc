package mna

import (
	"math"
	"slices"

	"biaswright/netlist"
)

// A Tuner moves some slots of a system without rebuilding it, and touches only
// what hangs on them: a sweep sets a rail at the cost of a few additions.
type Tuner struct {
	s        *System
	slots    []netlist.SlotID
	follow   bool             // other slots follow the moved ones
	pinned   bool             // a moved slot would itself follow others
	offsets  bool             // ideal branches move
	base     bool             // resistors or sources move
	devices  []int32          // devices whose coefficients move
	positive []netlist.SlotID // resistances
	zero     []netlist.SlotID // links', and bulk resistances that are not there
	scale    float64
}

// NewTuner prepares to move these slots of s. One that follows others has a number of its
// own from the first Set on.
func (s *System) NewTuner(slots ...netlist.SlotID) *Tuner {
	t := &Tuner{s: s, slots: slots, scale: s.startCurrent()}
	moved := s.touched(slots)
	own := 0
	for _, is := range moved {
		if is {
			own++
		}
	}
	t.follow = own > len(slots)
	for _, id := range slots {
		t.pinned = t.pinned || s.circuit.Follows(id)
	}
	for _, b := range s.forest.branches {
		if b.slot != netlist.None && moved[b.slot] {
			t.offsets = true
		}
	}
	for i := range s.devices {
		d := &s.devices[i]
		if !s.depends(d, moved) {
			continue
		}
		t.devices = append(t.devices, int32(i))
		switch d.kind {
		case resistorDevice:
			t.base = true
			t.positive = append(t.positive, s.circuit.Elements[d.element].Value)
		case bulkDevice, sourceDevice:
			t.base = true
		}
	}
	t.zero = s.absent(moved)
	return t
}

// absent lists the moved slots that are 0 now and would add something to the
// structure were they not.
func (s *System) absent(moved []bool) []netlist.SlotID {
	var out []netlist.SlotID
	for i := range s.circuit.Elements {
		e := &s.circuit.Elements[i]
		switch e.Kind {
		case netlist.Link:
			if moved[e.Value] {
				out = append(out, e.Value)
			}
		case netlist.JunctionPart:
			if id := e.Params[s.kind(e).Index("Rbulk")]; moved[id] && s.values[id] == 0 {
				out = append(out, id)
			}
		}
	}
	return out
}

// touched marks the slots and all that follow them: a NaN put in spreads to just
// those.
func (s *System) touched(slots []netlist.SlotID) []bool {
	values := append([]float64(nil), s.values...)
	for _, id := range slots {
		values[id] = math.NaN()
	}
	s.circuit.PropagateWith(values, func(id netlist.SlotID, number float64) float64 {
		if slices.Contains(slots, id) {
			return math.NaN()
		}
		return number
	})
	moved := make([]bool, len(values))
	for i, v := range values {
		moved[i] = math.IsNaN(v) && !math.IsNaN(s.values[i])
	}
	for _, id := range slots {
		moved[id] = true
	}
	return moved
}

// depends tells whether a device's coefficients hang on a moved slot.
func (s *System) depends(d *device, moved []bool) bool {
	e := &s.circuit.Elements[d.element]
	if d.kind == sourceDevice {
		return moved[e.Value]
	}
	if moved[s.circuit.Ambient] {
		return true
	}
	if d.kind == resistorDevice {
		return moved[e.Value] || e.TC != netlist.None && moved[e.TC]
	}
	if moved[e.Size] {
		return true
	}
	for _, id := range e.Params {
		if moved[id] {
			return true
		}
	}
	return false
}

// Set puts the slots' new numbers in force, in the order given to NewTuner. It
// reports false, with the system unchanged in structure, where a number does not
// fit the structure: a resistance that is no longer positive, or parameters that make
// no model together. Junctions keep their iteration state.
func (t *Tuner) Set(numbers ...float64) bool {
	s := t.s
	s.near = false
	for i, id := range t.slots {
		s.values[id] = numbers[i]
	}
	switch {
	case t.follow && t.pinned:
		s.circuit.PropagateWith(s.values, func(id netlist.SlotID, number float64) float64 {
			if i := slices.Index(t.slots, id); i >= 0 {
				return numbers[i]
			}
			return number
		})
	case t.follow:
		s.circuit.Propagate(s.values)
	}
	if t.offsets {
		s.setOffsets()
	}
	for _, id := range t.zero {
		if s.values[id] != 0 {
			return false
		}
	}
	if len(t.devices) == 0 {
		return true
	}
	kelvin := s.values[s.circuit.Ambient] + zeroCelsius
	ok := kelvin > 0
	for _, id := range t.positive {
		ok = ok && s.values[id] > 0
	}
	if !ok {
		return false
	}
	for _, i := range t.devices {
		d := &s.devices[i]
		s.kelvin[i] = kelvin
		s.setDevice(d, kelvin, t.scale)
		if s.check(d) != nil {
			return false
		}
		if d.kind <= bulkDevice {
			if g := s.resistors[d.at].g; !(g > 0) || math.IsInf(g, 0) {
				return false
			}
		}
	}
	if t.base {
		s.setBase()
	}
	return true
}
