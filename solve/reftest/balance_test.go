package reftest

import (
	"math"
	"path/filepath"
	"testing"

	"biaswright/netlist"
	"biaswright/solve"
)

// TestBalancesInFortyDigits is the second way to each answer: from the voltages
// alone, every current is computed again in 40 digits by the equations of the
// language, and summed at every node. What is left must be within the stopping
// rule: 1e-12 of the largest current at the node, plus the rounding of its own
// voltages, 8 eps sum |g| (|va| + |vb|).
func TestBalancesInFortyDigits(t *testing.T) {
	worst, nodes := 0.0, 0
	check := func(name string, text []byte, settings ...netlist.Setting) {
		t.Run(name, func(t *testing.T) {
			c := read(t, name, text)
			if len(settings) > 0 {
				set, list := c.With(settings...)
				if list.HasErrors() {
					t.Fatal(list)
				}
				c = set
			}
			ratio, n := checkBalances(t, point(t, c))
			worst, nodes = max(worst, ratio), nodes+n
		})
	}

	cases, err := Cases(networksFile)
	if err != nil {
		t.Fatal(err)
	}
	for i := range cases {
		if len(cases[i].Elements) == 0 || cases[i].Has("ideal_opamp") {
			continue
		}
		text, err := cases[i].Text()
		if err != nil {
			t.Fatal(err)
		}
		check(cases[i].ID, text.Source)
		if cases[i].Analysis == "temperature_sweep" {
			for _, ambient := range []string{"-40 degC", "125 degC"} { // the file's ends
				check(cases[i].ID+" at "+ambient, text.Source, netlist.Setting{Name: "ambient", Value: ambient})
			}
		}
	}
	known, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	for i := range known {
		text, err := known[i].Text()
		if err != nil {
			t.Fatal(err)
		}
		check(known[i].ID, text.Source)
	}
	for name, text := range demoCircuits(t) {
		check(filepath.ToSlash(name), text)
	}
	t.Logf("%d balances; the worst uses %.2g of what the rule allows", nodes, worst)
}

// A sum gathers the currents that leave a group of nodes, which ideal voltages
// join, in 40 digits.
type sum struct {
	total    dec
	largest  float64 // A
	rounding float64 // sum |g| (|va| + |vb|), A
	fixed    bool    // holds gnd or a rail, which take up any current
}

