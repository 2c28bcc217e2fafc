// Package expect checks diagnostics against the errors that a text itself says it
// expects: a line with errors ends in the comment
//
//	# error: a part of the message | a part of the next
//
// and likewise "# warning: …" for warnings. What is said of no line, or of the
// text as a whole, is expected in the first line.
package expect

import (
	"fmt"
	"strings"

	"biaswright/netlist/diag"
)

type key struct {
	line     int
	severity diag.Severity
}

// Check compares a list with what the text expects and returns what differs, one
// string each, in the order of the list and then of the text.
func Check(text string, list diag.List) []string {
	want := map[key][]string{}
	lines := strings.Split(text, "\n")
	for i, line := range lines {
		for _, s := range []diag.Severity{diag.Error, diag.Warning} {
			if _, parts, ok := strings.Cut(line, "# "+s.String()+": "); ok {
				want[key{i + 1, s}] = strings.Split(strings.TrimSpace(parts), " | ")
			}
		}
	}
	var out []string
	for _, d := range list {
		k := key{max(d.Span.Start.Line, 1), d.Severity}
		if !strike(want, k, d.Message) {
			out = append(out, fmt.Sprintf("%d:%d: unexpected %s: %s", k.line, d.Span.Start.Column, d.Severity, d.Message))
		}
	}
	for i := range lines {
		for _, s := range []diag.Severity{diag.Error, diag.Warning} {
			for _, w := range want[key{i + 1, s}] {
				out = append(out, fmt.Sprintf("%d: missing %s: %s", i+1, s, w))
			}
		}
	}
	return out
}

// strike removes the first expectation that the message meets.
func strike(want map[key][]string, k key, message string) bool {
	for i, w := range want[k] {
		if strings.Contains(message, w) {
			want[k] = append(append([]string{}, want[k][:i]...), want[k][i+1:]...)
			return true
		}
	}
	return false
}
