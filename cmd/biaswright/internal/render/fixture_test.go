package render

import (
	"math"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
)

// The fixture is a lamp sink with a figure in every field, made by hand so that
// the screens are tested apart from the solver. Its numbers are rounded; only
// their layout is tested.

func slot(name string, unit quantity.Unit, v float64) netlist.Slot {
	return netlist.Slot{Name: name, Unit: unit, Value: v, Stated: true}
}

func fixture() *Answer {
	none := netlist.SlotID(netlist.None)
	diode := &netlist.Kind{Name: "diode", Shape: netlist.Junction}
	led := &netlist.Kind{Name: "led", Shape: netlist.Junction}
	npn := &netlist.Kind{Name: "npn", Shape: netlist.Transistor}
	c := &netlist.Circuit{
		File: "lamp-sink.bias", Title: "Mast lamp sink, two-diode reference",
		Nodes: []netlist.Node{
			{Name: "gnd", Rail: netlist.None},
			{Name: "VCC", Rail: 0},
			{Name: "bias", Rail: netlist.None},
			{Name: "D1:D2", Rail: netlist.None, Made: true},
			{Name: "out", Rail: netlist.None},
			{Name: "tail", Rail: netlist.None},
			{Name: "LAMP.1:LAMP.2", Rail: netlist.None, Made: true},
		},
		Parts: []netlist.Part{{Name: "sig", Kind: diode}, {Name: "amber", Kind: led}, {Name: "gp", Kind: npn}},
		Slots: []netlist.Slot{
			slot("VCC", quantity.Volt, 12),
			slot("ambient", quantity.Celsius, 25),
			slot("R1", quantity.Ohm, 1800),
			slot("RE", quantity.Ohm, 47),
			slot("RE.P", quantity.Watt, 0.25),
		},
		Ambient: 1,
		Rails:   []netlist.Rail{{Name: "VCC", Node: 1, Volts: 0}},
	}
	c.Slots[0].Bounds = netlist.Bounds{Stated: true, Low: 10.8, High: 13.2}
	c.Slots[2].Bounds = netlist.Bounds{Stated: true, Relative: 0.05}
	c.Slots[3].Bounds = netlist.Bounds{Stated: true, Relative: 0.01}
	two := func(name string, kind netlist.ElementKind, part int, from, to netlist.NodeID, value netlist.SlotID) netlist.Element {
		return netlist.Element{
			Name: name, Kind: kind, Part: part, From: from, To: to, Row: 1, Chain: []netlist.NodeID{from, to},
			Value: value, TC: none, Rating: none, Size: none, Beside: netlist.None,
		}
	}
	c.Elements = []netlist.Element{
		two("R1", netlist.Resistor, netlist.None, 1, 2, 2),
		two("D1", netlist.JunctionPart, 0, 2, 3, none),
		two("D2", netlist.JunctionPart, 0, 3, 0, none),
		two("LAMP", netlist.JunctionPart, 1, 1, 4, none),
		two("Q1", netlist.TransistorPart, 2, 4, 5, none),
		two("RE", netlist.Resistor, netlist.None, 5, 0, 3),
	}
	c.Elements[3].Row, c.Elements[3].Chain = 2, []netlist.NodeID{1, 6, 4}
	c.Elements[4].Base = 2
	c.Elements[5].Rating = 4
	n := func(id netlist.NodeID) netlist.Step { return netlist.Step{Node: id, Element: netlist.None} }
	e := func(i int) netlist.Step { return netlist.Step{Element: i} }
	c.Paths = []netlist.Path{
		{Steps: []netlist.Step{n(1), e(0), n(2), e(1), n(3), e(2), n(0)}},
		{Steps: []netlist.Step{n(1), e(3), n(4), e(4), n(5), e(5), n(0)}},
	}
	c.Load = []int{3}
	lamp := &netlist.Expr{Text: "LAMP.I", Unit: quantity.Ampere}
	heat := &netlist.Expr{Text: "Q1.P", Unit: quantity.Watt}
	c.Targets = []netlist.Target{{Q: lamp, Value: 0.015, Within: 0.1, Relative: true}}
	c.Keeps = []netlist.Keep{{Left: heat, Right: &netlist.Expr{Text: "100 mW", Unit: quantity.Watt}, Text: "Q1.P < 100 mW"}}
	nan := math.NaN()
	p := &solve.Point{
		Circuit: c,
		NodeV:   []float64{0, 12, 1.3, 0.65, 7.9, 0.606, 9.95},
		Rails:   []solve.RailPoint{{V: 12, I: 0.0187661, P: 0.225193}},
		Elements: []solve.ElementPoint{
			{V: 10.7, I: 5.94444e-3, P: 0.0636056, Tj: nan},
			{V: 0.65, I: 5.87321e-3, P: 3.81759e-3, Tj: 25},
			{V: 0.65, I: 5.87321e-3, P: 3.81759e-3, Tj: 25},
			{V: 4.1, I: 0.0128223, P: 0.0525714, Tj: 25, Members: []solve.MemberPoint{
				{V: 2.05, I: 0.0128223, P: 0.0262857, Tj: 25}, {V: 2.05, I: 0.0128223, P: 0.0262857, Tj: 25},
			}},
			{Ic: 0.0128223, Ib: 7.1235e-5, Ie: 0.0128936, Vbe: 0.694, Vce: 7.294, P: 0.0935753, Tj: 25, State: "active"},
			{V: 0.606, I: 0.0128936, P: 7.81352e-3, Tj: nan},
		},
		LoadV: 4.1, LoadI: 0.0128223,
		Evidence: solve.Evidence{Residual: 1.2e-17, Where: "current balance at tail", LastStep: 3.1e-13, Steps: 7, Way: "direct", Determinant: 1, Attempts: 1},
	}
	return &Answer{
		File: "lamp-sink.bias", Circuit: c, Result: &solve.Result{Point: p},
		Verdicts: []solve.Verdict{
			{Kind: "target", Q: lamp, Met: false, Value: 0.0128223, Low: 0.0135, High: 0.0165, Margin: -0.0006777},
			{Kind: "keep", Q: heat, Met: true, Value: 0.0935753, Low: math.Inf(-1), High: 0.1, Margin: 0.0064247},
		},
		Cautions: []solve.Caution{{Kind: "rating", Subject: "RE", Rating: "rating", Value: 0.3, Limit: 0.25}},
	}
}
