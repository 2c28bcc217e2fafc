package netlist

import (
	"math"
	"slices"
	"strings"

	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// element resolves what an element is, its value and its modifiers.
func (r *resolver) element(l *laid) {
	r.valueOf(l.thing)
	if l.sound {
		r.modify(l)
	}
}

// elementValue finds what an element is by its second word, and its value.
func (r *resolver) elementValue(l *laid) {
	if l.place != nil {
		r.elementPart(l, l.place.Part)
		return
	}
	switch s := l.syn; s.What {
	case syntax.WhatDrop:
		r.ideal(l, Drop, quantity.Volt)
	case syntax.WhatCell:
		r.ideal(l, Cell, quantity.Volt)
	case syntax.WhatOpen:
		r.openResistance(l)
	case syntax.WhatName:
		r.elementNamed(l, s.Ref)
	default:
		if s.Value.Name != nil {
			r.elementNamed(l, *s.Value.Name)
			return
		}
		r.elementNumber(l)
	}
}

// partWord is the word that may name an element's part.
func (l *laid) partWord() syntax.Word {
	if l.place != nil {
		return l.place.Part
	}
	return l.syn.Ref
}

// elementNamed is an element whose second word is a name: a part or a given
// value, or else a resistance code that looks like a name (R22).
func (r *resolver) elementNamed(l *laid, ref syntax.Word) {
	t := r.find(r.local, ref)
	switch {
	case t != nil && t.sort == aPart:
		r.elementPart(l, ref)
	case t != nil && t.sort == aGiven:
		from, ok := r.givenNamed(ref, r.local)
		if !ok {
			return
		}
		switch unit := r.c.Slots[from].Unit; unit {
		case quantity.Ohm:
			r.ideal(l, Resistor, unit)
		case quantity.Ampere:
			r.ideal(l, CurrentSource, unit)
		default:
			r.errorf("unit", ref.Span, secondWordHint(unit, ref.Text), "%s is given in %s: %s is %s", l.name, noun(unit), ref.Text, show(r.c.Slots[from].Value, unit))
		}
	case l.syn.Value != nil && l.syn.Value.Literal != nil:
		r.elementNumber(l)
	case t != nil:
		r.errorf("wrong-place", ref.Span, "", "%s is %s; a part, a given value or a number says what %s is", ref.Text, t.sort, l.name)
		r.broken = true
	default:
		r.unknown(ref, r.local.nearer(aPart, aGiven), "there is no part or given value %s", ref.Text)
		r.broken = true
	}
}

// elementNumber is an element given by a number: a resistor or a current source.
func (r *resolver) elementNumber(l *laid) {
	lit := l.syn.Value.Literal
	if _, ok := asOhms(lit); ok {
		r.ideal(l, Resistor, quantity.Ohm)
		return
	}
	if lit.Unit == quantity.Ampere {
		r.ideal(l, CurrentSource, quantity.Ampere)
		return
	}
	r.errorf("unit", lit.Span, secondWordHint(lit.Unit, lit.Text), "%s is given in %s", l.name, noun(lit.Unit))
	r.broken = true
}

// ideal makes an element of one number.
func (r *resolver) ideal(l *laid, kind ElementKind, unit quantity.Unit) {
	keep := rule{}
	what := l.name
	if kind == Resistor {
		keep.sign = NotNegative
	}
	id := r.newSlot(Slot{Name: l.name, Unit: unit, Value: math.NaN(), Span: l.span}, keep)
	v := *l.value()
	if ohms, ok := r.ohms(&v, unit); ok {
		v.Literal = &ohms
	}
	if r.set(id, &v, what, r.local) {
		l.slot = id
	}
	e := &r.c.Elements[l.index]
	e.Kind, e.Value = kind, id
	if kind == Resistor && r.c.Slots[id].Value == 0 {
		e.Kind = Link
	}
	l.sound = true
}

// value is the second word as a value; one for a name where that is what it is.
func (l *laid) value() *syntax.Value {
	s := l.syn
	if s.What == syntax.WhatName && l.home.isGiven(s.Ref) {
		return &syntax.Value{Name: &s.Ref, Span: s.Ref.Span}
	}
	return s.Value
}

func (s *scope) isGiven(w syntax.Word) bool {
	if t := s.names[w.Text]; t != nil {
		return t.sort == aGiven
	}
	return len(s.taken[w.Text]) > 0 && s.taken[w.Text][0].sort == aGiven
}

// ohms rewrites a bare number in a resistance's place as ohms.
func (r *resolver) ohms(v *syntax.Value, unit quantity.Unit) (syntax.Literal, bool) {
	if unit != quantity.Ohm || v.Literal == nil {
		return syntax.Literal{}, false
	}
	out := *v.Literal
	ohms, ok := asOhms(v.Literal)
	if ok && out.Bare && strings.HasSuffix(out.Text, "m") {
		r.warnf("milliohm", out.Span, "mega is written M", "%s is in milliohms", out.Text)
	}
	out.Value, out.Unit, out.Bare = ohms, quantity.Ohm, false
	return out, ok
}

func (r *resolver) openResistance(l *laid) {
	s := l.syn
	if _, ok := quantity.Series(s.Series.Text); !ok {
		r.errorf("unknown-name", s.Series.Span, "the series of IEC 60063 are E3, E6, E12, E24, E48, E96 and E192", "there is no series %s", s.Series.Text)
	}
	id := r.newSlot(Slot{Name: l.name, Unit: quantity.Ohm, Value: math.NaN(), Span: s.Span}, rule{sign: NotNegative})
	e := &r.c.Elements[l.index]
	e.Kind, e.Value, e.Series = Open, id, s.Series.Text
	l.slot, l.sound = id, true
}

// elementPart is an element that is a part: it gets parameters of its own that
// follow the part's.
func (r *resolver) elementPart(l *laid, ref syntax.Word) {
	t := r.find(r.local, ref)
	if t == nil {
		r.unknown(ref, r.local.nearer(aPart), "there is no part %s", ref.Text)
		r.broken = true
		return
	}
	if t.sort != aPart {
		d := r.errorf("wrong-place", ref.Span, "", "%s is %s, not a part", ref.Text, t.sort)
		d.Related = related(t)
		r.broken = true
		return
	}
	t.used = true
	at, ok := r.partOf(t)
	if !ok {
		r.broken = true
		return
	}
	part := &r.c.Parts[at]
	e := &r.c.Elements[l.index]
	e.Part, e.Kind = at, JunctionPart
	if part.Kind.Shape == Transistor {
		e.Kind = TransistorPart
	}
	e.Params = make([]SlotID, len(part.Params))
	for i, from := range part.Params {
		e.Params[i] = r.ownParam(e, &part.Kind.Params[i], from)
	}
	e.Size = r.newSlot(Slot{Name: e.Name + ".size", Unit: quantity.One, Value: 1, Span: e.Span}, rule{sign: Positive})
	l.sound = true
}

// ownParam is an element's own copy of a parameter of its part.
func (r *resolver) ownParam(e *Element, p *Param, from SlotID) SlotID {
	of := &r.c.Slots[from]
	id := r.newSlot(Slot{
		Name: e.Name + "." + p.Name, Unit: of.Unit, Value: of.Value, Stated: of.Stated, Bounds: of.Bounds, Span: e.Span,
	}, r.c.priv.rules[from])
	r.follow(id, from, nil)
	return id
}

// describe says what an element is, for messages.
func (c *Circuit) describe(i int) string {
	e := &c.Elements[i]
	switch e.Kind {
	case JunctionPart, TransistorPart:
		return article(c.Parts[e.Part].Kind.Name)
	case Link:
		return "a link"
	case CurrentSource:
		return "a current source"
	case Drop:
		return "an ideal drop"
	case Cell:
		return "a cell"
	case Open:
		return "an open resistance"
	}
	return "a resistor"
}

// modifierWords are the modifiers that have a word of their own.
var modifierWords = []string{"base", "reversed", "row", "size", "beside"}

// modify applies an element's modifiers.
func (r *resolver) modify(l *laid) {
	seen := make([]string, 0, len(l.modifiers))
	for i := range l.modifiers {
		m := &l.modifiers[i]
		if key := m.Key.Text; key != "" {
			if slices.Contains(seen, key) {
				r.errorf("duplicate-statement", m.Span, "", "%s has %s twice", l.name, key)
				continue
			}
			seen = append(seen, key)
		}
		r.modifier(l, m)
	}
	e := &r.c.Elements[l.index]
	if e.Kind != TransistorPart {
		return
	}
	if e.Base == None {
		r.errorf("pins", e.Span, "write "+e.Name+" "+r.c.Parts[e.Part].Name+" base=NODE", "the base of %s is not connected", e.Name)
		r.broken = true
	}
	if e.Row > 1 {
		r.errorf("row", e.Span, "", "%s is a transistor, and a row is of parts with two ends", e.Name)
		r.broken = true
	}
}

func (r *resolver) modifier(l *laid, m *syntax.Modifier) {
	e := &r.c.Elements[l.index]
	part := e.Kind == JunctionPart || e.Kind == TransistorPart
	switch key := m.Key.Text; key {
	case "":
		r.plainModifier(l, m)
	case "base":
		switch {
		case wordOf(m) == nil:
			r.errorf("pins", m.Span, "base=NODE", "base needs the name of a node")
		case l.place != nil:
			r.errorf("wrong-place", m.Span, "", "the base of %s is a pin of the place statement", e.Name)
		case e.Kind != TransistorPart:
			r.errorf("wrong-place", m.Span, "", "%s is %s, which has no base", e.Name, r.c.describe(l.index))
		}
	case "reversed":
		switch {
		case e.Kind != JunctionPart:
			r.errorf("wrong-place", m.Span, "", "%s is %s; only a diode, led or zener can be reversed", e.Name, r.c.describe(l.index))
		case l.place != nil:
			r.errorf("wrong-place", m.Span, "exchange anode and cathode", "a placed part has its pins and cannot be reversed")
		default:
			e.Reversed = true
		}
	case "row": // counted when it was laid
		if e.Kind == CurrentSource {
			r.errorf("row", m.Span, "", "%s is a current source, and several in a row have no voltage between them", e.Name)
		}
	case "size":
		switch v := numberOf(m); {
		case !part:
			r.errorf("wrong-place", m.Span, "", "%s is %s; only a junction or a transistor has a size", e.Name, r.c.describe(l.index))
		case v == nil:
			r.errorf("wrong-place", m.Span, "size=8", "size needs a number")
		default:
			r.set(e.Size, v, "the size of "+e.Name, r.local)
		}
	case "beside":
		if !part {
			r.errorf("wrong-place", m.Span, "", "%s is %s; only a junction or a transistor has a temperature of its own", e.Name, r.c.describe(l.index))
		} else if wordOf(m) == nil {
			r.errorf("wrong-place", m.Span, "beside=Q1", "beside needs the name of an element")
		}
	default:
		r.errorf("unknown-name", m.Key.Span, didYouMean(key, modifierWords), "there is no modifier %s", key)
	}
}

// numberOf is the number that a modifier gives, or a given value's name.
func numberOf(m *syntax.Modifier) *syntax.Value {
	if m.Value == nil && m.Name != nil {
		return &syntax.Value{Name: m.Name, Span: m.Name.Span}
	}
	return m.Value
}

// plainModifier is one without a word: a tolerance, a temperature coefficient or
// a rating, told apart by its unit.
func (r *resolver) plainModifier(l *laid, m *syntax.Modifier) {
	e := &r.c.Elements[l.index]
	if m.Bounds != nil {
		if e.Value == None {
			r.errorf("wrong-place", m.Span, "state the tolerances of a part's parameters in its part", "%s is %s, which has no value for a tolerance", e.Name, r.c.describe(l.index))
			return
		}
		r.bounds(e.Value, m.Bounds, e.Name)
		return
	}
	lit := m.Value.Literal
	resistor := e.Kind == Resistor || e.Kind == Link || e.Kind == Open
	slot, name, what, keep := &e.TC, ".TC", "the temperature coefficient of ", rule{}
	switch lit.Unit {
	case quantity.PerKelvin:
	case quantity.Watt:
		slot, name, what, keep = &e.Rating, ".rating", "the rating of ", rule{sign: Positive}
	default:
		r.errorf("unit", lit.Span, "a tolerance is in %, a temperature coefficient in ppm/K, a rating in W", "%s is no modifier of %s", lit.Text, e.Name)
		return
	}
	what += e.Name
	if !resistor {
		r.errorf("wrong-place", m.Span, "", "%s is %s; %s is said of resistors", e.Name, r.c.describe(l.index), strings.TrimSuffix(what, " of "+e.Name))
		return
	}
	if *slot != None {
		r.errorf("duplicate-statement", m.Span, "", "%s is stated twice", what)
		return
	}
	*slot = r.newSlot(Slot{Name: e.Name + name, Unit: lit.Unit, Value: math.NaN(), Span: m.Span}, keep)
	r.set(*slot, m.Value, what, r.local)
}

// besides binds beside=Q1, once every element's kind is known.
func (r *resolver) besides() {
	for _, l := range r.laid {
		e := &r.c.Elements[l.index]
		for i := range l.modifiers {
			m := &l.modifiers[i]
			w := wordOf(m)
			if m.Key.Text != "beside" || w == nil || e.Beside != None {
				continue
			}
			t := r.local.names[w.Text]
			switch {
			case t == nil || t.sort != anElement:
				r.unknown(*w, r.local.nearer(anElement), "there is no element %s", w.Text)
			case t.element == nil || !t.element.sound:
			case t == l.thing:
				r.errorf("circle", w.Span, "", "%s stands beside itself", e.Name)
			case r.c.Elements[t.index].Part == None:
				r.errorf("wrong-place", w.Span, "", "%s is %s, which has no temperature of its own", w.Text, r.c.describe(t.index))
			default:
				e.Beside = t.index
			}
		}
	}
	if i := r.c.besideCircle(); i != None {
		e := &r.c.Elements[i]
		r.errorf("circle", e.Span, "one of them stands by itself", "%s stands beside itself by way of others", e.Name)
	}
}

// besideCircle finds an element that stands beside itself by way of others, or
// None. Every element is walked over once.
func (c *Circuit) besideCircle() int {
	seen := make([]int, len(c.Elements)) // by which walk, counted from 1
	for i := range c.Elements {
		for at := i; at != None && seen[at] == 0; {
			seen[at] = i + 1
			at = c.Elements[at].Beside
			if at != None && seen[at] == i+1 {
				return at
			}
		}
	}
	return None
}
