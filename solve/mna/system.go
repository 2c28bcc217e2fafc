// Package mna turns a circuit into balances: one current balance for every
// node whose voltage is not given, in the voltages of those nodes.
//
// It is modified nodal analysis with its extra unknowns taken out by hand.
// Rails, cells, fixed drops and links are ideal voltages; the netlist admits no
// loop of them, so they join nodes into groups that move together, and a group
// that holds gnd is known outright. One unknown a free group remains, the
// Jacobian keeps a positive diagonal, and the current of each ideal branch
// follows exactly from the balances of the nodes behind it.
//
// A junction with a bulk resistance has an inner node, an unknown like any other.
//
// Sources: C.-W. Ho, A. E. Ruehli and P. A. Brennan, The modified nodal approach
// to network analysis, IEEE Trans. Circuits Syst. 22 (1975); L. O. Chua and P.-M.
// Lin, Computer-Aided Analysis of Electronic Circuits, Prentice-Hall 1975.
package mna

import (
	"fmt"
	"math"
	"slices"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve/sparse"
)

// referenceKelvin is where a resistance is stated, 25 degC.
const referenceKelvin = 25 + zeroCelsius

// zeroCelsius is 0 degC in K, exact by definition.
const zeroCelsius = 273.15

// A System is the balances of one circuit with its numbers. It implements
// newton.System and newton.Correcting. It is not safe for concurrent use; Clone
// gives another with the same structure.
type System struct {
	circuit *netlist.Circuit
	values  []float64       // slot numbers in force
	ideals  []devices.Ideal // by element; nil where nothing is idealised

	*structure
	*numbers

	factors *sparse.Factors  // in the planned order: the fast way
	robust  *sparse.Pivoting // made when first needed
	active  sparse.Solver    // the one of the two that holds the last matrix

	// Fallbacks counts the factorisations that needed pivoting.
	Fallbacks int

	ramp  Ramp
	near  bool // the factors at hand will do for the next Step
	fresh bool // the next Linearise starts every junction at its start voltage
}

// A structure is what depends on the circuit alone; it is shared by clones.
type structure struct {
	n        int // unknowns: free groups
	nodes    int // local nodes: the circuit's, then inner ones
	inner    []innerNode
	between  []between
	row      []int32 // local node -> unknown, or n for a known node
	forest   forest
	behind   [][]terminal // by rail: the device terminals behind it
	devices  []device
	first    []int32 // element -> its first device; len(elements)+1
	plan     *sparse.Plan
	diagonal []int32 // Jacobian positions of the diagonal
	rowName  []int32 // unknown -> the local node it is named after
}

// An innerNode lies behind a bulk resistance.
type innerNode struct {
	element, member int32
	alone           bool // it stands for a whole row
}

// A between is a node between two members of a row that stands as one junction:
// it lies at a share of the way from one end to the other.
type between struct {
	node, from, to int32
	share          float64
}

// A device is one terminal-bearing thing: a resistor, a bulk resistance, a current
// source, a junction or a transistor. Terminals are a, b (the current flows from
// a to b), anode and cathode, or collector, base and emitter.
type device struct {
	kind    deviceKind
	element int32
	member  int32 // 0.. in a row
	alike   int32 // junction, bulk: the members of a row that it stands for
	node    [3]int32
	at      int32 // index into the kind's own list
}

// A terminal is one of a device.
type terminal struct{ device, at int32 }

type deviceKind uint8

const (
	resistorDevice deviceKind = iota
	bulkDevice
	sourceDevice
	junctionDevice
	bipolarDevice
)

func (d *device) terminals() int {
	if d.kind == bipolarDevice {
		return 3 // collector, base, emitter
	}
	return 2
}

// numbers is what depends on values and on the iteration; each clone has its own.
type numbers struct {
	offset []float64 // local node -> V above its group's unknown
	full   []float64 // offset without the ramp's source factor
	v      []float64 // local node voltages of the last evaluation
	x      []float64 // unknowns with a 0 behind them, for known nodes
	f      []float64 // balances, with a dump behind them
	jac    []float64 // Jacobian in plan positions, with a dump behind them
	base   []float64 // its constant part
	tol    []float64
	top    []float64 // largest current at each row
	anchor []float64 // where the ramp's shunts are tied
	tied   []float64 // 1 where there is one, else 0
	kelvin []float64 // temperature of each device

	gathered []float64 // scratch of params

	resistors []resistor
	sources   []source
	junctions []junction
	bipolars  []bipolar
}

type resistor struct {
	a, b, ra, rb int32
	p            [4]int32 // Jacobian positions aa, ab, ba, bb
	g, i         float64
}

type source struct {
	a, b, ra, rb int32
	amps, i      float64 // i is amps times the ramp's source factor
}

