package render

import (
	"math"
	"strconv"
	"strings"

	"biaswright/netlist"
)

// what says what an element is, as an engineer would beside its symbol:
// "1.8 kΩ 5 %", "amber led ×2", "gp npn".
func (s *stair) what(i int) string {
	e := &s.c.Elements[i]
	var words []string
	say := func(w ...string) { words = append(words, w...) }
	switch e.Kind {
	case netlist.Resistor:
		say(s.slot(e.Value, "Ω"))
	case netlist.Link:
		say("link")
	case netlist.CurrentSource:
		say(s.slot(e.Value, "A"), "source")
	case netlist.Drop:
		say(s.slot(e.Value, "V"), "drop")
	case netlist.Cell:
		say(s.slot(e.Value, "V"), "cell")
	case netlist.JunctionPart, netlist.TransistorPart:
		say(s.c.Parts[e.Part].Name)
		if kind := s.kind(e).Name; kind != s.c.Parts[e.Part].Name {
			say(kind)
		}
	case netlist.Open:
		say("?", e.Series)
	}
	if e.Row > 1 {
		say("×" + strconv.Itoa(e.Row))
	}
	if e.Value != netlist.None {
		if b := s.c.Slots[e.Value].Bounds; b.Stated && b.Relative != 0 {
			say(percent(b.Relative))
		}
	}
	if e.Rating != netlist.None {
		// Ratings of resistors are named in watts: 0.25 W.
		say(strconv.FormatFloat(s.c.Slots[e.Rating].Value, 'g', digits, 64) + " W")
	}
	if e.Size != netlist.None {
		if size := s.c.Slots[e.Size].Value; size != 1 {
			say("size " + strconv.FormatFloat(size, 'g', digits, 64))
		}
	}
	if e.Reversed {
		say("reversed")
	}
	return strings.Join(words, " ")
}

func (s *stair) slot(id netlist.SlotID, unit string) string {
	return stated(s.c.Slots[id].Value, unit)
}

// state says what region a part works in, and what stands out about it.
func (s *stair) state(i int) cell {
	c := s.region(i)
	rating, over := s.over[s.c.Elements[i].Name]
	if !over {
		return c
	}
	if c.text != "" {
		c.text += ", "
	}
	return cell{c.text + "over its " + rating, bad}
}

func (s *stair) region(i int) cell {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	switch e.Kind {
	case netlist.TransistorPart:
		if q.State != "active" {
			return cell{q.State, warning}
		}
		return cell{q.State, noInk}
	case netlist.JunctionPart:
		return s.junction(i)
	case netlist.Cell:
		if q.I < 0 {
			return cell{"charged", noInk}
		}
		return cell{"delivers", noInk}
	}
	return cell{}
}

// junction names the state of a diode, led or zener. The language names states
// of transistors only; these words say what the numbers beside them show.
func (s *stair) junction(i int) cell {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	own, current := q.V, q.I // from anode to cathode
	if e.Reversed {
		own, current = -own, -current
	}
	// The share of the largest current below which the language calls a
	// transistor off; the same measure for a junction.
	const off = 1e-6
	state := "conducts"
	switch {
	case math.Abs(current) < off*s.largest && own < 0:
		return cell{"off", faint}
	case math.Abs(current) < off*s.largest:
		return cell{"starved", warning}
	case own < 0 && s.kind(e).Name == "zener":
		state = "breakdown"
	case own < 0:
		return cell{"off", faint} // its leakage alone
	case e.Row > 1:
		state = Measured(q.V/float64(e.Row), "V") + " each"
	}
	return cell{s.look.text(state), noInk}
}
