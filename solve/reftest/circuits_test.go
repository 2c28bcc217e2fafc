package reftest

import (
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"biaswright/netlist"
	"biaswright/solve"
)

// demoCircuits reads every circuit that ships, by its path.
func demoCircuits(t *testing.T) map[string][]byte {
	t.Helper()
	files, err := filepath.Glob(circuitsGlob)
	if err != nil {
		t.Fatal(err)
	}
	texts := map[string][]byte{}
	for _, f := range files {
		text, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		texts[f] = text
	}
	if len(texts) < 5 { // three demos and two workloads
		t.Fatalf("%d circuits found, expected at least 5", len(texts))
	}
	return texts
}

// TestDemoCircuits solves each circuit that ships: it must meet what it states,
// at nominal and at every end of its ranges, without a warning or a caution.
func TestDemoCircuits(t *testing.T) {
	for file, text := range demoCircuits(t) {
		t.Run(filepath.Base(file), func(t *testing.T) {
			c := read(t, file, text)
			for _, w := range c.Warnings {
				t.Errorf("warning: %s", w.Message)
			}
			nominal := point(t, c)
			for _, x := range solve.Cautions(nominal) {
				t.Errorf("caution: %+v", x)
			}
			judge(t, nominal, nil)
			axes := []string{"ambient"}
			for _, r := range c.Rails {
				axes = append(axes, r.Name)
			}
			for _, axis := range axes {
				id, ok := c.Lookup(axis)
				if !ok || !c.Slots[id].Bounds.Stated {
					continue
				}
				for _, end := range []string{"low", "high"} {
					at, list := c.At(netlist.Setting{Name: axis, Value: end})
					if list.HasErrors() {
						t.Fatalf("%s %s: %v", axis, end, list)
					}
					judge(t, point(t, at), nominal)
				}
			}
		})
	}
}

// judge fails for each requirement that a point does not meet.
func judge(t *testing.T, p, nominal *solve.Point) {
	t.Helper()
	for _, v := range solve.Judge(p, nominal) {
		if nominal != nil && v.Kind == "target" {
			continue // a target is for the nominal point
		}
		if !v.Met {
			t.Errorf("%s %s: %g, allowed %g to %g", v.Kind, v.Q.Text, v.Value, v.Low, v.High)
		}
	}
}

// TestWorkloadsHaveTheirSize holds the workloads to the sizes that their
// figures are stated for.
func TestWorkloadsHaveTheirSize(t *testing.T) {
	for _, want := range []struct {
		file             string
		free, transistor int // nodes that no rail holds; transistors
		junction         int // diodes, members of rows counted each
	}{
		{"w1.bias", 5, 1, 4}, // and two inner nodes behind Rbulk: 7 unknowns
		{"w2.bias", 25, 14, 0},
	} {
		text, err := os.ReadFile(filepath.Join(filepath.Dir(circuitsGlob), want.file))
		if err != nil {
			t.Fatal(err)
		}
		c := read(t, want.file, text)
		free, transistor, junction := -1, 0, 0 // gnd is no unknown
		for _, n := range c.Nodes {
			if n.Rail == netlist.None {
				free++
			}
		}
		for _, e := range c.Elements {
			switch e.Kind {
			case netlist.TransistorPart:
				transistor++
			case netlist.JunctionPart:
				junction += e.Row
			}
		}
		if free != want.free || transistor != want.transistor || junction != want.junction {
			t.Errorf("%s: %d free nodes, %d transistors, %d diodes; expected %d, %d, %d",
				want.file, free, transistor, junction, want.free, want.transistor, want.junction)
		}
	}
}

// TestReadmeShowsTheCircuit keeps the text that README prints in step with the
// file, comments and blank lines aside.
func TestReadmeShowsTheCircuit(t *testing.T) {
	readme, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	_, rest, _ := strings.Cut(string(readme), "without its comments:\n\n```\n")
	shown, _, found := strings.Cut(rest, "```\n")
	if !found {
		t.Fatal("README shows no circuit")
	}
	file, err := os.ReadFile(filepath.Join(filepath.Dir(circuitsGlob), "mast-lamp.bias"))
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(statements(string(file)), statements(shown)); d != "" {
		t.Errorf("README differs from the file (-file +README):\n%s", d)
	}
}

// statements are a text's lines without comments and blank lines.
func statements(text string) []string {
	return slices.DeleteFunc(strings.Split(text, "\n"), func(line string) bool {
		return line == "" || strings.HasPrefix(line, "#")
	})
}
