package syntax

import (
	"bytes"
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// Limits of a text. They bound time and memory whatever the text is; no design is
// near them.
const (
	// MaxSize is the longest text in bytes that Parse takes. A command can stop
	// reading a file one byte behind it.
	MaxSize = 16 << 20
	// maxTokens bounds the tree: each token costs about a hundred bytes in it.
	maxTokens = 2_000_000
	// maxDepth bounds the brackets within each other, and so the stack.
	maxDepth = 200
	// maxOperators bounds one expression, whose tree leans to one side.
	maxOperators = 5000
	// maxErrors are reported one by one; the rest are counted.
	maxErrors = 50
)

// Parse reads a text; name is what messages call it. All errors of the text are
// found in one run, at most one for each segment of a path, parameter of a part,
// or other statement. A statement with an error is left out of the tree. The tree
// is nil if the text is no text at all (binary, or longer than MaxSize). The
// caller must not modify src afterwards.
func Parse(name string, src []byte) (*File, diag.List) {
	if d, bad := unreadable(name, src); bad {
		return nil, diag.List{d}
	}
	p := newParser(name, string(src))
	p.file.Source = src
	for p.gather() {
		p.one()
	}
	p.summary()
	return p.file, p.list
}

// ParseExpr reads an expression, as typed by itself.
func ParseExpr(name, text string) (Expr, diag.List) {
	var x Expr
	list := alone(name, text, func(p *parser) { x = p.expr() })
	if list.HasErrors() {
		return nil, list
	}
	return x, list
}

// ParseValue reads a value, as typed by itself: "12 V", "-40 degC", "infinite",
// "0.66 V at 1 mA". A word that reads as a letter code (R22) is one, a value by
// its name otherwise.
func ParseValue(name, text string) (*Value, diag.List) {
	var v *Value
	list := alone(name, text, func(p *parser) {
		if t := p.tok(); t.kind == kindWord {
			if r, ok := quantity.ScanCode(p.text(t)); ok {
				p.i++
				v = &Value{Literal: &Literal{Quantity: r.Quantity, Text: p.text(t), Span: p.span(t)}, Span: p.span(t)}
				return
			}
		}
		v = p.value(true)
	})
	if list.HasErrors() {
		return nil, list
	}
	return v, list
}

// alone parses a text that is one line's piece.
func alone(name, text string, parse func(*parser)) diag.List {
	if d, bad := unreadable(name, []byte(text)); bad {
		return diag.List{d}
	}
	p := newParser(name, text)
	p.gather()
	p.try(func() {
		parse(p)
		p.ended()
	})
	if len(p.list) == 0 && p.s.rest() != "" {
		p.say(diag.Diagnostic{Code: "syntax", Message: "one line is wanted here", Span: diag.Span{File: name, Start: p.s.pos, End: p.s.pos}})
	}
	p.summary()
	return p.list
}

// unreadable says why a text cannot be read at all.
func unreadable(name string, src []byte) (diag.Diagnostic, bool) {
	d := diag.Diagnostic{Code: "no-text", Span: diag.Span{File: name}}
	if len(src) > MaxSize {
		d.Code = "too-long"
		d.Message = fmt.Sprintf("the text is longer than %d MB, which no circuit needs", MaxSize>>20)
		return d, true
	}
	at := bytes.IndexByte(src, 0)
	what := "a zero byte"
	if at < 0 {
		if utf8.Valid(src) {
			return d, false
		}
		what = "a byte that is no UTF-8"
		for at = 0; ; {
			r, n := utf8.DecodeRune(src[at:])
			if r == utf8.RuneError && n <= 1 {
				break
			}
			at += n
		}
	}
	line := src[bytes.LastIndexByte(src[:at], '\n')+1 : at]
	pos := diag.Position{Line: bytes.Count(src[:at], []byte{'\n'}) + 1, Column: utf8.RuneCount(line) + 1, Offset: at}
	end := pos
	end.Column++
	end.Offset++
	d.Span.Start, d.Span.End = pos, end
	d.Message = "this is no text: it has " + what
	d.Hint = "a .bias file is plain UTF-8 text"
	return d, true
}

// A parser reads statement by statement. It keeps the tokens of one at a time.
type parser struct {
	s     scanner
	file  *File
	list  diag.List
	more  int // errors beyond those reported
	count int // tokens so far

	toks   []token
	inner  []innerComment
	notes  Notes
	i      int  // the token to read next
	failed bool // the statement has an error
	stop   bool // another statement begins here, and lists end
	wrong  int  // the token at which the first one was found

	depth, operators int
}

// An innerComment stands before the token of that index.
type innerComment struct {
	token int
	own   bool
	text  string
}

func newParser(name, src string) *parser {
	p := &parser{file: &File{Name: name}}
	p.s = scanner{name: name, src: src, pos: diag.Position{Line: 1, Column: 1}, say: p.say}
	if strings.HasPrefix(src, "\uFEFF") { // a byte order mark
		p.s.pos.Offset = len("\uFEFF")
	}
	return p
}

// say keeps a diagnostic, or counts it where there are too many.
func (p *parser) say(d diag.Diagnostic) {
	if len(p.list) >= maxErrors {
		p.more++
		return
	}
	p.list = append(p.list, d)
}

func (p *parser) summary() {
	p.list.Sort()
	if p.more > 0 {
		p.list = append(p.list, diag.Diagnostic{
			Code: "too-many", Message: fmt.Sprintf("and %d more errors", p.more),
			Span: diag.Span{File: p.s.name},
		})
	}
}

// gather collects the tokens of the next statement, over all of its lines, and
// the comments around it. It returns false at the end of the text.
func (p *parser) gather() bool {
	p.toks, p.inner, p.notes = p.toks[:0], p.inner[:0], Notes{}
	p.i, p.failed, p.stop, p.depth = 0, false, false, 0
	begun := len(p.file.Statements) > 0 || p.count > 0 // something stands before
	blank, empty, first := false, true, true
	for {
		p.s.spaces()
		rest := p.s.rest()
		switch {
		case rest == "":
			return p.gathered()
		case rest[0] == '\n' && len(p.toks) == 0:
			blank = blank || empty && begun
			empty = true
			p.s.newline()
		case rest[0] == '\n':
			if !p.open() && !p.s.arrowAhead() {
				p.s.newline()
				return p.gathered()
			}
			first = true
			p.s.newline()
		case rest[0] == '#' && len(p.toks) == 0:
			p.notes.Before = append(p.notes.Before, Comment{Text: p.s.comment(), Blank: blank})
			blank, empty, begun = false, false, true
		case rest[0] == '#':
			p.inner = append(p.inner, innerComment{len(p.toks), first, p.s.comment()})
		default:
			if len(p.toks) == 0 {
				p.notes.Blank = blank
			}
			if p.count++; p.count > maxTokens {
				p.s.complain(token{start: p.s.pos, end: p.s.pos}, "too-long", "", "the text has more than %d words, which no circuit needs", maxTokens)
				p.s.pos.Offset = len(p.s.src)
				return false
			}
			p.token(first)
			first = false
		}
	}
}

// token takes the next token into the statement.
func (p *parser) token(first bool) {
	p.s.quiet = p.failed
	t := p.s.token()
	t.first = first
	if t.kind == kindBad {
		p.fault(len(p.toks))
	}
	if t.kind == kindArrow && first && p.open() {
		p.s.complain(t, "syntax", "leave out one of the two", "both this line and the one before it say that the statement goes on")
		p.fault(len(p.toks))
		return
	}
	p.toks = append(p.toks, t)
}

// fault marks the statement as wrong at a token.
func (p *parser) fault(at int) {
	if !p.failed {
		p.failed, p.wrong = true, at
	}
}

// open tells that the statement goes on in the next line: its last token so far
// is an arrow or a comma.
func (p *parser) open() bool {
	if len(p.toks) == 0 {
		return false
	}
	t := p.toks[len(p.toks)-1]
	return t.kind == kindArrow || t.punct == ','
}

// gathered ends gather: it sorts the comments.
func (p *parser) gathered() bool {
	if len(p.toks) == 0 {
		p.file.Tail = p.notes.Before
		return false
	}
	if n := len(p.inner) - 1; n >= 0 && p.inner[n].token == len(p.toks) && !p.inner[n].own {
		p.notes.Behind = p.inner[n].text
		p.inner = p.inner[:n]
	}
	return true
}

// one parses what was gathered: a statement, or several where a line that ends in
// an arrow or a comma has swallowed the next.
func (p *parser) one() {
	for {
		said := len(p.list)
		var st Statement
		if p.try(func() { st = p.statement() }) && !p.failed {
			p.file.Statements = append(p.file.Statements, st)
			return
		}
		if !p.resume(said) {
			return
		}
	}
}

// resume goes on at the next line whose first word begins a statement, and takes
// back what was said of it as a part of the one before. It returns false where
// there is no such line. The tree is incomplete in any case, so that comments are
// left out from here on.
func (p *parser) resume(said int) bool {
	from := min(p.wrong, len(p.toks)-1)
	for from > 0 && !p.toks[from].first {
		from--
	}
	next := max(from, 1)
	for next < len(p.toks) && !p.swallowed(next) {
		next++
	}
	if next >= len(p.toks) {
		return false
	}
	start := p.toks[next].start.Offset
	late := slices.DeleteFunc(p.list[said:], func(d diag.Diagnostic) bool { return d.Span.Start.Offset >= start })
	p.list = p.list[:said+len(late)]
	p.toks, p.inner, p.notes = p.toks[next:], p.inner[:0], Notes{}
	p.i, p.failed, p.stop, p.depth = 0, false, false, 0
	return true
}

// swallowed tells that token i begins a line as a statement does, though it goes
// on from the line before.
func (p *parser) swallowed(i int) bool {
	return i > 0 && i < len(p.toks) && p.toks[i].first && p.isStatement(p.toks[i])
}

func (p *parser) isStatement(t token) bool {
	return t.kind == kindWord && slices.Contains(statementWords, p.text(t))
}

// A bail leaves a statement or an item of it; the error is said already.
type bail struct{}

// try runs a piece of the parser and returns false if it failed.
func (p *parser) try(parse func()) (ok bool) {
	defer func() {
		if r := recover(); r != nil {
			if _, is := r.(bail); !is {
				panic(r)
			}
		}
	}()
	parse()
	return true
}

// fail says what is wrong at a token and leaves the item.
func (p *parser) fail(t token, code, hint, format string, args ...any) {
	at := p.i
	for at > 0 && (at >= len(p.toks) || p.toks[at].start.Offset > t.start.Offset) {
		at--
	}
	quiet := t.kind == kindBad || p.tok().kind == kindBad
	line := at
	for line > 0 && !p.toks[line].first {
		line--
	}
	switch {
	case quiet: // the scanner has said it
	case p.swallowed(line):
		before := p.toks[line-1]
		p.s.complain(before, "syntax", "a line that ends in -> or , goes on in the next one", "nothing follows the %s at the end of the line", p.text(before))
		at, p.stop = line, true
	default:
		p.s.complain(t, code, hint, format, args...)
	}
	p.fault(at)
	panic(bail{})
}

// tok is the token to read next.
func (p *parser) tok() token { return p.ahead(0) }

// ahead is the token n behind the one to read next, or an end.
func (p *parser) ahead(n int) token {
	if p.i+n < len(p.toks) {
		return p.toks[p.i+n]
	}
	end := p.s.pos
	if len(p.toks) > 0 {
		end = p.toks[len(p.toks)-1].end
	}
	return token{kind: kindEnd, start: end, end: end}
}

func (p *parser) text(t token) string { return p.s.src[t.start.Offset:t.end.Offset] }

func (p *parser) span(t token) diag.Span {
	return diag.Span{File: p.s.name, Start: t.start, End: t.end}
}

// from is the span from a token to the last one read.
func (p *parser) from(t token) diag.Span {
	s := p.span(t)
	if p.i > 0 {
		s.End = p.toks[p.i-1].end
	}
	return s
}

// describe names a token for a message.
func (p *parser) describe(t token) string {
	if t.kind == kindEnd {
		return "the end of the line"
	}
	return clip(p.text(t))
}

// is tells whether the next token is that mark; isWord, that word.
func (p *parser) is(mark rune) bool { return p.tok().kind == kindPunct && p.tok().punct == mark }

func (p *parser) isWord(word string) bool {
	t := p.tok()
	return t.kind == kindWord && p.text(t) == word
}

// take reads a mark, or fails with what is wanted; sample shows how it is written.
func (p *parser) take(mark rune, sample string) {
	if !p.is(mark) {
		p.unexpected(fmt.Sprintf("%c", mark), sample)
	}
	p.i++
}

func (p *parser) takeWord(word, sample string) {
	if !p.isWord(word) {
		p.unexpected(word, sample)
	}
	p.i++
}

// ended fails unless the statement is read to its end.
func (p *parser) ended() {
	if p.tok().kind != kindEnd {
		p.unexpected("the end of the line", "")
	}
}

// unexpected fails at the next token. A word behind a bare number is probably a
// unit that is not known.
func (p *parser) unexpected(wanted, hint string) {
	t := p.tok()
	if p.i > 0 && t.kind == kindWord {
		if before := p.toks[p.i-1]; before.kind == kindNumber && before.bare {
			if fix, ok := quantity.Likely(p.text(before) + " " + p.text(t)); ok {
				if p.i > 1 && p.toks[p.i-2].punct == '-' {
					fix = "-" + fix
				}
				p.fail(t, "bad-unit", "write "+fix, "%s is no unit that is known here", clip(p.text(t)))
			}
		}
	}
	if hint != "" && !strings.Contains(hint, " ") {
		hint = ""
	}
	p.fail(t, "syntax", hint, "expected %s, not %s", wanted, p.describe(t))
}
