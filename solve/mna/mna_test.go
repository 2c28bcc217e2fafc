package mna_test

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// read resolves a text that must be right.
func read(t testing.TB, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	for _, d := range list {
		if c == nil {
			t.Errorf("%d: %s", d.Span.Start.Line, d.Message)
		}
	}
	if c == nil {
		t.Fatalf("the text has errors:\n%s", text)
	}
	return c
}

func shipped(t testing.TB, name string) *netlist.Circuit {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "circuits", name))
	if err != nil {
		t.Fatal(err)
	}
	return read(t, string(text))
}

// settle compiles and solves directly.
func settle(t testing.TB, c *netlist.Circuit) (*mna.System, []float64) {
	t.Helper()
	s, err := mna.New(c)
	if err != nil {
		t.Fatal(err)
	}
	x := make([]float64, s.Size())
	var w newton.Work
	s.Restart()
	if r := newton.Solve(s, x, &w, newton.Options{}); r.Outcome != newton.Converged {
		t.Fatalf("it %s after %d steps", r.Outcome, r.Steps)
	}
	return s, x
}

func value(t testing.TB, st *mna.State, c *netlist.Circuit, text string) float64 {
	t.Helper()
	e, list := c.ParseExpr(text)
	if list.HasErrors() {
		t.Fatalf("%s: %s", text, list[0].Message)
	}
	v, ok := e.Eval(st)
	if !ok {
		t.Fatalf("%s has no number", text)
	}
	return v
}

// Ideal branches: every figure by hand from Ohm's and Kirchhoff's laws.
func TestIdealBranches(t *testing.T) {
	for _, test := range []struct {
		name, text string
		want       map[string]float64
	}{
		{
			"a cell that lifts a floating resistor",
			"rail V = 10 V\npath V -> R1 1k -> a -> C cell 2 V -> b -> R2 3k -> gnd\n",
			// (10 + 2)/4k = 3 mA; a = 10 - 3 = 7, b = 9.
			map[string]float64{"a.V": 7, "b.V": 9, "C.I": 3e-3, "C.V": 2, "C.P": 6e-3, "V.I": 3e-3, "V.P": 30e-3, "R2.P": 27e-3},
		},
		{
			"a drop and a link in one group with a side branch",
			"rail V = 10 V\npath V -> R1 1k -> a -> Z drop 2 V -> b -> L 0 -> c -> R2 3k -> gnd\npath b -> R3 3k -> gnd\n",
			// b = c; (10 - 2 - b)/1k = b/1.5k: b = 4.8, total 3.2 mA, half each.
			map[string]float64{"b.V": 4.8, "c.V": 4.8, "a.V": 6.8, "Z.I": 3.2e-3, "Z.V": 2, "Z.P": 6.4e-3, "L.I": 1.6e-3, "L.V": 0, "R3.I": 1.6e-3},
		},
		{
			"a cell on gnd against its arrow, charged",
			"rail V = 10 V\npath V -> R1 1k -> a -> L 0 -> p\npath gnd -> C cell 6 V -> p\n",
			// p = 6 V; 4 mA flow into the cell against its arrow.
			map[string]float64{"p.V": 6, "C.I": -4e-3, "C.P": -24e-3, "L.I": 4e-3, "V.I": 4e-3},
		},
		{
			"a node held by a second, negative rail",
			"rail V = 10 V\nrail out = -5 V\npath V -> R1 1k -> out\n",
			map[string]float64{"out.V": -5, "V.I": 15e-3, "out.I": -15e-3, "out.P": 75e-3},
		},
		{
			"a current source into a resistor and a cell of a row",
			"rail V = 10 V\npath gnd -> I1 2 mA -> a -> R1 1k -> b -> Z drop 1 V row=3 -> gnd\npath V -> R2 1k -> b\n",
			// b = 3; a = 5; R2 adds 7 mA through the drops.
			map[string]float64{"a.V": 5, "b.V": 3, "I1.I": 2e-3, "I1.V": -5, "I1.P": -10e-3, "Z.I": 9e-3, "Z.V": 3, "Z.2.V": 1, "Z.3.P": 9e-3},
		},
	} {
		t.Run(test.name, func(t *testing.T) {
			c := read(t, test.text)
			s, x := settle(t, c)
			st := s.StateAt(x)
			for q, want := range test.want {
				if got := value(t, st, c, q); math.Abs(got-want) > 1e-12*math.Max(1, math.Abs(want)) {
					t.Errorf("%s = %.15g, want %g", q, got, want)
				}
			}
		})
	}
}

