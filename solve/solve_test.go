package solve_test

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/solve"
)

func read(t testing.TB, text string) *netlist.Circuit {
	t.Helper()
	generic, _ := shelf.Text("generic")
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{Shelves: map[string][]byte{"generic": generic}})
	if list.HasErrors() {
		t.Fatalf("%d: %s\n%s", list[0].Span.Start.Line, list[0].Message, text)
	}
	return c
}

func point(t testing.TB, text string) *solve.Result {
	t.Helper()
	r, err := solve.Solve(read(t, text), solve.Options{})
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return r
}

func quantity(t testing.TB, p *solve.Point, text string) float64 {
	t.Helper()
	e, list := p.Circuit.ParseExpr(text)
	if list.HasErrors() {
		t.Fatalf("%s: %s", text, list[0].Message)
	}
	v, ok := e.Eval(p)
	if !ok {
		t.Fatalf("%s has no number", text)
	}
	return v
}

const latch = `
rail V = 5 V
part q npn Isat = 1e-16 A, betaF = 100
path V -> RC1 1k -> c1 -> Q1 q base=b1 -> gnd
path V -> RC2 1k -> c2 -> Q2 q base=b2 -> gnd
path c1 -> RB2 10k -> b2
path c2 -> RB1 10k -> b1
`

// A symmetric latch rests on either side, never in the middle, though every start
// without a side leads there.
func TestLatchRestsOnOneSide(t *testing.T) {
	r := point(t, latch)
	if r.Point.Unstable {
		t.Fatal("the middle point was taken")
	}
	c1, c2 := quantity(t, r.Point, "c1.V"), quantity(t, r.Point, "c2.V")
	if !(c1 < 0.3 && c2 > 3) {
		t.Errorf("c1 %.3f V, c2 %.3f V; by the rule the side with the lower first node is taken", c1, c2)
	}
	var middle, other int
	for _, o := range r.Others {
		if o.Unstable {
			middle++
		} else {
			other++
		}
	}
	if middle != 1 || other != 1 {
		t.Errorf("told of %d unstable and %d other points, want 1 and 1", middle, other)
	}
}

func TestNearChoosesTheSide(t *testing.T) {
	c := read(t, latch)
	id := map[string]netlist.NodeID{}
	for i, n := range c.Nodes {
		id[n.Name] = netlist.NodeID(i)
	}
	for _, test := range []struct{ c1, c2 float64 }{{0, 5}, {5, 0}} {
		r, err := solve.Solve(c, solve.Options{Near: map[netlist.NodeID]float64{id["c1"]: test.c1, id["c2"]: test.c2}})
		if err != nil {
			t.Fatal(err)
		}
		c1, c2 := r.Point.NodeV[id["c1"]], r.Point.NodeV[id["c2"]]
		if (test.c1 < test.c2) != (c1 < c2) || math.Abs(c1-c2) < 1 {
			t.Errorf("near c1 = %g V, c2 = %g V came to %.3f V and %.3f V", test.c1, test.c2, c1, c2)
		}
	}
}

// A target decides between points that are both possible.
func TestTargetDecides(t *testing.T) {
	for _, test := range []struct{ target, node string }{
		{"target c1.V = 0.05 V within 0.3 V\n", "c1.V"},
		{"target c2.V = 0.05 V within 0.3 V\n", "c2.V"},
	} {
		r := point(t, latch+test.target)
		if v := quantity(t, r.Point, test.node); v > 0.35 {
			t.Errorf("%s: %s is %.3f V", strings.TrimSpace(test.target), test.node, v)
		}
	}
}

