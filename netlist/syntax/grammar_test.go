package syntax

import (
	"os"
	"regexp"
	"strings"
	"testing"
)

// frames make a statement of an example of each production that is none itself.
var frames = map[string]string{
	"Segment": "path a -> @", "Element": "path a -> @ -> b", "Modifier": "path a -> E1 p @ -> b",
	"Params": "part p diode @", "Param": "part p diode @", "Value": "rail X = @", "Bounds": "rail X = 5 V @", "Ends": "rail X = 5 V @",
	"Expr": "given x = @", "Product": "given x = @", "Signed": "given x = @", "Power": "given x = @", "Operand": "given x = @",
	"Quantity": "keep @ < 5 V", "Number": "given x = @", "Node": "path a -> R1 1k -> @", "Ref": "load @", "Arrow": "path a @ R1 1k -> b",
}

// The grammar in the package's documentation agrees with the parser: each
// production has an example that is accepted, and what it says is refused is.
func TestGrammar(t *testing.T) {
	src, err := os.ReadFile("doc.go")
	if err != nil {
		t.Fatal(err)
	}
	production := regexp.MustCompile(`^//\t([A-Z][a-z]+) +=`)
	example := regexp.MustCompile(`^//\t  (e\.g\.|not) +(.*)$`)
	name, seen := "", map[string]int{}
	for line := range strings.Lines(string(src)) {
		line = strings.TrimRight(line, "\n")
		if m := production.FindStringSubmatch(line); m != nil {
			name = m[1]
			seen[name] = 0
			continue
		}
		m := example.FindStringSubmatch(line)
		if m == nil {
			continue
		}
		text := m[2]
		if frame, ok := frames[name]; ok {
			text = strings.Replace(frame, "@", text, 1)
		}
		f, list := Parse("doc", []byte(text+"\n"))
		if accepted := !list.HasErrors(); accepted != (m[1] == "e.g.") {
			t.Errorf("%s: accepted is %v for %q: %v", name, accepted, text, list)
			continue
		}
		if m[1] == "e.g." {
			seen[name]++
			settles(t, f)
		}
	}
	if len(seen) < 30 { // the grammar has 35 productions: the pattern still fits
		t.Fatalf("found only %d productions", len(seen))
	}
	for name := range frames {
		if _, ok := seen[name]; !ok {
			t.Errorf("there is a frame for %s, which is no production", name)
		}
	}
	for name, n := range seen {
		if n == 0 {
			t.Errorf("%s has no example", name)
		}
	}
}

// settles checks that printing a tree gives a text that parses to the same tree
// and prints the same.
func settles(t checker, f *File) {
	t.Helper()
	once := Print(f)
	again, list := Parse("printed", once)
	if list.HasErrors() {
		t.Fatalf("the canonical text does not parse: %v\n%s", list, once)
	}
	if twice := Print(again); string(twice) != string(once) {
		t.Fatalf("the canonical text does not settle:\n%s\nbecomes\n%s", once, twice)
	}
	if diff := same(f, again); diff != "" {
		t.Fatalf("the canonical text means something else:\n%s\n%s", once, diff)
	}
}

// A checker is a testing.TB or a *rapid.T.
type checker interface {
	Helper()
	Fatalf(format string, args ...any)
}
