package syntax

import (
	"slices"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

var statementWords = []string{
	"title", "use", "given", "rail", "ambient", "part", "path", "place", "load", "hold", "target", "keep", "batch", "assume", "hand", "measured",
}

// statement reads the statement that was gathered, whose first word says which.
func (p *parser) statement() Statement {
	first := p.tok()
	if first.kind != kindWord {
		p.fail(first, "unknown-statement", "a line begins with a word such as path, part or rail", "%s begins no statement", p.describe(first))
	}
	p.i++
	s := stmt{Notes: p.notes}
	var out Statement
	var base *stmt
	switch p.text(first) {
	case "title":
		x := &Title{Text: p.string(`title "Mast lamp sink"`)}
		out, base = x, &x.stmt
	case "use":
		x := p.use()
		out, base = x, &x.stmt
	case "given":
		x := &Given{Name: p.name("a given value", "given RL = 47 ohm")}
		p.take('=', "given "+x.Name.Text+" = 47 ohm")
		x.Value = p.expr()
		x.Bounds = p.bounds()
		out, base = x, &x.stmt
	case "rail":
		x := &Rail{Name: p.name("a rail", "rail VCC = 12 V")}
		p.take('=', "rail "+x.Name.Text+" = 12 V")
		x.Value = *p.value(false)
		out, base = x, &x.stmt
	case "ambient":
		x := &Ambient{}
		p.take('=', "ambient = 25 degC")
		x.Value = *p.value(false)
		out, base = x, &x.stmt
	case "part":
		x := p.part(&s.Notes)
		out, base = x, &x.stmt
	case "path":
		x := p.path(&s.Notes)
		out, base = x, &x.stmt
	case "place":
		x := p.place()
		out, base = x, &x.stmt
	case "load":
		x := &Load{Names: p.names("load LAMP")}
		out, base = x, &x.stmt
	case "batch":
		x := &Batch{Names: p.names("batch Q1 Q2")}
		out, base = x, &x.stmt
	case "hold":
		x := &Hold{Quantity: p.expr()}
		p.takeWord("within", "hold LAMP.I within 5%")
		x.Within = *p.value(false)
		out, base = x, &x.stmt
	case "target":
		x := p.target()
		out, base = x, &x.stmt
	case "keep":
		x := p.keep()
		out, base = x, &x.stmt
	case "assume":
		x := &Assume{}
		x.Items = p.params(&s.Notes, true)
		out, base = x, &x.stmt
	case "hand":
		x := &Hand{Quantity: p.expr()}
		p.take('=', "hand tail.V = 0.7 V")
		x.Value = p.expr()
		out, base = x, &x.stmt
	case "measured":
		x := &Measured{Quantity: p.expr()}
		p.take('=', "measured LAMP.I = 9.8 mA")
		x.Value = *p.value(false)
		out, base = x, &x.stmt
	default:
		p.i--
		p.fail(first, "unknown-statement", p.statementHint(first), "%s begins no statement", p.describe(first))
	}
	if p.failed {
		return nil
	}
	p.ended()
	for _, c := range p.inner { // comments that no list has taken
		s.Notes.Before = append(s.Notes.Before, Comment{Text: c.text})
	}
	s.Span = p.from(first)
	*base = s
	return out
}

func (p *parser) statementHint(first token) string {
	word := p.text(first)
	if near := diag.DidYouMean(word, statementWords); near != "" {
		return near
	}
	if slices.ContainsFunc(p.toks, func(t token) bool { return t.kind == kindArrow }) {
		return "a row of segments begins with path: path " + clip(word) + " -> …"
	}
	if p.ahead(1).punct == '=' {
		return "a supply is declared with rail, another value with given"
	}
	return "statements are " + strings.Join(statementWords, ", ")
}

func (p *parser) string(sample string) string {
	t := p.tok()
	if t.kind != kindString {
		p.unexpected("a text between quotation marks", sample)
	}
	p.i++
	return unquote(p.text(t))
}

func (p *parser) use() *Use {
	t := p.tok()
	x := &Use{PathPos: p.span(t)}
	switch t.kind {
	case kindString:
		x.Path = unquote(p.text(t))
		if x.Path == "" {
			p.fail(t, "syntax", `use "parts.bias"`, "the name of the file is empty")
		}
	case kindWord:
		w := p.word(t)
		if strings.ContainsAny(w.Text, ".:") {
			p.fail(t, "syntax", `use "`+clip(w.Text)+`"`, "the name of a file stands between quotation marks")
		}
		x.Shelf = &w
	default:
		p.unexpected("a file's name between quotation marks", `use "parts.bias" or use generic`)
	}
	p.i++
	return x
}

// names reads one name or more.
func (p *parser) names(sample string) []Word {
	names := []Word{p.ref("an element", sample)}
	for p.tok().kind == kindWord {
		names = append(names, p.ref("an element", sample))
	}
	if p.is(',') {
		p.fail(p.tok(), "syntax", sample, "names are separated by spaces here")
	}
	return names
}

func (p *parser) target() *Target {
	x := &Target{Quantity: p.expr()}
	p.take('=', "target LAMP.I = 15 mA within 10%")
	x.Value = *p.value(false)
	if p.tok().kind != kindEnd {
		p.takeWord("within", "target LAMP.I = 15 mA within 10%")
		x.Within = p.value(false)
	}
	return x
}

func (p *parser) keep() *Keep {
	const sample = "keep Q1.P < 250 mW"
	x := &Keep{Left: p.expr()}
	switch {
	case p.is('<'), p.is('>'):
		x.Greater = p.is('>')
		p.i++
	default:
		p.unexpected("< or >", sample)
	}
	if p.is('=') {
		p.fail(p.tok(), "syntax", sample, "a bound is written < or >, without =")
	}
	x.Right = p.expr()
	return x
}

func (p *parser) part(n *Notes) *Part {
	x := &Part{Name: p.name("a part", "part sig diode drop = 0.62 V at 1 mA")}
	if p.tok().kind != kindWord || p.ahead(1).punct == '=' {
		p.fail(p.tok(), "no-kind", "part "+clip(x.Name.Text)+" diode …", "%s has no kind", clip(x.Name.Text))
	}
	x.Kind = p.ref("a kind of part", "")
	if p.tok().kind != kindEnd {
		x.Params = p.params(n, false)
	}
	return x
}

// params reads parameters between commas, in an assume statement with the part
// that they hold for.
func (p *parser) params(n *Notes, of bool) []Param {
	var out []Param
	var starts []int
	for {
		start := p.i
		starts = append(starts, start)
		if !p.try(func() { out = append(out, p.param(of)) }) {
			p.toComma(start)
		}
		if p.stop || !p.is(',') {
			break
		}
		p.i++
	}
	p.within(n, starts)
	return out
}

// toComma goes on to the next comma that is outside of the brackets opened since
// a token.
func (p *parser) toComma(start int) {
	depth := 0
	for i := start; i < len(p.toks) && !p.swallowed(i); i++ {
		switch p.toks[i].punct {
		case '(':
			depth++
		case ')':
			depth--
		case ',':
			// A decimal comma has a number on both sides, and no key follows it.
			key := i+1 < len(p.toks) && p.toks[i+1].kind == kindWord
			if depth <= 0 && i >= p.i && key {
				p.i = i
				return
			}
		}
	}
	p.i = len(p.toks)
}

func (p *parser) param(of bool) Param {
	const sample = "parameters are written key = value, key = value"
	t := p.tok()
	if t.kind != kindWord {
		p.unexpected("a parameter", sample)
	}
	x := Param{Key: p.ref("a parameter", sample)}
	if of && p.is('(') {
		p.i++
		w := p.ref("a part", "drop(sig) = 0.7 V")
		x.Of = &w
		p.take(')', "drop(sig) = 0.7 V")
	}
	p.take('=', clip(x.Key.Text)+" = VALUE")
	if p.tok().kind == kindEnd || p.is(',') {
		p.fail(p.tok(), "no-value", "", "%s has no value", clip(x.Key.Text))
	}
	x.Value = *p.value(true)
	x.Span = p.from(t)
	if k := p.tok(); k.kind != kindEnd && !p.is(',') {
		hint := ""
		if k.kind == kindWord && (p.ahead(1).punct == '=' || p.ahead(1).punct == '(') {
			hint = "put a comma before " + clip(p.text(k))
		}
		p.unexpected("a comma or the end of the line", hint)
	}
	return x
}

// within gives a list the comments between its lines; starts are the tokens at
// which the items begin.
func (p *parser) within(n *Notes, starts []int) {
	for _, c := range p.inner {
		after, _ := slices.BinarySearch(starts, c.token)
		own := c.own || len(n.Within) > 0 && n.Within[len(n.Within)-1].After == after
		n.Within = append(n.Within, Inner{After: after, Own: own, Text: c.text})
	}
	p.inner = p.inner[:0]
}

func (p *parser) path(n *Notes) *Path {
	x := &Path{}
	var starts []int
	for {
		starts = append(starts, p.i)
		if !p.try(func() { x.Segments = append(x.Segments, p.segment()) }) {
			for !p.segmentEnds(0) && !p.swallowed(p.i) {
				p.i++
			}
		}
		if p.stop || p.tok().kind != kindArrow {
			break
		}
		p.i++
	}
	p.within(n, starts)
	return x
}

// segmentEnds tells whether the token n ahead is behind the segment.
func (p *parser) segmentEnds(n int) bool {
	k := p.ahead(n).kind
	return k == kindArrow || k == kindEnd
}

func (p *parser) segment() Segment {
	t := p.tok()
	switch {
	case p.segmentEnds(0):
		p.fail(t, "syntax", "path VCC -> R1 1.8k -> gnd", "a node or an element is missing here")
	case t.kind == kindNumber && (!p.segmentEnds(1) || strings.ContainsAny(p.text(t), " \t")):
		p.fail(t, "no-designator", "an element begins with its designator: R1 "+p.text(t), "%s has no designator before it", p.text(t))
	case t.kind != kindWord && t.kind != kindNumber:
		p.unexpected("a node or an element", "")
	}
	if !p.segmentEnds(1) {
		return Segment{Element: p.element()}
	}
	w := p.word(t)
	if strings.Contains(w.Text, ".") && t.kind == kindWord && !strings.Contains(w.Text, ":") {
		p.fail(t, "bad-name", "", "%s is no node", clip(w.Text))
	}
	p.i++
	return Segment{Node: &w}
}

func (p *parser) element() *Element {
	first := p.tok()
	e := &Element{Name: p.name("an element", "")}
	name := clip(e.Name.Text)
	second := p.tok()
	switch {
	case p.is('?'):
		p.i++
		e.What = WhatOpen
		if p.tok().kind != kindWord {
			p.fail(p.tok(), "no-series", name+" ? E24", "the series for the open value of %s is missing", name)
		}
		e.Series = p.ref("a series", "")
	case p.isWord("drop"), p.isWord("cell"):
		p.i++
		e.What = WhatDrop
		if p.text(second) == "cell" {
			e.What = WhatCell
		}
		if p.segmentEnds(0) {
			p.fail(second, "no-value", name+" "+p.text(second)+" 1.5 V", "%s has no value", name)
		}
		e.Value = p.value(false)
	case p.startsNumber():
		e.Value = &Value{Literal: p.literal()}
		e.Value.Bounds = p.bounds()
		e.Value.Span = p.from(second)
	case second.kind == kindWord && p.ahead(1).punct != '=':
		p.i++
		e.What, e.Ref = WhatName, p.word(second)
		if r, ok := quantity.ScanCode(e.Ref.Text); ok {
			e.Value = &Value{Literal: &Literal{Quantity: r.Quantity, Text: e.Ref.Text, Span: e.Ref.Span}, Span: e.Ref.Span}
		}
	case p.is('='):
		p.fail(second, "no-value", "a value stands right behind the designator: R1 1.8k", "%s has no value", name)
	default:
		p.fail(second, "no-value", name+" 1.8k", "%s has no value", name)
	}
	e.Modifiers = p.modifiers(name)
	e.Span = p.from(first)
	return e
}

// modifiers reads to the end of the segment.
func (p *parser) modifiers(of string) []Modifier {
	var out []Modifier
	for !p.segmentEnds(0) {
		out = append(out, p.modifier(of))
	}
	return out
}

func (p *parser) modifier(of string) Modifier {
	first := p.tok()
	m := Modifier{Bounds: p.bounds()}
	switch {
	case m.Bounds != nil:
	case p.startsNumber():
		l := p.literal()
		m.Value = &Value{Literal: l, Span: l.Span}
	case p.isWord("reversed") && p.ahead(1).punct != '=':
		p.i++
		m.Key = p.word(first)
	case first.kind == kindWord && p.ahead(1).punct == '=':
		m.Key = p.ref("a modifier", "")
		p.i++
		p.setting(&m)
	case first.kind == kindWord:
		hint := diag.DidYouMean(p.text(first), []string{"reversed"})
		if hint == "" && (p.segmentEnds(1) || p.ahead(1).kind == kindWord || p.ahead(1).kind == kindNumber) {
			hint = "is -> missing before " + clip(p.text(first)) + "?"
		}
		p.unexpected("a modifier of "+of+" or ->", hint)
	default:
		p.unexpected("a modifier of "+of+" or ->", "")
	}
	m.Span = p.from(first)
	return m
}

// setting reads what stands behind the = of a modifier.
func (p *parser) setting(m *Modifier) {
	switch t := p.tok(); {
	case p.startsNumber():
		l := p.literal()
		m.Value = &Value{Literal: l, Span: l.Span}
	case t.kind == kindWord:
		w := p.ref("", "")
		m.Name = &w
	default:
		p.fail(t, "no-value", "", "%s has no value", clip(m.Key.Text))
	}
}

var pinWords = []string{"collector", "base", "emitter", "anode", "cathode"}

func (p *parser) place() *Place {
	const sample = "place Q1 gp collector=out base=bias emitter=tail"
	x := &Place{Name: p.name("an element", sample)}
	if t := p.tok(); t.kind != kindWord || p.ahead(1).punct == '=' {
		p.fail(t, "no-value", sample, "%s has no part", clip(x.Name.Text))
	}
	x.Part = p.ref("a part", sample)
	for p.tok().kind != kindEnd {
		key := p.tok()
		if key.kind != kindWord || !slices.Contains(pinWords, p.text(key)) {
			x.Modifiers = append(x.Modifiers, p.placeModifier(x.Name.Text))
			continue
		}
		p.i++
		p.take('=', p.text(key)+"= NODE")
		x.Pins = append(x.Pins, Pin{Key: p.word(key), Node: p.node()})
	}
	return x
}

// node reads the word behind a pin.
func (p *parser) node() Word {
	t := p.tok()
	if t.kind == kindNumber && !strings.ContainsAny(p.text(t), " \t") {
		p.i++
		return p.word(t)
	}
	return p.ref("a node", "")
}

func (p *parser) placeModifier(of string) Modifier {
	if p.tok().kind == kindArrow {
		p.fail(p.tok(), "syntax", "an element between arrows belongs in a path", "a placed element has no arrows")
	}
	return p.modifier(of)
}
