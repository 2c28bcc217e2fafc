package mna

import (
	"errors"
	"math"

	"biaswright/devices"
	"biaswright/netlist"
)

// Sensitivity gives an expression's value at the state and its derivative with
// respect to every slot, in the expression's unit over the slot's, by one
// solution with the transposed Jacobian (the adjoint; S. W. Director and R. A.
// Rohrer, IEEE Trans. Circuit Theory 16, 1969). Followers are chained to what
// they follow. The error says why there is none.
//
// With L the adjoint (J^T L = dQ/dx), dQ/dp = dQ/dp|x - L·dF/dp: every device's
// terminal current therefore enters with the weight that Q gives it, less the
// adjoint of the balance it flows into, and one pass over the devices collects
// all derivatives.
func (st *State) Sensitivity(q *netlist.Expr) (value float64, d []float64, err error) {
	s := st.s
	seed := s.newSeed()
	ok := true
	value, found := q.Grad(st,
		func(id netlist.SlotID, w float64) { seed.slot[id] += w },
		func(r netlist.Ref, w float64) {
			if _, has := st.measure(r, seed, w); !has {
				ok = false
			}
		})
	if !found || !ok {
		return math.NaN(), nil, errors.New(q.Text + " has no number here")
	}
	adjoint, err := st.adjoint(seed)
	if err != nil {
		return value, nil, err
	}
	d = seed.slot
	offsets := append([]float64(nil), seed.v...)
	var r devices.Response
	for i := range s.devices {
		dev := &s.devices[i]
		w := seed.i[i]
		for j := 0; j < dev.terminals(); j++ {
			w[j] -= adjoint[s.row[dev.node[j]]]
		}
		s.collect(st, i, w, &r, offsets, d)
	}
	// An offset moves its node and all nodes behind it.
	s.forest.behind(offsets)
	for _, b := range s.forest.branches {
		if b.slot != netlist.None {
			d[b.slot] += b.rise * offsets[b.child]
		}
	}
	s.circuit.ChainAt(s.values, d)
	return value, d, nil
}

// adjoint solves J^T L = dQ/dx; the entry behind the last, for known rows, is 0.
func (st *State) adjoint(seed *Seed) ([]float64, error) {
	s := st.s
	if s.ideals != nil {
		return nil, errIdealised
	}
	st.fill()
	// Weights on ideal branches are weights on the currents of the nodes behind.
	s.forest.spread(seed.branch)
	for i := range s.devices {
		d := &s.devices[i]
		for j := 0; j < d.terminals(); j++ {
			seed.i[i][j] += seed.branch[d.node[j]]
		}
	}
	for _, b := range s.between {
		seed.v[b.from] += (1 - b.share) * seed.v[b.node]
		seed.v[b.to] += b.share * seed.v[b.node]
		seed.v[b.node] = 0
	}
	x := make([]float64, s.n+1)
	for node, w := range seed.v {
		x[s.row[node]] += w
	}
	var r devices.Response
	for i := range s.devices {
		s.respond(st, i, &r)
		d := &s.devices[i]
		for j := 0; j < d.terminals(); j++ {
			for k := 0; k < d.terminals(); k++ {
				if w := seed.i[i][j]; w != 0 {
					x[s.row[d.node[k]]] += w * r.DV[j][k]
				}
			}
		}
	}
	x[s.n] = 0
	s.currents(st.unknowns())
	solve := s.solveTransposed
	if st.Twofold {
		solve = s.Precise().solveTransposed
	}
	if !solve(x[:s.n]) || !finite(x) {
		return nil, errUndetermined
	}
	return x, nil
}

// solveTransposed solves with the transposed Jacobian of the last evaluation.
func (s *System) solveTransposed(b []float64) bool {
	if !s.factor() {
		return false
	}
	s.active.SolveT(b)
	return true
}

var (
	errUndetermined = errors.New("the balances do not determine the voltages here")
	errIdealised    = errors.New("an idealised circuit has no derivatives")
)

// unknowns are the state's unknowns.
func (st *State) unknowns() []float64 {
	x := make([]float64, st.s.n)
	for i, node := range st.s.rowName {
		x[i] = st.V[node] - st.s.offset[node]
	}
	return x
}

// respond gives a device's derivatives with respect to its terminal voltages (all
// kinds) and parameters (junctions and transistors).
func (s *System) respond(st *State, i int, r *devices.Response) {
	d := &s.devices[i]
	e := &s.circuit.Elements[d.element]
	switch d.kind {
	case junctionDevice, bipolarDevice:
		var v [3]float64
		for j := 0; j < d.terminals(); j++ {
			v[j] = st.V[d.node[j]]
		}
		if d.alike > 1 { // its members share the voltage
			v[0], v[1] = (v[0]-v[1])/float64(d.alike), 0
		}
		devices.Evaluate(s.kind(e), s.params(e), s.values[e.Size], v[:d.terminals()], s.kelvin[i], r)
		if d.alike > 1 {
			for j := range r.DV {
				for k := range r.DV[j] {
					r.DV[j][k] /= float64(d.alike)
				}
			}
		}
		return
	case bulkDevice:
		devices.Evaluate(s.kind(e), s.params(e), s.values[e.Size], []float64{0, 0}, s.kelvin[i], r)
	}
	g := 0.0
	if d.kind != sourceDevice {
		g = s.resistors[d.at].g
	}
	r.DV = [][]float64{{g, -g}, {-g, g}}
}