// follows tells a slot that is computed from others: it does not keep a number of
// its own.
func follows(c *netlist.Circuit, id int) bool {
	values := c.Values()
	values[id]++
	c.Propagate(values)
	return values[id] == c.Slots[id].Value
}

// What every quantity's adjoint must give: the derivative that two solutions
// on either side give, for every slot that can be moved.
func TestSensitivitiesAgainstSolutions(t *testing.T) {
	text := `
given Vtop = 3.1 V
rail VCC = 12 V
rail VN = -2 V
ambient = 35 degC
part sig diode drop = 0.62 V at 1 mA, n = 1.8, Rbulk = 2 ohm
part gp npn Vbe = 0.65 V at 1 mA, betaF = 180, betaR = 3, VA = 80 V, betaDrift = 0.5 %/K, Irec = 1e-15 A
part gq pnp Veb = 0.66 V at 1 mA, betaF = 120, VA = 40 V
part amber led drop = 2.05 V at 15 mA, Rbulk = 5 ohm
part z5 zener Vz = 5.1 V at 5 mA, rz = 30 ohm, drift = 1 mV/K
path VCC -> R1 1.8k 100 ppm/K -> bias -> D1 sig -> D2 sig -> gnd
path VCC -> LAMP amber row=2 -> out -> Q1 gp base=bias size=2 -> tail -> RE 47 -> VN
path VCC -> R3 1k -> zn -> Z z5 reversed -> gnd
path VCC -> RP 560 -> pe -> Q2 gq base=zn -> pc -> C cell 0.3 V -> pd -> RL 2.2k -> gnd
path gnd -> I1 0.2 mA -> pc -> RX 10k -> bias
`
	c := read(t, text)
	s, x := settle(t, c)
	st := s.StateAt(x)
	var w newton.Work
	for _, q := range []string{
		"LAMP.I", "LAMP.P", "tail.V", "Q1.P", "Q1.Ie", "Q2.Ib", "Q2.Veb", "Q2.Vec", "VCC.I", "VN.P", "C.I", "C.P", "Z.I", "Z.P",
		"D1.V", "LAMP.2.V", "RE.I", "R1.P", "I1.V", "RL.I*pd.V", "Q1.Ic/Q2.Ic",
	} {
		e, list := c.ParseExpr(q)
		if list.HasErrors() {
			t.Fatalf("%s: %s", q, list[0].Message)
		}
		_, d, err := st.Sensitivity(e)
		if err != nil {
			t.Fatalf("%s: %v", q, err)
		}
		moved := 0
		for id := range c.Slots {
			base := c.Slots[id].Value
			if follows(c, id) || math.IsNaN(base) || math.IsInf(base, 0) {
				continue
			}
			at := func(v float64) float64 {
				values := c.Values()
				values[id] = v
				c.Propagate(values)
				s.Apply(values)
				y := append([]float64(nil), x...)
				s.From(y)
				if r := newton.Solve(s, y, &w, newton.Options{}); r.Outcome != newton.Converged {
					t.Fatalf("%s moved to %g: it %s", c.Slots[id].Name, v, r.Outcome)
				}
				got, _ := e.Eval(s.StateAt(y))
				return got
			}
			if base == 0 {
				continue // a default that may not become negative
			}
			h := 1e-4 * math.Abs(base)
			// Two central differences, extrapolated: error of order h⁴.
			fine, coarse := (at(base+h)-at(base-h))/(2*h), (at(base+2*h)-at(base-2*h))/(4*h)
			want := fine + (fine-coarse)/3
			scale := math.Max(math.Abs(want), math.Abs(fine))
			value, _ := e.Eval(st)
			noise := 1e-11 * math.Abs(value) / h // of the solutions themselves
			if math.Abs(d[id]-want) > 1e-5*scale+noise {
				t.Errorf("d %s / d %s = %.9g, by solutions %.9g", q, c.Slots[id].Name, d[id], want)
			}
			moved++
		}
		if moved < 20 {
			t.Errorf("%s: only %d values were moved", q, moved)
		}
		s.Apply(c.Values())
	}
}

