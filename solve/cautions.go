package solve

import (
	"math"

	"biaswright/netlist"
)

// A Caution is something an engineer should be told about a point. Kind is one
// of:
//
//   - "high-voltage": Value is the voltage between nodes Subject and Other;
//   - "rating": Subject exceeds its stated Rating;
//   - "zener-forward": zener Subject conducts Value forward;
//   - "beta-current": transistor Subject carries Value, and Limit is the current
//     up to which its constant beta is believable;
//   - "slip": Rating names what looks like a slip, Value is its number, Limit the
//     bound of what is usual that it passes;
//   - "hot": element Subject, without a stated rating, dissipates Value;
//   - "bright": emitter Subject runs at Value;
//   - "impossible": element Subject carries Value, which nothing survives, and far
//     beyond which the models are not those of any part.
//
// Value and Limit are in SI units.
type Caution struct {
	Kind, Subject, Other string
	Rating               string // "Pmax", …
	Value, Limit         float64
}

// Bounds that cautions rest on.
const (
	// highVoltage is the DC voltage in V above which touching is commonly held
	// to be dangerous (IEC 62368-1, energy source class 1, steady state; from
	// memory: 60 V).
	highVoltage = 60
	// hotPower in W: an unrated small part at 1 W burns a finger (common
	// practice).
	hotPower = 1
	// brightCurrent in A: emitters driven harder are lamps to be judged by IEC
	// 62471 (common practice: the 350 mA class).
	brightCurrent = 0.35
	// impossibleCurrent in A: far above what any part of a bias network, or the wire to it,
	// carries (common practice). A junction straight across a supply gets there.
	impossibleCurrent = 1e4
	// betaVoltage in V at 25 degC: a base-emitter junction beyond it is in high
	// injection, where beta falls (common practice).
	betaVoltage = 0.8
	// trickle is the share of the circuit's largest current below which a
	// zener's forward current is leakage.
	trickle = 1e-6
)

// Cautions lists what an engineer should be told, in a fixed order: the circuit,
// then the elements in file order, then slips in parts.
func Cautions(p *Point) []Caution {
	var out []Caution
	if c, ok := highestVoltage(p); ok {
		out = append(out, c)
	}
	for i := range p.Circuit.Elements {
		out = append(out, elementCautions(p, i)...)
	}
	return append(out, slips(p.Circuit)...)
}

// highestVoltage looks for the two nodes furthest apart.
func highestVoltage(p *Point) (Caution, bool) {
	low, high := 0, 0
	for i, v := range p.NodeV {
		if v < p.NodeV[low] {
			low = i
		}
		if v > p.NodeV[high] {
			high = i
		}
	}
	volts := p.NodeV[high] - p.NodeV[low]
	return Caution{
		Kind: "high-voltage", Subject: p.Circuit.Nodes[high].Name, Other: p.Circuit.Nodes[low].Name,
		Value: volts, Limit: highVoltage,
	}, volts > highVoltage
}

func elementCautions(p *Point, i int) []Caution {
	e := &p.Circuit.Elements[i]
	var out []Caution
	add := func(c Caution) {
		c.Subject = e.Name
		out = append(out, c)
	}
	exceeds := func(rating string, value, limit float64) {
		if value > limit { // false for a NaN, a rating that is not stated
			add(Caution{Kind: "rating", Rating: rating, Value: value, Limit: limit})
		}
	}
	ep := &p.Elements[i]
	power, current := ep.P, math.Abs(ep.I)
	if len(ep.Members) > 0 {
		power = ep.Members[0].P
		for _, m := range ep.Members {
			power = math.Max(power, m.P)
		}
	}
	if most := mostCurrent(ep); most > impossibleCurrent {
		add(Caution{Kind: "impossible", Value: most, Limit: impossibleCurrent})
	}
	rated := false
	switch e.Kind {
	case netlist.Resistor:
		if rated = e.Rating != netlist.None; rated {
			exceeds("rating", power, p.Slot(e.Rating))
		}
	case netlist.JunctionPart:
		forward := ep.I
		volts := ep.V / float64(max(1, e.Row))
		if e.Reversed {
			forward, volts = -forward, -volts
		}
		rated = exceedsPart(p, e, exceeds, power, map[string]float64{
			"Imax": current, "Tjmax": ep.Tj, "VRmax": -volts,
		})
		kind := p.Circuit.Parts[e.Part].Kind.Name
		if kind == "zener" && forward > trickle*p.LargestCurrent() {
			add(Caution{Kind: "zener-forward", Value: forward})
		}
		if kind == "led" && current >= brightCurrent {
			add(Caution{Kind: "bright", Value: current, Limit: brightCurrent})
		}
	case netlist.TransistorPart:
		rated = exceedsPart(p, e, exceeds, power, map[string]float64{
			"Imax": math.Abs(ep.Ic), "Tjmax": ep.Tj, "VCEOmax": ep.Vce, "VEBOmax": -ep.Vbe,
		})
		if limit := p.state.CurrentAt(i, betaVoltage); ep.Ic > limit {
			add(Caution{Kind: "beta-current", Value: ep.Ic, Limit: limit})
		}
	default:
		return out // sources deliver; links and drops stand for something else
	}
	if !rated && power > hotPower {
		add(Caution{Kind: "hot", Value: power, Limit: hotPower})
	}
	return out
}

