package reftest

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"biaswright/solve"
)

// TestRandomNetworks solves networks drawn at random: every one must settle, for
// each has a point (positive resistors to the rails, passive junctions, no two
// held nodes joined by junctions alone). By default a small subset; all of them
// with BIASWRIGHT_RANDOM=2000.
func TestRandomNetworks(t *testing.T) {
	count := 60 // enough to notice a break, in about a second
	if s := os.Getenv("BIASWRIGHT_RANDOM"); s != "" {
		n, err := strconv.Atoi(s)
		if err != nil || n < 1 {
			t.Fatalf("BIASWRIGHT_RANDOM=%q: a number of networks is wanted", s)
		}
		count = n
	}
	ways, steps := map[string]int{}, []int{}
	failed := 0
	for i := range count {
		text := randomText(uint64(i))
		c := read(t, fmt.Sprintf("random-%d.bias", i), []byte(text))
		r, err := solve.Solve(c, solve.Options{})
		if err != nil {
			failed++
			says := err.Error()
			var f *solve.Failure
			if errors.As(err, &f) {
				says = fmt.Sprintf("%s; tried %+v", f.Says, f.Tried)
			}
			t.Errorf("network %d does not settle: %s\n%s", i, says, text)
			continue
		}
		ways[r.Point.Evidence.Way]++
		steps = append(steps, r.Point.Evidence.Steps)
		if i%10 == 0 { // forty digits take their time
			checkBalances(t, r.Point)
		}
	}
	t.Logf("%d of %d random networks settled", count-failed, count)
	if len(steps) > 0 {
		slices.Sort(steps)
		t.Logf("Newton steps of the way that found the point: median %d, most %d", steps[len(steps)/2], steps[len(steps)-1])
	}
	for _, way := range slices.Sorted(maps.Keys(ways)) {
		t.Logf("%5d by %s", ways[way], way)
	}
}

// A draw writes one random network.
type draw struct {
	*rand.Rand
	b     strings.Builder
	held  []string // rails and gnd
	inner []string
	lines int
	ends  map[string]int // connections of each inner node
}

// randomText draws the network of that number: 3 to 60 inner nodes, up to three
// rails to ±200 V, resistors from 1 ohm to 1 Mohm (six decades), and about as
// many junctions and transistors as nodes.
func randomText(number uint64) string {
	d := &draw{Rand: rand.New(rand.NewPCG(number, 0x626961735f)), ends: map[string]int{}} // any fixed second word
	fmt.Fprintf(&d.b, "title \"random network %d\"\n", number)
	d.rails()
	d.parts()
	for i := range 3 + d.IntN(58) {
		d.inner = append(d.inner, fmt.Sprintf("n%d", i))
	}
	// A tree of resistors: each node hangs on an earlier one or on a held one.
	for i, n := range d.inner {
		onto := pickOf(d, d.held)
		if i > 0 && d.IntN(3) > 0 {
			onto = d.inner[d.IntN(i)]
		}
		d.resistor(onto, n)
	}
	for range d.IntN(len(d.inner) + 1) {
		if a, b := d.any(), pickOf(d, d.inner); a != b {
			d.resistor(a, b)
		}
	}
	for range 1 + d.IntN(len(d.inner)) {
		if d.IntN(2) == 0 {
			d.junction()
		} else {
			d.transistor()
		}
	}
	for _, n := range d.inner {
		if d.ends[n] < 2 { // a node with one connection is an error
			d.resistor("gnd", n)
		}
	}
	return d.b.String()
}

func (d *draw) rails() {
	d.held = []string{"gnd"}
	// The first is positive: it is the one that collectors may stand on.
	fmt.Fprintf(&d.b, "rail VP = %s V\n", number(d.decade(1, 200)))
	d.held = append(d.held, "VP")
	if d.IntN(2) == 0 {
		fmt.Fprintf(&d.b, "rail VN = %s V\n", number(-d.decade(1, 200)))
		d.held = append(d.held, "VN")
	}
	fmt.Fprintf(&d.b, "ambient = %s degC\n", number(math.Round(-40+165*d.Float64())))
}

