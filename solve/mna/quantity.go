package mna

import (
	"fmt"
	"math"
	"slices"

	"biaswright/devices"
	"biaswright/netlist"
)

// A State is the system at one solution: node voltages and the current into
// every device terminal, from the models themselves. It is an environment for
// expressions (netlist.Env).
type State struct {
	s *System
	// V is each local node's voltage in V.
	V []float64
	// I[d][j] is the current into terminal j of device d, in A.
	I [][3]float64
	// branch[node] is the current through the ideal branch that leads to node,
	// from its parent, in A; leaving[node] what leaves the node into devices.
	branch []float64
	// live tells that I and branch are still to be read from the system, which
	// stands at this state: a sweep shows few of them.
	live bool
	// Twofold asks the adjoint to solve in twofold numbers.
	Twofold bool
}

// StateAt evaluates the system at x (length Size()), whatever ramp is in force.
func (s *System) StateAt(x []float64) *State {
	st := &State{s: s, V: make([]float64, s.nodes), I: make([][3]float64, len(s.devices)), branch: make([]float64, s.nodes)}
	st.Refresh(x)
	st.fill()
	return st
}

// Refresh evaluates the state's system anew, at x and with the numbers in force,
// without allocating. The state then leans on its system, and holds until that is
// moved on.
func (st *State) Refresh(x []float64) {
	st.s.currents(x)
	st.read()
}

// Polished takes over what newton.Solve ended with: x lies one last step, below its
// StepLimit, from the last evaluation. It holds as Refresh's does. Currents are carried along that step by their
// derivatives; what that leaves out is the square of the step over V_T, far below
// rounding.
func (st *State) Polished(x []float64) {
	s := st.s
	s.place(x)
	v := s.v
	for i := range s.resistors {
		r := &s.resistors[i]
		r.i = r.g * (v[r.a] - v[r.b])
	}
	for i := range s.junctions {
		j := &s.junctions[i]
		u := (v[j.a] - v[j.k]) * j.share
		j.i += j.g / j.share * (u - j.u)
		j.u = u
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		de := b.sign*(v[b.b]-v[b.e]) - b.ube
		dc := b.sign*(v[b.b]-v[b.c]) - b.ubc
		b.pt.Ic += b.pt.IcVbe*de + b.pt.IcVbc*dc
		b.pt.Ib += b.pt.IbVbe*de + b.pt.IbVbc*dc
		b.ube, b.ubc = b.ube+de, b.ubc+dc
	}
	st.read()
}

// read takes the voltages of the last evaluation.
func (st *State) read() {
	s := st.s
	copy(st.V, s.v)
	for _, b := range s.between {
		st.V[b.node] = (1-b.share)*st.V[b.from] + b.share*st.V[b.to]
	}
	st.live = true
}

// fill takes the currents too, so that the state stands by itself.
func (st *State) fill() {
	if !st.live {
		return
	}
	s := st.s
	clear(st.branch)
	for i := range s.devices {
		d := &s.devices[i]
		st.I[i] = s.terminalCurrents(d)
		for j := 0; j < d.terminals(); j++ {
			st.branch[d.node[j]] += st.I[i][j]
		}
	}
	s.forest.behind(st.branch)
	st.live = false
}

// terminalCurrents are the currents into a device's terminals at the last
// evaluation.
func (s *System) terminalCurrents(d *device) [3]float64 {
	switch d.kind {
	case resistorDevice, bulkDevice:
		i := s.resistors[d.at].i
		return [3]float64{i, -i}
	case sourceDevice:
		i := s.sources[d.at].i
		return [3]float64{i, -i}
	case junctionDevice:
		i := s.junctions[d.at].i
		return [3]float64{i, -i}
	default:
		b := &s.bipolars[d.at]
		return [3]float64{b.sign * b.pt.Ic, b.sign * b.pt.Ib, -b.sign * (b.pt.Ic + b.pt.Ib)}
	}
}

// Slot gives a slot's number in force.
func (st *State) Slot(id netlist.SlotID) float64 { return st.s.values[id] }

// A Seed is a quantity's derivatives with respect to what a State holds, by which
// the adjoint begins.
type Seed struct {
	v      []float64    // by local node
	i      [][3]float64 // by device terminal
	branch []float64    // by the branch that leads to a node
	slot   []float64    // by slot, direct
}

func (s *System) newSeed() *Seed {
	return &Seed{
		v: make([]float64, s.nodes), i: make([][3]float64, len(s.devices)),
		branch: make([]float64, s.nodes), slot: make([]float64, len(s.values)),
	}
}

// Quantity gives a quantity of the solution in SI units, Tj in degC.
func (st *State) Quantity(r netlist.Ref) (float64, bool) { return st.measure(r, nil, 0) }

