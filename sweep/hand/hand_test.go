package hand_test

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/sweep/hand"
)

func read(t rapid.TB, name, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read(name, []byte(text), devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
	if list.HasErrors() {
		t.Fatalf("%s: %+v", name, list)
	}
	return c
}

// demos are the shipped circuits with hand lines.
func demos(t *testing.T) []*netlist.Circuit {
	t.Helper()
	names, err := filepath.Glob(filepath.Join("..", "..", "testdata", "circuits", "*.bias"))
	if err != nil {
		t.Fatal(err)
	}
	var out []*netlist.Circuit
	for _, name := range names {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		if c := read(t, name, string(text)); len(c.Hands) > 0 {
			out = append(out, c)
		}
	}
	const shipped = 9 // those with hand lines
	if len(out) < shipped {
		t.Fatalf("%d circuits with hand lines, expected %d", len(out), shipped)
	}
	return out
}

func check(t rapid.TB, c *netlist.Circuit) *hand.Answer {
	t.Helper()
	a, err := hand.Check(c, hand.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// The row of the formula and the assumptions' shares add up to the difference between
// hand and full.
func TestSharesAddUp(t *testing.T) {
	for _, c := range demos(t) {
		a := check(t, c)
		if a.Unsplit != nil {
			t.Errorf("%s: %v", c.File, a.Unsplit)
			continue
		}
		for i := range a.Rows {
			r := &a.Rows[i]
			sum := 0.0
			for _, s := range r.Shares {
				sum += s
			}
			if d := math.Abs(r.Ideal + sum - r.Full); d > 1e-9*math.Abs(r.Full) {
				t.Errorf("%s: %s: shares miss the difference by %g", c.File, r.Q.Text, d)
			}
		}
	}
}

// The shares are the average, over every order in which the assumptions may be taken
// away, of what taking each away changes. Each combination is a file of its own here,
// with an assume line of just those.
func TestSharesAreTheAverageOverAllOrders(t *testing.T) {
	for _, c := range demos(t) {
		t.Run(filepath.Base(c.File), func(t *testing.T) {
			text, err := os.ReadFile(c.File)
			if err != nil {
				t.Fatal(err)
			}
			before, line, after := assumeLine(t, string(text))
			items := strings.Split(line, ",")
			value := map[int][]float64{}
			for set := range 1 << len(items) {
				var kept []string
				for i, item := range items {
					if set>>i&1 == 1 {
						kept = append(kept, item)
					}
				}
				line := ""
				if len(kept) > 0 {
					line = "assume " + strings.Join(kept, ",")
				}
				some := check(t, read(t, c.File, before+line+after))
				for i := range some.Rows {
					value[set] = append(value[set], some.Rows[i].Ideal)
				}
			}
			a := check(t, c)
			for i := range a.Rows {
				want := averaged(len(items), func(set int) float64 { return value[set][i] })
				for k, share := range a.Rows[i].Shares {
					if d := math.Abs(share - want[k]); !(d <= 1e-9*math.Abs(a.Rows[i].Full)) {
						t.Errorf("%s: %s has %.12g, the average over orders is %.12g", a.Rows[i].Q.Text, a.Players[k].Text, share, want[k])
					}
				}
			}
		})
	}
}

// assumeLine cuts a text about the items of its one assume line.
func assumeLine(t *testing.T, text string) (before, items, after string) {
	t.Helper()
	before, rest, ok := strings.Cut(text, "\nassume ")
	items, after, _ = strings.Cut(rest, "\n")
	if !ok || strings.Contains(after, "\nassume ") {
		t.Fatal("the text has not one assume line")
	}
	return before + "\n", items, "\n" + after
}

// averaged gives each of k players what v loses, in the mean over all orders of taking
// the players away from a full set.
func averaged(k int, v func(set int) float64) []float64 {
	sums := make([]float64, k)
	// Each order is walked step by step; all are alike likely.
	var through func(set int, weight float64)
	through = func(set int, weight float64) {
		left := 0
		for i := range k {
			left += set >> i & 1
		}
		for i := range k {
			if set>>i&1 == 1 {
				w := weight / float64(left)
				sums[i] += w * (v(set&^(1<<i)) - v(set))
				through(set&^(1<<i), w)
			}
		}
	}
	through(1<<k-1, 1)
	return sums
}
