package diag

import (
	"cmp"
	"slices"
)

// Sort orders the list by file name and place, errors before warnings where two
// stand at one place, and otherwise as found. Diagnostics without a place come
// first.
func (l List) Sort() {
	slices.SortStableFunc(l, func(a, b Diagnostic) int {
		return cmp.Or(
			cmp.Compare(a.Span.File, b.Span.File),
			cmp.Compare(a.Span.Start.Offset, b.Span.Start.Offset),
			cmp.Compare(a.Severity, b.Severity),
		)
	})
}

// Unique returns the list without those that repeat an earlier one: same place,
// severity, code and message. The order stays; l itself is not modified.
func (l List) Unique() List {
	type key struct {
		span          Span
		severity      Severity
		code, message string
	}
	seen := make(map[key]bool, len(l))
	var out List
	for _, d := range l {
		k := key{d.Span, d.Severity, d.Code, d.Message}
		if !seen[k] {
			seen[k] = true
			out = append(out, d)
		}
	}
	return out
}

// String names the severity as messages do.
func (s Severity) String() string {
	if s == Warning {
		return "warning"
	}
	return "error"
}

// To returns the span from the start of s to the end of end.
func (s Span) To(end Span) Span {
	s.End = end.End
	return s
}