// measure evaluates a quantity and, with a seed, adds weight times its
// derivatives to it.
func (st *State) measure(r netlist.Ref, seed *Seed, weight float64) (float64, bool) {
	switch r.Subject {
	case netlist.OfNode:
		return st.voltage(int32(r.Index), 0, seed, weight), true
	case netlist.OfRail:
		return st.rail(r, seed, weight)
	case netlist.OfLoad:
		return st.load(r, seed, weight)
	default:
		return st.element(&st.s.circuit.Elements[r.Index], r.Index, r.Member, r.Symbol, seed, weight)
	}
}

// voltage is V(a) - V(b).
func (st *State) voltage(a, b int32, seed *Seed, weight float64) float64 {
	if seed != nil {
		seed.v[a] += weight
		seed.v[b] -= weight
	}
	return st.V[a] - st.V[b]
}

// product is a V·I of a part: value, and the weights of its factors.
func product(v, i func(weight float64) float64, weight float64) float64 {
	volts, amps := v(0), i(0)
	v(weight * amps)
	i(weight * volts)
	return volts * amps
}

func (st *State) rail(r netlist.Ref, seed *Seed, weight float64) (float64, bool) {
	node := int32(st.s.circuit.Rails[r.Index].Node)
	v := func(w float64) float64 { return st.voltage(node, 0, seed, w) }
	i := func(w float64) float64 { return st.branchCurrent(st.s.forest.byRail[r.Index], 1, seed, w) }
	if st.live && seed == nil {
		i = func(float64) float64 { return st.delivered(r.Index) }
	}
	return byType(r.Symbol, v, i, 1, weight)
}

// delivered adds up a rail's current from the system's last evaluation.
func (st *State) delivered(rail int) float64 {
	sum := 0.0
	for _, t := range st.s.behind[rail] {
		sum += st.s.terminalCurrents(&st.s.devices[t.device])[t.at]
	}
	return sum
}

// byType evaluates V, I or P = sign·V·I.
func byType(symbol string, v, i func(float64) float64, sign, weight float64) (float64, bool) {
	switch symbol {
	case "V":
		return v(weight), true
	case "I":
		return i(weight), true
	case "P":
		return sign * product(v, i, sign*weight), true
	}
	return math.NaN(), false
}

// branchCurrent is the current of an ideal branch along its element's arrow, times
// sign.
func (st *State) branchCurrent(at int32, sign float64, seed *Seed, weight float64) float64 {
	st.fill()
	b := &st.s.forest.branches[at]
	if !b.forward {
		sign = -sign
	}
	if seed != nil {
		seed.branch[b.child] += sign * weight
	}
	return sign * st.branch[b.child]
}

func (st *State) load(r netlist.Ref, seed *Seed, weight float64) (float64, bool) {
	c := st.s.circuit
	if len(c.Load) == 0 {
		return math.NaN(), false
	}
	first, last := &c.Elements[c.Load[0]], &c.Elements[c.Load[len(c.Load)-1]]
	switch r.Symbol {
	case "V":
		return st.voltage(int32(first.From), int32(last.To), seed, weight), true
	case "I":
		return st.element(first, c.Load[0], 0, "I", seed, weight)
	}
	return math.NaN(), false
}

// element evaluates an element's quantity, or one of its members' where member
// is 1 or more.
func (st *State) element(e *netlist.Element, index, member int, symbol string, seed *Seed, weight float64) (float64, bool) {
	if symbol != "I" && st.s.circuit.LoadHeld && slices.Contains(st.s.circuit.Load, index) {
		return math.NaN(), false // an ideal voltage stands there
	}
	if symbol == "Tj" {
		return st.temperature(index, member, seed, weight)
	}
	if e.Kind == netlist.TransistorPart {
		return st.transistor(e, index, symbol, seed, weight)
	}
	from, to, m := e.From, e.To, 0
	if member > 0 {
		m = member - 1
		from, to = e.Chain[m], e.Chain[m+1]
	}
	v := func(w float64) float64 { return st.voltage(int32(from), int32(to), seed, w) }
	switch e.Kind {
	case netlist.Link, netlist.Drop, netlist.Cell:
		i := func(w float64) float64 {
			return st.branchCurrent(st.s.forest.byElement[index][m], 1, seed, w)
		}
		if e.Kind != netlist.Cell {
			return byType(symbol, v, i, 1, weight)
		}
		// A cell's V is its rise, its P what it delivers: V·I all the same.
		rise := func(w float64) float64 { return -v(-w) }
		return byType(symbol, rise, i, 1, weight)
	default:
		dev, sign := st.s.carrier(index, m), 1.0
		if e.Reversed {
			sign = -1
		}
		i := func(w float64) float64 { return st.terminal(dev, 0, sign, seed, w) }
		return byType(symbol, v, i, 1, weight)
	}
}

// carrier is the device that gives a member's current: of a junction with a bulk
// resistance the junction, whose current the model computes.
func (s *System) carrier(element, member int) int {
	for d := s.first[element]; d < s.first[element+1]; d++ {
		if dev := &s.devices[d]; dev.kind != bulkDevice && (int(dev.member) == member || dev.alike > 1) {
			return int(d)
		}
	}
	panic(fmt.Sprintf("mna: element %d has no member %d", element, member))
}

