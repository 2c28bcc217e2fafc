package diag

import (
	"bytes"
	"fmt"
	"io"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/clipperhouse/displaywidth"
)

// A Printer writes diagnostics the way compilers do:
//
//	mast.bias:7:13: error: there is no part sgi
//	  path VCC -> D1 sgi -> gnd
//	                 ^~~
//	  hint: did you mean sig?
//	  mast.bias:3:1: declared here
//
// The zero Printer writes no source lines, all diagnostics, and no colour.
type Printer struct {
	// Source gives the text of a file that a span names, or nil. May be nil.
	Source func(file string) []byte
	// Plain keeps what the printer adds to ASCII and writes the other characters
	// of a source line as '?'.
	Plain bool
	// Colour marks severities and carets with terminal colours.
	Colour bool
	// Limit is how many diagnostics to write before "and 12 more"; 0 for all.
	Limit int
}

const (
	indent   = "  "
	tabWidth = 4 // columns; a tab is written as spaces so that the caret stays aligned
	// A source line is cut to a window of at most so many columns, which fits
	// beside the indent on a common terminal of 120 columns.
	windowWidth = 110
	// Columns that the window keeps before the caret where it cuts.
	windowLead = 40

	colourError   = "\x1b[1;31m" // bold red
	colourWarning = "\x1b[1;33m" // bold yellow
	colourEnd     = "\x1b[0m"
)

// Write writes the list in its order.
func (p *Printer) Write(w io.Writer, l List) error {
	var b strings.Builder
	for i := range l {
		if p.Limit > 0 && i == p.Limit {
			fmt.Fprintf(&b, "and %d more\n", len(l)-i)
			break
		}
		p.one(&b, &l[i])
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (p *Printer) one(b *strings.Builder, d *Diagnostic) {
	colour := colourError
	if d.Severity == Warning {
		colour = colourWarning
	}
	fmt.Fprintf(b, "%s %s %s\n", place(d.Span), p.paint(colour, d.Severity.String()+":"), printable(d.Message))
	p.excerpt(b, d.Span, colour)
	if d.Hint != "" {
		fmt.Fprintf(b, "%shint: %s\n", indent, printable(d.Hint))
	}
	for _, r := range d.Related {
		fmt.Fprintf(b, "%s%s %s\n", indent, place(r.Span), printable(r.Message))
	}
}

// printable is a text as one line that a terminal only shows: messages quote
// texts and file names, and those may hold anything.
func printable(text string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case unicode.IsSpace(r):
			return ' '
		case obeyed(r):
			return '?'
		}
		return r
	}, text)
}

// obeyed tells the characters that do more than show themselves, and the bytes
// that are none.
func obeyed(r rune) bool {
	return r == utf8.RuneError || !unicode.IsPrint(r) && !unicode.IsMark(r)
}

func (p *Printer) paint(colour, text string) string {
	if !p.Colour {
		return text
	}
	return colour + text + colourEnd
}

// place is "file:line:column:", or as much of it as is known.
func place(s Span) string {
	switch {
	case s.Start.Line > 0:
		return fmt.Sprintf("%s:%d:%d:", printable(s.File), s.Start.Line, s.Start.Column)
	case s.File != "":
		return printable(s.File) + ":"
	}
	return "biaswright:"
}

// excerpt writes the source line of a span and marks the span below it.
func (p *Printer) excerpt(b *strings.Builder, s Span, colour string) {
	if p.Source == nil || s.Start.Line == 0 {
		return
	}
	src := p.Source(s.File)
	if src == nil || s.Start.Offset > len(src) {
		return
	}
	start := bytes.LastIndexByte(src[:s.Start.Offset], '\n') + 1
	line := src[start:]
	if n := bytes.IndexByte(line, '\n'); n >= 0 {
		line = line[:n]
	}
	from := s.Start.Offset - start
	to := len(line)
	if s.End.Line == s.Start.Line && s.End.Offset >= s.Start.Offset {
		to = min(s.End.Offset-start, to)
	}
	text, mark, length := p.window(line, min(from, to), to)
	fmt.Fprintf(b, "%s%s\n", indent, text)
	under := "^" + strings.Repeat("~", max(length-1, 0))
	fmt.Fprintf(b, "%s%s%s\n", indent, strings.Repeat(" ", mark), p.paint(colour, under))
}

// window returns the part of a line to show around the bytes from..to, and the
// column and width of those in it.
func (p *Printer) window(line []byte, from, to int) (text string, mark, length int) {
	// Only what can be seen is looked at, so that a line of megabytes costs
	// little: a character has at most four bytes and a tab four columns.
	const look = windowWidth * 4
	cutLeft, cutRight := false, false
	if lo := from - look; lo > 0 {
		for lo < from && !utf8.RuneStart(line[lo]) {
			lo++
		}
		line, from, to, cutLeft = line[lo:], from-lo, to-lo, true
	}
	if hi := from + look; hi < len(line) {
		for hi > from && !utf8.RuneStart(line[hi]) {
			hi--
		}
		line, to, cutRight = line[:hi], min(to, hi), true
	}
	before := p.clean(line[:from], 0)
	mark = displaywidth.String(before)
	marked := p.clean(line[from:to], mark)
	length = displaywidth.String(marked)
	after := strings.TrimRight(p.clean(line[to:], mark+length), " ")

	ellipsis := "…"
	if p.Plain {
		ellipsis = "..."
	}
	wide := displaywidth.String(ellipsis)
	if mark > windowWidth-windowLead {
		cutLeft = true
	}
	if cutLeft {
		for mark > windowLead-wide {
			_, n := utf8.DecodeRuneInString(before)
			before = before[n:]
			mark = displaywidth.String(before)
		}
		before = ellipsis + before
		mark += wide
	}
	text = before + marked + after
	if displaywidth.String(text) > windowWidth || cutRight {
		text = displaywidth.TruncateString(text, windowWidth-wide, "") + ellipsis
		length = max(min(length, windowWidth-wide-mark), 1)
	}
	return text, mark, length
}

// clean makes a piece of a line that begins at a column fit to print: tabs
// become spaces, what a terminal would obey becomes '?'.
func (p *Printer) clean(piece []byte, column int) string {
	var b strings.Builder
	for len(piece) > 0 {
		r, n := utf8.DecodeRune(piece)
		piece = piece[n:]
		switch {
		case r == '\t':
			spaces := tabWidth - (column+displaywidth.String(b.String()))%tabWidth
			b.WriteString("        "[:spaces])
		case r == '\uFEFF' || r == '\r':
			// a byte order mark, or the first half of a line's end
		case obeyed(r) || p.Plain && r >= utf8.RuneSelf:
			b.WriteByte('?')
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}
