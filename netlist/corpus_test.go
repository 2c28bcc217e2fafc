package netlist

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// wanted are the errors and warnings that a text of the invalid corpus expects, by
// line: a line ends in the comment "# error: " or "# warning: " and a part of the
// message. What is said of the file as a whole is expected in its first line.
func wanted(text string) map[int]string {
	want := map[int]string{}
	for i, line := range strings.Split(text, "\n") {
		for _, severity := range []string{"error: ", "warning: "} {
			if _, message, ok := strings.Cut(line, "# "+severity); ok {
				want[i+1] = severity + strings.TrimSpace(message)
			}
		}
	}
	return want
}

// Each text of the corpus that is wrong in its meaning says exactly the errors that
// it expects.
func TestInvalid(t *testing.T) {
	files, err := filepath.Glob("../testdata/invalid/sem-*.bias")
	if err != nil || len(files) == 0 {
		t.Fatalf("no corpus: %v", err)
	}
	for _, file := range files {
		t.Run(filepath.Base(file), func(t *testing.T) {
			text, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			want := wanted(string(text))
			c, diags := Read(file, text, testCatalogue(), nil)
			if c != nil {
				t.Error("it has no errors")
			}
			for _, d := range diags {
				line := max(d.Span.Start.Line, 1)
				severity, part, _ := strings.Cut(want[line], ": ")
				if severity == d.Severity.String() && strings.Contains(d.Message, part) {
					delete(want, line)
					continue
				}
				t.Errorf("%d:%d: unexpected %v %s: %s", line, d.Span.Start.Column, d.Severity, d.Code, d.Message)
			}
			for line, w := range want {
				t.Errorf("%d: missing: %s", line, w)
			}
		})
	}
}
