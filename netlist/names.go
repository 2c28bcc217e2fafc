package netlist

import (
	"slices"
	"sort"
	"strconv"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// A sort is what a name stands for.
type sortOf int

const (
	aNode sortOf = iota
	aRail
	anElement
	aPart
	aGiven
)

func (s sortOf) String() string {
	return [...]string{"a node", "a rail", "an element", "a part", "a given value"}[s]
}

// A progress is how far a name has been resolved; busy tells a circle.
type progress uint8

const (
	untouched progress = iota
	busy
	done
)

// A thing is what a name of a text stands for. Things are filled in while a
// circuit is resolved and only read afterwards.
type thing struct {
	name string
	sort sortOf
	span diag.Span
	home *scope // where the names in its own text are looked up

	given   *syntax.Given
	part    *syntax.Part
	value   *syntax.Value // a rail's volts
	element *laid

	// index is the place in Nodes, Rails, Elements or Parts; None until there
	// is one. slot is the value of a rail, an element or a given value.
	index int
	slot  SlotID
	state progress
	used  bool
}

// A scope is the names of one text. All kinds of thing share it, so that a name
// means one thing.
type scope struct {
	names map[string]*thing
	order []*thing // as declared
	// taken are the parts and given values that `use` brought in; a name of
	// names hides them. A name brought in twice is refused only where it is used.
	taken map[string][]*thing
	ready []*thing          // what was taken in, in the order of its texts
	made  map[string]NodeID // nodes that no word names
	from  string            // what the text is called, for messages
	local bool              // the circuit's own text
}

func newScope(from string, local bool) *scope {
	return &scope{names: map[string]*thing{}, taken: map[string][]*thing{}, made: map[string]NodeID{}, from: from, local: local}
}

// take brings a part or given value in; the same one by two ways is one.
func (s *scope) take(t *thing) {
	if !slices.Contains(s.taken[t.name], t) {
		s.taken[t.name] = append(s.taken[t.name], t)
		s.ready = append(s.ready, t)
	}
}

// exports are the parts and given values that the text hands on: those it took in
// and its own.
func (s *scope) exports() []*thing {
	var out []*thing
	for _, t := range s.ready {
		if s.names[t.name] == nil {
			out = append(out, t)
		}
	}
	for _, t := range s.order {
		if t.sort == aPart || t.sort == aGiven {
			out = append(out, t)
		}
	}
	return out
}

func sortedKeys[V any](m map[string]V) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	return keys
}

// find looks a word up. It returns nil for an unknown name, and says so where two
// texts brought it in.
func (r *resolver) find(s *scope, w syntax.Word) *thing {
	if t := s.names[w.Text]; t != nil {
		return t
	}
	switch found := s.taken[w.Text]; len(found) {
	case 0:
		return nil
	case 1:
		return found[0]
	default:
		d := r.errorf("duplicate-name", w.Span, "declare "+w.Text+" in this file; that one then counts",
			"%s comes from both %s and %s", w.Text, found[0].home.from, found[1].home.from)
		d.Related = []diag.Related{{Span: found[0].span, Message: "here"}, {Span: found[1].span, Message: "and here"}}
		return found[0]
	}
}

// near lists the names of the sorts asked for, for the spelling helper.
func (s *scope) near(sorts ...sortOf) []string {
	var out []string
	for _, t := range s.order {
		if slices.Contains(sorts, t.sort) {
			out = append(out, t.name)
		}
	}
	for _, t := range s.ready {
		if slices.Contains(sorts, t.sort) {
			out = append(out, t.name)
		}
	}
	return out
}

// nearer is near put off until it is needed.
func (s *scope) nearer(sorts ...sortOf) func() []string {
	return func() []string { return s.near(sorts...) }
}

// reserved are the words that nothing may be called; partWords those that a part
// or a given value may not be called either, since an element's second word or a
// modifier would be read as them.
var (
	reserved  = []string{"gnd", "GND", "load", "ambient", "infinite"}
	partWords = []string{
		"drop", "cell", "reversed", "row", "size", "beside", "base", "collector", "emitter", "anode", "cathode",
		"normal", "pick", "at", "within", "parallel", "sqrt", "ln", "exp",
	}
)

// declare enters a name of the local text or says why it cannot be one. The thing
// is returned in any case, so that what it says is still checked; it is found by
// name only if the name is free.
func (r *resolver) declare(s *scope, w syntax.Word, sort sortOf) *thing {
	t := &thing{name: w.Text, sort: sort, span: w.Span, home: s, index: None, slot: None}
	s.order = append(s.order, t)
	switch {
	case slices.Contains(reserved, w.Text):
		r.errorf("reserved-name", w.Span, "", "%s is a word of the language and cannot name %s", w.Text, sort)
	case (sort == aPart || sort == aGiven) && slices.Contains(partWords, w.Text):
		r.errorf("reserved-name", w.Span, "", "%s is a word of the language and cannot name %s", w.Text, sort)
	case quantity.Reads(w.Text):
		r.errorf("reserved-name", w.Span, quantityName(w.Text), "%s reads as a quantity and cannot name %s", w.Text, sort)
	}
	first := s.names[w.Text]
	if first == nil {
		s.names[w.Text] = t
		return t
	}
	var d *diag.Diagnostic
	if first.sort == sort {
		d = r.errorf("duplicate-name", w.Span, "", "%s is declared twice", w.Text)
	} else {
		d = r.errorf("duplicate-name", w.Span, "rails, nodes, elements, parts and given values share one name space",
			"%s is already %s and cannot name %s as well", w.Text, first.sort, sort)
	}
	d.Related = []diag.Related{{Span: first.span, Message: "first declared here"}}
	return t
}

