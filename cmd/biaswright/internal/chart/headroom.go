package chart

import (
	"math"
	"strconv"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/solve"
)

// A stack is one point of a circuit as columns of drops: what the headroom picture
// and its sketch both show. All voltages are against gnd, in V.
type stack struct {
	low, high float64 // of all levels
	levels    []level
	columns   []column
}

// A level is a rail, or gnd, across all columns.
type level struct {
	name  string
	volts float64
}

// A column is one path, or one placed part.
type column struct {
	blocks []block
	nodes  []knot
	placed bool
}

// A block is an element's drop.
type block struct {
	name string
	// from and to are the voltages at its ends along the arrow.
	from, to float64
	kind     figure.Paint
	row      int // members in series
	// lane is 0 in the path's own place, more where an element before it
	// stands at the same height: after a rise.
	lane int
	// A transistor's spare volts lie between edge, where it would saturate, and
	// its collector; NaN for others. base is its base's voltage, baseNode whose.
	edge, collector, base float64
	baseNode              netlist.NodeID
	state                 string
}

// A knot is a node on a path.
type knot struct {
	node  netlist.NodeID
	name  string // "" for one that no word of the file names
	volts float64
	held  bool // by a rail, or gnd: a level shows it
}

func (b *block) top() float64    { return math.Max(b.from, b.to) }
func (b *block) bottom() float64 { return math.Min(b.from, b.to) }
func (b *block) drop() float64   { return b.from - b.to }

// spare is how far a transistor's collector may still come towards its emitter; NaN
// for what has none.
func (b *block) spare() float64 {
	if b.state == "off" || b.state == "reverse" {
		return math.NaN()
	}
	return math.Abs(b.collector-b.edge) * sign(b.collector-b.edge, b.collector-b.emitter())
}

// emitter is the voltage at the other end than the collector's.
func (b *block) emitter() float64 {
	if b.collector == b.from {
		return b.to
	}
	return b.from
}

// sign is 1 where a has the sense of b, otherwise -1.
func sign(a, b float64) float64 {
	if a*b < 0 {
		return -1
	}
	return 1
}

// newStack reads a point.
func newStack(p *solve.Point) *stack {
	s := &stack{}
	c := p.Circuit
	s.levels = append(s.levels, level{"gnd", 0})
	for i := range c.Rails {
		s.levels = append(s.levels, level{c.Rails[i].Name, p.Rails[i].V})
	}
	for i := range c.Paths {
		s.columns = append(s.columns, pathColumn(p, &c.Paths[i]))
	}
	for _, i := range c.Placed {
		e := &c.Elements[i]
		s.columns = append(s.columns, column{
			placed: true,
			blocks: []block{newBlock(p, i)},
			nodes:  []knot{newKnot(p, e.From), newKnot(p, e.To)},
		})
	}
	for _, l := range s.levels {
		s.include(l.volts)
	}
	for i := range s.columns {
		for k := range s.columns[i].blocks {
			b := &s.columns[i].blocks[k]
			s.include(b.from)
			s.include(b.to)
			if !math.IsNaN(b.base) {
				s.include(b.base)
			}
		}
	}
	return s
}

func (s *stack) include(v float64) {
	s.low, s.high = math.Min(s.low, v), math.Max(s.high, v)
}

func pathColumn(p *solve.Point, path *netlist.Path) column {
	var col column
	for _, step := range path.Steps {
		if step.Element == netlist.None {
			col.nodes = append(col.nodes, newKnot(p, step.Node))
			continue
		}
		b := newBlock(p, step.Element)
		b.lane = col.laneFor(&b)
		col.blocks = append(col.blocks, b)
	}
	return col
}

// laneFor is the first lane in which nothing stands at the block's height.
func (c *column) laneFor(b *block) int {
	for lane := 0; ; lane++ {
		free := true
		for k := range c.blocks {
			o := &c.blocks[k]
			const touch = 1e-9 // V: what only meets does not overlap
			if o.lane == lane && o.top() > b.bottom()+touch && b.top() > o.bottom()+touch {
				free = false
			}
		}
		if free {
			return lane
		}
	}
}

func newKnot(p *solve.Point, n netlist.NodeID) knot {
	k := knot{node: n, volts: p.NodeV[n], held: n == netlist.Gnd || p.Circuit.Nodes[n].Rail >= 0}
	if !p.Circuit.Nodes[n].Made {
		k.name = p.Circuit.Nodes[n].Name
	}
	return k
}

