package hand_test

import (
	"math"
	"os"
	"path/filepath"
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/sweep/hand"
)

func read(t testing.TB, name, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read(name, []byte(text), devices.Catalogue(), netlist.Files{})
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
	return out
}

func check(t testing.TB, c *netlist.Circuit) *hand.Answer {
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
			t.Logf("%s %s hand %.9g ideal %.9g full %.9g shares %v %v", filepath.Base(c.File), r.Q.Text, r.Hand, r.Ideal, r.Full, a.Players, r.Shares)
		}
	}
}
