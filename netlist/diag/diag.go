// Package diag holds what the language says about a text: places in it, and
// diagnostics as values with a message, a place, a hint and related places.
package diag

// A Position is one place in a source text. Line and Column count from 1; a
// column is one Unicode code point. Offset counts bytes from 0.
type Position struct {
	Line, Column, Offset int
}

// A Span is the stretch of a file from Start up to, not including, End. The
// zero Span means "no place" (a command-line setting, say).
type Span struct {
	File       string
	Start, End Position
}

// A Severity tells an error, which makes a file unusable, from a warning.
type Severity int

// The severities.
const (
	Error Severity = iota
	Warning
)

// A Related place explains a diagnostic: "first declared here".
type Related struct {
	Span    Span
	Message string
}

// A Diagnostic is one thing to say about a text. Code is a short stable word
// for scripts ("unknown-name"); Message has no trailing full stop; Hint is
// advice, or empty.
type Diagnostic struct {
	Severity Severity
	Code     string
	Message  string
	Span     Span
	Hint     string
	Related  []Related
}

// A List is the diagnostics of one run over a text.
type List []Diagnostic

// HasErrors reports whether any diagnostic of the list is an Error.
func (l List) HasErrors() bool {
	for _, d := range l {
		if d.Severity == Error {
			return true
		}
	}
	return false
}
