package netlist

import (
	"slices"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// A laterNumber is a number of a requirement that follows a given value.
type laterNumber struct {
	of    requirement
	index int
	slot  SlotID
}

// A requirement is a number of a statement.
type requirement int

const (
	targetValue requirement = iota
	targetWithin
	holdWithin
	measuredValue
	assumedValue
)

// refresh brings the numbers of requirements up to date with the given values
// that they name. The tables are copied first, for other circuits share them.
func (c *Circuit) refresh() {
	if len(c.priv.later) == 0 {
		return
	}
	c.Targets, c.Measured, c.Assumed = slices.Clone(c.Targets), slices.Clone(c.Measured), slices.Clone(c.Assumed)
	if c.Hold != nil {
		hold := *c.Hold
		c.Hold = &hold
	}
	for _, l := range c.priv.later {
		*c.numberOf(l.of, l.index) = c.Slots[l.slot].Value
	}
}

func (c *Circuit) numberOf(of requirement, index int) *float64 {
	switch of {
	case targetValue:
		return &c.Targets[index].Value
	case targetWithin:
		return &c.Targets[index].Within
	case holdWithin:
		return &c.Hold.Within
	case measuredValue:
		return &c.Measured[index].Value
	default:
		return &c.Assumed[index].Value
	}
}

// requirements binds what the text asks of the circuit.
func (r *resolver) requirements() {
	r.hold()
	for _, s := range statements[*syntax.Target](r.tree) {
		r.target(s)
	}
	for _, s := range statements[*syntax.Keep](r.tree) {
		r.keep(s)
	}
	r.hands()
	first := map[string]diag.Span{}
	for _, s := range statements[*syntax.Measured](r.tree) {
		r.measured(s, first)
	}
	r.assumptions()
	r.batches()
}

// ofSolution binds an expression that must say something of the solution.
func (r *resolver) ofSolution(x syntax.Expr, statement string) (*Expr, bool) {
	e, ok := r.binder(r.local).bind(x)
	if ok && len(e.refs) == 0 {
		r.errorf("no-quantity", x.Where(), "a quantity is written Q1.Ic or tail.V", "%s is about a quantity, and %s is known before the circuit is solved", statement, e.Text)
		return nil, false
	}
	return e, ok
}

// single binds an expression that must be one quantity.
func (r *resolver) single(x syntax.Expr, statement string) (*Expr, bool) {
	if _, ok := x.(*syntax.QuantityExpr); !ok {
		r.errorf("no-quantity", x.Where(), "a quantity is written Q1.Ic or tail.V", "%s is about one quantity", statement)
		return nil, false
	}
	return r.ofSolution(x, statement)
}

// plain reads the number of a requirement in a unit. Its slot is None unless it
// is a given value.
func (r *resolver) plain(v *syntax.Value, want quantity.Unit, keep rule, what string) (float64, SlotID, bool) {
	if v.At != nil {
		r.errorf("wrong-place", v.At.Span, "", "%s is one number, not a point of a curve", what)
		return 0, None, false
	}
	if v.Bounds != nil {
		r.errorf("wrong-place", v.Bounds.Span, "", "%s has no tolerance of its own", what)
		return 0, None, false
	}
	if v.Name == nil {
		value, ok := r.number(v.Literal, want, keep, what)
		return value, None, ok
	}
	id, ok := r.givenNamed(*v.Name, r.local)
	if !ok {
		return 0, None, false
	}
	s := &r.c.Slots[id]
	if s.Unit != want {
		r.errorf("unit", v.Name.Span, "", "%s is in %s, but %s is in %s", what, noun(want), v.Name.Text, noun(s.Unit))
		return 0, None, false
	}
	if says := keep.breach(want, s.Value); says != "" {
		r.errorf("sign", v.Name.Span, "", "%s %s", what, says)
		return 0, None, false
	}
	return s.Value, id, true
}

func (r *resolver) later(of requirement, index int, slot SlotID) {
	if slot != None {
		r.c.priv.later = append(r.c.priv.later, laterNumber{of, index, slot})
	}
}

// within reads a width: a percentage of the value, or a number in its unit.
func (r *resolver) within(v *syntax.Value, e *Expr, what string) (width float64, relative bool, slot SlotID, ok bool) {
	unit := e.Unit
	relative = r.isRelative(v, unit)
	want := unit
	switch {
	case relative && unit.Absolute:
		r.errorf("unit", v.Span, "state it in K", "a percentage of degrees Celsius means nothing")
		return 0, false, None, false
	case relative:
		want = quantity.One
	case unit.Absolute:
		want = quantity.Kelvin
	}
	if !relative && v.Literal != nil && v.Literal.Bare && unit != quantity.One {
		r.errorf("unit", v.Span, "write "+likelyPercent(v.Literal)+", or a width in "+noun(want), "%s has no unit", what)
		return 0, false, None, false
	}
	width, slot, ok = r.plain(v, want, rule{sign: Positive}, what)
	return width, relative, slot, ok
}

// likelyPercent is the percentage that a bare width was probably meant to be: 5% for
// 5 and for 0.05.
func likelyPercent(l *syntax.Literal) string {
	const percent = 100
	if l.Value < 1 {
		return show(l.Value*percent, quantity.One) + "%"
	}
	return l.Text + "%"
}

// isRelative tells a width that is a fraction of the value: a percentage, or a
// given value without unit for what has one.
func (r *resolver) isRelative(v *syntax.Value, unit quantity.Unit) bool {
	if v.Literal != nil {
		return strings.HasSuffix(v.Literal.Text, "%")
	}
	t := r.find(r.local, *v.Name)
	if t == nil || t.sort != aGiven {
		return false
	}
	id, ok := r.valueOf(t)
	return ok && unit != quantity.One && r.c.Slots[id].Unit == quantity.One
}

func (r *resolver) hold() {
	s, ok := only[*syntax.Hold](r, "hold")
	if !ok {
		return
	}
	e, ok := r.ofSolution(s.Quantity, "hold")
	if !ok {
		return
	}
	width, relative, slot, ok := r.within(&s.Within, e, "the width of hold")
	if !ok {
		return
	}
	r.c.Hold = &Hold{Q: e, Within: width, Relative: relative, Span: s.Where()}
	r.later(holdWithin, 0, slot)
}

func (r *resolver) target(s *syntax.Target) {
	e, ok := r.ofSolution(s.Quantity, "target")
	if s.Within == nil {
		r.errorf("no-width", s.Where(), "add: within 10%", "a target states how near is near enough")
		return
	}
	if !ok {
		return
	}
	value, valueSlot, okValue := r.plain(&s.Value, e.Unit, rule{}, e.Text)
	width, relative, widthSlot, okWidth := r.within(s.Within, e, "the width of this target")
	if !okValue || !okWidth {
		return
	}
	if relative && value == 0 {
		r.errorf("bounds", s.Within.Span, "state the width in "+noun(e.Unit), "a percentage of 0 is no width")
		return
	}
	at := len(r.c.Targets)
	r.c.Targets = append(r.c.Targets, Target{Q: e, Value: value, Within: width, Relative: relative, Span: s.Where()})
	r.later(targetValue, at, valueSlot)
	r.later(targetWithin, at, widthSlot)
}

func (r *resolver) keep(s *syntax.Keep) {
	b := r.binder(r.local)
	left, okLeft := b.bind(s.Left)
	right, okRight := b.bind(s.Right)
	if !okLeft || !okRight {
		return
	}
	sign := " < "
	if s.Greater {
		sign = " > "
	}
	text := left.Text + sign + right.Text
	if left.Unit != right.Unit {
		r.errorf("unit", s.Right.Where(), "", "%s is in %s, but %s is in %s", left.Text, noun(left.Unit), right.Text, noun(right.Unit))
		return
	}
	if len(left.refs)+len(right.refs) == 0 {
		r.errorf("no-quantity", s.Where(), "a quantity is written Q1.Ic or tail.V", "keep bounds a quantity, and both sides are known before the circuit is solved")
		return
	}
	r.c.Keeps = append(r.c.Keeps, Keep{Left: left, Right: right, Greater: s.Greater, Text: text, Span: s.Where()})
}

// hands binds the hand calculation. A quantity in it means that quantity's own
// line, so the lines may not go round in a circle.
func (r *resolver) hands() {
	lines := statements[*syntax.Hand](r.tree)
	stated := map[string]int{} // by the quantity's text
	for i, s := range lines {
		q, ok := s.Quantity.(*syntax.QuantityExpr)
		if !ok {
			continue
		}
		if first, twice := stated[quantityText(q)]; twice {
			d := r.errorf("duplicate-statement", s.Where(), "", "the hand calculation states %s twice", quantityText(q))
			d.Related = []diag.Related{{Span: lines[first].Where(), Message: "first stated here"}}
			continue
		}
		stated[quantityText(q)] = i
	}
	for _, s := range lines {
		q, ok := r.single(s.Quantity, "hand")
		b := r.binder(r.local)
		b.quantity = func(x *syntax.QuantityExpr) (Ref, bool) {
			ref, ok := r.quantityRef(x)
			if _, has := stated[quantityText(x)]; ok && !has {
				r.errorf("no-hand", x.Span, r.handHint(x), "the hand calculation does not say what %s is", quantityText(x))
				return ref, false
			}
			return ref, ok
		}
		value, okValue := b.bind(s.Value)
		if !ok || !okValue {
			continue
		}
		if value.Unit != q.Unit {
			r.errorf("unit", s.Value.Where(), "", "%s is in %s, but this is in %s", q.Text, noun(q.Unit), noun(value.Unit))
			continue
		}
		r.c.Hands = append(r.c.Hands, Hand{Q: q, Value: value, Span: s.Where()})
	}
	r.handCircle()
}

// handHint says how a hand line comes by a quantity: a rail's voltage is stated already.
func (r *resolver) handHint(x *syntax.QuantityExpr) string {
	text := quantityText(x)
	if name, ok := strings.CutSuffix(text, ".V"); ok {
		for i := range r.c.Rails {
			if r.c.Rails[i].Name == name {
				return "write " + name + ", the rail's voltage"
			}
		}
	}
	return "add a line: hand " + text + " = …"
}

// handCircle says where a hand line leads back to itself. Lines are taken off in
// an order in which each one's quantities are known; what is left goes round.
func (r *resolver) handCircle() {
	hands := r.c.Hands
	at := make(map[string]int, len(hands))
	for i := range hands {
		at[hands[i].Q.Text] = i
	}
	waits := make([]int, len(hands))
	feeds := make([][]int, len(hands))
	var ready []int
	for i := range hands {
		for _, ref := range hands[i].Value.refs {
			if from, ok := at[ref.Text]; ok {
				waits[i]++
				feeds[from] = append(feeds[from], i)
			}
		}
		if waits[i] == 0 {
			ready = append(ready, i)
		}
	}
	known := 0
	for ; known < len(ready); known++ {
		for _, to := range feeds[ready[known]] {
			if waits[to]--; waits[to] == 0 {
				ready = append(ready, to)
			}
		}
	}
	if known == len(hands) {
		return
	}
	for i := range hands {
		if waits[i] > 0 {
			r.errorf("circle", hands[i].Span, "", "the hand calculation of %s needs its own result", hands[i].Q.Text)
			return
		}
	}
}

func (r *resolver) measured(s *syntax.Measured, first map[string]diag.Span) {
	e, ok := r.single(s.Quantity, "measured")
	if !ok {
		return
	}
	value, slot, ok := r.plain(&s.Value, e.Unit, rule{}, e.Text)
	if !ok {
		return
	}
	if at, twice := first[e.Text]; twice {
		d := r.errorf("duplicate-statement", s.Where(), "", "%s is measured twice", e.Text)
		d.Related = []diag.Related{{Span: at, Message: "first measured here"}}
		return
	}
	first[e.Text] = s.Where()
	at := len(r.c.Measured)
	r.c.Measured = append(r.c.Measured, Measured{Q: e, Value: value, Span: s.Where()})
	r.later(measuredValue, at, slot)
}

// An idealisation is what assume may say: for all transistors, for one part, or
// either.
type idealisation struct {
	unit         quantity.Unit
	keep         rule
	all, forPart bool
	// of tells which kinds of part it is said of.
	of func(*Kind) bool
}

var (
	idealisations = map[string]idealisation{
		"Vbe":     {unit: quantity.Volt, keep: rule{sign: NotNegative}, all: true, forPart: true, of: func(k *Kind) bool { return k.Shape == Transistor }},
		"drop":    {unit: quantity.Volt, keep: rule{sign: NotNegative}, forPart: true, of: func(k *Kind) bool { return k.Shape == Junction }},
		"Vz":      {unit: quantity.Volt, keep: rule{sign: Positive}, forPart: true, of: func(k *Kind) bool { return k.Index("Vz") >= 0 }},
		"betaF":   {unit: quantity.One, keep: rule{sign: Positive, infinite: true}, all: true},
		"betaR":   {unit: quantity.One, keep: rule{sign: Positive, infinite: true}, all: true},
		"VA":      {unit: quantity.Volt, keep: rule{sign: Positive, infinite: true}, all: true},
		"ambient": {unit: quantity.Celsius, all: true},
	}
	idealisationNames = sortedKeys(idealisations)
)

func (r *resolver) assumptions() {
	first := map[string]diag.Span{}
	for _, s := range statements[*syntax.Assume](r.tree) {
		for i := range s.Items {
			item := &s.Items[i]
			key := item.Key.Text
			if item.Of != nil {
				key += "(" + item.Of.Text + ")"
			}
			if at, twice := first[key]; twice {
				d := r.errorf("duplicate-statement", item.Span, "", "%s is assumed twice", key)
				d.Related = []diag.Related{{Span: at, Message: "first assumed here"}}
				continue
			}
			first[key] = item.Span
			r.assume(item, key)
		}
	}
}

func (r *resolver) assume(item *syntax.Param, text string) {
	key := item.Key.Text
	ideal, ok := idealisations[key]
	if !ok {
		hint := didYouMean(key, idealisationNames)
		if key == "Veb" {
			hint = "write Vbe, for pnp transistors too"
		}
		r.errorf("unknown-name", item.Key.Span, hint, "%s is nothing that can be assumed", key)
		return
	}
	part := None
	switch {
	case item.Of == nil && !ideal.all:
		r.errorf("wrong-place", item.Key.Span, "write "+key+"(PART)", "%s is assumed of one part", key)
		return
	case item.Of != nil && !ideal.forPart:
		r.errorf("wrong-place", item.Of.Span, "write "+key+" alone", "%s is assumed of all alike", key)
		return
	case item.Of != nil:
		if part, ok = r.assumedPart(item, ideal); !ok {
			return
		}
	}
	value, slot, ok := r.plain(&item.Value, ideal.unit, ideal.keep, text)
	if !ok {
		return
	}
	at := len(r.c.Assumed)
	r.c.Assumed = append(r.c.Assumed, Assumption{Key: key, Part: part, Value: value, Span: item.Span})
	r.later(assumedValue, at, slot)
}

func (r *resolver) assumedPart(item *syntax.Param, ideal idealisation) (int, bool) {
	t := r.find(r.local, *item.Of)
	if t == nil || t.sort != aPart {
		r.unknown(*item.Of, r.local.nearer(aPart), "there is no part %s", item.Of.Text)
		return None, false
	}
	at, ok := r.partOf(t)
	if ok && !ideal.of(r.c.Parts[at].Kind) {
		d := r.errorf("wrong-place", item.Of.Span, "", "%s is %s, of which %s is not assumed", t.name, article(r.c.Parts[at].Kind.Name), item.Key.Text)
		d.Related = related(t)
		return None, false
	}
	return at, ok
}

func (r *resolver) batches() {
	in := map[int]diag.Span{} // by element
	for _, s := range statements[*syntax.Batch](r.tree) {
		var batch []int
		for i := range s.Names {
			w := s.Names[i]
			t, ok := r.elementNamedBy(w)
			if !ok {
				continue
			}
			if at, twice := in[t.index]; twice {
				d := r.errorf("duplicate-statement", w.Span, "an element comes from one batch", "%s is in a batch already", w.Text)
				d.Related = []diag.Related{{Span: at, Message: "here"}}
				continue
			}
			in[t.index] = w.Span
			batch = append(batch, t.index)
		}
		if len(s.Names) == 1 {
			r.errorf("batch", s.Where(), "", "a batch of one says nothing")
		}
		r.c.Batches = append(r.c.Batches, batch)
	}
}

// elementNamedBy finds the element that a statement names.
func (r *resolver) elementNamedBy(w syntax.Word) (*thing, bool) {
	t := r.local.names[w.Text]
	switch {
	case t == nil:
		r.unknown(w, r.local.nearer(anElement), "there is no element %s", w.Text)
		return nil, false
	case t.sort != anElement:
		d := r.errorf("wrong-place", w.Span, "", "%s is %s, not an element", w.Text, t.sort)
		d.Related = related(t)
		return nil, false
	}
	return t, t.index != None
}

// load binds the elements that stand for the load. They must carry one current:
// in a row on one path, with nothing else at the nodes between them.
func (r *resolver) load() {
	s, ok := only[*syntax.Load](r, "load")
	if !ok {
		return
	}
	on := map[int]syntax.Word{}
	for _, w := range s.Names {
		t, ok := r.elementNamedBy(w)
		if !ok {
			return
		}
		e := &r.c.Elements[t.index]
		switch {
		case e.Kind == TransistorPart:
			r.errorf("load", w.Span, "", "%s is a transistor; a load has two ends", w.Text)
			return
		case e.Path == None:
			r.errorf("load", w.Span, "", "%s is a placed part; a load stands on a path", w.Text)
			return
		}
		if _, twice := on[t.index]; twice {
			r.errorf("duplicate-statement", w.Span, "", "the load has %s twice", w.Text)
			return
		}
		on[t.index] = w
	}
	if len(s.Names) == 0 {
		return
	}
	r.loadInARow(s, on)
}

func (r *resolver) loadInARow(s *syntax.Load, on map[int]syntax.Word) {
	first := r.local.names[s.Names[0].Text].index
	path := r.c.Elements[first].Path
	var load []int
	gap := false
	for _, step := range r.c.Paths[path].Steps {
		if step.Element == None {
			continue
		}
		w, in := on[step.Element]
		if !in {
			gap = len(load) > 0
			continue
		}
		if gap {
			r.errorf("load", w.Span, "", "%s does not follow %s: the load is one row of elements", w.Text, r.c.Elements[load[len(load)-1]].Name)
			return
		}
		load = append(load, step.Element)
	}
	for _, w := range s.Names {
		if r.c.Elements[r.local.names[w.Text].index].Path != path {
			r.errorf("load", w.Span, "", "%s is on another path than %s: the load is one row of elements", w.Text, s.Names[0].Text)
			return
		}
	}
	count := r.c.connections()
	for i, e := range load {
		inner := r.c.Elements[e].Chain[1:]
		if i == len(load)-1 {
			inner = inner[:len(inner)-1] // the last end is the load's own
		}
		for _, id := range inner {
			if n := &r.c.Nodes[id]; count[id] > 2 || n.Rail != None || id == Gnd {
				r.errorf("load", s.Where(), "", "%s, inside the load, has a side branch", n.Name)
				return
			}
		}
	}
	r.c.Load = load
}