func (st *State) terminal(dev, terminal int, sign float64, seed *Seed, weight float64) float64 {
	if seed != nil {
		seed.i[dev][terminal] += sign * weight
	}
	if st.live {
		return sign * st.s.terminalCurrents(&st.s.devices[dev])[terminal]
	}
	return sign * st.I[dev][terminal]
}

// temperature is a junction's, in degC. It is the ambient as long as no heat is
// fed back.
func (st *State) temperature(index, member int, seed *Seed, weight float64) (float64, bool) {
	first := st.s.first[index]
	if first == st.s.first[index+1] {
		return math.NaN(), false
	}
	if seed != nil {
		seed.slot[st.s.circuit.Ambient] += weight
	}
	ambient := st.s.values[st.s.circuit.Ambient]
	return ambient + (st.s.kelvin[first] - (ambient + zeroCelsius)), true // to the last digit where it is the ambient
}

func (st *State) transistor(e *netlist.Element, index int, symbol string, seed *Seed, weight float64) (float64, bool) {
	dev := int(st.s.first[index])
	d := &st.s.devices[dev]
	c, b, em := d.node[0], d.node[1], d.node[2]
	sign := 1.0 // of the terminal currents in normal use
	if st.s.circuit.Parts[e.Part].Kind.PNP {
		sign = -1
	}
	switch symbol {
	case "Ic":
		return st.terminal(dev, 0, sign, seed, weight), true
	case "Ib":
		return st.terminal(dev, 1, sign, seed, weight), true
	case "Ie":
		return st.terminal(dev, 2, -sign, seed, weight), true
	case "Vbe", "Veb":
		return sign * st.voltage(b, em, seed, sign*weight), true
	case "Vce", "Vec":
		return sign * st.voltage(c, em, seed, sign*weight), true
	case "P": // V_CE I_C + V_BE I_B, the same for both polarities
		ce := func(w float64) float64 { return st.voltage(c, em, seed, w) }
		be := func(w float64) float64 { return st.voltage(b, em, seed, w) }
		ic := func(w float64) float64 { return st.terminal(dev, 0, 1, seed, w) }
		ib := func(w float64) float64 { return st.terminal(dev, 1, 1, seed, w) }
		return product(ce, ic, weight) + product(be, ib, weight), true
	}
	return math.NaN(), false
}

// Saturation tells, for a transistor element, how much of its base current in A its
// collector junction takes, I_r/betaR, the whole base current, and v_BC and v_BE in
// V, pnp in their own senses: what its state is judged by.
func (st *State) Saturation(element int) (collector, base, vbc, vbe float64) {
	d := &st.s.devices[st.s.first[element]]
	b := &st.s.bipolars[d.at]
	vbe = b.sign * (st.V[d.node[1]] - st.V[d.node[2]])
	vbc = b.sign * (st.V[d.node[1]] - st.V[d.node[0]])
	var p devices.BipolarPoint
	b.k.At(vbe, vbc, &p)
	return p.Ir * b.k.InvBetaR, p.Ib, vbc, vbe
}

// SaturationEdge is the V_CE in V, pnp in its own sense, below which a transistor
// element would count as saturated with its present V_BE: there the collector
// junction takes a share of the base current. With that share s and the base
// current I of forward operation, I_r/betaR = s/(1 - s) I.
func (st *State) SaturationEdge(element int, share float64) float64 {
	d := &st.s.devices[st.s.first[element]]
	b := &st.s.bipolars[d.at]
	vbe := b.sign * (st.V[d.node[1]] - st.V[d.node[2]])
	if b.k.InvBetaR == 0 { // the collector junction takes no base current
		return 0
	}
	var open devices.BipolarPoint // the collector junction at 0 V
	b.k.At(vbe, 0, &open)
	ir := share / (1 - share) * open.Ib / b.k.InvBetaR
	vbc := b.k.Reach(math.Max(0, ir), 1)
	return vbe - math.Min(vbc, vbe)
}

// EarlyBroken names a transistor whose v_BC has reached its VA, beyond which the
// model means nothing; "" where none has.
func (st *State) EarlyBroken() string {
	for i := range st.s.devices {
		d := &st.s.devices[i]
		if d.kind != bipolarDevice {
			continue
		}
		b := &st.s.bipolars[d.at]
		if b.sign*(st.V[d.node[1]]-st.V[d.node[0]]) >= b.va {
			return st.s.circuit.Elements[d.element].Name
		}
	}
	return ""
}

// CurrentAt is the forward current in A at which a transistor element's
// base-emitter junction would stand at vbe volts at 25 degC, at the ideality of
// its part.
func (st *State) CurrentAt(element int, vbe float64) float64 {
	e := &st.s.circuit.Elements[element]
	k := devices.BipolarOf(st.s.kind(e), st.s.params(e), st.s.values[e.Size], referenceKelvin)
	return k.Isat * math.Expm1(vbe*k.InvNVt)
}