// A string of emitters wired backwards passes its leakage, whatever holds the nodes
// between: shared equally in a row, whole on the one with least leakage elsewhere.
func TestReversedStrings(t *testing.T) {
	r := point(t, "rail VP = 12 V\nuse generic\npath gnd -> R1 1k -> a -> LAMP red row=3 -> VP\n")
	for m := 1; m <= 3; m++ {
		name := "LAMP." + string(rune('0'+m)) + ".V"
		if v := quantity(t, r.Point, name); math.Abs(v+4) > 1e-6 {
			t.Errorf("%s = %.9f V, want a third of -12 V", name, v)
		}
	}
	r = point(t, `
rail VP = 12 V
part big led Isat = 2e-20 A, Rbulk = 5 ohm
part small led Isat = 1e-20 A, Rbulk = 5 ohm
path gnd -> R1 1k -> a -> L1 big -> m -> L2 small -> n -> L3 big -> VP
`)
	if !r.Point.Evidence.Twofold {
		t.Error("doubles should not have seen this leakage")
	}
	// L2 passes its whole saturation current; the others half of theirs, at which
	// exp(v/(n V_T)) = 1/2.
	vt := 1.380649e-23 * 298.15 / 1.602176634e-19
	if v, want := quantity(t, r.Point, "L1.V"), -2*vt*math.Ln2; math.Abs(v-want) > 1e-9 {
		t.Errorf("L1.V = %.9f V, want %.9f V", v, want)
	}
	if i := quantity(t, r.Point, "R1.I"); math.Abs(i+1e-20) > 1e-12*1e-20 && math.Abs(i+1e-20) > 1e-17*1e-3 {
		t.Errorf("R1.I = %g A, want -1e-20 A", i)
	}
	if i := quantity(t, r.Point, "L2.I"); math.Abs(i+1e-20) > 1e-32 {
		t.Errorf("L2.I = %g A, want -1e-20 A", i)
	}
}

// Extremes of the stopping rule: 1 Ω and 1 MΩ side by side on 200 V, and a node
// held by 1e-16 A.
func TestStoppingRuleExtremes(t *testing.T) {
	r := point(t, "rail V = 200 V\npath V -> R1 1 -> a -> R2 1M -> b -> R3 1 -> c -> R4 1M -> gnd\n")
	if got, want := quantity(t, r.Point, "b.V"), 200*1000001.0/2000002; math.Abs(got-want) > 1e-12*want {
		t.Errorf("b.V = %.15g, want %.15g", got, want)
	}
	r = point(t, "rail V = 5 V\npart d diode Isat = 1e-16 A\npath V -> D1 d reversed -> a -> R1 1G -> gnd\n")
	if got, want := quantity(t, r.Point, "a.V"), 1e-7; math.Abs(got-want) > 1e-9*want {
		t.Errorf("a.V = %g V, want 1e-16 A through 1 GΩ, %g V", got, want)
	}
}

func TestFailureSpeaks(t *testing.T) {
	// A junction cannot pass 1 mA against its arrow: there is no point.
	c := read(t, "part d diode Isat = 1e-14 A\npath gnd -> I1 1 mA -> a -> D1 d reversed -> gnd\n")
	_, err := solve.Solve(c, solve.Options{})
	var f *solve.Failure
	if !errors.As(err, &f) {
		t.Fatalf("error %v, want a Failure", err)
	}
	if !strings.Contains(f.Says, "current balance at a, off by 0.001 A") || len(f.Tried) < 5 {
		t.Errorf("says %q after %d ways", f.Says, len(f.Tried))
	}
	if _, err := solve.Solve(read(t, "rail V = 5 V\npath V -> R1 ? E24 -> a -> R2 1k -> gnd\n"), solve.Options{}); err == nil {
		t.Error("an open resistance was solved")
	}
}

func TestJudge(t *testing.T) {
	c := read(t, `
rail V = 10 V (8 V .. 12 V)
path V -> R1 1k -> a -> R2 1k -> gnd
target a.V = 4.9 V within 3%
target R1.I = 4 mA within 0.5 mA
keep R2.P < 20 mW
keep a.V > R1.V + 1 V
hold a.V within 10%
`)
	nominal := point0(t, c)
	got := solve.Judge(nominal, nominal)
	want := []struct {
		kind        string
		met         bool
		low, margin float64
	}{
		{"target", true, 4.9 * 0.97, 4.9*1.03 - 5}, // 5 V, 47 mV below the upper end
		{"target", false, 3.5e-3, -0.5e-3},         // 5 mA, 0.5 mA above 4.5 mA
		{"keep", false, math.Inf(-1), 20e-3 - 25e-3},
		{"keep", false, 6, -1},
		{"hold", true, 4.5, 0.5},
	}
	if len(got) != len(want) {
		t.Fatalf("%d verdicts, want %d", len(got), len(want))
	}
	near := func(a, b float64) bool { return a == b || math.Abs(a-b) < 1e-12 }
	for i, w := range want {
		g := got[i]
		if g.Kind != w.kind || g.Met != w.met || !near(g.Low, w.low) || !near(g.Margin, w.margin) {
			t.Errorf("verdict %d: %s met %v low %g margin %g, want %+v", i, g.Kind, g.Met, g.Low, g.Margin, w)
		}
	}
	low, list := c.At(netlist.Setting{Name: "V", Value: "low"})
	if list.HasErrors() {
		t.Fatal(list[0].Message)
	}
	verdicts := solve.Judge(point0(t, low), nominal)
	if hold := verdicts[len(verdicts)-1]; hold.Met || !near(hold.Margin, -0.5) {
		t.Errorf("at 8 V the hold of 5 V within 10 %% has margin %g, want -0.5 V", hold.Margin)
	}
}

