package mna

import (
	"errors"
	"math"

	"biaswright/netlist"
	"biaswright/solve/sparse"
)

// A builder lays a circuit out as devices between local nodes.
type builder struct {
	c      *netlist.Circuit
	st     *structure
	ideals []ideal
	ties   []int // connections of each node, once wanted
}

func newBuilder(c *netlist.Circuit) *builder {
	return &builder{c: c, st: &structure{nodes: len(c.Nodes)}}
}

func (b *builder) structure() (*structure, error) {
	if len(b.c.Nodes)+len(b.c.Elements) > math.MaxInt32/4 { // a row and its inner nodes must fit
		return nil, errors.New("the circuit is too large")
	}
	for i := range b.c.Rails {
		r := &b.c.Rails[i]
		b.ideals = append(b.ideals, ideal{from: 0, to: int32(r.Node), slot: r.Volts, rise: 1, rail: i, element: -1})
	}
	for i := range b.c.Elements {
		b.st.first = append(b.st.first, int32(len(b.st.devices)))
		b.element(i, &b.c.Elements[i])
	}
	b.st.first = append(b.st.first, int32(len(b.st.devices)))
	forest, root := grow(b.st.nodes, b.ideals, len(b.c.Rails), len(b.c.Elements))
	b.st.forest = forest
	b.st.listBehind()
	b.number(root)
	plan, err := sparse.Analyse(b.st.n, b.st.entries())
	if err != nil {
		return nil, err
	}
	b.st.plan = plan
	for i := int32(0); int(i) < b.st.n; i++ {
		b.st.diagonal = append(b.st.diagonal, b.st.position(i, i))
	}
	return b.st, nil
}

// element lays out one element: its devices, or its ideal branches.
func (b *builder) element(i int, e *netlist.Element) {
	if e.Kind == netlist.JunctionPart && b.alone(e) {
		b.row(int32(i), e)
		return
	}
	for m := 0; m < len(e.Chain)-1; m++ {
		from, to := int32(e.Chain[m]), int32(e.Chain[m+1])
		switch e.Kind {
		case netlist.Resistor:
			b.device(device{kind: resistorDevice, element: int32(i), member: int32(m), node: [3]int32{from, to}})
		case netlist.CurrentSource:
			b.device(device{kind: sourceDevice, element: int32(i), member: int32(m), node: [3]int32{from, to}})
		case netlist.Link:
			b.ideals = append(b.ideals, ideal{from: from, to: to, slot: netlist.None, rail: -1, element: i, member: m})
		case netlist.Drop:
			b.ideals = append(b.ideals, ideal{from: from, to: to, slot: e.Value, rise: -1, rail: -1, element: i, member: m})
		case netlist.Cell:
			b.ideals = append(b.ideals, ideal{from: from, to: to, slot: e.Value, rise: 1, rail: -1, element: i, member: m})
		case netlist.JunctionPart:
			b.junction(int32(i), int32(m), e, from, to, 1)
		case netlist.TransistorPart:
			collector, emitter := from, to
			if b.c.Parts[e.Part].Kind.PNP {
				collector, emitter = to, from
			}
			b.device(device{kind: bipolarDevice, element: int32(i), node: [3]int32{collector, int32(e.Base), emitter}})
		}
	}
}

// alone tells a row of junctions between whose members nothing else is tied: its
// members carry one current and, being alike, share the voltage equally.
func (b *builder) alone(e *netlist.Element) bool {
	if e.Row < 2 {
		return false
	}
	if b.ties == nil {
		b.ties = ties(b.c)
	}
	for _, node := range e.Chain[1:e.Row] {
		if b.ties[node] > 2 { // two members meet there
			return false
		}
	}
	return true
}

// ties counts what is connected to each node.
func ties(c *netlist.Circuit) []int {
	count := make([]int, len(c.Nodes))
	for i := range c.Elements {
		e := &c.Elements[i]
		for m, node := range e.Chain {
			count[node]++
			if m > 0 && m < len(e.Chain)-1 {
				count[node]++
			}
		}
		if e.Kind == netlist.TransistorPart {
			count[e.Base]++
		}
	}
	for i := range c.Rails {
		count[c.Rails[i].Node]++
	}
	return count
}

// row lays out a row that is alone as one junction at the members' share of its
// voltage. The nodes between the members are no unknowns: in reverse, where the
// currents of like junctions are alike to the last digit, no balance could tell
// them.
func (b *builder) row(element int32, e *netlist.Element) {
	b.junction(element, 0, e, int32(e.From), int32(e.To), int32(e.Row))
	for m := 1; m < e.Row; m++ {
		b.st.between = append(b.st.between, between{
			node: int32(e.Chain[m]), from: int32(e.From), to: int32(e.To), share: float64(m) / float64(e.Row),
		})
	}
}

// junction lays out one member of a junction element, or several alike as one,
// with the bulk resistance on the anode's side.
func (b *builder) junction(element, member int32, e *netlist.Element, from, to, alike int32) {
	anode, cathode := from, to
	if e.Reversed {
		anode, cathode = to, from
	}
	k := b.c.Parts[e.Part].Kind
	if at := k.Index("Rbulk"); at >= 0 && b.c.Value(e.Params[at]) > 0 {
		inner := int32(b.st.nodes)
		b.st.nodes++
		b.st.inner = append(b.st.inner, innerNode{element, member, alike > 1})
		b.device(device{kind: bulkDevice, element: element, member: member, alike: alike, node: [3]int32{anode, inner}})
		anode = inner
	}
	b.device(device{kind: junctionDevice, element: element, member: member, alike: alike, node: [3]int32{anode, cathode}})
}

func (b *builder) device(d device) { b.st.devices = append(b.st.devices, d) }