type junction struct {
	a, k, ra, rk int32
	p            [4]int32 // Jacobian positions aa, ak, ka, kk
	share        float64  // of the voltage that falls on one of the members alike
	d            devices.Diode
	i, g         float64 // of the last evaluation, at its own point u; g by the whole voltage
	u            float64 // of one member
	start        float64
	corner       float64 // above it a rise is guarded
	knee         float64 // zener: below it a fall is guarded
}

type bipolar struct {
	c, b, e, rc, rb, re int32
	p                   [9]int32 // rows c, b, e by columns c, b, e
	sign                float64  // +1 npn, -1 pnp
	k                   devices.Bipolar
	pt                  devices.BipolarPoint
	ube, ubc            float64
	corner              float64 // of the base-emitter junction
	cornerC             float64 // of the base-collector junction
	va                  float64 // V, +Inf where infinite
	reach               float64 // the lower of cornerC and just below va: no guard below
}

// New compiles a circuit. It fails on a resistance still open (? E24), on parameters
// that make no model together, and on circuits with more balances than an int32 can
// number.
func New(c *netlist.Circuit) (*System, error) {
	for i := range c.Elements {
		if e := &c.Elements[i]; e.Kind == netlist.Open {
			return nil, fmt.Errorf("the resistance of %s is still open", e.Name)
		}
	}
	b := newBuilder(c)
	st, err := b.structure()
	if err != nil {
		return nil, err
	}
	s := &System{circuit: c, structure: st, ramp: Full}
	s.numbers = b.numbers(st)
	s.factors = st.plan.NewFactors()
	s.Release()
	s.Apply(c.Values())
	for i := range s.devices {
		if err := s.check(&s.devices[i]); err != nil {
			return nil, err
		}
	}
	return s, nil
}

// check tells where a device's parameters make no model together, such as a bulk
// resistance that takes more than the stated drop.
func (s *System) check(d *device) error {
	if d.kind != junctionDevice && d.kind != bipolarDevice {
		return nil
	}
	e := &s.circuit.Elements[d.element]
	kelvin := s.values[s.circuit.Ambient] + zeroCelsius
	if err := devices.Check(s.kind(e), s.params(e), kelvin); err != nil {
		return fmt.Errorf("%s %s: %w", e.Name, s.circuit.Parts[e.Part].Name, err)
	}
	return nil
}

// Clone returns a system that shares the structure and nothing else.
func (s *System) Clone() *System {
	c := &System{circuit: s.circuit, structure: s.structure, ramp: s.ramp}
	c.numbers = s.numbers.clone()
	c.factors = s.plan.NewFactors()
	c.values = append([]float64(nil), s.values...)
	c.ideals = slices.Clone(s.ideals)
	c.Apply(c.values)
	return c
}

func (n *numbers) clone() *numbers {
	c := *n
	c.gathered = nil
	for _, v := range []*[]float64{&c.offset, &c.full, &c.v, &c.x, &c.f, &c.jac, &c.base, &c.tol, &c.top, &c.anchor, &c.tied, &c.kelvin} {
		*v = append([]float64(nil), *v...)
	}
	c.resistors = append([]resistor(nil), c.resistors...)
	c.sources = append([]source(nil), c.sources...)
	c.junctions = append([]junction(nil), c.junctions...)
	c.bipolars = append([]bipolar(nil), c.bipolars...)
	return &c
}

// Idealise puts an idealisation in force for each element (length
// len(Circuit().Elements), copied; those of other kinds than junctions and transistors
// are not looked at), or takes all away with nil. Junctions keep their iteration state.
// A bulk resistance stays beside a fixed drop unless it is 0. There are no derivatives
// by slots while something is idealised: Sensitivity and its like fail.
func (s *System) Idealise(ideals []devices.Ideal) {
	s.ideals = slices.Clone(ideals)
	scale := s.startCurrent()
	for i := range s.devices {
		if d := &s.devices[i]; d.kind == junctionDevice || d.kind == bipolarDevice {
			s.setDevice(d, s.kelvin[i], scale)
		}
	}
	s.near = false
}

// Size is the number of unknowns.
func (s *System) Size() int { return s.n }

// Circuit is the circuit that the system was made from.
func (s *System) Circuit() *netlist.Circuit { return s.circuit }

// Values are the slot numbers in force; read only.
func (s *System) Values() []float64 { return s.values }

// Label names an unknown's balance in the engineer's words.
func (s *System) Label(row int) string {
	return "current balance at " + s.NodeName(int(s.rowName[row]))
}

// NodeName names a local node; an inner one after its junction.
func (s *System) NodeName(node int) string {
	if node < len(s.circuit.Nodes) {
		return s.circuit.Nodes[node].Name
	}
	in := s.inner[node-len(s.circuit.Nodes)]
	e := &s.circuit.Elements[in.element]
	if in.alone || e.Row == 1 {
		return e.Name + "'s junction"
	}
	return fmt.Sprintf("%s.%d's junction", e.Name, in.member+1)
}