// checkBalances verifies every balance of a point and gives the largest share of
// the allowance that one used, and how many there were.
func checkBalances(t *testing.T, p *solve.Point) (worst float64, n int) {
	t.Helper()
	c := p.Circuit
	group := groups(c)
	sums := make([]sum, len(c.Nodes))
	for i := range sums {
		sums[i].total = zero
	}
	for i := range c.Nodes {
		if netlist.NodeID(i) == netlist.Gnd || c.Nodes[i].Rail != netlist.None {
			sums[group[i]].fixed = true
		}
	}
	// flow adds a current from one node to another, with the conductance that
	// makes it depend on each listed pair of voltages.
	flow := func(from, to netlist.NodeID, i dec, g, spread float64) {
		for _, end := range []struct {
			node netlist.NodeID
			i    dec
		}{{from, i}, {to, neg(i)}} {
			s := &sums[group[end.node]]
			s.total = add(s.total, end.i)
			s.largest = max(s.largest, math.Abs(float(i)))
			s.rounding += g * spread
		}
	}
	volts := func(n netlist.NodeID) dec { return exactly(p.NodeV[n]) }
	spread := func(a, b netlist.NodeID) float64 { return math.Abs(p.NodeV[a]) + math.Abs(p.NodeV[b]) }
	ambient := add(exactly(c.Slots[c.Ambient].Value), iceKelvin)

	for i := range c.Elements {
		e := &c.Elements[i]
		switch e.Kind {
		case netlist.Resistor:
			r := exactly(c.Slots[e.Value].Value)
			if e.TC != netlist.None {
				rise := sub(ambient, literal("298.15"))
				r = mul(r, add(one, mul(exactly(c.Slots[e.TC].Value), rise)))
			}
			for m := range e.Row {
				a, b := e.Chain[m], e.Chain[m+1]
				flow(a, b, div(sub(volts(a), volts(b)), r), 1/float(r), spread(a, b))
			}
		case netlist.CurrentSource:
			flow(e.From, e.To, exactly(c.Slots[e.Value].Value), 0, 0)
		case netlist.Link, netlist.Drop, netlist.Cell:
			checkIdealVoltage(t, p, e)
		case netlist.JunctionPart:
			model := junctionOf(c, e, ambient)
			for m := range e.Row {
				a, b := e.Chain[m], e.Chain[m+1]
				guess := p.Elements[i].I
				v := sub(volts(a), volts(b))
				if e.Reversed {
					v, guess = neg(v), -guess
				}
				current, g := model.current(v, guess)
				if e.Reversed {
					current = neg(current)
				}
				flow(a, b, current, float(g), spread(a, b))
			}
		case netlist.TransistorPart:
			collector, emitter := e.From, e.To
			turn := func(d dec) dec { return d }
			if c.Parts[e.Part].Kind.PNP {
				collector, emitter, turn = e.To, e.From, neg
			}
			model := bipolarOf(c, e, ambient)
			vbe, vbc := sub(volts(e.Base), volts(emitter)), sub(volts(e.Base), volts(collector))
			ic, ib, gbe, gbc, gce := model.currents(turn(vbe), turn(vbc))
			flow(collector, emitter, turn(ic), 0, 0)
			flow(e.Base, emitter, turn(ib), 0, 0)
			for _, end := range []netlist.NodeID{collector, e.Base, emitter} {
				sums[group[end]].rounding += gbe*spread(e.Base, emitter) + (gbc+gce)*spread(e.Base, collector)
			}
		default:
			t.Fatalf("%s: no equation for %s", c.File, e.Name)
		}
	}

	const eps = 0x1p-52
	for i := range sums {
		s := &sums[i]
		if group[i] != i || s.fixed {
			continue
		}
		left := math.Abs(float(s.total))
		// The solver's rule. A node that the last digit of the smallest double
		// holds, 5e-324 V, has nothing finer to offer.
		allowed := 1e-12*s.largest + 8*eps*s.rounding + 2*math.SmallestNonzeroFloat64
		if left > allowed {
			t.Errorf("%s: %.3g A left at %s, allowed %.3g A", c.File, left, c.Nodes[i].Name, allowed)
		}
		if allowed > 0 {
			worst = max(worst, left/allowed)
		}
		n++
	}
	return worst, n
}

// groups gives each node the first of the nodes that ideal voltages join to it.
func groups(c *netlist.Circuit) []int {
	group := make([]int, len(c.Nodes))
	for i := range group {
		group[i] = i
	}
	join := func(a, b netlist.NodeID) {
		into, from := min(group[a], group[b]), max(group[a], group[b])
		for i := range group {
			if group[i] == from {
				group[i] = into
			}
		}
	}
	for i := range c.Elements {
		switch e := &c.Elements[i]; e.Kind {
		case netlist.Link, netlist.Drop, netlist.Cell:
			join(e.From, e.To)
		}
	}
	return group
}

// checkIdealVoltage verifies that an ideal voltage is what it says, to the
// rounding of the voltages.
func checkIdealVoltage(t *testing.T, p *solve.Point, e *netlist.Element) {
	t.Helper()
	want := 0.0
	if e.Kind != netlist.Link {
		want = p.Circuit.Slots[e.Value].Value
	}
	if e.Kind == netlist.Cell {
		want = -want // it rises along the arrow
	}
	want *= float64(e.Row)
	from, to := p.NodeV[e.From], p.NodeV[e.To]
	const eps = 0x1p-52
	if got := from - to; math.Abs(got-want) > 4*eps*(math.Abs(from)+math.Abs(to)+math.Abs(want)) {
		t.Errorf("%s: %s holds %.17g V, says %.17g V", p.Circuit.File, e.Name, got, want)
	}
}

