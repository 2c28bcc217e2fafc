package syntax

import (
	"slices"
	"strconv"
	"strings"

	"biaswright/netlist/diag"
)

var functions = []string{"parallel", "sqrt", "ln", "exp"}

// expr reads a whole expression.
func (p *parser) expr() Expr {
	p.operators = 0
	return p.sum()
}

func (p *parser) sum() Expr {
	first := p.tok()
	x := p.product()
	for p.is('+') || p.is('-') {
		x = p.binary(first, x, p.product)
	}
	return x
}

func (p *parser) product() Expr {
	first := p.tok()
	x := p.unary()
	for p.is('*') || p.is('/') {
		x = p.binary(first, x, p.unary)
	}
	return x
}

// binary reads an operator and its right side.
func (p *parser) binary(first token, x Expr, right func() Expr) Expr {
	op := p.tok()
	if p.operators++; p.operators > maxOperators {
		p.fail(op, "too-long", "give parts of it names with given", "the expression has more than %d operators", maxOperators)
	}
	p.i++
	y := right()
	return &Binary{Op: byte(op.punct), X: x, Y: y, Span: p.from(first)}
}

// unary reads a sign and what it stands before. The minus of a temperature is
// part of its number.
func (p *parser) unary() Expr {
	first := p.tok()
	if !p.is('-') && !p.is('+') || p.signed() {
		return p.power()
	}
	p.i++
	p.enter(first)
	x := p.unary()
	p.depth--
	return &Unary{Minus: first.punct == '-', X: x, Span: p.from(first)}
}

// signed tells that the next tokens are the number of a temperature below zero.
func (p *parser) signed() bool {
	t := p.ahead(1)
	return p.is('-') && t.kind == kindNumber && t.value.Unit.Absolute
}

func (p *parser) power() Expr {
	first := p.tok()
	x := p.primary()
	if !p.is('^') {
		return x
	}
	p.enter(first)
	x = p.binary(first, x, p.unary)
	p.depth--
	return x
}

// enter counts what stands within each other.
func (p *parser) enter(t token) {
	if p.depth++; p.depth > maxDepth {
		p.fail(t, "too-deep", "give parts of it names with given", "more than %d brackets, signs or powers stand within each other", maxDepth)
	}
}

func (p *parser) primary() Expr {
	t := p.tok()
	switch {
	case t.kind == kindNumber || p.signed() || p.is('.'):
		return &Number{*p.literalInExpr()}
	case p.is('('):
		p.i++
		p.enter(t)
		x := p.sum()
		p.depth--
		p.take(')', "a bracket is not closed")
		return x
	case t.kind == kindWord:
		return p.named(t)
	}
	p.unexpected("a number, a name or a bracket", "")
	return nil
}

// literalInExpr is literal; between the brackets of a function a comma separates
// its arguments.
func (p *parser) literalInExpr() *Literal {
	if t := p.tok(); t.kind == kindNumber && p.depth > 0 {
		p.i++
		return &Literal{Quantity: t.value, Bare: t.bare, Text: p.text(t), Span: p.span(t)}
	}
	return p.literal()
}

// named reads what begins with a name.
func (p *parser) named(t token) Expr {
	text := p.text(t)
	bracket := p.ahead(1)
	if bracket.punct == '(' && !p.boundsAhead(1) {
		if slices.Contains(functions, text) {
			return p.call(t)
		}
		if bracket.start == t.end {
			p.fail(t, "unknown-name", diag.DidYouMean(text, functions), "there is no function %s; there are parallel, sqrt, ln and exp", clip(text))
		}
	}
	p.i++
	switch {
	case text == "infinite":
		return &Number{*p.infinite(t)}
	case strings.Contains(text, "."):
		return p.quantity(t)
	}
	return &NameExpr{p.word(t)}
}

// boundsAhead tells whether the bracket n tokens ahead holds bounds: a number,
// with its sign or without, and two points.
func (p *parser) boundsAhead(n int) bool {
	return p.ahead(n+2).kind == kindRange || p.ahead(n+1).kind == kindPunct && p.ahead(n+3).kind == kindRange
}

func (p *parser) call(t token) Expr {
	c := &Call{Func: p.word(t)}
	p.i += 2 // the name and its bracket
	p.enter(t)
	for {
		c.Args = append(c.Args, p.sum())
		if !p.is(',') {
			break
		}
		p.i++
	}
	p.depth--
	p.take(')', "a bracket is not closed")
	c.Span = p.from(t)
	return c
}

// quantity takes a word with points apart: SUBJECT.SYMBOL or SUBJECT.INDEX.SYMBOL.
// Such a word is ASCII, so that columns count bytes.
func (p *parser) quantity(t token) Expr {
	text := p.text(t)
	part := func(from, to int) Word {
		s := p.span(t)
		s.Start.Offset, s.End.Offset = t.start.Offset+from, t.start.Offset+to
		s.Start.Column, s.End.Column = t.start.Column+from, t.start.Column+to
		return Word{text[from:to], s}
	}
	dot := strings.LastIndexByte(text, '.')
	q := &QuantityExpr{Subject: part(0, dot), Symbol: part(dot+1, len(text)), Span: p.span(t)}
	if digit := text[dot+1]; digit >= '0' && digit <= '9' {
		p.fail(t, "syntax", "write "+clip(text)+".I or "+clip(text)+".V", "%s names no quantity", clip(text))
	}
	subject := q.Subject.Text
	if point := strings.IndexByte(subject, '.'); point >= 0 && !strings.Contains(subject, ":") {
		const longest = 9 // digits that surely fit an int
		index, err := strconv.Atoi(subject[point+1:])
		if err != nil || index < 1 || len(subject)-point-1 > longest {
			p.fail(t, "syntax", "write LAMP.I, or LAMP.1.I for the first of a row", "%s names no quantity", clip(text))
		}
		q.Subject, q.Index = part(0, point), index
	}
	return q
}
