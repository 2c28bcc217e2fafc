package render

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"biaswright/netlist"
	"biaswright/solve"
)

// The columns of the upper half of the screen: one grid for paths, placed parts
// and rails, so that a voltage, a current or a power stands in one place.
const (
	colLabel = iota
	colWhat
	colNode
	colDrop
	colCurrent
	colPower
	colState
	cols
)

// scales of one block of the grid.
type units struct{ volts, amps, watts scale }

// A stair draws one point.
type stair struct {
	look Look
	c    *netlist.Circuit
	p    *solve.Point
	over map[string]string // designator to the rating that is exceeded

	pins    map[netlist.NodeID][]pin
	largest float64 // A, the largest element current: what "off" is measured by
	common  units
	t       table
}

// A pin is where an element's current meets a node.
type pin struct {
	element int
	name    string // "base", "collector", "emitter", "anode", "cathode" or ""
	node    netlist.NodeID
	into    float64 // A, from the node into the element
}

func newStair(l Look, p *solve.Point, over map[string]string) *stair {
	s := &stair{look: l, c: p.Circuit, p: p, over: over, pins: map[netlist.NodeID][]pin{}}
	s.t = table{
		numeric: []bool{colNode: true, colDrop: true, colCurrent: true, colPower: true, colState: false},
		// Longer labels and descriptions push their numbers to the next line.
		most: []int{colLabel: 20, colWhat: 24, colState: 0},
	}
	for i := range s.c.Elements {
		for _, q := range s.pinsOf(i) {
			s.pins[q.node] = append(s.pins[q.node], q)
		}
		s.largest = max(s.largest, math.Abs(s.current(i)))
	}
	s.common = s.unitsOf(s.everything(), nil)
	return s
}

// pinsOf lists an element's pins, for a transistor collector, base, emitter.
func (s *stair) pinsOf(i int) []pin {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	if e.Kind == netlist.TransistorPart {
		if s.kind(e).PNP {
			return []pin{
				{i, "collector", e.To, -q.Ic},
				{i, "base", e.Base, -q.Ib},
				{i, "emitter", e.From, q.Ie},
			}
		}
		return []pin{
			{i, "collector", e.From, q.Ic},
			{i, "base", e.Base, q.Ib},
			{i, "emitter", e.To, -q.Ie},
		}
	}
	from, to := "", ""
	if e.Kind == netlist.JunctionPart {
		from, to = "anode", "cathode"
		if e.Reversed {
			from, to = to, from
		}
	}
	return []pin{{i, from, e.From, q.I}, {i, to, e.To, -q.I}}
}

func (s *stair) kind(e *netlist.Element) *netlist.Kind { return s.c.Parts[e.Part].Kind }

// current is what flows into the element along its path, in A: a transistor's
// collector or, for a pnp, emitter current.
func (s *stair) current(i int) float64 {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	switch {
	case e.Kind != netlist.TransistorPart:
		return q.I
	case s.kind(e).PNP:
		return q.Ie
	default:
		return q.Ic
	}
}

// currentOut is what leaves the element along its path, in A.
func (s *stair) currentOut(i int) float64 {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	switch {
	case e.Kind != netlist.TransistorPart:
		return q.I
	case s.kind(e).PNP:
		return q.Ic
	default:
		return q.Ie
	}
}

// voltage is the fall along the arrow, in V.
func (s *stair) voltage(i int) float64 {
	q := &s.p.Elements[i]
	if s.c.Elements[i].Kind == netlist.TransistorPart {
		return q.Vce
	}
	return q.V
}

// everything lists all elements, the rails' figures are added by unitsOf.
func (s *stair) everything() []int {
	all := make([]int, len(s.c.Elements))
	for i := range all {
		all[i] = i
	}
	return all
}