// mostCurrent is the largest current of an element's terminals.
func mostCurrent(ep *ElementPoint) float64 {
	most := 0.0
	for _, i := range []float64{ep.I, ep.Ic, ep.Ib, ep.Ie} {
		if i = math.Abs(i); i > most { // false for a NaN
			most = i
		}
	}
	return most
}

// exceedsPart compares with the ratings of a part, in its own order, and tells
// whether its power is rated.
func exceedsPart(p *Point, e *netlist.Element, exceeds func(string, float64, float64), power float64, now map[string]float64) bool {
	now["Pmax"] = power
	rated := false
	for k, param := range p.Circuit.Parts[e.Part].Kind.Params {
		value, known := now[param.Name]
		if !param.Rating || !known {
			continue
		}
		limit := p.Slot(e.Params[k])
		exceeds(param.Name, value, limit)
		if param.Name == "Pmax" && !math.IsNaN(limit) {
			rated = true
		}
	}
	return rated
}

// A usual range: what lies outside looks like a slip of the pen.
type usual struct{ low, high float64 }

// The ranges are common practice, drawn wide: what lies outside is possible, but
// rarer than a slip.
var (
	usualResistor = usual{0.1, 100e6} // ohm
	usualRail     = usual{0, 1000}    // V, of its magnitude
	usualParam    = map[string]map[string]usual{
		"diode": {"drop": {0.15, 1.3}, "n": {0.9, 3}},
		"led":   {"drop": {1, 5}, "n": {0.9, 6}},
		"zener": {"Vz": {1.8, 200}, "drop": {0.4, 1.3}},
		"npn":   {"Vbe": {0.4, 0.9}, "betaF": {5, 5000}, "VA": {5, math.Inf(1)}, "n": {0.9, 2.1}},
		"pnp":   {"Veb": {0.4, 0.9}, "betaF": {5, 5000}, "VA": {5, math.Inf(1)}, "n": {0.9, 2.1}},
	}
)

// Usual is the range, in SI units, in which a parameter of a kind of part commonly lies;
// ok is false where none is known. What lies outside is rarer than a slip.
func Usual(kind, param string) (low, high float64, ok bool) {
	u, ok := usualParam[kind][param]
	return u.low, u.high, ok
}

// slips lists numbers that look like slips, in elements and parts that are used.
func slips(c *netlist.Circuit) []Caution {
	var out []Caution
	check := func(subject, what string, value float64, u usual) {
		switch {
		case value < u.low:
			out = append(out, Caution{Kind: "slip", Subject: subject, Rating: what, Value: value, Limit: u.low})
		case value > u.high:
			out = append(out, Caution{Kind: "slip", Subject: subject, Rating: what, Value: value, Limit: u.high})
		}
	}
	for _, r := range c.Rails {
		check(r.Name, "V", math.Abs(c.Value(r.Volts)), usualRail)
	}
	used := make([]bool, len(c.Parts))
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Kind == netlist.Resistor {
			check(e.Name, "ohms", c.Value(e.Value), usualResistor)
		}
		if e.Part != netlist.None {
			used[e.Part] = true
		}
	}
	for i := range c.Parts {
		part := &c.Parts[i]
		if !used[i] {
			continue
		}
		for k, param := range part.Kind.Params {
			if u, ok := usualParam[part.Kind.Name][param.Name]; ok && c.Slots[part.Params[k]].Stated {
				check(part.Name, param.Name, c.Value(part.Params[k]), u)
			}
		}
	}
	return out
}
