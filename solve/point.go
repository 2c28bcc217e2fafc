package solve

import (
	"math"

	"biaswright/netlist"
	"biaswright/solve/mna"
)

// A Point is one operating point, with every quantity and its evidence. It is
// not modified after it was returned.
type Point struct {
	Circuit  *netlist.Circuit
	NodeV    []float64 // V, by NodeID
	Inner    []InnerPoint
	Rails    []RailPoint
	Elements []ElementPoint
	// LoadV and LoadI are of the declared load, in V and A; NaN without one.
	LoadV, LoadI float64
	// Unstable is true for a point that cannot be stable (determinant sign -1).
	// False is no proof of stability.
	Unstable bool
	Evidence Evidence

	x     []float64
	state *mna.State
}

// An InnerPoint is an inner node behind a bulk resistance.
type InnerPoint struct {
	Name string
	V    float64 // V
}

// A RailPoint is what a rail delivers, in V, A and W.
type RailPoint struct{ V, I, P float64 }

// Delivers is the current in A that the rail gives to the circuit, whichever its polarity;
// 0 where it takes some.
func (r *RailPoint) Delivers() float64 { return math.Max(0, r.I*math.Copysign(1, r.V)) }

// An ElementPoint is an element's quantities in SI units; V and I run along its
// arrow. A transistor has no V and I (NaN).
type ElementPoint struct {
	V, I, P float64
	Tj      float64       // degC; NaN for elements without a junction
	Members []MemberPoint // of a row of 2 or more
	// Transistors only; otherwise zero. For a pnp Vbe is V_EB and Vce V_EC.
	Ic, Ib, Ie, Vbe, Vce float64
	State                string // "active", "saturated", "off", "reverse"; "" otherwise
}

// A MemberPoint is one member of a row.
type MemberPoint struct{ V, I, P, Tj float64 }

// Evidence is why a point is believed.
type Evidence struct {
	Residual    float64 // A, the largest remaining balance
	Where       string  // its name
	LastStep    float64 // V, the largest voltage step of the last iteration
	Steps       int     // Newton steps of the way that found it
	Way         string
	Determinant int // +1 or -1; 0 where the balances are singular
	Attempts    int // rungs of the ladder tried up to this one
	Fallbacks   int // steps that needed more than the planned factorisation
	// Twofold tells that doubles did not see what holds some node, and numbers
	// of twice their precision were needed.
	Twofold bool
}

// newPoint reads every quantity at x.
func newPoint(s *mna.System, x []float64, ev Evidence) *Point {
	c := s.Circuit()
	p := &Point{Circuit: c, Evidence: ev, LoadV: math.NaN(), LoadI: math.NaN(), x: append([]float64(nil), x...)}
	p.Unstable = p.Evidence.Determinant < 0
	var row int
	p.Evidence.Residual, row = s.Residual(x)
	if row >= 0 {
		p.Evidence.Where = s.Label(row)
	}
	p.state = s.StateAt(x)
	p.state.Twofold = ev.Twofold
	p.NodeV = p.state.V[:len(c.Nodes):len(c.Nodes)]
	for i, v := range p.state.V[len(c.Nodes):] {
		p.Inner = append(p.Inner, InnerPoint{s.NodeName(len(c.Nodes) + i), v})
	}
	for i := range c.Rails {
		r := netlist.Ref{Subject: netlist.OfRail, Index: i}
		p.Rails = append(p.Rails, RailPoint{p.of(r, "V"), p.of(r, "I"), p.of(r, "P")})
	}
	if len(c.Load) > 0 {
		r := netlist.Ref{Subject: netlist.OfLoad}
		p.LoadV, p.LoadI = p.of(r, "V"), p.of(r, "I")
	}
	for i := range c.Elements {
		p.Elements = append(p.Elements, p.element(i))
	}
	p.setStates()
	return p
}

// of is a quantity by its symbol, NaN where there is none.
func (p *Point) of(r netlist.Ref, symbol string) float64 {
	r.Symbol = symbol
	v, ok := p.state.Quantity(r)
	if !ok {
		return math.NaN()
	}
	return v
}

func (p *Point) element(i int) ElementPoint {
	e := &p.Circuit.Elements[i]
	r := netlist.Ref{Subject: netlist.OfElement, Index: i}
	if e.Kind == netlist.TransistorPart {
		vbe, vce := "Vbe", "Vce"
		if p.Circuit.Parts[e.Part].Kind.PNP {
			vbe, vce = "Veb", "Vec"
		}
		return ElementPoint{
			V: math.NaN(), I: math.NaN(), P: p.of(r, "P"), Tj: p.of(r, "Tj"),
			Ic: p.of(r, "Ic"), Ib: p.of(r, "Ib"), Ie: p.of(r, "Ie"), Vbe: p.of(r, vbe), Vce: p.of(r, vce),
		}
	}
	ep := ElementPoint{V: p.of(r, "V"), I: p.of(r, "I"), P: p.of(r, "P"), Tj: math.NaN()}
	if e.Kind == netlist.JunctionPart {
		ep.Tj = p.of(r, "Tj")
	}
	if e.Row > 1 {
		for m := 1; m <= e.Row; m++ {
			r.Member = m
			mp := MemberPoint{p.of(r, "V"), p.of(r, "I"), p.of(r, "P"), math.NaN()}
			if e.Kind == netlist.JunctionPart {
				mp.Tj = p.of(r, "Tj")
			}
			ep.Members = append(ep.Members, mp)
		}
	}
	return ep
}