// params reads an element's parameters by name; nil stands for infinite, and ok
// is false for one that is not stated.
func params(c *netlist.Circuit, e *netlist.Element) func(name string) (dec, bool) {
	kind := c.Parts[e.Part].Kind
	return func(name string) (dec, bool) {
		k := kind.Index(name)
		if k < 0 || e.Params[k] == netlist.None {
			return zero, false
		}
		switch x := c.Slots[e.Params[k]].Value; {
		case math.IsNaN(x):
			return zero, false
		case math.IsInf(x, 1):
			return nil, true
		default:
			return exactly(x), true
		}
	}
}

// stated gives the second co-ordinate of a stated point.
func stated(c *netlist.Circuit, e *netlist.Element, name string) dec {
	kind := c.Parts[e.Part].Kind
	at := kind.Index(kind.Params[kind.Index(name)].At)
	return exactly(c.Slots[e.Params[at]].Value)
}

// junctionOf derives a junction's model from what its part states.
func junctionOf(c *netlist.Circuit, e *netlist.Element, t dec) *junctionModel {
	get := params(c, e)
	must := func(name string) dec { d, _ := get(name); return d }
	t0 := add(must("T0"), iceKelvin)
	n, rbulk, egap := must("n"), must("Rbulk"), must("Egap")
	isat, ok := get("Isat")
	if !ok { // drop = v at i, the drop on Rbulk included
		v, _ := get("drop")
		i := stated(c, e, "drop")
		isat = div(i, sub(exp(div(sub(v, mul(i, rbulk)), mul(n, thermal(t0)))), one))
	}
	size := exactly(c.Slots[e.Size].Value)
	m := &junctionModel{
		isat: mul(size, scaled(isat, n, egap, t, t0)), nvt: mul(n, thermal(t)), rbulk: div(rbulk, size),
	}
	if vz, ok := get("Vz"); ok {
		iz := stated(c, e, "Vz")
		nz, _ := get("nz")
		if rz, ok := get("rz"); ok { // nz = rz I_z/V_T at T0
			nz = div(mul(rz, iz), thermal(t0))
		}
		m.iz, m.nzvt = mul(size, iz), mul(nz, thermal(t))
		m.vz = add(vz, mul(must("drift"), sub(t, t0)))
	}
	return m
}

// bipolarOf derives a transistor's model from what its part states.
func bipolarOf(c *netlist.Circuit, e *netlist.Element, t dec) *bipolarModel {
	get := params(c, e)
	must := func(name string) dec { d, _ := get(name); return d }
	t0 := add(must("T0"), iceKelvin)
	n, nrec, egap := must("n"), must("nrec"), must("Egap")
	isat, ok := get("Isat")
	if !ok { // Vbe = v at that collector current, V_CB = 0
		name := "Vbe"
		if c.Parts[e.Part].Kind.PNP {
			name = "Veb"
		}
		v, _ := get(name)
		isat = div(stated(c, e, name), sub(exp(div(v, mul(n, thermal(t0)))), one))
	}
	betaF := must("betaF")
	if betaF != nil {
		betaF = mul(betaF, add(one, mul(must("betaDrift"), sub(t, t0))))
	}
	size := exactly(c.Slots[e.Size].Value)
	return &bipolarModel{
		isat: mul(size, scaled(isat, n, egap, t, t0)), nvt: mul(n, thermal(t)),
		betaF: betaF, betaR: must("betaR"), va: must("VA"),
		irec: mul(size, scaled(must("Irec"), nrec, egap, t, t0)), nrecvt: mul(nrec, thermal(t)),
	}
}