// quantityName proposes a name for what reads as a quantity: V5 for 5V.
func quantityName(text string) string {
	digits := 0
	for digits < len(text) && text[digits] >= '0' && text[digits] <= '9' {
		digits++
	}
	if digits == 0 || digits == len(text) || !isName(text[digits:]) {
		return "let the name begin with a letter"
	}
	return "call it " + text[digits:] + text[:digits]
}

// isName tells that text could be a name: ASCII letters, digits and _.
func isName(text string) bool {
	for _, b := range []byte(text) {
		if (b < '0' || b > '9') && (b < 'A' || b > 'Z') && (b < 'a' || b > 'z') && b != '_' {
			return false
		}
	}
	return text != ""
}

// node finds or makes the node that a word names. A name that stands for
// something else is an error, and gets a node of its own so that the rest is
// still checked.
func (r *resolver) node(w syntax.Word) NodeID {
	switch w.Text {
	case "gnd", "GND":
		return Gnd
	case "0":
		r.errorf("reserved-name", w.Span, "write gnd", "the reference node is called gnd, not 0")
		return Gnd
	}
	if strings.Contains(w.Text, ":") {
		return r.referred(w)
	}
	t := r.local.names[w.Text]
	if t != nil && (t.sort == aNode || t.sort == aRail) {
		if t.sort == aRail {
			t.used = true
			return r.c.Rails[t.index].Node
		}
		return NodeID(t.index)
	}
	if t != nil {
		d := r.errorf("duplicate-name", w.Span, "a node needs a name of its own", "%s is %s and cannot be a node", w.Text, t.sort)
		d.Related = []diag.Related{{Span: t.span, Message: "declared here"}}
		t = &thing{name: w.Text, sort: aNode, span: w.Span, home: r.local, slot: None}
		r.broken = true
	} else {
		t = r.declare(r.local, w, aNode)
	}
	id := r.addNode(Node{Name: w.Text, Rail: None, Span: w.Span})
	t.index = int(id)
	return id
}

// referred is a node that the language names (D1:D2), referred to perhaps before the
// path that makes it was laid.
func (r *resolver) referred(w syntax.Word) NodeID {
	if id, ok := r.local.made[w.Text]; ok {
		return id
	}
	if r.toMake == nil {
		r.foreseeNodes()
	}
	if !r.toMake[w.Text] {
		r.unknown(w, func() []string { return sortedKeys(r.toMake) }, "there is no node %s: nothing stands side by side so", w.Text)
		r.broken = true
		return Gnd
	}
	return r.makeNode(w.Text, w.Span)
}

// foreseeNodes finds the names of all nodes that paths and rows will make.
func (r *resolver) foreseeNodes() {
	r.toMake = map[string]bool{}
	row := func(name string, modifiers []syntax.Modifier) {
		n := r.rows[name]
		for i := range modifiers {
			if m := &modifiers[i]; n == 0 && m.Key.Text == "row" && m.Value != nil && m.Value.Literal != nil {
				n = int(min(m.Value.Literal.Value, longestRow))
			}
		}
		for m := 1; m < n; m++ {
			r.toMake[innerName(name, m)] = true
		}
	}
	for _, p := range statements[*syntax.Path](r.tree) {
		for i := range p.Segments {
			e := p.Segments[i].Element
			if e == nil {
				continue
			}
			row(e.Name.Text, e.Modifiers)
			if i > 0 && p.Segments[i-1].Element != nil {
				r.toMake[betweenName(p.Segments[i-1].Element.Name.Text, e.Name.Text)] = true
			}
		}
	}
	for _, p := range statements[*syntax.Place](r.tree) {
		row(p.Name.Text, p.Modifiers)
	}
}

// betweenName is the node between two elements, innerName that behind member m of
// a row.
func betweenName(a, b string) string { return a + ":" + b }

func innerName(row string, m int) string {
	return betweenName(row+"."+strconv.Itoa(m), row+"."+strconv.Itoa(m+1))
}

// makeNode finds or makes a node that the language names.
func (r *resolver) makeNode(name string, at diag.Span) NodeID {
	if id, ok := r.local.made[name]; ok {
		return id
	}
	id := r.addNode(Node{Name: name, Rail: None, Made: true, Span: at})
	r.local.made[name] = id
	return id
}

func (r *resolver) addNode(n Node) NodeID {
	r.c.Nodes = append(r.c.Nodes, n)
	return NodeID(len(r.c.Nodes) - 1)
}
