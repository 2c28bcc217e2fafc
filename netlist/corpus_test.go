package netlist

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// wanted are the errors that a text of the invalid corpus expects, by line: a line
// ends in the comment "# error: " and a part of the message. What is said of the
// file as a whole is expected in its first line.
func wanted(text string) map[int]string {
	want := map[int]string{}
	for i, line := range strings.Split(text, "\n") {
		if _, message, ok := strings.Cut(line, "# error: "); ok {
			want[i+1] = strings.TrimSpace(message)
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
				if w, ok := want[line]; ok && strings.Contains(d.Message, w) {
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