// collect adds one device's share to the derivatives: weight[j] is what a unit
// of current into terminal j is worth.
func (s *System) collect(st *State, i int, weight [3]float64, r *devices.Response, offsets, d []float64) {
	dev := &s.devices[i]
	e := &s.circuit.Elements[dev.element]
	s.respond(st, i, r)
	for j := 0; j < dev.terminals(); j++ {
		for k := 0; k < dev.terminals(); k++ {
			offsets[dev.node[k]] += weight[j] * r.DV[j][k]
		}
	}
	through := weight[0] - weight[1] // of a current from terminal 0 to 1
	switch dev.kind {
	case sourceDevice:
		d[e.Value] += through
	case resistorDevice:
		s.collectResistor(st, i, e, through, d)
	case bulkDevice:
		// i = v/(n r): di/dr = -i/r, and 1/r is n g.
		g, current := s.resistors[dev.at].g*float64(dev.alike), st.I[i][0]
		for p, id := range e.Params {
			if r.RbulkDP[p] != 0 {
				d[id] -= through * current * g * r.RbulkDP[p]
			}
		}
		d[e.Size] -= through * current * g * r.RbulkDArea
	default:
		for j := 0; j < dev.terminals(); j++ {
			for p, id := range e.Params {
				if r.DP[j][p] != 0 {
					d[id] += weight[j] * r.DP[j][p]
				}
			}
			d[e.Size] += weight[j] * r.DArea[j]
			d[s.circuit.Ambient] += weight[j] * r.DT[j]
		}
	}
}

// collectResistor differentiates i = v/R, R = r (1 + tc (T - T0)).
func (s *System) collectResistor(st *State, i int, e *netlist.Element, through float64, d []float64) {
	value := s.values[e.Value]
	current := st.I[i][0]
	d[e.Value] -= through * current / value
	if e.TC == netlist.None {
		return
	}
	tc := s.values[e.TC]
	rise := s.kelvin[i] - referenceKelvin
	factor := 1 + tc*rise
	d[e.TC] -= through * current * rise / factor
	d[s.circuit.Ambient] -= through * current * tc / factor
}

// A Contribution is an element's share of a derivative.
type Contribution struct {
	Element int
	Amount  float64 // in the quantity's unit over the slot's
}

// Contributions splits dQ/d(slot) into what each element passes on, for a slot that
// is a rail's or the load's volts, or the ambient temperature: a supply acts through
// the elements tied to it, a temperature through every part. Their sum is the
// derivative, followers of the slot left aside. Elements without a share are left
// out; the order is the circuit's.
func (st *State) Contributions(q *netlist.Expr, id netlist.SlotID) ([]Contribution, error) {
	s := st.s
	seed := s.newSeed()
	ok := true
	if _, found := q.Grad(st,
		func(netlist.SlotID, float64) {},
		func(r netlist.Ref, w float64) {
			_, has := st.measure(r, seed, w)
			ok = ok && has
		}); !found || !ok {
		return nil, errors.New(q.Text + " has no number here")
	}
	adjoint, err := st.adjoint(seed)
	if err != nil {
		return nil, err
	}
	for i := range s.devices {
		d := &s.devices[i]
		for j := 0; j < d.terminals(); j++ {
			seed.i[i][j] -= adjoint[s.row[d.node[j]]]
		}
	}
	direction := s.NewTuner(id).direction()
	out, size := s.contributions(st, seed, id, direction)
	if against := s.against(direction); against != nil {
		if other, smaller := s.contributions(st, seed, id, against); smaller < size {
			out = other
		}
	}
	return out, nil
}

// against is the same movement seen from the moved nodes: all other known nodes go
// the other way. Both ways of telling it are right, for only voltage differences
// matter; the one with less cancellation is the better explanation: a source that
// hangs on its supply sees gnd move. It is nil where a free node is moved.
func (s *System) against(direction []float64) []float64 {
	out := make([]float64, len(direction))
	for node, d := range direction {
		switch known := int(s.row[node]) == s.n; {
		case !known && d != 0:
			return nil
		case known && node < len(s.circuit.Nodes):
			out[node] = d - 1
		}
	}
	return out
}

// contributions collects each element's amount for a movement of the nodes, and the
// sum of their magnitudes.
func (s *System) contributions(st *State, seed *Seed, id netlist.SlotID, direction []float64) (out []Contribution, size float64) {
	amounts := make([]float64, len(s.circuit.Elements))
	offsets, d := make([]float64, s.nodes), make([]float64, len(s.values))
	var r devices.Response
	for i := range s.devices {
		dev := &s.devices[i]
		for j := 0; j < dev.terminals(); j++ {
			offsets[dev.node[j]] = 0
		}
		before := d[id]
		s.collect(st, i, seed.i[i], &r, offsets, d)
		amount := d[id] - before
		for j := 0; j < dev.terminals(); j++ {
			node := dev.node[j]
			amount += offsets[node] * direction[node]
			offsets[node] = 0 // terminals on one node count once
		}
		amounts[dev.element] += amount
	}
	for i, amount := range amounts {
		if amount != 0 {
			out = append(out, Contribution{i, amount})
			size += math.Abs(amount)
		}
	}
	return out, size
}
