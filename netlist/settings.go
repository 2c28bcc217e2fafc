package netlist

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// A Setting is NAME=VALUE of --set or --at, both as typed.
type Setting struct{ Name, Value string }

func (s Setting) String() string { return s.Name + "=" + s.Value }

// A change is a circuit on its way to be changed, and what is to be said of it.
type change struct {
	c     *Circuit
	diags diag.List
	rows  map[string]int
}

// With returns a copy of c with values set, as --set does: "VCC=9", "R1=47k",
// "gp.betaF=infinite", "Q1.Vbe=0.66 V at 1 mA", "ambient=-40 degC",
// "LAMP.row=3". A set slot no longer follows another; percent tolerances
// follow; a competing parameter replaces the stated one; a count of a row or a
// resistance that becomes or stops being 0 rebuilds the structure. The copy shares
// with c all that has not changed. It is nil if the list has errors, whose spans
// are places in the setting's value, or none.
func (c *Circuit) With(settings ...Setting) (*Circuit, diag.List) {
	ch := &change{c: c.copy(), rows: maps.Clone(c.priv.rows)}
	var kept []Setting
	for _, s := range settings {
		if name, ok := strings.CutSuffix(s.Name, ".row"); ok && c.isElement(name) {
			ch.row(name, s)
			continue
		}
		kept = append(kept, s)
	}
	if ch.diags.HasErrors() {
		return nil, ch.diags
	}
	all := append(slices.Clone(c.priv.settings), kept...)
	if !maps.Equal(ch.rows, c.priv.rows) {
		// The nodes change, and with them every table: begin anew from the tree.
		r := newResolver(c.priv.tree, c.priv.cat, c.priv.library)
		r.rows = ch.rows
		fresh, diags := r.run()
		if fresh == nil {
			return nil, diags
		}
		if c.LoadHeld { // the tree knows nothing of it
			fresh = fresh.HoldLoad(c.Value(c.LoadVolts))
		}
		ch.c, kept = fresh.copy(), all
	}
	for _, s := range kept {
		ch.apply(s)
	}
	if ch.diags.HasErrors() {
		return nil, ch.diags
	}
	ch.c.priv.settings = all
	ch.finish(c)
	if ch.diags.HasErrors() {
		return nil, ch.diags
	}
	return ch.c, ch.diags
}

// copy is a circuit with slots of its own.
func (c *Circuit) copy() *Circuit {
	out := *c
	out.Slots = slices.Clone(c.Slots)
	return &out
}

func (ch *change) errorf(s Setting, hint, format string, args ...any) {
	ch.diags = append(ch.diags, diag.Diagnostic{
		Code: "setting", Message: s.String() + ": " + fmt.Sprintf(format, args...), Hint: hint,
	})
}

func (c *Circuit) isElement(name string) bool {
	t := c.priv.scope.names[name]
	return t != nil && t.sort == anElement
}

func (ch *change) row(name string, s Setting) {
	v, ok := ch.value(s)
	if !ok {
		return
	}
	e := &ch.c.Elements[ch.c.priv.scope.names[name].index]
	n := v.Literal.Value
	switch {
	case n != math.Trunc(n) || n < 1 || n > longestRow:
		ch.errorf(s, "", "a row is a whole number of parts from 1 to %d", longestRow)
	case e.Kind == TransistorPart || e.Kind == CurrentSource:
		ch.errorf(s, "", "%s is %s and cannot stand in a row", name, ch.c.describe(ch.c.priv.scope.names[name].index))
	default:
		if ch.rows == nil {
			ch.rows = map[string]int{}
		}
		ch.rows[name] = int(n)
	}
}

// value reads the value of a setting: a number, with or without its unit, and for a
// point of a curve the second one behind "at".
func (ch *change) value(s Setting) (*syntax.Value, bool) {
	first, second, point := strings.Cut(s.Value, " at ")
	v := &syntax.Value{}
	var ok bool
	if v.Literal, ok = ch.literal(s, first); !ok || !point {
		return v, ok
	}
	v.At = &syntax.Value{}
	v.At.Literal, ok = ch.literal(s, second)
	return v, ok
}

