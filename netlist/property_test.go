package netlist

import (
	"fmt"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"biaswright/netlist/syntax"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func format(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

// picture is all that a circuit says, by names, whatever the order of its tables.
func picture(c *Circuit) map[string]string {
	p := map[string]string{"title": c.Title}
	for _, s := range c.Slots {
		p["slot "+s.Name] = format(s.Value) + fmt.Sprint(s.Unit, s.Stated, s.Bounds)
	}
	for _, e := range c.Elements {
		chain := ""
		for _, n := range e.Chain {
			chain += " " + c.nodeName(n)
		}
		p["element "+e.Name] = fmt.Sprint(e.Kind, chain, " base ", c.nodeName(e.Base), e.Reversed, e.Series)
	}
	for _, n := range c.Nodes {
		p["node "+n.Name] = fmt.Sprint(n.Rail != None, n.Made)
	}
	for _, k := range c.Keeps {
		p["keep "+k.Text] = ""
	}
	for _, t := range c.Targets {
		p["target "+t.Q.Text] = fmt.Sprint(t.Value, t.Within, t.Relative)
	}
	for _, h := range c.Hands {
		p["hand "+h.Q.Text] = h.Value.Text
	}
	for _, a := range c.Assumed {
		p["assume "+a.Key] = fmt.Sprint(a.Value, a.Part == None)
	}
	for _, e := range c.Load {
		p["load"] += " " + c.Elements[e].Name
	}
	return p
}

func TestOrderOfStatementsDoesNotMatter(t *testing.T) {
	for name, text := range map[string]string{"lamp": lamp, "follows": follows} {
		t.Run(name, func(t *testing.T) {
			want := picture(read(t, text))
			lines := strings.Split(strings.TrimSpace(text), "\n")
			rapid.Check(t, func(t *rapid.T) {
				shuffled := rapid.Permutation(lines).Draw(t, "lines")
				c, diags := Read("test.bias", []byte(strings.Join(shuffled, "\n")+"\n"), testCatalogue(), nil)
				if c == nil {
					t.Fatalf("%v", diags)
				}
				if diff := cmp.Diff(want, picture(c)); diff != "" {
					t.Fatalf("(-in order +shuffled):\n%s", diff)
				}
			})
		})
	}
}

// ladder is a text of n stages: a resistor, a diode to ground, and every third
// stage a transistor.
func ladder(n int) string {
	var b strings.Builder
	b.WriteString("rail VCC = 12 V (10 V .. 14 V)\npart sig diode drop = 0.62 V at 1 mA\npart gp npn betaF = 100\n")
	b.WriteString("path VCC -> R0 1k -> n0 -> D0 sig -> gnd\n")
	for i := 1; i < n; i++ {
		fmt.Fprintf(&b, "path n%d -> R%d 1k 5%% -> n%d -> D%d sig -> gnd\n", i-1, i, i, i)
		if i%3 == 0 {
			fmt.Fprintf(&b, "path VCC -> RC%d 10k -> c%d -> Q%d gp base=n%d -> gnd\n", i, i, i, i)
		}
	}
	return b.String()
}

func TestLargeFile(t *testing.T) {
	const stages = 4000 // 2 elements each, and 2 more in every third
	c := read(t, ladder(stages))
	if got := len(c.Elements); got < 10000 {
		t.Errorf("%d elements", got)
	}
}

func BenchmarkResolve(b *testing.B) {
	for _, stages := range []int{4, 40, 4000} {
		tree, diags := syntax.Parse("ladder.bias", []byte(ladder(stages)))
		if diags.HasErrors() {
			b.Fatal(diags)
		}
		cat := testCatalogue()
		b.Run(strconv.Itoa(stages), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if c, diags := Resolve(tree, cat, nil); c == nil {
					b.Fatal(diags)
				}
			}
		})
	}
}

func BenchmarkWith(b *testing.B) {
	c := read(b, lamp)
	b.ReportAllocs()
	for b.Loop() {
		c.With(Setting{"VCC", "11"})
	}
}

// FuzzResolve: no text makes the resolver panic; there is a circuit exactly when
// there are no errors; what it says has places in the text.
func FuzzResolve(f *testing.F) {
	f.Add(lamp)
	f.Add(follows)
	f.Add(ladder(4))
	for _, text := range shuffledWords(50) {
		f.Add(text)
	}
	cat := testCatalogue()
	f.Fuzz(func(t *testing.T, text string) {
		c, diags := Read("fuzz.bias", []byte(text), cat, Files{Shelves: testShelves})
		if (c == nil) != diags.HasErrors() {
			t.Fatalf("circuit %v with %v", c != nil, diags)
		}
		for _, d := range diags {
			if d.Message == "" || d.Code == "" || d.Span.Start.Offset > len(text) && d.Span.File == "fuzz.bias" {
				t.Fatalf("%+v", d)
			}
		}
		if c == nil {
			return
		}
		for _, name := range c.Names() {
			id, ok := c.Lookup(name)
			if !ok || c.Slots[id].Name != name {
				t.Fatalf("Names lists %s, which Lookup does not find", name)
			}
		}
		c.Propagate(c.Values())
		c.Chain(make([]float64, len(c.Slots)))
	})
}

// shuffledWords makes texts that are nearly right: the words of good ones, some
// exchanged or left out.
func shuffledWords(n int) []string {
	random := rand.New(rand.NewPCG(1, 2))
	var out []string
	for range n {
		lines := strings.Split(lamp, "\n")
		for range 3 {
			at := random.IntN(len(lines))
			words := strings.Fields(lines[at])
			if len(words) < 2 {
				continue
			}
			i, j := random.IntN(len(words)), random.IntN(len(words))
			words[i], words[j] = words[j], words[i]
			lines[at] = strings.Join(words[:len(words)-random.IntN(2)], " ")
		}
		out = append(out, strings.Join(lines, "\n"))
	}
	return out
}

// What is nearly right must not panic either; the fuzz target has the same texts
// as seeds, and here there are more.
func TestNearlyRight(t *testing.T) {
	for _, text := range shuffledWords(500) {
		c, diags := Read("near.bias", []byte(text), testCatalogue(), nil)
		if (c == nil) != diags.HasErrors() {
			t.Fatalf("circuit %v with %v in\n%s", c != nil, diags, text)
		}
	}
}