// Kinds and values that parts have in practice, and some beyond it.
func (d *draw) parts() {
	for i := range 2 {
		fmt.Fprintf(&d.b, "part dio%d diode Isat = %s A, n = %s, Rbulk = %s ohm\n",
			i, number(d.decade(1e-18, 1e-8)), number(d.span(1, 2)), number([]float64{0, d.decade(0.1, 10)}[d.IntN(2)]))
		fmt.Fprintf(&d.b, "part zen%d zener Isat = %s A, Vz = %s V at 5 mA, nz = %s\n",
			i, number(d.decade(1e-16, 1e-10)), number(d.decade(2.7, 50)), number(d.span(1, 8)))
		for _, kind := range []string{"npn", "pnp"} {
			va := "infinite"
			if d.IntN(2) == 0 {
				va = number(d.span(30, 200)) + " V"
			}
			fmt.Fprintf(&d.b, "part %s%d %s Isat = %s A, betaF = %s, betaR = %s, VA = %s, Irec = %s A\n",
				kind, i, kind, number(d.decade(1e-18, 1e-12)), number(d.decade(20, 500)), number(d.decade(0.1, 10)), va,
				number([]float64{0, d.decade(1e-16, 1e-12)}[d.IntN(2)]))
		}
	}
}

func (d *draw) decade(low, high float64) float64 { return low * math.Pow(high/low, d.Float64()) }
func (d *draw) span(low, high float64) float64   { return low + (high-low)*d.Float64() }
func (d *draw) any() string                      { return pickOf(d, append(slices.Clone(d.held), d.inner...)) }
func pickOf(d *draw, from []string) string       { return from[d.IntN(len(from))] }

// name makes the next designator and counts the connections that it adds.
func (d *draw) name(letter string, nodes ...string) string {
	for _, n := range nodes {
		d.ends[n]++
	}
	d.lines++
	return fmt.Sprintf("%s%d", letter, d.lines)
}

func (d *draw) resistor(a, b string) {
	fmt.Fprintf(&d.b, "path %s -> %s %s -> %s\n", a, d.name("R", a, b), number(d.decade(1, 1e6)), b)
}

// junction joins two inner nodes, or one and gnd: rails reach junctions through
// resistors alone, so that no supply is shorted through a forward junction. Rows
// are left out: a node that only reverse leakage holds, between two reversed
// junctions with bulk resistance, is README's "indeterminate node".
func (d *draw) junction() {
	a, b := pickOf(d, d.inner), pickOf(d, append([]string{"gnd"}, d.inner...))
	if a == b {
		return
	}
	if d.IntN(2) == 0 {
		a, b = b, a
	}
	what := pickOf(d, []string{"dio0", "dio1", "zen0", "zen1", "zen0 reversed", "dio0 row=2", "dio1 row=3 reversed"})
	fmt.Fprintf(&d.b, "path %s -> %s %s -> %s\n", a, d.name("D", a, b), what, b)
}

// transistor stands on inner nodes; an npn's collector may stand on the positive
// rail, any emitter on gnd (but never both at once, with the base the only node
// between them).
func (d *draw) transistor() {
	kind := pickOf(d, []string{"npn", "pnp"})
	collector, base, emitter := pickOf(d, d.inner), pickOf(d, d.inner), pickOf(d, d.inner)
	switch d.IntN(4) {
	case 0:
		emitter = "gnd"
	case 1:
		if kind == "npn" {
			collector = "VP"
		}
	}
	if collector == emitter || base == emitter {
		return
	}
	fmt.Fprintf(&d.b, "place %s %s%d collector=%s base=%s emitter=%s size=%s\n",
		d.name("Q", collector, base, emitter), kind, d.IntN(2), collector, base, emitter, number(math.Round(d.span(1, 8))))
}