// States by the language's definition; each transistor is put where it must be.
func TestStates(t *testing.T) {
	for _, test := range []struct{ name, text, want string }{
		{"active", "path V -> R1 1k -> c -> Q1 q base=b -> gnd\npath V -> RB 1M -> b\n", "active"},
		{"saturated", "path V -> R1 1k -> c -> Q1 q base=b -> gnd\npath V -> RB 10k -> b\n", "saturated"},
		{"off", "path V -> R1 1k -> c -> Q1 q base=b -> gnd\npath b -> RB 10k -> gnd\n path V -> R2 1k -> gnd\n", "off"},
		{"upside down", "path gnd -> Q1 q base=b -> e -> R1 1k -> V\npath V -> RB 100k -> b\n", "reverse"},
		{"active without base current", "path V -> R1 100 -> c -> Q1 qi base=b -> e -> RE 1k -> gnd\npath V -> RB 10k -> b -> RC 10k -> gnd\n", "active"},
	} {
		r := point(t, "rail V = 5 V\npart q npn Vbe = 0.65 V at 1 mA, betaR = 2\npart qi npn Vbe = 0.65 V at 1 mA, betaF = infinite\n"+test.text)
		for i := range r.Point.Elements {
			if r.Point.Circuit.Elements[i].Name == "Q1" {
				if got := r.Point.Elements[i].State; got != test.want {
					t.Errorf("%s: state %s, want %s", test.name, got, test.want)
				}
			}
		}
	}
}

// Where nothing flows at all a transistor is off, and its junctions are at the ambient to
// the last digit.
func TestAtRest(t *testing.T) {
	p := point(t, "rail V = 0 V\nambient = 46.98 degC\npart q npn Vbe = 0.65 V at 1 mA\npath V -> R1 1k -> c -> Q1 q base=c -> gnd\n").Point
	for i := range p.Elements {
		if p.Circuit.Elements[i].Name == "Q1" && (p.Elements[i].State != "off" || p.Elements[i].Tj != 46.98) {
			t.Errorf("%s at %v degC, want off at 46.98", p.Elements[i].State, p.Elements[i].Tj)
		}
	}
}

func point0(t testing.TB, c *netlist.Circuit) *solve.Point {
	t.Helper()
	r, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return r.Point
}

// TestSpareVolts moves a transistor's collector by its spare volts, base and emitter
// held: it then stands at the edge of saturation, as the language defines that.
func TestSpareVolts(t *testing.T) {
	for _, text := range []string{
		"part n npn Isat = 1e-15 A, betaF = 150, betaR = 2, VA = 70 V, Irec = 1e-13 A\nrail B = 0.68 V\nrail C = 5 V\npath C -> Q1 n base=B -> gnd\n",
		"part p pnp Isat = 1e-15 A, betaF = 40, betaR = 0.5\nrail B = -0.68 V\nrail C = -5 V\npath gnd -> Q1 p base=B -> C\n",
	} {
		c := point(t, text).Point.Circuit
		p := point0(t, c)
		spare := p.SpareVolts(0)
		if !(spare > 4) {
			t.Errorf("spare %g V of %g V", spare, p.Elements[0].Vce)
		}
		volts := c.Value(c.Rails[1].Volts)
		edge, list := c.With(netlist.Setting{Name: "C", Value: fmt.Sprintf("%.17g", volts*(1-spare/math.Abs(volts)))})
		if list.HasErrors() {
			t.Fatal(list)
		}
		at := point0(t, edge)
		if left := at.SpareVolts(0); math.Abs(left) > 1e-12 || math.Abs(at.Depth(0)-1) > 1e-9 {
			t.Errorf("at the edge: spare %g V, depth %g", left, at.Depth(0))
		}
	}
}

