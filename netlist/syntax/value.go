package syntax

import (
	"math"
	"strings"

	"biaswright/netlist/quantity"
)

// word makes a word of a token.
func (p *parser) word(t token) Word { return Word{Text: p.text(t), Span: p.span(t)} }

// name reads a name that declares something. A number of one word is passed on:
// what declares it says how it could be called.
func (p *parser) name(what, sample string) Word {
	t := p.tok()
	text := p.text(t)
	switch {
	case t.kind == kindNumber && !strings.ContainsAny(text, " \t"):
	case t.kind != kindWord:
		p.unexpected("the name of "+what, sample)
	case strings.ContainsAny(text, ".:"):
		p.fail(t, "bad-name", "names are made of ASCII letters, digits and _", "%s cannot be declared as %s", clip(text), what)
	}
	p.i++
	return p.word(t)
}

// ref reads a name that refers to something, LAMP.1 and D1:D2 among them.
func (p *parser) ref(what, sample string) Word {
	t := p.tok()
	if t.kind != kindWord {
		p.unexpected("the name of "+what, sample)
	}
	p.i++
	return p.word(t)
}

// literal reads a number with its sign.
func (p *parser) literal() *Literal {
	first := p.tok()
	negative := p.is('-')
	if negative || p.is('+') {
		p.i++
	}
	t := p.tok()
	switch {
	case t.kind == kindPunct && t.punct == '.' && p.ahead(1).kind == kindNumber:
		p.fail(t, "bad-number", "write 0."+p.text(p.ahead(1)), "a number begins with a digit")
	case t.kind != kindNumber:
		p.unexpected("a number", "")
	}
	p.i++
	p.comma(t)
	l := &Literal{Quantity: t.value, Bare: t.bare, Span: p.from(first)}
	l.Text = p.s.src[l.Span.Start.Offset:l.Span.End.Offset]
	if negative {
		l.Value = -l.Value
	}
	return l
}

// comma refuses a decimal comma: a number, a comma and a number without a space.
func (p *parser) comma(t token) {
	c, n := p.tok(), p.ahead(1)
	if c.punct != ',' || n.kind != kindNumber || c.start != t.end || n.start != c.end || !t.bare || strings.Contains(p.text(t), ".") {
		return
	}
	whole := token{start: t.start, end: n.end}
	p.fail(whole, "bad-number", "the decimal point is a point: "+p.text(t)+"."+p.text(n), "%s has a decimal comma", clip(p.text(whole)))
}

func (p *parser) startsNumber() bool {
	t := p.tok()
	return t.kind == kindNumber || p.is('-') || p.is('+') || p.is('.')
}

// value reads a number or a given name with its bounds, and the second
// co-ordinate of a point where at allows it.
func (p *parser) value(at bool) *Value {
	first := p.tok()
	v := &Value{}
	switch {
	case p.startsNumber():
		v.Literal = p.literal()
	case p.isWord("infinite"):
		p.i++
		v.Literal = p.infinite(first)
	case first.kind == kindWord:
		w := p.ref("a given value", "")
		if strings.ContainsAny(w.Text, ".:") {
			p.fail(first, "syntax", "a number or the name of a given value stands here", "%s is no value", clip(w.Text))
		}
		v.Name = &w
	default:
		p.unexpected("a value", "")
	}
	v.Bounds = p.bounds()
	if at && p.isWord("at") {
		p.i++
		v.At = p.value(false)
		if b := v.At.Bounds; b != nil {
			p.fail(token{start: b.Span.Start, end: b.Span.End}, "syntax", "0.65 V (0.6 V .. 0.7 V) at 1 mA", "bounds stand right behind the value, before at")
		}
	}
	v.Span = p.from(first)
	return v
}

func (p *parser) infinite(t token) *Literal {
	return &Literal{Quantity: quantity.Quantity{Value: math.Inf(1)}, Infinite: true, Bare: true, Text: p.text(t), Span: p.span(t)}
}

// bounds reads a tolerance or bounds and how values lie within them; nil where
// there are none.
func (p *parser) bounds() *Bounds {
	first := p.tok()
	b := &Bounds{}
	switch {
	case p.is('±'):
		p.i++
		if t := p.tok(); t.kind == kindNumber && !t.percent {
			p.fail(t, "syntax", "write both ends: (100 .. 300)", "a tolerance is in percent")
		}
		b.Relative = p.literal()
	case first.kind == kindNumber && first.percent:
		b.Relative = p.literal()
	case p.is('('):
		p.ends(b)
	case p.isWord("pick"):
	case p.isWord("normal"):
		p.fail(first, "syntax", "5% normal", "normal stands behind a tolerance or bounds")
	default:
		return nil
	}
	switch {
	case p.isWord("normal"):
		p.i++
		b.Spread = Normal
	case p.isWord("pick"):
		p.i++
		b.Spread = Pick
		p.picks(b)
	}
	b.Span = p.from(first)
	return b
}

func (p *parser) ends(b *Bounds) {
	const sample = "bounds are written (100 .. 300)"
	p.take('(', sample)
	b.Low = p.literal()
	if p.tok().kind != kindRange {
		p.unexpected("..", sample)
	}
	p.i++
	b.High = p.literal()
	p.take(')', sample)
}

// picks reads the list of values to pick from. It ends before a number of another
// unit than its first, which is a modifier.
func (p *parser) picks(b *Bounds) {
	for p.startsNumber() {
		t := p.tok()
		if t.kind == kindPunct {
			t = p.ahead(1)
		}
		if t.percent || len(b.Picks) > 0 && t.kind == kindNumber && t.value.Unit != b.Picks[0].Unit {
			break
		}
		b.Picks = append(b.Picks, *p.literal())
	}
	if len(b.Picks) == 0 {
		p.unexpected("the values to pick from", "write pick 100 150 250")
	}
}