// unitsOf finds the prefixes that these elements ask for. Node voltages share
// the prefix of the drops, so that a drop is seen as their difference.
func (s *stair) unitsOf(elements []int, more []float64) units {
	var v, w []float64
	a := slices.Clone(more)
	for _, i := range elements {
		v = append(v, s.voltage(i))
		a = append(a, s.current(i), s.currentOut(i))
		w = append(w, s.p.Elements[i].P)
	}
	for _, r := range s.p.Rails {
		v = append(v, r.V)
	}
	return units{scaleFor(v...), scaleFor(a...), scaleFor(w...)}
}

// unitsFor keeps the screen's prefixes for a path unless its figures are so much
// smaller than the largest that they would be rows of zeros. More are currents in
// A that stand beside the elements'.
func (s *stair) unitsFor(elements []int, more []float64) units {
	own := s.unitsOf(elements, more)
	u := s.common
	const apart = 3 // powers of ten: one prefix
	if s.common.amps.exp-own.amps.exp > apart {
		u.amps = own.amps
	}
	if s.common.watts.exp-own.watts.exp > apart {
		u.watts = own.watts
	}
	return u
}

// head puts the headings of a block.
func (s *stair) head(title string, u units, voltage, drop, current, power string) {
	h := row{head: true, cells: make([]cell, cols)}
	h.cells[colLabel] = cell{title, bold}
	put := func(col int, what string, sc scale, unit string) {
		if what != "" {
			h.cells[col] = cell{s.look.text(heading(what, sc, unit)), faint}
		}
	}
	put(colNode, voltage, u.volts, "V")
	put(colDrop, drop, u.volts, "V")
	put(colCurrent, current, u.amps, "A")
	put(colPower, power, u.watts, "W")
	s.t.add(h)
}

// path draws one path from its first node to its last.
func (s *stair) path(p *netlist.Path) {
	var on []int
	for _, st := range p.Steps {
		if st.Element >= 0 {
			on = append(on, st.Element)
		}
	}
	u := s.unitsFor(on, s.branchCurrents(p))
	first, last := p.Steps[0].Node, p.Steps[len(p.Steps)-1].Node
	title := s.name(first) + " " + s.look.glyph(arrow) + " " + s.name(last)
	s.head(title, u, "node", "drop", "current", "power")
	flow := math.NaN() // the current last shown, in A
	for k, st := range p.Steps {
		switch {
		case st.Element >= 0:
			flow = s.element(st.Element, u, flow)
		default:
			s.node(st.Node, u, k == 0, k == len(p.Steps)-1)
			if s.branches(p, k, u) {
				flow = math.NaN()
			}
		}
	}
	s.t.blank()
}

func (s *stair) name(n netlist.NodeID) string {
	if n == netlist.Gnd {
		return "gnd"
	}
	return s.c.Nodes[n].Name
}

// node puts a node with its voltage.
func (s *stair) node(n netlist.NodeID, u units, top, end bool) {
	g, i := dot, noInk
	held := n == netlist.Gnd || s.c.Nodes[n].Rail >= 0
	switch {
	case held && top:
		g = supply
	case held && end:
		g = ground
	case s.c.Nodes[n].Made:
		g, i = ring, faint
	}
	r := make([]cell, cols)
	r[colLabel] = cell{s.look.glyph(g) + " " + s.name(n), i}
	r[colNode] = cell{number(u.volts.in(s.p.NodeV[n])), i}
	s.t.add(row{cells: r, lead: s.look.glyph(wire)})
}

// element puts an element, and for a transistor its base beneath. Its current is
// shown where it is not flow, the one last shown, and returned.
func (s *stair) element(i int, u units, flow float64) float64 {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	bar := s.look.glyph(wire)
	r := make([]cell, cols)
	r[colLabel] = cell{bar + "   " + e.Name, noInk}
	r[colWhat] = cell{s.look.text(s.what(i)), noInk}
	r[colDrop] = cell{number(u.volts.in(s.voltage(i))), noInk}
	here := s.current(i)
	if !same(here, flow) {
		r[colCurrent] = cell{number(u.amps.in(here)), noInk}
	}
	r[colPower] = cell{number(u.watts.in(q.P)), noInk}
	r[colState] = s.state(i)
	s.t.add(row{cells: r, lead: bar})
	if e.Kind == netlist.TransistorPart {
		s.base(i, u)
	}
	return here
}