func TestCautions(t *testing.T) {
	for _, test := range []struct{ name, text, want string }{
		{"high voltage between two rails", "rail P = 40 V\nrail N = -30 V\npath P -> R1 100k -> N\n", "high-voltage P N"},
		{"none at 60 V", "rail P = 60 V\npath P -> R1 100k -> gnd\n", ""},
		{"a resistor's rating", "rail V = 10 V\npath V -> R1 100 0.25 W -> gnd\n", "rating R1 rating"},
		{"unrated and hot", "rail V = 10 V\npath V -> R1 50 -> gnd\n", "hot R1"},
		{"a zener the wrong way round", "rail V = 10 V\nuse generic\npath V -> R1 1k -> a -> Z1 z5v6 -> gnd\n", "zener-forward Z1"},
		{"and the right way round", "rail V = 10 V\nuse generic\npath V -> R1 1k -> a -> Z1 z5v6 reversed -> gnd\n", ""},
		{"a resistor of 10 mΩ", "rail V = 10 V\npath V -> R1 10k -> a -> R2 10 mohm -> gnd\n", "slip R2 ohms"},
		{"a diode that drops 2 V", "rail V = 10 V\npart x diode drop = 2 V at 10 mA\npath V -> R1 1k -> a -> D1 x -> gnd\n", "slip x drop"},
		{"a transistor at amps", "rail V = 10 V\npart q npn Vbe = 0.65 V at 1 mA\npath V -> R1 0.5 20 W -> c -> Q1 q base=V -> e -> R2 3 50 W -> gnd\n", "beta-current Q1"},
		{"a base without its resistor", "rail V = 5 V\npart q npn Vbe = 0.65 V at 1 mA\npath V -> R1 1k -> c -> Q1 q base=V -> gnd\n", "impossible Q1"},
		{"a diode across a supply", "rail V = 3 V\npart d diode drop = 0.62 V at 1 mA, n = 1.8\npath V -> D1 d -> gnd\n", "impossible D1"},
		{"a bright emitter", "rail V = 10 V\npart x led drop = 3 V at 350 mA, Pmax = 5 W\npath V -> R1 15 10 W -> a -> D1 x -> gnd\n", "bright D1"},
	} {
		t.Run(test.name, func(t *testing.T) {
			var got []string
			for _, c := range solve.Cautions(point(t, test.text).Point) {
				got = append(got, strings.TrimSpace(strings.Join([]string{c.Kind, c.Subject, c.Other + c.Rating}, " ")))
			}
			if s := strings.Join(got, ", "); !strings.HasPrefix(s, test.want) || (test.want == "" && s != "") {
				t.Errorf("cautions %q, want %q", s, test.want)
			}
		})
	}
}

// A file of 10 000 elements resolves and solves: a ladder of resistors with diodes,
// at whose far end hardly anything is left.
func TestTenThousandElements(t *testing.T) {
	var b strings.Builder
	b.WriteString("rail V = 20 V\npart d diode Isat = 1 fA\n")
	before := "V"
	const rungs = 5000
	for i := range rungs {
		node := fmt.Sprintf("n%d", i)
		fmt.Fprintf(&b, "path %s -> R%d 220 -> %s -> D%d d -> gnd\n", before, i, node, i)
		before = node
	}
	r := point(t, b.String())
	if got := len(r.Point.Elements); got != 2*rungs {
		t.Fatalf("%d elements, want %d", got, 2*rungs)
	}
	if r.Point.Evidence.Way != "direct" || r.Point.Evidence.Steps > 40 {
		t.Errorf("found by %s in %d steps, want directly in at most 40", r.Point.Evidence.Way, r.Point.Evidence.Steps)
	}
	for i := 1; i < len(r.Point.NodeV)-2; i++ {
		if r.Point.NodeV[i+2] > r.Point.NodeV[i+1] {
			t.Fatalf("the voltage rises towards the end at %s", r.Point.Circuit.Nodes[i+2].Name)
		}
	}
}