// Apply puts new slot numbers in force (length len(Circuit().Slots), followers
// already propagated); they are copied. The structure must still fit: a
// resistance or a bulk resistance neither becomes nor stops being 0.
func (s *System) Apply(values []float64) {
	if len(s.values) != len(values) {
		s.values = make([]float64, len(values))
	}
	copy(s.values, values)
	s.setOffsets()
	ambient := values[s.circuit.Ambient] + zeroCelsius
	scale := s.startCurrent()
	for i := range s.devices {
		d := &s.devices[i]
		s.kelvin[i] = ambient
		s.setDevice(d, ambient, scale)
	}
	s.setBase()
	s.Restart()
}

// setDevice computes a device's coefficients at its temperature.
func (s *System) setDevice(d *device, kelvin, scale float64) {
	e := &s.circuit.Elements[d.element]
	switch d.kind {
	case resistorDevice:
		s.resistors[d.at].g = 1 / s.resistance(e, kelvin)
	case bulkDevice:
		_, bulk := devices.DiodeOf(s.kind(e), s.params(e), s.values[e.Size], kelvin)
		s.resistors[d.at].g = 1 / (float64(d.alike) * bulk)
	case sourceDevice:
		s.sources[d.at].amps = s.values[e.Value]
	case junctionDevice:
		j := &s.junctions[d.at]
		j.d, _ = devices.DiodeOf(s.kind(e), s.params(e), s.values[e.Size], kelvin)
		if s.ideals != nil {
			j.d.Idealise(&s.ideals[d.element], s.values[e.Size])
		}
		j.corner = j.d.Reach(scale)
		j.start = j.corner
		j.knee = math.Inf(-1)
		if j.d.Zener {
			j.knee = -j.d.Vz - j.d.NzVt*math.Log1p(scale/j.d.Iz)
			if e.Reversed {
				j.start = j.knee
			}
		}
	case bipolarDevice:
		b := &s.bipolars[d.at]
		b.k = devices.BipolarOf(s.kind(e), s.params(e), s.values[e.Size], kelvin)
		if s.ideals != nil {
			b.k.Idealise(&s.ideals[d.element], s.values[e.Size])
		}
		b.corner = b.k.Reach(scale, 1)
		// The collector junction's own current is larger by 1/betaR.
		b.cornerC = b.k.Reach(scale, 1+b.k.InvBetaR)
		b.va = 1 / b.k.InvVA // +Inf for an infinite VA
		b.reach = math.Min(b.cornerC, math.Nextafter(b.va, 0))
	}
}

func (s *System) kind(e *netlist.Element) *netlist.Kind { return s.circuit.Parts[e.Part].Kind }

// params gathers an element's parameters; the slice holds until the next call.
func (s *System) params(e *netlist.Element) []float64 {
	s.gathered = s.gathered[:0]
	for _, id := range e.Params {
		s.gathered = append(s.gathered, s.values[id])
	}
	return s.gathered
}

func (s *System) resistance(e *netlist.Element, kelvin float64) float64 {
	tc := 0.0
	if e.TC != netlist.None {
		tc = s.values[e.TC]
	}
	return devices.Resistance(s.values[e.Value], tc, kelvin)
}

// LargestConductance is the largest entry on the Jacobian's diagonal at the last
// evaluation, in S.
func (s *System) LargestConductance() float64 {
	g := 0.0
	for _, at := range s.diagonal {
		g = math.Max(g, math.Abs(s.jac[at]))
	}
	return g
}

// StartCurrent is a current of the circuit's own size in A: see startCurrent.
func (s *System) StartCurrent() float64 { return s.startCurrent() }

// startCurrent is a current of the circuit's own size, from which junctions
// start: the span of the supplies through the geometric mean of the
// resistances. A start ten times too high costs several steps (a junction falls
// by about n V_T a step), one too low hardly any, hence the tenth.
func (s *System) startCurrent() float64 {
	low, high := 0.0, 0.0
	for node, row := range s.row {
		if int(row) == s.n {
			low, high = math.Min(low, s.full[node]), math.Max(high, s.full[node])
		}
	}
	sum, count := 0.0, 0
	for i := range s.circuit.Elements {
		if e := &s.circuit.Elements[i]; e.Kind == netlist.Resistor {
			sum += math.Log(s.values[e.Value])
			count++
		}
	}
	const tenth = 0.1
	if count > 0 && high > low {
		return tenth * (high - low) / math.Exp(sum/float64(count))
	}
	// No supply or no resistor: current sources or nothing drive the circuit.
	amps := 0.0
	for i := range s.circuit.Elements {
		if e := &s.circuit.Elements[i]; e.Kind == netlist.CurrentSource {
			amps = math.Max(amps, math.Abs(s.values[e.Value]))
		}
	}
	if amps > 0 {
		return tenth * amps
	}
	return 1e-3 // A; a milliamp is the trade's ordinary bias current
}
