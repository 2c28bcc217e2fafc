package hand

import (
	"math"
	"slices"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve/mna"
)

// A RuleKind is a rule of thumb.
type RuleKind string

// The rules of thumb that are tested.
const (
	// Stiffness: a divider that feeds the base of a transistor with an emitter resistor
	// is stiff where beta times that resistor is ten times the divider's parallel
	// resistance or more (common practice).
	Stiffness RuleKind = "stiffness"
	// Reference: a junction that stands as a reference for bases carries ten times
	// what they take or more (common practice).
	Reference RuleKind = "reference"
	// Saturation: a transistor keeps at least 0.3 V above the V_CE at which it
	// saturates: half a volt in all (common practice).
	Saturation RuleKind = "saturation"
	// Switch: a saturated transistor that stands on a rail or gnd, its base fed by
	// resistors alone, is meant to be on, and is so for sure where I_C/I_B is 20 or less
	// (common practice: ten to twenty).
	Switch RuleKind = "switch"
)

// The rules' bounds, common practice all.
const (
	stiffEnough = 10
	feedsEnough = 10
	spareEnough = 0.3 // V
	forcedMost  = 20
)

// A Rule is a rule of thumb tested on the circuit.
type Rule struct {
	Kind RuleKind
	// Element is the transistor (Stiffness, Saturation, Switch) or the reference.
	Element int
	// Node is the base's (Stiffness, Reference, Switch), Bases the transistors fed there.
	Node  netlist.NodeID
	Bases []int
	// Figure is a ratio, or volts for Saturation; Wanted is what the rule asks for: the
	// least, and of Switch the most.
	Figure, Wanted float64
	// Beta is I_C/I_B, Emitter the emitter resistor and Divider the parallel
	// resistance of the divider, in ohm (Stiffness). Amps is the reference's current
	// and Base what the bases take, in A (Stiffness, Switch: Base alone).
	Beta, Emitter, Divider, Amps, Base float64
	// Costs is by row what it costs here: the full solution over that without the
	// bases' currents (Saturation: without the collector junction), less 1. NaN where
	// there is none, as for a Switch, whose saturation is wanted.
	Costs []float64
}

// Kept tells whether the rule holds.
func (r *Rule) Kept() bool {
	if r.Kind == Switch {
		return r.Figure <= r.Wanted
	}
	return r.Figure >= r.Wanted
}

// rules tests every rule of thumb where it applies, in the order of the elements.
func (a *Answer) rules() []Rule {
	var out []Rule
	c, p := a.Circuit, a.Full
	done := map[netlist.NodeID]bool{} // bases on one node are one matter
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Kind != netlist.TransistorPart || p.Elements[i].State == "off" {
			continue
		}
		if r, ok := a.stiffness(i); ok {
			out = append(out, r)
		}
		if !done[e.Base] {
			done[e.Base] = true
			out = append(out, a.references(e.Base)...)
		}
		if r, ok := a.asSwitch(i); ok {
			out = append(out, r)
			continue
		}
		out = append(out, a.saturation(i))
	}
	return out
}

// basesAt are the conducting transistors whose bases hang on a node.
func (a *Answer) basesAt(node netlist.NodeID) []int {
	var out []int
	for i := range a.Circuit.Elements {
		if e := &a.Circuit.Elements[i]; e.Kind == netlist.TransistorPart && e.Base == node && a.Full.Elements[i].State != "off" {
			out = append(out, i)
		}
	}
	return out
}

// baseCurrent is what transistors take by their bases, in A.
func (a *Answer) baseCurrent(of []int) float64 {
	sum := 0.0
	for _, i := range of {
		sum += a.Full.Elements[i].Ib
	}
	return sum
}

// isGiven tells a node whose voltage is given: gnd or a rail's.
func isGiven(c *netlist.Circuit, n netlist.NodeID) bool {
	return n == netlist.Gnd || c.Nodes[n].Rail != netlist.None
}