func (ch *change) literal(s Setting, text string) (*syntax.Literal, bool) {
	r, err := quantity.Parse(text)
	var wrong *quantity.Error
	switch {
	case errors.As(err, &wrong):
		hint := wrong.Hint
		if strings.ContainsAny(text, "%(") {
			hint = "a setting is a value; the stated tolerances stay"
		}
		ch.errorf(s, hint, "%s", wrong.Message)
		return nil, false
	case err != nil:
		ch.errorf(s, "", "%v", err)
		return nil, false
	}
	return &syntax.Literal{Quantity: r.Quantity, Text: strings.TrimSpace(text), Bare: r.Bare, Infinite: r.Infinite}, true
}

// number is a literal in a unit; a bare one counts in the unit itself.
func (ch *change) number(s Setting, l *syntax.Literal, want quantity.Unit, keep rule) (float64, bool) {
	value := l.Value
	if ohms, ok := asOhms(l); ok && want == quantity.Ohm {
		value = ohms
	} else if l.Unit != want && !l.Bare && !l.Infinite {
		ch.errorf(s, "", "%s is in %s, not in %s", s.Name, noun(want), noun(l.Unit))
		return 0, false
	}
	if says := keep.breach(want, value); says != "" {
		ch.errorf(s, "", "%s %s", s.Name, says)
		return 0, false
	}
	return value, true
}

// apply makes one setting.
func (ch *change) apply(s Setting) {
	id, ok := ch.c.Lookup(s.Name)
	if !ok {
		ch.errorf(s, didYouMean(s.Name, ch.c.Names()), "%s", ch.c.notSettable(s.Name))
		return
	}
	slot := &ch.c.Slots[id]
	v, ok := ch.value(s)
	if !ok {
		return
	}
	value, ok := ch.number(s, v.Literal, slot.Unit, ch.c.priv.rules[id])
	if !ok {
		return
	}
	kind, params, at := ch.c.paramOf(s.Name)
	if kind != nil && kind.owner(at) >= 0 && math.IsNaN(ch.c.Slots[params[kind.owner(at)]].Value) {
		p := kind.Params[kind.owner(at)].Name
		ch.errorf(s, "", "it is where %s is stated, and %s is not", p, p)
		return
	}
	if kind == nil || kind.Params[at].At == "" {
		if v.At != nil {
			ch.errorf(s, "", "%s is one number, not a point of a curve", s.Name)
			return
		}
	} else if !ch.point(s, kind, params, at, v.At) {
		return
	}
	ch.own(id, value)
	if kind != nil {
		ch.replaceRivals(kind, params, at)
	}
}

// notSettable says why a name means no number.
func (c *Circuit) notSettable(name string) string {
	if t := c.priv.scope.names[name]; t != nil {
		switch t.sort {
		case aNode:
			return name + " is a node, whose voltage the circuit decides"
		case aPart:
			return name + " is a part; its parameters are written " + name + "." + c.Parts[t.index].Kind.Params[0].Name
		case anElement:
			return name + " is " + c.describe(t.index) + "; its parameters are written " + name + "." + c.Parts[c.Elements[t.index].Part].Kind.Params[0].Name
		}
	}
	return "there is no value " + name
}

// own gives a slot a number of its own.
func (ch *change) own(id SlotID, value float64) {
	s := &ch.c.Slots[id]
	s.Value, s.Stated, s.def = value, true, slotDef{}
}

// paramOf finds the kind, the parameter slots and the parameter's index where a
// name is a part's or an element's parameter; the kind is nil otherwise.
func (c *Circuit) paramOf(name string) (*Kind, []SlotID, int) {
	owner, param, _ := strings.Cut(name, ".")
	t := c.owner(owner)
	if t == nil || t.index == None {
		return nil, nil, 0
	}
	var kind *Kind
	var slots []SlotID
	switch t.sort {
	case aPart:
		kind, slots = c.Parts[t.index].Kind, c.Parts[t.index].Params
	case anElement:
		if e := &c.Elements[t.index]; e.Part != None {
			kind, slots = c.Parts[e.Part].Kind, e.Params
		}
	}
	if kind == nil {
		return nil, nil, 0
	}
	at := kind.Index(param)
	if at < 0 {
		return nil, nil, 0
	}
	return kind, slots, at
}

// owner is the thing of the circuit that a name means.
func (c *Circuit) owner(name string) *thing {
	if t := c.priv.scope.names[name]; t != nil {
		return t
	}
	if taken := c.priv.scope.taken[name]; len(taken) == 1 {
		return taken[0]
	}
	return nil
}

