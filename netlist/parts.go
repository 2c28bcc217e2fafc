package netlist

import (
	"math"
	"slices"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// related points at where a thing is declared.
func related(t *thing) []diag.Related {
	return []diag.Related{{Span: t.span, Message: "declared here"}}
}

// partOf resolves a part once and returns its index in Parts.
func (r *resolver) partOf(t *thing) (int, bool) {
	if t.state == done {
		return t.index, t.index != None
	}
	t.state = done
	s := t.part
	kind, ok := r.cat.Kind(s.Kind.Text)
	if !ok {
		names := make([]string, len(r.cat.Kinds))
		for i := range r.cat.Kinds {
			names[i] = r.cat.Kinds[i].Name
		}
		hint := didYouMean(s.Kind.Text, names)
		if hint == "" {
			hint = "there are " + strings.Join(names, ", ")
		}
		r.errorf("unknown-name", s.Kind.Span, hint, "there is no kind of part called %s", s.Kind.Text)
		return None, false
	}
	stated := r.statedParams(t, kind)
	r.rivals(t, kind, stated)
	part := Part{Name: t.name, Kind: kind, Params: make([]SlotID, len(kind.Params)), Span: t.span, Shelf: !t.home.local}
	for i := range kind.Params {
		p := &kind.Params[i]
		slot := Slot{Name: t.name + "." + p.Name, Unit: p.Unit, Value: p.Default, Span: t.span}
		if stated[i] == nil && kind.replaced(i, func(k int) bool { return stated[k] != nil }) {
			slot.Value = math.NaN()
		}
		part.Params[i] = r.newSlot(slot, rule{sign: p.Sign, infinite: p.Infinite})
	}
	for i := range kind.Params {
		if stated[i] != nil {
			r.param(t, kind, i, part.Params, stated[i])
		}
	}
	r.c.Parts = append(r.c.Parts, part)
	t.index = len(r.c.Parts) - 1
	return t.index, true
}

// statedParams finds what the part states, by parameter index.
func (r *resolver) statedParams(t *thing, kind *Kind) []*syntax.Param {
	stated := make([]*syntax.Param, len(kind.Params))
	for n := range t.part.Params {
		p := &t.part.Params[n]
		key := p.Key
		if p.Of != nil {
			r.errorf("wrong-place", p.Of.Span, "", "%s(%s) is said in assume, not in a part", key.Text, p.Of.Text)
			continue
		}
		i := kind.Index(key.Text)
		if i < 0 || kind.Params[i].Hidden {
			hint := didYouMean(key.Text, kind.paramNames())
			if hint == "" {
				hint = "it has " + strings.Join(kind.paramNames(), ", ")
			}
			r.errorf("unknown-name", key.Span, hint, "%s has no parameter %s", article(kind.Name), key.Text)
			continue
		}
		if stated[i] != nil {
			d := r.errorf("duplicate-statement", key.Span, "", "%s states %s twice", t.name, key.Text)
			d.Related = []diag.Related{{Span: stated[i].Span, Message: "first stated here"}}
			continue
		}
		stated[i] = p
	}
	return stated
}

func (k *Kind) paramNames() []string {
	var names []string
	for i := range k.Params {
		if !k.Params[i].Hidden {
			names = append(names, k.Params[i].Name)
		}
	}
	return names
}

// rival tells that two parameters cannot both hold.
func (k *Kind) rival(i, j int) bool {
	return slices.Contains(k.Params[i].Rivals, k.Params[j].Name) || slices.Contains(k.Params[j].Rivals, k.Params[i].Name)
}

// replaced tells that a parameter is not in force since a rival is stated: its
// own, or that of the parameter whose second co-ordinate it holds.
func (k *Kind) replaced(i int, stated func(int) bool) bool {
	owner := k.owner(i)
	if owner >= 0 {
		if stated(owner) {
			return false
		}
		i = owner
	}
	for j := range k.Params {
		if j != i && stated(j) && k.rival(i, j) {
			return true
		}
	}
	return false
}

// owner is the parameter whose second co-ordinate a hidden one holds, or -1.
func (k *Kind) owner(i int) int {
	if !k.Params[i].Hidden {
		return -1
	}
	for j := range k.Params {
		if k.Params[j].At == k.Params[i].Name {
			return j
		}
	}
	return -1
}

// rivals says where a part states two parameters of which one follows from the
// other.
func (r *resolver) rivals(t *thing, kind *Kind, stated []*syntax.Param) {
	for i := range stated {
		for j := i + 1; j < len(stated); j++ {
			if stated[i] == nil || stated[j] == nil || !kind.rival(i, j) {
				continue
			}
			first, second := stated[i], stated[j]
			if first.Span.Start.Offset > second.Span.Start.Offset {
				first, second = second, first
			}
			d := r.errorf("rivals", second.Span, "state one of them; it gives the other", "%s states both %s and %s", t.name, first.Key.Text, second.Key.Text)
			d.Related = []diag.Related{{Span: first.Span, Message: "the other one"}}
		}
	}
}

// param sets a stated parameter, and the second co-ordinate of a point.
func (r *resolver) param(t *thing, kind *Kind, i int, slots []SlotID, s *syntax.Param) {
	p := &kind.Params[i]
	what := p.Name + " of " + t.name
	if !r.setNumber(slots[i], &s.Value, what, t.home) {
		return
	}
	r.bounds(slots[i], s.Value.Bounds, what)
	at := s.Value.At
	switch {
	case p.At == "" && at != nil:
		r.errorf("wrong-place", at.Span, "", "%s is one number, not a point of a curve", what)
	case p.At != "" && at == nil:
		r.errorf("no-point", s.Value.Span, "write "+p.Name+" = "+r.written(&s.Value)+" at "+pointExample(kind, p), "%s is a point of a curve and needs its second co-ordinate", what)
	case at != nil:
		r.set(slots[kind.Index(p.At)], at, "the point of "+what, t.home)
	}
}

// pointExample shows a usual second co-ordinate.
func pointExample(kind *Kind, p *Param) string {
	if h := kind.Index(p.At); h >= 0 && kind.Params[h].Unit != quantity.Ampere {
		return "a value in " + noun(kind.Params[h].Unit)
	}
	return "1 mA"
}

// written is a value as the text has it.
func (r *resolver) written(v *syntax.Value) string {
	if v.Name != nil {
		return v.Name.Text
	}
	return v.Literal.Text
}