// legs are the resistors from a node to given ones, each perhaps several in a row, and
// what they make in parallel, in ohm.
func (a *Answer) legs(node netlist.NodeID) (ends []netlist.NodeID, parallel float64) {
	c := a.Circuit
	siemens := 0.0
	for i := range c.Elements {
		if c.Elements[i].From != node && c.Elements[i].To != node {
			continue
		}
		if end, ohms, ok := a.follow(i, node); ok && ohms > 0 {
			ends = append(ends, end)
			siemens += 1 / ohms
		}
	}
	return ends, 1 / siemens
}

// follow walks along resistors and links from a node, as long as nothing else is tied
// between them, to a given node.
func (a *Answer) follow(element int, from netlist.NodeID) (end netlist.NodeID, ohms float64, ok bool) {
	c := a.Circuit
	for range c.Elements { // no row is longer
		e := &c.Elements[element]
		switch e.Kind {
		case netlist.Resistor:
			ohms += float64(e.Row) * c.Value(e.Value)
		case netlist.Link:
		default:
			return 0, 0, false
		}
		if end = e.To; from == e.To {
			end = e.From
		}
		if isGiven(c, end) {
			return end, ohms, true
		}
		next := a.tied(end)
		if len(next) != 2 {
			return 0, 0, false
		}
		if next[0] == element {
			next[0] = next[1]
		}
		element, from = next[0], end
	}
	return 0, 0, false
}

// tied lists the elements at a node, one twice that has both ends or a base there too.
func (a *Answer) tied(node netlist.NodeID) []int {
	var out []int
	for i := range a.Circuit.Elements {
		e := &a.Circuit.Elements[i]
		at := []netlist.NodeID{e.From, e.To}
		if e.Kind == netlist.TransistorPart {
			at = append(at, e.Base)
		}
		for _, n := range at {
			if n == node {
				out = append(out, i)
			}
		}
	}
	return out
}

// divider tells that a node hangs on a divider: resistors to two given nodes or more,
// and no junction that holds it.
func (a *Answer) divider(node netlist.NodeID) (parallel float64, ok bool) {
	ends, parallel := a.legs(node)
	slices.Sort(ends)
	return parallel, len(slices.Compact(ends)) > 1 && len(a.holders(node)) == 0
}

func (a *Answer) stiffness(q int) (Rule, bool) {
	e := &a.Circuit.Elements[q]
	parallel, ok := a.divider(e.Base)
	ends, re := a.legs(a.emitter(q))
	if !ok || len(ends) == 0 {
		return Rule{}, false
	}
	ep := &a.Full.Elements[q]
	beta := ep.Ic / ep.Ib
	return Rule{
		Kind: Stiffness, Element: q, Node: e.Base, Bases: []int{q}, Figure: beta * re / parallel, Wanted: stiffEnough,
		Beta: beta, Emitter: re, Divider: parallel, Base: ep.Ib, Costs: a.withoutBases([]int{q}),
	}, true
}

// holders are the junctions that hold a node as a reference for bases: diodes and
// zeners tied to it, and transistors whose collector is tied to their base there, whose
// current passes the node the same way as the bases'. One the other way round feeds them.
func (a *Answer) holders(node netlist.NodeID) []int {
	c, p := a.Circuit, a.Full
	into := 0.0 // the elements, by the bases, in A
	for _, i := range a.basesAt(node) {
		into += a.inward(i, node)
	}
	var out []int
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Part == netlist.None || e.From != node && e.To != node {
			continue
		}
		collector := e.From
		if c.Parts[e.Part].Kind.PNP {
			collector = e.To
		}
		tied := e.Kind == netlist.JunctionPart || e.Base == node && collector == node
		amps := a.inward(i, node)
		if e.Kind == netlist.TransistorPart && tied {
			amps = math.Copysign(p.Elements[i].Ie, into)
		}
		if tied && amps*into > 0 && math.Abs(amps) > idle*p.LargestCurrent() {
			out = append(out, i)
		}
	}
	return out
}

