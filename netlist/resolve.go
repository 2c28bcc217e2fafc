package netlist

import (
	"fmt"
	"slices"
	"sort"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// private is what a Circuit keeps for itself: what names mean, how slots follow
// others, and the tree to resolve anew when a setting changes the structure.
type private struct {
	scope     *scope
	followers []follower
	exprs     int    // followers that are expressions
	rules     []rule // by slot
	later     []laterNumber

	tree     *syntax.File
	cat      *Catalogue
	library  *library
	rows     map[string]int // counts of rows set from outside
	settings []Setting      // in the order they were made
}

// A resolver binds one tree.
type resolver struct {
	c       *Circuit
	cat     *Catalogue
	library *library
	tree    *syntax.File
	local   *scope
	scopes  map[string]*scope // of the texts taken in, by name
	rows    map[string]int
	diags   diag.List

	laid      []*laid         // by element index
	nodeWords map[string]int  // how often each word stands as a node
	toMake    map[string]bool // the nodes that paths and rows make, by name
	// busy are the values being resolved, outermost first: what a circle is
	// made of.
	busy   []*thing
	inRows int // parts in rows so far
	// broken tells that an error has left the structure incomplete, so that its
	// topology says nothing.
	broken bool
	// partial tells that the tree lacks statements that did not parse: what may
	// be missing for that reason is not complained of.
	partial bool
	hints   int // given for unknown names
	// forgotten are words that stand as nodes and must be elements.
	forgotten map[string]bool
	// partsOnly asks for the parts and given values alone.
	partsOnly bool
}

// Read parses and resolves a text, name being what messages call it. The list has
// the errors and warnings in the order of the text, those of texts that `use`
// brought in behind them. The circuit is nil if the list has errors. The
// catalogue and the source are kept for With and must not be modified.
func Read(name string, text []byte, cat *Catalogue, src Source) (*Circuit, diag.List) {
	tree, diags := syntax.Parse(name, text)
	if tree == nil {
		return nil, diags
	}
	r := newResolver(tree, cat, newLibrary(src))
	r.partial = diags.HasErrors()
	r.diags = diags
	return r.run()
}

// Resolve binds a tree. The circuit is nil if the list has errors; the list has
// warnings too, in the order of the text. The tree is kept and must not be
// modified.
func Resolve(f *syntax.File, cat *Catalogue, src Source) (*Circuit, diag.List) {
	return newResolver(f, cat, newLibrary(src)).run()
}

// ReadParts resolves the parts and given values of a text and leaves everything
// else in it aside: a file that others `use`, or a shelf. The circuit has no
// elements; it is nil if the list has errors.
func ReadParts(name string, text []byte, cat *Catalogue, src Source) (*Circuit, diag.List) {
	tree, diags := syntax.Parse(name, text)
	if tree == nil {
		return nil, diags
	}
	r := newResolver(tree, cat, newLibrary(src))
	r.partial, r.partsOnly = diags.HasErrors(), true
	r.diags = diags
	return r.run()
}

func newResolver(f *syntax.File, cat *Catalogue, lib *library) *resolver {
	return &resolver{
		c:         &Circuit{File: f.Name, Ambient: None},
		cat:       cat,
		library:   lib,
		tree:      f,
		local:     newScope(f.Name, true),
		scopes:    map[string]*scope{},
		forgotten: map[string]bool{},
	}
}

// run resolves in an order in which every step finds what it needs, whatever the
// order of the statements.
func (r *resolver) run() (*Circuit, diag.List) {
	r.takeIn(r.local, r.tree, []string{cleanName(r.tree.Name)})
	r.declareAll()
	r.addNode(Node{Name: "gnd", Rail: None})
	r.rails()
	r.lay()
	r.values()
	if !r.partsOnly {
		r.requirements()
		if !r.broken && !r.partial {
			r.diags = append(r.diags, r.c.topology()...)
			r.load()
		}
	}
	if !r.diags.HasErrors() {
		r.unused()
	}
	return r.finish()
}

func (r *resolver) finish() (*Circuit, diag.List) {
	r.diags = r.diags.Unique()
	inOrder(r.diags, r.c.File)
	if r.diags.HasErrors() {
		return nil, r.diags
	}
	c := r.c
	c.Warnings = r.diags
	c.priv.scope = r.local
	c.priv.tree, c.priv.cat, c.priv.library, c.priv.rows = r.tree, r.cat, r.library, r.rows
	return c, r.diags
}

// inOrder sorts what is said of a text by place, what is said of others behind it.
func inOrder(l diag.List, file string) {
	sort.SliceStable(l, func(i, j int) bool {
		a, b := l[i].Span, l[j].Span
		if a.File != b.File {
			return a.File == file || b.File != file && a.File < b.File
		}
		return a.Start.Offset < b.Start.Offset
	})
}

// errorf says an error at a place; hint may be empty. The diagnostic may be added
// to until the next one is made.
func (r *resolver) errorf(code string, at diag.Span, hint, format string, args ...any) *diag.Diagnostic {
	r.diags = append(r.diags, diag.Diagnostic{Code: code, Message: fmt.Sprintf(format, args...), Span: at, Hint: hint})
	return &r.diags[len(r.diags)-1]
}

// unknown says that a name is not known, with the nearest one that is. Where
// statements did not parse, the name may well stand in one of them.
func (r *resolver) unknown(w syntax.Word, candidates func() []string, format string, args ...any) {
	const mostHints = 50 // to compare every name with every unknown one takes long in a large file
	if r.forgotten[w.Text] {
		return // an element without a value, told of already
	}
	if r.partial {
		r.broken = true
		return
	}
	hint := ""
	if r.hints++; r.hints <= mostHints {
		hint = didYouMean(w.Text, candidates())
	}
	r.errorf("unknown-name", w.Span, hint, format, args...)
}

func (r *resolver) warnf(code string, at diag.Span, hint, format string, args ...any) {
	r.errorf(code, at, hint, format, args...).Severity = diag.Warning
}

// statements gives the statements of one type, in file order.
func statements[T syntax.Statement](f *syntax.File) []T {
	var out []T
	for _, s := range f.Statements {
		if t, ok := s.(T); ok {
			out = append(out, t)
		}
	}
	return out
}

// only gives the one statement of its type, and says so where there are more.
func only[T syntax.Statement](r *resolver, what string) (T, bool) {
	all := statements[T](r.tree)
	var first T
	if len(all) == 0 {
		return first, false
	}
	for _, s := range all[1:] {
		d := r.errorf("duplicate-statement", s.Where(), "", "a file has one %s", what)
		d.Related = []diag.Related{{Span: all[0].Where(), Message: "the first one"}}
	}
	return all[0], true
}

// declareAll enters the names that the text declares. Nodes are declared by the
// paths that pass through them.
func (r *resolver) declareAll() {
	for _, s := range r.tree.Statements {
		switch s := s.(type) {
		case *syntax.Given:
			r.declare(r.local, s.Name, aGiven).given = s
		case *syntax.Part:
			r.declare(r.local, s.Name, aPart).part = s
		}
		if r.partsOnly {
			continue
		}
		switch s := s.(type) {
		case *syntax.Rail:
			t := r.declare(r.local, s.Name, aRail)
			t.value = &s.Value
		case *syntax.Path:
			for i := range s.Segments {
				if e := s.Segments[i].Element; e != nil {
					r.declare(r.local, e.Name, anElement)
				}
			}
		case *syntax.Place:
			r.declare(r.local, s.Name, anElement)
		}
	}
}

// rails makes the rails and their nodes, and the ambient's slot.
func (r *resolver) rails() {
	c := r.c
	for _, t := range r.local.order {
		if t.sort != aRail {
			continue
		}
		t.index = len(c.Rails)
		node := r.addNode(Node{Name: t.name, Rail: t.index, Span: t.span})
		c.Rails = append(c.Rails, Rail{Name: t.name, Node: node, Volts: None, Span: t.span})
	}
	c.Ambient = r.newSlot(Slot{Name: "ambient", Unit: quantity.Celsius, Value: roomTemperature}, rule{})
	if title, ok := only[*syntax.Title](r, "title"); ok && !r.partsOnly {
		c.Title = title.Text
	}
}

// values gives every number its slot: rails and ambient, given values, parts,
// elements. Rails and given values resolve each other on demand.
func (r *resolver) values() {
	if s, ok := only[*syntax.Ambient](r, "ambient temperature"); ok && !r.partsOnly {
		r.c.Slots[r.c.Ambient].Span = s.Span
		r.set(r.c.Ambient, &s.Value, "the ambient temperature", r.local)
	}
	for _, t := range r.local.order {
		if t.sort == aRail || t.sort == aGiven {
			r.valueOf(t)
		}
	}
	for _, t := range r.local.order {
		if t.sort == aGiven && t.slot != None {
			r.c.Givens = append(r.c.Givens, t.slot)
		}
	}
	for _, t := range r.local.order {
		if t.sort == aPart {
			r.partOf(t)
		}
	}
	for _, t := range r.local.ready {
		if t.sort == aPart && r.local.names[t.name] == nil && len(r.local.taken[t.name]) == 1 {
			r.partOf(t)
		}
	}
	r.makeRoom()
	for i := range r.laid {
		r.element(r.laid[i])
	}
	r.besides()
}

// makeRoom grows the tables of slots once for all elements: most slots are the
// elements' own parameters.
func (r *resolver) makeRoom() {
	const ofItsOwn = 2 // a part's size; a resistor's value and rating
	more := 0
	for _, l := range r.laid {
		more += ofItsOwn
		if kind, ok := r.kindOf(l.partWord()); ok {
			more += len(kind.Params)
		}
	}
	p := &r.c.priv
	r.c.Slots, p.rules, p.followers = slices.Grow(r.c.Slots, more), slices.Grow(p.rules, more), slices.Grow(p.followers, more)
}

// unused warns of parts, given values and rails that nothing uses. What `use`
// brought in is there to choose from.
func (r *resolver) unused() {
	if r.partsOnly {
		return
	}
	for _, t := range r.local.order {
		switch {
		case t.used || t.sort == aNode || t.sort == anElement:
		case t.sort == aRail:
			r.warnf("unused", t.span, "", "nothing is connected to the rail %s", t.name)
		case t.sort == aPart:
			r.warnf("unused", t.span, "", "no element uses the part %s", t.name)
		default:
			r.warnf("unused", t.span, "", "nothing uses %s", t.name)
		}
	}
}

// circle tells that a name depends on itself, by the names on the way.
func (r *resolver) circle(t *thing) {
	from := slices.Index(r.busy, t)
	way := ""
	for _, b := range r.busy[from:] {
		way += b.name + " -> "
	}
	r.errorf("circle", t.span, "", "%s depends on itself: %s%s", t.name, way, t.name)
}