func newBlock(p *solve.Point, i int) block {
	e, q := &p.Circuit.Elements[i], &p.Elements[i]
	nan := math.NaN()
	b := block{name: e.Name, from: p.NodeV[e.From], to: p.NodeV[e.To], row: e.Row, kind: figure.Ideal, edge: nan, collector: nan, base: nan, baseNode: netlist.None}
	switch e.Kind {
	case netlist.Resistor:
		b.kind = figure.Ohmic
	case netlist.JunctionPart:
		b.kind = figure.Junction
	case netlist.TransistorPart:
		b.kind = figure.Active
		b.state = q.State
		b.base, b.baseNode = p.NodeV[e.Base], e.Base
		b.collector = b.from
		spare := p.SpareVolts(i)
		b.edge = b.collector - spare
		if p.Circuit.Parts[e.Part].Kind.PNP {
			b.collector = b.to
			b.edge = b.collector + spare
		}
	}
	return b
}

// text is what stands beside a block.
func (b *block) text() string {
	text := b.name + " " + render.Measured(b.drop(), "V")
	if b.row > 1 {
		text = b.name + " ×" + strconv.Itoa(b.row) + " " + render.Measured(b.drop(), "V")
	}
	if b.state != "" && b.state != "active" {
		text += ", " + b.state
	}
	return text
}

// spareText says a transistor's spare volts, "" where it has none.
func (b *block) spareText() string {
	spare := b.spare()
	if math.IsNaN(spare) || spare <= 0 {
		return ""
	}
	return render.Measured(spare, "V") + " spare"
}

// text is what stands beside a node, "" where a level or nothing names it.
func (k *knot) text() string {
	if k.name == "" || k.held {
		return ""
	}
	return k.name + " " + render.Measured(k.volts, "V")
}

// A label is a text beside a column, and where it belongs.
type label struct {
	text  string
	volts float64
	node  bool
	lane  int
}

// labels are the column's, from the highest down.
func (c *column) labels() []label {
	var out []label
	seen := map[netlist.NodeID]bool{}
	for i := range c.nodes {
		if t := c.nodes[i].text(); t != "" && !seen[c.nodes[i].node] {
			seen[c.nodes[i].node] = true
			out = append(out, label{text: t, volts: c.nodes[i].volts, node: true})
		}
	}
	for i := range c.blocks {
		b := &c.blocks[i]
		out = append(out, label{text: b.text(), volts: (b.from + b.to) / 2, lane: b.lane})
		if t := b.spareText(); t != "" { // below its transistor
			out = append(out, label{text: t, volts: (b.from + b.to) / 2, lane: b.lane})
		}
	}
	sortBy(out, func(l label) float64 { return -l.volts })
	return out
}

func (c *column) lanes() int {
	most := 1
	for i := range c.blocks {
		most = max(most, c.blocks[i].lane+1)
	}
	return most
}

// A join is a node that several columns share.
type join struct {
	volts   float64
	columns []int
	bases   []int // columns in which it is a transistor's base
}

// joins finds them among columns [from, to).
func (s *stack) joins(from, to int) []join {
	type place struct{ columns, bases []int }
	at := map[netlist.NodeID]*place{}
	volts := map[netlist.NodeID]float64{}
	var order []netlist.NodeID
	get := func(n netlist.NodeID, v float64) *place {
		if at[n] == nil {
			at[n] = &place{}
			volts[n] = v
			order = append(order, n)
		}
		return at[n]
	}
	for i := from; i < to; i++ {
		col := &s.columns[i]
		for k := range col.nodes {
			if n := &col.nodes[k]; !n.held {
				pl := get(n.node, n.volts)
				if len(pl.columns) == 0 || pl.columns[len(pl.columns)-1] != i {
					pl.columns = append(pl.columns, i)
				}
			}
		}
		for k := range col.blocks {
			if b := &col.blocks[k]; b.baseNode > netlist.Gnd {
				pl := get(b.baseNode, b.base)
				pl.bases = append(pl.bases, i)
			}
		}
	}
	var out []join
	for _, n := range order {
		if pl := at[n]; len(pl.columns)+len(pl.bases) > 1 {
			out = append(out, join{volts[n], pl.columns, pl.bases})
		}
	}
	return out
}