// inward is the current that flows from a node into a junction, or into a transistor's
// base, in A.
func (a *Answer) inward(element int, node netlist.NodeID) float64 {
	e, ep := &a.Circuit.Elements[element], &a.Full.Elements[element]
	switch {
	case e.Kind == netlist.TransistorPart && a.Circuit.Parts[e.Part].Kind.PNP:
		return -ep.Ib
	case e.Kind == netlist.TransistorPart:
		return ep.Ib
	case e.From == node:
		return ep.I
	default:
		return -ep.I
	}
}

func (a *Answer) references(node netlist.NodeID) []Rule {
	var out []Rule
	for _, i := range a.holders(node) {
		bases := a.basesAt(node)
		taken := a.baseCurrent(bases)
		_, amps := junctionOf(a.Full, i)
		out = append(out, Rule{
			Kind: Reference, Element: i, Node: node, Bases: bases, Figure: math.Abs(amps / taken), Wanted: feedsEnough,
			Amps: math.Abs(amps), Base: taken, Costs: a.withoutBases(bases),
		})
	}
	return out
}

// emitter is the node of a transistor's emitter.
func (a *Answer) emitter(q int) netlist.NodeID {
	e := &a.Circuit.Elements[q]
	if a.Circuit.Parts[e.Part].Kind.PNP {
		return e.From
	}
	return e.To
}

// asSwitch is the rule of a transistor that is meant to be a switch.
func (a *Answer) asSwitch(q int) (Rule, bool) {
	c, ep := a.Circuit, &a.Full.Elements[q]
	base := c.Elements[q].Base
	if ep.State != "saturated" || !isGiven(c, a.emitter(q)) {
		return Rule{}, false
	}
	for _, i := range a.tied(base) {
		if kind := c.Elements[i].Kind; i != q && kind != netlist.Resistor && kind != netlist.Link {
			return Rule{}, false // something else decides on the base
		}
	}
	return Rule{Kind: Switch, Element: q, Node: base, Bases: []int{q}, Figure: ep.Ic / ep.Ib, Wanted: forcedMost, Base: ep.Ib, Costs: a.none()}, true
}

func (a *Answer) saturation(q int) Rule {
	ideals := make([]devices.Ideal, len(a.Circuit.Elements))
	ideals[q].NoCollector = true
	return Rule{
		Kind: Saturation, Element: q, Node: netlist.None, Figure: a.Full.SpareVolts(q), Wanted: spareEnough,
		Costs: a.costs(a.Circuit, ideals),
	}
}

// withoutBases is what the base currents of these transistors cost.
func (a *Answer) withoutBases(of []int) []float64 {
	var set []netlist.Setting
	for _, i := range of {
		name := a.Circuit.Elements[i].Name
		set = append(set, noRecombination(name)...)
		set = append(set, netlist.Setting{Name: name + ".betaF", Value: "infinite"})
	}
	c, err := with(a.Circuit, set)
	if err != nil {
		return a.none()
	}
	return a.costs(c, nil)
}

func (a *Answer) none() []float64 {
	out := make([]float64, len(a.Rows))
	for i := range out {
		out[i] = math.NaN()
	}
	return out
}

// costs compares the full solution with a circuit that has been made better.
func (a *Answer) costs(c *netlist.Circuit, ideals []devices.Ideal) []float64 {
	s, err := mna.New(c)
	if err != nil {
		return a.none()
	}
	if ideals != nil {
		s.Idealise(ideals)
	}
	p, err := a.nearest(s)
	if err != nil {
		return a.none()
	}
	out := a.read(p)
	for i := range out {
		out[i] = a.Rows[i].Full/out[i] - 1
		if math.IsInf(out[i], 0) {
			out[i] = math.NaN()
		}
	}
	return out
}