// The bounds between a transistor's states, fixed by the language's definition.
const (
	offShare       = 1e-6 // of the circuit's largest element current
	saturatedShare = 0.05 // of the base current
)

func (p *Point) setStates() {
	largest := p.LargestCurrent()
	for i := range p.Elements {
		ep := &p.Elements[i]
		if p.Circuit.Elements[i].Kind != netlist.TransistorPart {
			continue
		}
		collector, base, vbc, vbe := p.state.Saturation(i)
		switch {
		case math.Abs(ep.Ic) <= offShare*largest && math.Abs(ep.Ie) <= offShare*largest: // all at 0 too
			ep.State = "off"
		case vbc > 0 && vbc > vbe:
			ep.State = "reverse"
		case collector > saturatedShare*base: // also where beta is infinite and both are leakage
			ep.State = "saturated"
		default:
			ep.State = "active"
		}
	}
}

// LargestCurrent is the largest current of any element, in A.
func (p *Point) LargestCurrent() float64 {
	largest := 0.0
	for i := range p.Elements {
		ep := &p.Elements[i]
		for _, amps := range []float64{ep.I, ep.Ic, ep.Ie} {
			if a := math.Abs(amps); a > largest {
				largest = a
			}
		}
	}
	return largest
}

// Slot and Quantity make a Point an environment for expressions.
func (p *Point) Slot(id netlist.SlotID) float64 { return p.state.Slot(id) }

// Quantity gives a quantity of the point in SI units (Tj in degC); false where it
// has no number.
func (p *Point) Quantity(r netlist.Ref) (float64, bool) { return p.state.Quantity(r) }

// Sensitivity returns Q and dQ/d(slot) for every slot, in Q's unit per the slot's,
// by the adjoint of the balances; followers are chained to what they follow. The
// system that found the point must not have been given other values since.
func (p *Point) Sensitivity(q *netlist.Expr) (value float64, d []float64, err error) {
	return p.state.Sensitivity(q)
}

// railCurrents is the sum of the magnitudes of the rails' currents, in A.
func (p *Point) railCurrents() float64 {
	sum := 0.0
	for _, r := range p.Rails {
		sum += math.Abs(r.I)
	}
	return sum
}

// Volts are the voltages in V of all nodes but gnd, as Options.Near has them; the caller owns
// the map.
func (p *Point) Volts() map[netlist.NodeID]float64 {
	out := make(map[netlist.NodeID]float64, len(p.NodeV))
	for node, v := range p.NodeV {
		if id := netlist.NodeID(node); id != netlist.Gnd {
			out[id] = v
		}
	}
	return out
}

// Unknowns are the solver's unknowns at the point, in V; read only.
func (p *Point) Unknowns() []float64 { return p.x }

// PointAt reads every quantity of a system at unknowns x that solve it with the
// numbers in force: for points that were found by following a branch.
func PointAt(s *mna.System, x []float64, way string) *Point {
	return newPoint(s, x, Evidence{Way: way, Determinant: s.DetSign(x), Attempts: 1})
}

// Contributions splits dQ/d(slot) at the point into the elements' shares; see
// mna.State.Contributions.
func (p *Point) Contributions(q *netlist.Expr, id netlist.SlotID) ([]mna.Contribution, error) {
	return p.state.Contributions(q, id)
}

// Depth tells how far a transistor element has left the active region: the collector
// junction's share of its base current over the share that marks saturation; 1 at
// the edge.
func (p *Point) Depth(element int) float64 {
	collector, base, _, _ := p.state.Saturation(element)
	return math.Abs(collector / (saturatedShare * base))
}

// SpareVolts is how far a transistor element's V_CE (a pnp's V_EC) in V may still fall
// with its present V_BE before it counts as saturated; negative where it is.
func (p *Point) SpareVolts(element int) float64 {
	return p.Elements[element].Vce - p.state.SaturationEdge(element, saturatedShare)
}

// CollectorShare is the share of a transistor element's base current that its collector
// junction takes, as a fraction: above 0.05 the transistor counts as saturated.
func (p *Point) CollectorShare(element int) float64 {
	collector, base, _, _ := p.state.Saturation(element)
	return collector / base
}
