package syntax

import (
	"os"
	"path/filepath"
	"testing"

	"biaswright/netlist/internal/expect"
)

// corpus reads the files of a pattern below testdata.
func corpus(t testing.TB, pattern string) map[string][]byte {
	t.Helper()
	files, err := filepath.Glob("../../testdata/" + pattern)
	if err != nil || len(files) == 0 {
		t.Fatalf("no files %s: %v", pattern, err)
	}
	out := map[string][]byte{}
	for _, file := range files {
		if out[file], err = os.ReadFile(file); err != nil {
			t.Fatal(err)
		}
	}
	return out
}

// Each text of the corpus that is wrong in its form says exactly the errors that
// its comments expect (package expect), all in one run.
func TestInvalid(t *testing.T) {
	for file, text := range corpus(t, "invalid/syn-*.bias") {
		_, list := Parse(file, text)
		for _, difference := range expect.Check(string(text), list) {
			t.Errorf("%s:%s", filepath.Base(file), difference)
		}
	}
}

// The circuits of the tests parse, and their canonical text settles.
func TestCircuitsSettle(t *testing.T) {
	for file, text := range corpus(t, "circuits/*.bias") {
		f, list := Parse(file, text)
		if list.HasErrors() {
			t.Errorf("%s: %v", file, list)
			continue
		}
		settles(t, f)
	}
}

func FuzzParse(f *testing.F) {
	for _, pattern := range []string{"circuits/*.bias", "invalid/syn-*.bias"} {
		for _, text := range corpus(f, pattern) {
			f.Add(string(text))
		}
	}
	f.Fuzz(func(t *testing.T, text string) {
		tree, list := Parse("fuzz", []byte(text))
		for _, d := range list {
			if d.Message == "" || d.Span.Start.Offset > len(text) || d.Span.End.Offset > len(text) || d.Span.End.Offset < d.Span.Start.Offset {
				t.Fatalf("a diagnostic outside of the text: %+v", d)
			}
		}
		if tree != nil && !list.HasErrors() {
			settles(t, tree)
		}
	})
}

// The scanner moves forward over any text, and its tokens lie within their lines.
func FuzzScan(f *testing.F) {
	f.Add("path VCC → R1 4k7 ±5% \"x\" .. 1.8 kΩ")
	f.Fuzz(func(t *testing.T, text string) {
		p := newParser("fuzz", text)
		end := 0
		for p.gather() {
			for _, tok := range p.toks {
				if tok.start.Offset < end || tok.end.Offset <= tok.start.Offset || tok.end.Offset > len(text) {
					t.Fatalf("token %+v begins before byte %d or is empty", tok, end)
				}
				end = tok.end.Offset
				if tok.start.Line != tok.end.Line || p.s.src[tok.start.Offset] == '\n' {
					t.Fatalf("token %+v spans lines", tok)
				}
			}
		}
	})
}
