package choose

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
	"biaswright/solve"
)

// A writer puts a choice into a text.
type writer struct {
	text  []byte
	tree  *syntax.File
	a     *Answer
	c     *Choice
	edits []edit
}

// An edit replaces the bytes from Start up to End.
type edit struct {
	start, end int
	text       string
}

// Write returns a copy of the text that the circuit was read from with a choice put in:
// each open value is replaced by its number, and all else, comments and layout, stays. A
// pair in series becomes two elements behind each other; one in parallel gets a path
// line of its own, between the same nodes. What the text says of a resistor that has
// become two, it then says of both. The error is an *Error.
//
// What the copy says should be held against the choice by Verify.
func (a *Answer) Write(text []byte, c *Choice) ([]byte, error) {
	tree, list := syntax.Parse(a.Circuit.File, text)
	if list.HasErrors() {
		return nil, &Error{Code: list[0].Code, Message: list[0].Message, Hint: list[0].Hint, Span: list[0].Span}
	}
	w := &writer{text: text, tree: tree, a: a, c: c}
	for i := range a.Unknowns {
		if err := w.element(i); err != nil {
			return nil, err
		}
	}
	return w.apply(), nil
}

// apply makes the edits, from the last to the first; those at one place in their order.
func (w *writer) apply() []byte {
	slices.SortStableFunc(w.edits, func(x, y edit) int { return x.start - y.start })
	var out []byte
	at := 0
	for _, e := range w.edits {
		out = append(append(out, w.text[at:e.start]...), e.text...)
		at = e.end
	}
	return append(out, w.text[at:]...)
}

func (w *writer) replace(s diag.Span, text string) {
	w.edits = append(w.edits, edit{s.Start.Offset, s.End.Offset, text})
}

func (w *writer) insert(offset int, text string) {
	w.edits = append(w.edits, edit{offset, offset, text})
}

// element writes one value.
func (w *writer) element(unknown int) error {
	u := &w.a.Unknowns[unknown]
	path, e := w.find(u.Name)
	if e == nil {
		return wrong("wrong-place", w.a.Circuit.Elements[u.Element].Span, "", "%s does not stand in the text itself", u.Name)
	}
	value := w.valueSpan(e)
	pair := w.c.Pair(unknown)
	if pair == nil {
		w.replace(value, OhmsText(w.c.Ohms[unknown]))
		return nil
	}
	w.replace(value, OhmsText(pair.A))
	second := w.freshName(u.Name)
	words := []string{second, OhmsText(pair.B)}
	if v := e.Value; v != nil && v.Bounds != nil {
		words = append(words, w.source(v.Bounds.Span))
	}
	for i := range e.Modifiers {
		words = append(words, w.source(e.Modifiers[i].Span))
	}
	other := strings.Join(words, " ")
	if !pair.Parallel {
		w.insert(e.Span.End.Offset, " -> "+other)
	} else {
		c := w.a.Circuit
		of := &c.Elements[u.Element]
		line := fmt.Sprintf("path %s -> %s -> %s", c.Nodes[of.From].Name, other, c.Nodes[of.To].Name)
		w.insertLine(path.Span.End.Offset, line)
	}
	w.references(u.Name, second, pair.Parallel)
	return nil
}

// find looks for an element of a path.
func (w *writer) find(name string) (*syntax.Path, *syntax.Element) {
	for _, s := range w.tree.Statements {
		p, ok := s.(*syntax.Path)
		if !ok {
			continue
		}
		for i := range p.Segments {
			if e := p.Segments[i].Element; e != nil && e.Name.Text == name {
				return p, e
			}
		}
	}
	return nil, nil
}

// valueSpan is where an element's resistance stands: a number, a given value's name, or
// "? E24".
func (w *writer) valueSpan(e *syntax.Element) diag.Span {
	switch e.What {
	case syntax.WhatOpen:
		s := e.Series.Span
		s.Start.Offset = e.Name.Span.End.Offset + strings.IndexByte(string(w.text[e.Name.Span.End.Offset:]), '?')
		return s
	case syntax.WhatName:
		return e.Ref.Span
	}
	if e.Value.Literal != nil {
		return e.Value.Literal.Span
	}
	return e.Value.Name.Span
}

func (w *writer) source(s diag.Span) string {
	return string(w.text[s.Start.Offset:s.End.Offset])
}

// insertLine puts a line behind the one on which a statement ends.
func (w *writer) insertLine(end int, line string) {
	rest := string(w.text[end:])
	if i := strings.IndexByte(rest, '\n'); i >= 0 {
		w.insert(end+i+1, line+"\n")
		return
	}
	w.insert(len(w.text), "\n"+line+"\n")
}