// same tells two currents that are one: their models agree to rounding.
func same(a, b float64) bool {
	const rounding = 1e-9 // far below what is printed, far above what a solution leaves
	return math.Abs(a-b) <= rounding*max(math.Abs(a), math.Abs(b))
}

// base puts the base's branch: its node, V_BE and I_B.
func (s *stair) base(i int, u units) {
	e, q := &s.c.Elements[i], &s.p.Elements[i]
	into, symbol := q.Ib, "Vbe"
	if s.kind(e).PNP {
		into, symbol = -q.Ib, "Veb"
	}
	g := joins
	if into < 0 {
		g = leaves
	}
	r := make([]cell, cols)
	r[colLabel] = cell{s.look.glyph(g) + " " + s.name(e.Base), noInk}
	r[colWhat] = cell{"base, " + symbol, faint}
	r[colDrop] = cell{number(u.volts.in(q.Vbe)), noInk}
	r[colCurrent] = cell{number(u.amps.in(math.Abs(into))), noInk}
	s.t.add(row{cells: r, lead: s.look.glyph(wire)})
}

// neighbours are the elements before and behind a path's k-th step, or None.
func neighbours(p *netlist.Path, k int) (above, below int) {
	above, below = netlist.None, netlist.None
	if k > 0 {
		above = p.Steps[k-1].Element
	}
	if k+1 < len(p.Steps) {
		below = p.Steps[k+1].Element
	}
	return above, below
}

// others are the pins at a path's k-th step, a node, that are not on its wire.
// There are none to tell of at a rail or at gnd.
func (s *stair) others(p *netlist.Path, k int) []pin {
	n := p.Steps[k].Node
	if s.c.Nodes[n].Rail >= 0 || n == netlist.Gnd {
		return nil
	}
	above, below := neighbours(p, k)
	var others []pin
	for _, q := range s.pins[n] {
		onWire := (q.element == above || q.element == below) && q.name != "base"
		if !onWire {
			others = append(others, q)
		}
	}
	return others
}

// branchCurrents are those that a path's nodes tell of, in A.
func (s *stair) branchCurrents(p *netlist.Path) []float64 {
	var amps []float64
	for k := range p.Steps {
		if p.Steps[k].Element != netlist.None {
			continue
		}
		for _, q := range s.others(p, k) {
			amps = append(amps, q.into)
		}
	}
	return amps
}

// branches puts what joins or leaves at the path's k-th step, a node. It tells
// whether anything does.
func (s *stair) branches(p *netlist.Path, k int, u units) bool {
	n := p.Steps[k].Node
	if s.c.Nodes[n].Rail >= 0 || n == netlist.Gnd {
		return true // the rail takes what it must; its own line tells
	}
	above, below := neighbours(p, k)
	others := s.others(p, k)
	// A bus that feeds dozens is told as a sum; sooner where the path ends,
	// since other paths tell of the rest.
	most := 6
	if above == netlist.None || below == netlist.None {
		most = 3
	}
	shown := others
	if len(others) > most {
		shown = others[:most-1]
	}
	for i, q := range shown {
		last := below == netlist.None && i == len(others)-1
		s.branch(strings.TrimSpace(s.c.Elements[q.element].Name+" "+q.name), q.into, u, last)
	}
	if rest := others[len(shown):]; len(rest) > 0 {
		sum := 0.0
		for _, q := range rest {
			sum += q.into
		}
		s.branch(fmt.Sprintf("%d more", len(rest)), sum, u, below == netlist.None)
	}
	return len(others) > 0
}