// point sets the second co-ordinate of a parameter that is a point of a curve. The
// one in force stays where the setting has none.
func (ch *change) point(s Setting, kind *Kind, params []SlotID, at int, v *syntax.Value) bool {
	id := params[kind.Index(kind.Params[at].At)]
	slot := &ch.c.Slots[id]
	if v == nil {
		if math.IsNaN(slot.Value) {
			ch.errorf(s, "write "+s.String()+" at 1 mA", "it is a point of a curve and needs its second co-ordinate")
			return false
		}
		return true
	}
	value, ok := ch.number(s, v.Literal, slot.Unit, ch.c.priv.rules[id])
	if ok {
		ch.own(id, value)
	}
	return ok
}

// replaceRivals takes the rivals of a parameter out of force.
func (ch *change) replaceRivals(kind *Kind, params []SlotID, at int) {
	for i := range kind.Params {
		owner := i
		if o := kind.owner(i); o >= 0 {
			owner = o
		}
		if owner == at || !kind.rival(owner, at) {
			continue
		}
		s := &ch.c.Slots[params[i]]
		s.Value, s.Stated, s.def, s.Bounds = math.NaN(), false, slotDef{}, Bounds{}
	}
}

// finish brings a changed circuit's followers, requirements and structure in line
// with its numbers.
func (ch *change) finish(old *Circuit) {
	c := ch.c
	c.priv.followers = stillFollowing(c)
	c.settle()
	for i := range c.Slots {
		s := &c.Slots[i]
		if says := c.priv.rules[i].breach(s.Unit, s.Value); says != "" {
			ch.diags = append(ch.diags, diag.Diagnostic{
				Code: "setting", Span: s.Span, Message: fmt.Sprintf("%s %s, and the settings make it %s", s.Name, says, show(s.Value, s.Unit)),
			})
		}
	}
	c.refresh()
	if c.rekind() {
		c.Warnings = slices.DeleteFunc(slices.Clone(c.Warnings), func(d diag.Diagnostic) bool { return d.Code == "idle" })
		for _, d := range c.topology() {
			if d.Severity == diag.Error {
				ch.diags = append(ch.diags, d)
			} else {
				c.Warnings = append(c.Warnings, d)
			}
		}
	}
}

// stillFollowing drops the followers that have got a number of their own. The old
// list is left alone, for other circuits share it.
func stillFollowing(c *Circuit) []follower {
	gone := func(f follower) bool { return !c.Slots[f.slot].def.follows }
	if !slices.ContainsFunc(c.priv.followers, gone) {
		return c.priv.followers
	}
	return slices.DeleteFunc(slices.Clone(c.priv.followers), gone)
}

// rekind makes links of resistances of 0, resistors of links that have become
// more and of open resistances that have got a value. It tells whether any kind
// changed.
func (c *Circuit) rekind() bool {
	changed := false
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Kind != Resistor && e.Kind != Link && e.Kind != Open {
			continue
		}
		kind := Resistor
		switch value := c.Slots[e.Value].Value; {
		case math.IsNaN(value):
			kind = Open
		case value == 0:
			kind = Link
		}
		if kind == e.Kind {
			continue
		}
		if !changed {
			c.Elements = slices.Clone(c.Elements)
			changed = true
		}
		c.Elements[i].Kind = kind
	}
	return changed
}

// At returns a copy at stated ends: Value is "low", "high" or "nominal"; Name a
// rail or ambient. The ends are algebraic: the low end of -12 V (-13 V .. -11 V)
// is -13 V. Nominal is what c has; bounds stay.
func (c *Circuit) At(ends ...Setting) (*Circuit, diag.List) {
	ch := &change{c: c.copy()}
	for _, s := range ends {
		ch.at(c, s)
	}
	if ch.diags.HasErrors() {
		return nil, ch.diags
	}
	bounds := make([]Bounds, len(c.Slots))
	for i := range c.Slots {
		bounds[i] = c.Slots[i].Bounds
	}
	ch.finish(c)
	for _, s := range ends { // a percentage is of the nominal value, not of its own end
		if id, ok := c.rangeNamed(s.Name); ok {
			ch.c.Slots[id].Bounds = bounds[id]
		}
	}
	if ch.diags.HasErrors() {
		return nil, ch.diags
	}
	return ch.c, ch.diags
}