// number gives each free group an unknown, in node order; gnd's group, the only
// known one, gets the row behind the last.
func (b *builder) number(root []int32) {
	st := b.st
	st.row = make([]int32, st.nodes)
	for _, node := range b.untouched() {
		root[node] = 0 // no balance; known, for all that solves
	}
	for node, r := range root {
		switch {
		case r == 0:
			st.row[node] = -1
		case int(r) == node:
			st.row[node] = int32(st.n)
			st.rowName = append(st.rowName, int32(node))
			st.n++
		default:
			st.row[node] = st.row[r] // a root comes before its group
		}
	}
	for node := range st.row {
		if st.row[node] < 0 {
			st.row[node] = int32(st.n)
		}
	}
}

// listBehind lists, for each rail, the device terminals on its node and on the nodes
// behind it: their currents are what it delivers.
func (st *structure) listBehind() {
	owner := make([]int32, st.nodes) // 1 + the rail whose branch leads to the node
	for rail, at := range st.forest.byRail {
		owner[st.forest.branches[at].child] = int32(rail) + 1
	}
	for _, b := range st.forest.branches { // a parent comes before its child
		if owner[b.child] == 0 {
			owner[b.child] = owner[b.parent]
		}
	}
	st.behind = make([][]terminal, len(st.forest.byRail))
	for i := range st.devices {
		d := &st.devices[i]
		for j := 0; j < d.terminals(); j++ {
			if rail := owner[d.node[j]]; rail > 0 {
				st.behind[rail-1] = append(st.behind[rail-1], terminal{int32(i), int32(j)})
			}
		}
	}
}

// untouched lists the nodes that nothing is tied to: those within a row that
// stands as one junction, or whose row has gone with a held load.
func (b *builder) untouched() []int {
	tied := make([]bool, b.st.nodes)
	tied[0] = true
	for i := range b.st.devices {
		d := &b.st.devices[i]
		for j := 0; j < d.terminals(); j++ {
			tied[d.node[j]] = true
		}
	}
	for _, i := range b.ideals {
		tied[i.from], tied[i.to] = true, true
	}
	var nodes []int
	for node, is := range tied {
		if !is {
			nodes = append(nodes, node)
		}
	}
	return nodes
}

// entries lists the Jacobian's pattern: a full diagonal, and every pair of free
// rows that a device joins.
func (st *structure) entries() []sparse.Entry {
	entries := make([]sparse.Entry, 0, st.n+9*len(st.devices))
	for i := 0; i < st.n; i++ {
		entries = append(entries, sparse.Entry{Row: i, Col: i})
	}
	for i := range st.devices {
		d := &st.devices[i]
		if d.kind == sourceDevice {
			continue
		}
		for j := 0; j < d.terminals(); j++ {
			for k := 0; k < d.terminals(); k++ {
				r, c := int(st.row[d.node[j]]), int(st.row[d.node[k]])
				if r < st.n && c < st.n && r != c {
					entries = append(entries, sparse.Entry{Row: r, Col: c})
				}
			}
		}
	}
	return entries
}

// position is the place of an entry in the Jacobian's values; entries of known
// rows or columns go to the dump behind the last.
func (st *structure) position(row, col int32) int32 {
	if int(row) == st.n || int(col) == st.n {
		return int32(st.plan.NNZ())
	}
	return int32(st.plan.Index(int(row), int(col)))
}

// pair is the places of a two-terminal device's entries: aa, ab, ba, bb.
func (st *structure) pair(a, b int32) [4]int32 {
	return [4]int32{st.position(a, a), st.position(a, b), st.position(b, a), st.position(b, b)}
}

// numbers makes the workspace and the device lists of a structure.
func (b *builder) numbers(st *structure) *numbers {
	nnz := st.plan.NNZ()
	n := &numbers{
		offset: make([]float64, st.nodes), full: make([]float64, st.nodes), v: make([]float64, st.nodes),
		x: make([]float64, st.n+1), f: make([]float64, st.n+1), tol: make([]float64, st.n+1), top: make([]float64, st.n+1), anchor: make([]float64, st.n), tied: make([]float64, st.n),
		jac: make([]float64, nnz+1), base: make([]float64, nnz+1),
		kelvin: make([]float64, len(st.devices)),
	}
	for i := range st.devices {
		d := &st.devices[i]
		a, c := d.node[0], d.node[1]
		ra, rc := st.row[a], st.row[c]
		switch d.kind {
		case resistorDevice, bulkDevice:
			d.at = int32(len(n.resistors))
			n.resistors = append(n.resistors, resistor{a: a, b: c, ra: ra, rb: rc, p: st.pair(ra, rc)})
		case sourceDevice:
			d.at = int32(len(n.sources))
			n.sources = append(n.sources, source{a: a, b: c, ra: ra, rb: rc})
		case junctionDevice:
			d.at = int32(len(n.junctions))
			n.junctions = append(n.junctions, junction{a: a, k: c, ra: ra, rk: rc, p: st.pair(ra, rc), share: 1 / float64(d.alike)})
		case bipolarDevice:
			d.at = int32(len(n.bipolars))
			n.bipolars = append(n.bipolars, st.bipolar(d, b.c.Parts[b.c.Elements[d.element].Part].Kind.PNP))
		}
	}
	return n
}

func (st *structure) bipolar(d *device, pnp bool) bipolar {
	q := bipolar{c: d.node[0], b: d.node[1], e: d.node[2], sign: 1}
	if pnp {
		q.sign = -1
	}
	rows := [3]int32{st.row[q.c], st.row[q.b], st.row[q.e]}
	q.rc, q.rb, q.re = rows[0], rows[1], rows[2]
	for j, r := range rows {
		for k, c := range rows {
			q.p[3*j+k] = st.position(r, c)
		}
	}
	return q
}
