package syntax

import (
	"errors"
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// A kind is what a token is.
type kind uint8

const (
	kindEnd    kind = iota // the end of the statement
	kindWord               // a name, or names joined by '.' and ':'
	kindNumber             // a quantity
	kindString             // "…"
	kindArrow              // -> or →
	kindRange              // ..
	kindPunct              // one of , = ( ) + - * / ^ < > ? ± .
	kindBad                // what the scanner has already complained of
)

// A token is one word or mark. It never spans lines.
type token struct {
	kind       kind
	punct      rune // for kindPunct
	first      bool // the first of its line
	bare       bool // a number without a unit
	code       bool // a number written as a letter code
	percent    bool // a number in percent
	start, end diag.Position
	value      quantity.Quantity
}

// A scanner cuts a text into tokens. It does not know statements.
type scanner struct {
	name string
	src  string
	pos  diag.Position
	say  func(diag.Diagnostic)
	// quiet holds back complaints of stray characters: one in a statement is
	// enough.
	quiet bool
}

func (s *scanner) rest() string { return s.src[s.pos.Offset:] }

// skip goes on by n bytes that are one line's.
func (s *scanner) skip(n int) {
	s.pos.Column += utf8.RuneCountInString(s.src[s.pos.Offset : s.pos.Offset+n])
	s.pos.Offset += n
}

// newline goes on behind a line's end.
func (s *scanner) newline() {
	s.pos = diag.Position{Line: s.pos.Line + 1, Column: 1, Offset: s.pos.Offset + 1}
}

// spaces skips blanks, no-break ones included, and the first half of CR LF.
func (s *scanner) spaces() {
	rest := s.rest()
	n := 0
	for n < len(rest) {
		switch b := rest[n]; {
		case b == ' ' || b == '\t' || b == '\r' && (n+1 == len(rest) || rest[n+1] == '\n'):
			n++
		case strings.HasPrefix(rest[n:], "\u00a0"):
			n += len("\u00a0")
		case strings.HasPrefix(rest[n:], "\u202f"):
			n += len("\u202f")
		default:
			s.skip(n)
			return
		}
	}
	s.skip(n)
}

// comment reads a comment at the head, without its '#'.
func (s *scanner) comment() string {
	text := s.rest()
	if i := strings.IndexByte(text, '\n'); i >= 0 {
		text = text[:i]
	}
	s.skip(len(text))
	return strings.TrimRightFunc(text[1:], unicode.IsSpace)
}

// arrowAhead tells whether the next thing but blank lines and comments is an
// arrow.
func (s *scanner) arrowAhead() bool {
	look := *s
	for {
		look.spaces()
		switch rest := look.rest(); {
		case rest == "":
			return false
		case rest[0] == '\n':
			look.newline()
		case rest[0] == '#':
			look.comment()
		default:
			return arrow(rest) > 0
		}
	}
}

// arrow is the length of the arrow at the head of a text, or 0.
func arrow(s string) int {
	for _, a := range []string{"->", "→"} {
		if strings.HasPrefix(s, a) {
			return len(a)
		}
	}
	return 0
}

// token reads the token at the head, which is neither blank nor a comment.
func (s *scanner) token() token {
	rest := s.rest()
	t := token{start: s.pos}
	n := 1
	switch c := rest[0]; {
	case arrow(rest) > 0:
		t.kind, n = kindArrow, arrow(rest)
	case c >= '0' && c <= '9':
		return s.number(t)
	case isNameByte(c):
		t.kind, n = kindWord, chain(rest)
	case c == '"':
		return s.quoted(t)
	case strings.HasPrefix(rest, ".."):
		t.kind, n = kindRange, len("..")
	case strings.IndexByte(",=()+-*/^<>?.", c) >= 0:
		t.kind, t.punct = kindPunct, rune(c)
	case strings.HasPrefix(rest, "±"):
		t.kind, t.punct, n = kindPunct, '±', len("±")
	case strings.HasPrefix(rest, "\u2212"): // the minus sign that typesetters use
		t.kind, t.punct, n = kindPunct, '-', len("\u2212")
	default:
		return s.stray(t)
	}
	s.skip(n)
	t.end = s.pos
	return t
}

// number reads a token that begins with a digit: a quantity or a name.
func (s *scanner) number(t token) token {
	head := s.head()
	r, err := quantity.Scan(head)
	var wrong *quantity.Error
	if errors.As(err, &wrong) && wrong.Length == longestNumber || err == nil && r.Length == longestNumber {
		err = &quantity.Error{Code: "bad-number", Message: "the number has too many digits", Length: chain(s.rest())}
	}
	if err == nil {
		t.kind, t.value, t.bare, t.code, t.percent = kindNumber, r.Quantity, r.Bare, r.Code, r.Percent()
		s.skip(r.Length)
		t.end = s.pos
		return t
	}
	if !errors.As(err, &wrong) {
		t.kind = kindWord
		s.skip(chain(s.rest()))
		t.end = s.pos
		return t
	}
	t.kind = kindBad
	s.skip(wrong.Length)
	t.end = s.pos
	s.complain(t, wrong.Code, wrong.Hint, "%s", wrong.Message)
	return t
}

// longestNumber in bytes bounds what is looked at to read a number, so that a line
// of megabytes costs little.
const longestNumber = 1000

// head is the text that a number may reach into.
func (s *scanner) head() string {
	rest := s.rest()
	return rest[:min(len(rest), longestNumber)]
}

// quoted reads "…", in which \" is a quotation mark and \\ a backslash.
func (s *scanner) quoted(t token) token {
	rest := s.rest()
	i := 1
	for ; i < len(rest) && rest[i] != '\n'; i++ {
		switch {
		case rest[i] == '\\' && i+1 < len(rest) && (rest[i+1] == '"' || rest[i+1] == '\\'):
			i++
		case rest[i] == '"':
			t.kind = kindString
			s.skip(i + 1)
			t.end = s.pos
			return t
		}
	}
	t.kind = kindBad
	s.skip(i)
	t.end = s.pos
	s.complain(t, "open-text", `end it with "`, "the text in quotation marks does not end on its line")
	return t
}

// unquote gives the text between the quotation marks of a token.
func unquote(text string) string {
	text = text[1 : len(text)-1]
	if !strings.Contains(text, `\`) {
		return text
	}
	return strings.NewReplacer(`\\`, `\`, `\"`, `"`).Replace(text)
}

func quote(text string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(text) + `"`
}

// stray complains of characters that begin nothing, all that stand together at
// once.
func (s *scanner) stray(t token) token {
	rest := s.rest()
	r, n := utf8.DecodeRuneInString(rest)
	hint := ""
	switch {
	case strings.ContainsRune("“”„«»‘’'", r):
		hint = `texts stand between straight quotation marks: "…"`
	case r == ';':
		hint = "a statement ends with its line"
	case r == '{' || r == '[':
		hint = "brackets are round"
	case r == '≤' || r == '≥':
		hint = "bounds are written < and >"
	}
	what := fmt.Sprintf("the character %q has no meaning here", r)
	if unicode.IsLetter(r) || unicode.IsDigit(r) {
		for n < len(rest) {
			r, size := utf8.DecodeRuneInString(rest[n:])
			if !unicode.IsLetter(r) && !unicode.IsDigit(r) && r != '_' {
				break
			}
			n += size
		}
		what, hint = fmt.Sprintf("%s is no name", clip(rest[:n])), "names are made of ASCII letters, digits and _"
	}
	t.kind = kindBad
	s.skip(n)
	t.end = s.pos
	if !s.quiet {
		s.complain(t, "bad-character", hint, "%s", what)
	}
	return t
}

func (s *scanner) complain(t token, code, hint, format string, args ...any) {
	s.say(diag.Diagnostic{Code: code, Message: fmt.Sprintf(format, args...), Hint: hint, Span: diag.Span{File: s.name, Start: t.start, End: t.end}})
}

func isNameByte(b byte) bool {
	return b >= '0' && b <= '9' || b|0x20 >= 'a' && b|0x20 <= 'z' || b == '_' // 0x20 is the ASCII case bit
}

// chain is the length of the names at the head of s, joined by single points and
// colons: tail, tail.V, LAMP.1.I, D1:D2.V.
func chain(s string) int {
	n := 0
	for n < len(s) && (isNameByte(s[n]) || (s[n] == '.' || s[n] == ':') && n > 0 && n+1 < len(s) && isNameByte(s[n+1])) {
		n++
	}
	return n
}

// clip shortens what a message quotes.
func clip(s string) string {
	const most = 40 // characters; a message stays one line
	if len(s) <= most || utf8.RuneCountInString(s) <= most {
		return s
	}
	return string([]rune(s)[:most]) + "…"
}
