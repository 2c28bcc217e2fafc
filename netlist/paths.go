package netlist

import (
	"slices"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// longestRow bounds a row, so that a slip of the keyboard does not fill the
// memory; a string of lamps has a few dozen.
const longestRow = 1000

// mostInRows bounds the parts in all rows together, for the same reason.
const mostInRows = 100000

// A laid is an element on its way: between its nodes already, its kind and its
// values still to come.
type laid struct {
	*thing
	syn       *syntax.Element // nil for a placed one
	place     *syntax.Place   // nil for one on a path
	modifiers []syntax.Modifier
	sound     bool // its kind is known
}

// lay puts the elements between their nodes, in file order: the nodes of a path
// are in the order in which the text names them.
func (r *resolver) lay() {
	if r.partsOnly {
		return
	}
	var things []*thing
	for _, t := range r.local.order {
		if t.sort == anElement {
			things = append(things, t)
		}
	}
	found := false
	for _, s := range r.tree.Statements {
		switch s := s.(type) {
		case *syntax.Path:
			found = true
			things = r.path(s, things)
		case *syntax.Place:
			found = true
			r.placed(s, things[0])
			things = things[1:]
		}
	}
	if !found && !r.partial {
		r.errorf("empty", diag.Span{File: r.tree.Name}, "a path leads from a rail to ground: path VCC -> R1 1k -> gnd", "there is no path, so there is nothing to solve")
		r.broken = true
	}
}

// path lays one path. things begins with the path's own elements; the rest is
// returned.
func (r *resolver) path(p *syntax.Path, things []*thing) []*thing {
	segments := p.Segments
	skip := r.sideBySide(segments)
	at := len(r.c.Paths)
	r.c.Paths = append(r.c.Paths, Path{Span: p.Where()})
	var steps []Step
	var before *laid // the element just laid, with no node behind it yet
	from := NodeID(None)
	for i := range segments {
		s := &segments[i]
		if s.Element == nil {
			id := NodeID(None)
			if skip[i] {
				r.broken = true
			} else if s.Node != nil {
				id = r.node(*s.Node)
				steps = append(steps, Step{Node: id, Element: None})
			}
			r.end(before, id)
			before, from = nil, id
			continue
		}
		l := &laid{thing: things[0], syn: s.Element, modifiers: s.Element.Modifiers}
		things = things[1:]
		if before != nil {
			from = r.makeNode(betweenName(before.name, l.name), s.Element.Span)
			steps = append(steps, Step{Node: from, Element: None})
			r.end(before, from)
		}
		if i == 0 {
			r.errorf("open-path", s.Element.Span, "begin at a rail or a node: path VCC -> "+l.name+" …", "a path begins at a node, not with %s", l.name)
			r.broken = true
		}
		r.begin(l, from, at)
		steps = append(steps, Step{Node: None, Element: l.index})
		before, from = l, None
	}
	if before != nil {
		r.errorf("open-path", before.span, "end at gnd or a node: … "+before.name+" … -> gnd", "a path ends at a node, not with %s", before.name)
		r.broken = true
		r.end(before, None)
	}
	r.c.Paths[at].Steps = steps
	return things
}

// begin makes an element that begins at a node. An end that is missing, which was
// said, is put to gnd so that the rest is still checked.
func (r *resolver) begin(l *laid, from NodeID, path int) {
	e := Element{
		Name: l.name, Kind: Open, Part: None, From: from, To: Gnd, Base: None, Value: None, TC: None, Rating: None, Size: None,
		Beside: None, Path: path, Row: 1, Span: l.span,
	}
	if from == None {
		e.From = Gnd
		r.broken = true
	}
	l.index = len(r.c.Elements)
	l.thing.element = l
	r.c.Elements = append(r.c.Elements, e)
	r.laid = append(r.laid, l)
	for i := range l.modifiers {
		m := &l.modifiers[i]
		switch m.Key.Text {
		case "base":
			if w := wordOf(m); w != nil && r.c.Elements[l.index].Base == None {
				base := r.node(*w)
				r.c.Elements[l.index].Base = base
			}
		case "row":
			r.row(l, m)
		}
	}
	if n, ok := r.rows[l.name]; ok {
		r.c.Elements[l.index].Row = n
	}
	r.countRow(l)
}

// countRow keeps the rows together within their bound. It is said once.
func (r *resolver) countRow(l *laid) {
	row := &r.c.Elements[l.index].Row
	if *row == 1 {
		return
	}
	fitted := r.inRows <= mostInRows
	r.inRows += *row
	if r.inRows <= mostInRows {
		return
	}
	if fitted {
		r.errorf("row", l.span, "", "the rows up to %s hold more than %d parts", l.name, mostInRows)
	}
	*row = 1
}

// row reads the count of a row.
func (r *resolver) row(l *laid, m *syntax.Modifier) {
	if m.Value == nil || m.Value.Literal == nil {
		r.errorf("row", m.Span, "row=2", "row needs a number: how many stand in series")
		return
	}
	n := m.Value.Literal
	if !n.Bare || n.Value != float64(int(n.Value)) || n.Value < 1 || n.Value > longestRow {
		r.errorf("row", n.Span, "", "a row is a whole number of parts from 1 to %d, not %s", longestRow, n.Text)
		return
	}
	r.c.Elements[l.index].Row = int(n.Value)
}

// end closes an element, nil for none, at a node, and makes the nodes inside a
// row.
func (r *resolver) end(l *laid, to NodeID) {
	if l == nil {
		return
	}
	if to == None {
		to = Gnd
		r.broken = true
	}
	e := &r.c.Elements[l.index]
	e.To = to
	e.Chain = append(make([]NodeID, 0, e.Row+1), e.From)
	for m := 1; m < e.Row; m++ {
		e.Chain = append(e.Chain, r.makeNode(innerName(e.Name, m), e.Span))
	}
	e.Chain = append(e.Chain, to)
}

// sideBySide says where two nodes stand beside each other with no element between
// them, and returns the segments that are no nodes but elements without a value.
func (r *resolver) sideBySide(segments []syntax.Segment) map[int]bool {
	skip := map[int]bool{}
	for i := 0; i < len(segments); i++ {
		j := i
		for j < len(segments) && segments[j].Element == nil && segments[j].Node != nil {
			j++
		}
		if j-i >= 2 {
			r.nodesInARow(segments, i, j, skip)
		}
		if len(segments) == 1 && j == 1 {
			r.errorf("open-path", segments[0].Node.Span, "", "a path leads from one node through an element to another")
			r.broken = true
		}
		i = max(i, j-1)
	}
	return skip
}

// nodesInARow judges the run of nodes segments[i:j].
func (r *resolver) nodesInARow(segments []syntax.Segment, i, j int, skip map[int]bool) {
	r.broken = true
	first, last := segments[i].Node, segments[j-1].Node
	var suspects []int
	for k := i; k < j; k++ {
		if inside := k > i && k < j-1; inside || j-i == 2 && r.onlyHere(segments[k].Node.Text) {
			suspects = append(suspects, k)
		}
	}
	if len(suspects) == 0 || j-i == 2 && len(suspects) == 2 {
		r.errorf("side-by-side", last.Span, "write the element between them: "+first.Text+" -> R1 1k -> "+last.Text,
			"nothing stands between %s and %s", first.Text, last.Text)
		return
	}
	for n := 0; n < len(suspects); n++ {
		k := suspects[n]
		skip[k] = true
		w := segments[k].Node
		r.forgotten[w.Text] = true
		if n+1 < len(suspects) && quantity.Reads(segments[suspects[n+1]].Node.Text) {
			value := segments[suspects[n+1]].Node
			skip[suspects[n+1]] = true
			n++
			r.errorf("side-by-side", value.Span, "write "+w.Text+" "+value.Text, "the value of %s stands behind it with no arrow between", w.Text)
			continue
		}
		if quantity.Reads(w.Text) {
			r.errorf("side-by-side", w.Span, "give it a designator: R1 "+w.Text, "%s has no name", w.Text)
			continue
		}
		r.errorf("side-by-side", w.Span, "a value or a part follows the name: "+w.Text+" 1k", "%s has no value", w.Text)
	}
}

// onlyHere tells a word that could be an element whose value was forgotten: no
// rail, and mentioned nowhere else as a node.
func (r *resolver) onlyHere(text string) bool {
	if text == "gnd" || text == "GND" {
		return false
	}
	if t := r.local.names[text]; t != nil && t.sort == aRail {
		return false
	}
	return r.mentions()[text] == 1
}

// mentions counts how often each word stands as a node.
func (r *resolver) mentions() map[string]int {
	if r.nodeWords != nil {
		return r.nodeWords
	}
	r.nodeWords = map[string]int{}
	count := func(w *syntax.Word) {
		if w != nil {
			r.nodeWords[w.Text]++
		}
	}
	for _, s := range r.tree.Statements {
		switch s := s.(type) {
		case *syntax.Path:
			for i := range s.Segments {
				count(s.Segments[i].Node)
				if e := s.Segments[i].Element; e != nil {
					for m := range e.Modifiers {
						if e.Modifiers[m].Key.Text == "base" {
							count(wordOf(&e.Modifiers[m]))
						}
					}
				}
			}
		case *syntax.Place:
			for i := range s.Pins {
				count(&s.Pins[i].Node)
			}
		}
	}
	return r.nodeWords
}

// placed lays an element that is put by its pins. Which of them is which end is
// known by its part's kind.
func (r *resolver) placed(p *syntax.Place, t *thing) {
	l := &laid{thing: t, place: p, modifiers: p.Modifiers}
	pins := map[string]NodeID{}
	for i := range p.Pins {
		pin := &p.Pins[i]
		if _, twice := pins[pin.Key.Text]; twice {
			r.errorf("duplicate-statement", pin.Key.Span, "", "%s has two pins called %s", t.name, pin.Key.Text)
		}
		pins[pin.Key.Text] = r.node(pin.Node)
	}
	from, to := NodeID(Gnd), NodeID(Gnd)
	base := NodeID(None)
	kind, known := r.kindOf(p.Part)
	switch {
	case !known: // said when the part is bound
		r.broken = true
	case kind.Shape == Junction:
		r.pins(p, kind, pins, "anode", "cathode")
		from, to = pins["anode"], pins["cathode"]
	default:
		r.pins(p, kind, pins, "collector", "base", "emitter")
		from, to, base = pins["collector"], pins["emitter"], pins["base"]
		if kind.PNP {
			from, to = to, from
		}
	}
	r.begin(l, from, None)
	r.c.Elements[l.index].Base = base
	r.end(l, to)
	r.c.Placed = append(r.c.Placed, l.index)
}

// kindOf looks at the kind of a part without resolving it.
func (r *resolver) kindOf(w syntax.Word) (*Kind, bool) {
	t := r.local.names[w.Text]
	if t == nil && len(r.local.taken[w.Text]) > 0 {
		t = r.local.taken[w.Text][0]
	}
	if t == nil || t.part == nil {
		return nil, false
	}
	return r.cat.Kind(t.part.Kind.Text)
}

// pins checks that the pins of a placed part are those of its kind.
func (r *resolver) pins(p *syntax.Place, kind *Kind, have map[string]NodeID, want ...string) {
	usage := ""
	for _, w := range want {
		usage += " " + w + "=NODE"
	}
	hint := p.Name.Text + " " + p.Part.Text + usage
	for i := range p.Pins {
		if key := p.Pins[i].Key; !slices.Contains(want, key.Text) {
			r.errorf("pins", key.Span, hint, "%s is %s, which has no pin %s", p.Name.Text, article(kind.Name), key.Text)
			r.broken = true
			return // the pins it should have are missing then
		}
	}
	for _, w := range want {
		if _, ok := have[w]; !ok {
			r.errorf("pins", p.Name.Span, hint, "the %s of %s is not connected", w, p.Name.Text)
			r.broken = true
		}
	}
}

// secondWordHint tells how the unit of a second word would be written.
func secondWordHint(u quantity.Unit, text string) string {
	switch u {
	case quantity.Volt:
		return "an ideal voltage is written drop " + text + ", or cell " + text + " where it rises along the arrow"
	case quantity.Watt:
		return "a rating stands behind the resistance: 47 " + text
	case quantity.Siemens:
		return "write its resistance"
	case quantity.One:
		return "a given value has the unit that it is written with: 1 kohm"
	}
	return "an element is given in ohms or amps, or by a part"
}

// wordOf is the name that a modifier gives: base=bias, beside=Q1.
func wordOf(m *syntax.Modifier) *syntax.Word {
	if m.Name == nil && m.Value != nil {
		return m.Value.Name
	}
	return m.Name
}