// branch puts one branch: last where the wire ends with it.
func (s *stair) branch(name string, into float64, u units, last bool) {
	out, in := leaves, joins
	if last {
		out, in = leavesLast, joinsLast
	}
	g := out
	if into < 0 {
		g = in
	}
	r := make([]cell, cols)
	r[colLabel] = cell{s.look.glyph(g) + " " + name, noInk}
	r[colCurrent] = cell{number(u.amps.in(math.Abs(into))), noInk}
	s.t.add(row{cells: r, lead: s.look.glyph(wire)})
}

// placed draws the parts that stand on no path, by their pins.
func (s *stair) placed() {
	if len(s.c.Placed) == 0 {
		return
	}
	u := s.unitsFor(s.c.Placed, nil)
	s.head("Placed", u, "node", "drop", "current", "power")
	for _, i := range s.c.Placed {
		e, q := &s.c.Elements[i], &s.p.Elements[i]
		r := make([]cell, cols)
		r[colLabel] = cell{"  " + e.Name, noInk}
		r[colWhat] = cell{s.look.text(s.what(i)), noInk}
		r[colDrop] = cell{number(u.volts.in(s.voltage(i))), noInk}
		r[colPower] = cell{number(u.watts.in(q.P)), noInk}
		r[colState] = s.state(i)
		s.t.add(row{cells: r})
		for _, q := range s.pinsOf(i) {
			s.placedPin(q, u)
		}
	}
	s.t.blank()
}

func (s *stair) placedPin(q pin, u units) {
	g := inward
	if q.into < 0 {
		g = outward
	}
	r := make([]cell, cols)
	r[colLabel] = cell{"    " + q.name + " " + s.look.glyph(g) + " " + s.name(q.node), noInk}
	r[colNode] = cell{number(u.volts.in(s.p.NodeV[q.node])), noInk}
	if q.name == "base" {
		e := &s.c.Elements[q.element]
		symbol := "Vbe"
		if s.kind(e).PNP {
			symbol = "Veb"
		}
		r[colWhat] = cell{symbol, faint}
		r[colDrop] = cell{number(u.volts.in(s.p.Elements[q.element].Vbe)), noInk}
	}
	r[colCurrent] = cell{number(u.amps.in(math.Abs(q.into))), noInk}
	s.t.add(row{cells: r})
}

// rails puts what each rail delivers, and the sum.
func (s *stair) rails() {
	if len(s.c.Rails) == 0 {
		return
	}
	u := s.common
	s.head("Rails", u, "node", "", "delivers", "power")
	total := 0.0
	for i := range s.c.Rails {
		rail, q := &s.c.Rails[i], &s.p.Rails[i]
		r := make([]cell, cols)
		r[colLabel] = cell{"  " + rail.Name, noInk}
		if b := s.c.Slots[rail.Volts].Bounds; b.Stated {
			r[colWhat] = cell{s.look.text(rangeText(b, "V")), faint}
		}
		r[colNode] = cell{number(u.volts.in(q.V)), noInk}
		r[colCurrent] = cell{number(u.amps.in(q.I)), noInk}
		r[colPower] = cell{number(u.watts.in(q.P)), noInk}
		s.t.add(row{cells: r})
		total += q.P
	}
	if len(s.c.Rails) > 1 {
		r := make([]cell, cols)
		r[colLabel] = cell{"  all rails", faint}
		r[colPower] = cell{number(u.watts.in(total)), noInk}
		s.t.add(row{cells: r})
	}
	s.t.blank()
}

// rangeText writes bounds: "10.8 .. 13.2 V", or "5 %".
func rangeText(b netlist.Bounds, unit string) string {
	if b.Relative != 0 {
		return percent(b.Relative)
	}
	if len(b.Picks) > 0 {
		var picks []string
		for _, v := range b.Picks {
			picks = append(picks, stated(v, unit))
		}
		return "pick " + strings.Join(picks, " ")
	}
	low, high := stated(b.Low, unit), stated(b.High, unit)
	return strings.TrimSuffix(low, " "+unit) + " .. " + high
}

func percent(x float64) string {
	const toPercent = 100
	return fmt.Sprintf("%.4g %%", x*toPercent)
}