// freshName is a name that the text does not have: RE_2, RE_3, …
func (w *writer) freshName(name string) string {
	words := strings.FieldsFunc(string(w.text), func(r rune) bool {
		return r != '_' && (r < '0' || r > '9') && (r < 'A' || r > 'Z') && (r < 'a' || r > 'z')
	})
	for n := 2; ; n++ {
		if fresh := name + "_" + strconv.Itoa(n); !slices.Contains(words, fresh) {
			return fresh
		}
	}
}

// references makes what is said of a resistor hold for the two that it has become.
func (w *writer) references(name, second string, parallel bool) {
	for _, s := range w.tree.Statements {
		switch s := s.(type) {
		case *syntax.Load:
			w.names(s.Names, name, second)
		case *syntax.Batch:
			w.names(s.Names, name, second)
		case *syntax.Given:
			w.expression(s.Value, name, second, parallel)
		case *syntax.Hold:
			w.expression(s.Quantity, name, second, parallel)
		case *syntax.Target:
			w.expression(s.Quantity, name, second, parallel)
		case *syntax.Keep:
			w.expression(s.Left, name, second, parallel)
			w.expression(s.Right, name, second, parallel)
		case *syntax.Hand:
			w.expression(s.Quantity, name, second, parallel)
			w.expression(s.Value, name, second, parallel)
		case *syntax.Measured:
			w.expression(s.Quantity, name, second, parallel)
		}
	}
}

func (w *writer) names(words []syntax.Word, name, second string) {
	for _, word := range words {
		if word.Text == name {
			w.insert(word.Span.End.Offset, " "+second)
		}
	}
}

// expression rewrites the mentions of a resistor: its ohms are those of both, its
// voltage (in series), current (in parallel) and power their sums.
func (w *writer) expression(x syntax.Expr, name, second string, parallel bool) {
	switch x := x.(type) {
	case *syntax.NameExpr:
		switch {
		case x.Text != name:
		case parallel:
			w.replace(x.Where(), "parallel("+name+", "+second+")")
		default:
			w.replace(x.Where(), "("+name+" + "+second+")")
		}
	case *syntax.QuantityExpr:
		shared := "I"
		if parallel {
			shared = "V"
		}
		if x.Subject.Text != name || x.Symbol.Text == shared {
			return
		}
		of := func(n string) string { return n + strings.TrimPrefix(w.source(x.Span), name) }
		w.replace(x.Span, "("+of(name)+" + "+of(second)+")")
	case *syntax.Unary:
		w.expression(x.X, name, second, parallel)
	case *syntax.Binary:
		w.expression(x.X, name, second, parallel)
		w.expression(x.Y, name, second, parallel)
	case *syntax.Call:
		for _, arg := range x.Args {
			w.expression(arg, name, second, parallel)
		}
	}
}

// OhmsText writes a resistance as the language has it in an element: "47", "1.8k",
// "0.47". It reads back exactly.
func OhmsText(ohms float64) string {
	if ohms < 1 { // a bare m would look like a mega gone wrong
		return strconv.FormatFloat(ohms, 'f', -1, 64)
	}
	text := quantity.Exact(quantity.Quantity{Value: ohms, Unit: quantity.Ohm})
	return strings.ReplaceAll(strings.TrimSuffix(text, "ohm"), " ", "")
}

// Verify tells whether a circuit, read from a copy that Write made, has a choice's
// operating point. The error says what differs.
func (a *Answer) Verify(c *Choice, copied *netlist.Circuit) error {
	how := a.how
	if how.near != nil { // a node that a pair makes moves those behind it
		how.near = map[netlist.NodeID]float64{}
		for i := range copied.Nodes {
			at := slices.IndexFunc(a.Circuit.Nodes, func(n netlist.Node) bool { return n.Name == copied.Nodes[i].Name })
			if volts, ok := a.how.near[netlist.NodeID(at)]; ok {
				how.near[netlist.NodeID(i)] = volts
			}
		}
	}
	b, err := newBench(copied, nil, nil, how)
	if err != nil {
		return err
	}
	if !b.at(nil) {
		return errors.New("it has no operating point")
	}
	verdicts := solve.JudgeAt(copied, b.state, nil)
	if len(verdicts) > len(c.Requirements) {
		return fmt.Errorf("it has %d requirements, and the file %d", len(verdicts), len(c.Requirements))
	}
	for i := range verdicts {
		const rounding = 1e-9 // two resistors are not summed as one is
		got, want := verdicts[i].Value, c.Requirements[i].Nominal.Value
		if !(math.Abs(got-want) <= rounding*math.Abs(want)) && !(math.IsNaN(got) && math.IsNaN(want)) {
			return fmt.Errorf("%s is %g in it, and %g with the values chosen", verdicts[i].Q.Text, got, want)
		}
	}
	return nil
}