// A determinant's sign is +1 for a circuit without gain, and the middle point of a
// latch has -1 (Green and Willson 1992; the latch is symmetric, so that the
// middle point is known: both sides alike).
func TestDeterminantSign(t *testing.T) {
	c := read(t, `
rail V = 5 V
part q npn Isat = 1e-16 A, betaF = 100
path V -> RC1 1k -> c1 -> Q1 q base=b1 -> gnd
path V -> RC2 1k -> c2 -> Q2 q base=b2 -> gnd
path c1 -> RB2 10k -> b2
path c2 -> RB1 10k -> b1
`)
	s, x := settle(t, c)
	st := s.StateAt(x)
	if a, b := value(t, st, c, "c1.V"), value(t, st, c, "c2.V"); math.Abs(a-b) > 1e-9 {
		t.Fatalf("the cold start is symmetric, the point is not: %g V and %g V", a, b)
	}
	if got := s.DetSign(x); got != -1 {
		t.Errorf("middle point of a latch: sign %d, want -1", got)
	}
	ladder, y := settle(t, read(t, "rail V = 5 V\npart d diode Isat = 1e-14 A\npath V -> R1 1k -> a -> D1 d -> b -> R2 1k -> gnd\n"))
	if got := ladder.DetSign(y); got != 1 {
		t.Errorf("a circuit without gain: sign %d, want +1", got)
	}
}

func TestParametersThatMakeNoModel(t *testing.T) {
	c := read(t, "rail V = 5 V\npart d led drop = 0.4 V at 100 mA, Rbulk = 5 ohm\npath V -> R1 1k -> a -> D1 d -> gnd\n")
	if _, err := mna.New(c); err == nil || !strings.Contains(err.Error(), "D1 d: Rbulk takes all of the stated drop") {
		t.Errorf("error %v", err)
	}
}

func TestLabels(t *testing.T) {
	s, err := mna.New(read(t, "rail V = 5 V\npart d led Rbulk = 5 ohm\npath V -> R1 1k -> top -> D1 d row=2 -> gnd\n"))
	if err != nil {
		t.Fatal(err)
	}
	got := make([]string, s.Size())
	for i := range got {
		got[i] = s.Label(i)
	}
	want := []string{
		"current balance at top", "current balance at D1's junction",
	}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("labels %q, want %q", got, want)
	}
}

// Counts, not seconds: a solve allocates nothing, needs few steps and no pivoting.
func TestColdSolveCosts(t *testing.T) {
	for _, test := range []struct {
		file            string
		unknowns, steps int
	}{
		{"w1.bias", 7, 11},
		{"w2.bias", 30, 16},
	} {
		t.Run(test.file, func(t *testing.T) {
			s, err := mna.New(shipped(t, test.file))
			if err != nil {
				t.Fatal(err)
			}
			x := make([]float64, s.Size())
			var w newton.Work
			var r newton.Result
			allocations := testing.AllocsPerRun(100, func() {
				clear(x)
				s.Restart()
				r = newton.Solve(s, x, &w, newton.Options{})
			})
			if r.Outcome != newton.Converged || r.Steps > test.steps {
				t.Errorf("it %s after %d steps, want at most %d", r.Outcome, r.Steps, test.steps)
			}
			if allocations != 0 {
				t.Errorf("%g allocations in a solve", allocations)
			}
			if s.Fallbacks != 0 {
				t.Errorf("%d factorisations needed pivoting", s.Fallbacks)
			}
			if s.Size() > test.unknowns {
				t.Errorf("%d unknowns, want at most %d", s.Size(), test.unknowns)
			}
			t.Logf("%d unknowns, %d steps", s.Size(), r.Steps)
		})
	}
}