func (ch *change) at(c *Circuit, s Setting) {
	id, ok := c.rangeNamed(s.Name)
	if !ok {
		candidates := []string{"ambient"}
		for i := range c.Rails {
			candidates = append(candidates, c.Rails[i].Name)
		}
		ch.errorf(s, didYouMean(s.Name, candidates), "there is no rail %s; the ends are those of a rail or of ambient", s.Name)
		return
	}
	slot := &c.Slots[id]
	value := slot.Value
	switch s.Value {
	case "low":
		value = slot.Bounds.Low
	case "high":
		value = slot.Bounds.High
	case "nominal":
	default:
		ch.errorf(s, didYouMean(s.Value, []string{"low", "high", "nominal"}), "an end is low, high or nominal")
		return
	}
	if s.Value != "nominal" && !slot.Bounds.Stated {
		ch.errorf(s, "state it in the file: "+rangeExample(slot), "%s has no stated range", s.Name)
		return
	}
	if s.Value != "nominal" {
		ch.own(id, value)
	}
}

func rangeExample(s *Slot) string {
	const tenth = 0.1 // a usual width of a supply
	if s.Unit.Absolute {
		return "ambient = 25 degC (-20 degC .. 60 degC)"
	}
	low, high := ends(s.Value, tenth)
	return "rail " + s.Name + " = " + show(s.Value, s.Unit) + " " + span(Bounds{Low: low, High: high}, s.Unit)
}

// rangeNamed is the slot of a rail's volts or of the ambient temperature.
func (c *Circuit) rangeNamed(name string) (SlotID, bool) {
	if name == "ambient" {
		return c.Ambient, true
	}
	if name == LoadName {
		return c.LoadVolts, c.LoadHeld
	}
	t := c.priv.scope.names[strings.TrimSuffix(name, ".V")]
	if t == nil || t.sort != aRail {
		return None, false
	}
	return c.Rails[t.index].Volts, true
}

// Lookup finds the slot that a name means: "VCC" or "VCC.V", "RE", "RE.TC",
// "gp.betaF", "Q1.betaF", "Q1.size", "ambient", a given name.
func (c *Circuit) Lookup(name string) (SlotID, bool) {
	if id, ok := c.rangeNamed(name); ok {
		return id, true
	}
	owner, param, dotted := strings.Cut(name, ".")
	t := c.owner(owner)
	if t == nil {
		return None, false
	}
	if !dotted {
		return t.slot, t.slot != None && t.sort != aRail
	}
	if kind, slots, at := c.paramOf(name); kind != nil {
		return slots[at], true
	}
	if t.sort != anElement {
		return None, false
	}
	e := &c.Elements[t.index]
	id := SlotID(None)
	switch param {
	case "TC":
		id = e.TC
	case "rating":
		id = e.Rating
	case "size":
		id = e.Size
	}
	return id, id != None
}

// Names lists what Lookup knows, for the spelling helper, in file order: rails,
// ambient, given values, parts, elements.
func (c *Circuit) Names() []string {
	var names []string
	seen := make(map[string]bool, len(c.Slots))
	for i := range c.Slots {
		name := c.Slots[i].Name
		if id, ok := c.Lookup(name); ok && id == SlotID(i) && !seen[name] {
			seen[name] = true
			names = append(names, name)
		}
	}
	return names
}

// ParseExpr binds an expression of quantities, names and numbers, as typed
// after --show or in a keep line. Places are in the text.
func (c *Circuit) ParseExpr(text string) (*Expr, diag.List) {
	x, diags := syntax.ParseExpr("expression", text)
	if diags.HasErrors() {
		return nil, diags
	}
	b := &binder{
		say:      func(d diag.Diagnostic) { diags = append(diags, d) },
		slotUnit: func(id SlotID) quantity.Unit { return c.Slots[id].Unit },
		slot: func(w syntax.Word) (SlotID, bool) {
			id, ok := c.Lookup(w.Text)
			if !ok {
				diags = append(diags, *refusal("unknown-name", w.Span, didYouMean(w.Text, c.Names()), c.notSettable(w.Text)))
			}
			return id, ok
		},
		quantity: func(q *syntax.QuantityExpr) (Ref, bool) {
			if q.Subject.Text == "load" && len(c.Load) == 0 {
				diags = append(diags, *refusal("unknown-quantity", q.Span, "name its elements: load LAMP", "the file has no load"))
				return Ref{}, false
			}
			ref, d := c.refOf(c.priv.scope, q)
			if d == nil {
				return ref, true
			}
			if d.Code == "unknown-name" {
				d.Hint = didYouMean(q.Subject.Text, c.priv.scope.subjects(q.Subject.Text))
			}
			diags = append(diags, *d)
			return ref, false
		},
	}
	e, ok := b.bind(x)
	if !ok {
		return nil, diags
	}
	return e, diags
}