// ladder writes workload W3: n nodes in a row, each fed from the one before by a
// resistor, with a diode to ground; at every third a transistor stands between the
// supply and ground.
func ladder(n int) string {
	var b strings.Builder
	b.WriteString("rail V = 20 V\npart d diode Isat = 1 fA, n = 1.5\npart q npn Isat = 1 fA, betaF = 150\n")
	before := "V"
	for i := 1; i <= n; i++ {
		node := fmt.Sprintf("n%d", i)
		fmt.Fprintf(&b, "path %s -> R%d 220 -> %s -> D%d d -> gnd\n", before, i, node, i)
		if i%3 == 0 {
			fmt.Fprintf(&b, "path V -> Q%d q base=%s -> gnd\n", i, node)
		}
		before = node
	}
	return b.String()
}

func BenchmarkColdSolve(b *testing.B) {
	systems := []struct {
		name string
		c    *netlist.Circuit
	}{{"W1", shipped(b, "w1.bias")}, {"W2", shipped(b, "w2.bias")}}
	for _, n := range []int{10, 30, 100, 300, 1000, 3000} {
		systems = append(systems, struct {
			name string
			c    *netlist.Circuit
		}{fmt.Sprintf("W3-%d", n), read(b, ladder(n))})
	}
	for _, test := range systems {
		b.Run(test.name, func(b *testing.B) {
			s, err := mna.New(test.c)
			if err != nil {
				b.Fatal(err)
			}
			x := make([]float64, s.Size())
			var w newton.Work
			var r newton.Result
			b.ReportAllocs()
			for b.Loop() {
				clear(x)
				s.Restart()
				r = newton.Solve(s, x, &w, newton.Options{})
			}
			if r.Outcome != newton.Converged {
				b.Fatalf("it %s", r.Outcome)
			}
			b.ReportMetric(float64(r.Steps), "steps")
			b.ReportMetric(float64(s.Size()), "unknowns")
		})
	}
}

// BenchmarkGrowth prints how the time of W3 grows with its size: the exponent from
// 30 to 3000 nodes, measured in turns.
func BenchmarkGrowth(b *testing.B) {
	const small, large, times = 30, 3000, 100 // the small one as often as it is smaller
	var elapsed [2]time.Duration
	var s [2]*mna.System
	for i, n := range []int{small, large} {
		var err error
		if s[i], err = mna.New(read(b, ladder(n))); err != nil {
			b.Fatal(err)
		}
	}
	var w [2]newton.Work
	solve := func(i, count int) {
		x := make([]float64, s[i].Size())
		start := time.Now()
		for range count {
			clear(x)
			s[i].Restart()
			if r := newton.Solve(s[i], x, &w[i], newton.Options{}); r.Outcome != newton.Converged {
				b.Fatalf("it %s", r.Outcome)
			}
		}
		elapsed[i] += time.Since(start)
	}
	for b.Loop() {
		solve(0, times)
		solve(1, 1)
	}
	ratio := float64(elapsed[1]) * times / float64(elapsed[0])
	b.ReportMetric(math.Log(ratio)/math.Log(large/small), "exponent")
}

// BenchmarkExp is the yardstick that a machine's speed is told by.
func BenchmarkExp(b *testing.B) {
	sum, x := 0.0, 1.3
	for b.Loop() {
		sum += math.Exp(x)
		x = 2.6 - x
	}
	if sum == 0 {
		b.Fatal("no sum")
	}
}
