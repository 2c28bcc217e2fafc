package compare_test

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep"
	"biaswright/sweep/compare"
	"biaswright/sweep/limits"
)

func read(t testing.TB, name string, text []byte) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read(name, text, devices.Catalogue(), netlist.Files{})
	if list.HasErrors() {
		t.Fatal(list)
	}
	return c
}

// mast are the five ways to light the mast's lamps.
var mast = []string{"mast-resistor", "mast-divider", "mast-lamp", "mast-zener", "mast-limiter"}

func demo(t testing.TB, name string) *netlist.Circuit {
	t.Helper()
	file := filepath.Join("..", "..", "testdata", "circuits", name+".bias")
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	return read(t, file, text)
}

func of(t testing.TB, c *netlist.Circuit) *compare.Topology {
	t.Helper()
	top := compare.Of(c, 1)
	if top.Failure != nil {
		t.Fatal(top.Failure)
	}
	return top
}

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) && !(math.IsNaN(got) && math.IsNaN(want)) {
		t.Errorf("%s is %.12g, want %.12g", what, got, want)
	}
}

// extremes sweeps one axis over the range that the file states, finely.
func extremes(t *testing.T, c *netlist.Circuit, axis, q string) compare.Span {
	t.Helper()
	id, _ := c.Lookup(axis)
	b := c.Slots[id].Bounds
	const points = 4001 // a turn lies within 1/8000 of the range: its square is what is missed
	a, err := sweep.ParseAxis(c, fmt.Sprintf("%s=%.17g..%.17g", axis, b.Low, b.High), points, false)
	if err != nil {
		t.Fatal(err)
	}
	out := compare.Span{Low: math.Inf(1), High: math.Inf(-1)}
	err = sweep.Run(t.Context(), sweep.Plan{Circuit: c, Axes: []sweep.Axis{a}, Show: []string{q}}, func(r sweep.Row) error {
		out.Low, out.High = math.Min(out.Low, r.Values[0]), math.Max(out.High, r.Values[0])
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// solvedAt is a quantity with settings.
func solvedAt(t *testing.T, c *netlist.Circuit, q string, settings ...netlist.Setting) float64 {
	t.Helper()
	at, list := c.With(settings...)
	if list.HasErrors() {
		t.Fatal(list)
	}
	res, err := solve.Solve(at, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	e, list := at.ParseExpr(q)
	if list.HasErrors() {
		t.Fatal(list)
	}
	v, _ := e.Eval(res.Point)
	return v
}

// TestFiguresAreTheEngines holds every figure against what solve, sweep and limits give.
func TestFiguresAreTheEngines(t *testing.T) {
	for _, name := range mast {
		t.Run(name, func(t *testing.T) {
			c := demo(t, name)
			top := of(t, c)
			const q = "LAMP.I"
			res, err := solve.Solve(c, solve.Options{})
			if err != nil {
				t.Fatal(err)
			}
			p := res.Point
			const exact, refined = 1e-12, 1e-9
			near(t, "value", top.Value, solvedAt(t, c, q), exact)
			near(t, "error", top.Error, (top.Value-0.015)/0.015, exact)
			near(t, "supply current", top.SupplyCurrent, p.Rails[0].I, exact)
			near(t, "efficiency", top.Efficiency, p.LoadV*p.LoadI/p.Rails[0].P, exact)
			watts := 0.0
			for i := range p.Elements {
				if !slices.Contains(c.Load, i) {
					watts = math.Max(watts, p.Elements[i].P)
				}
			}
			near(t, "hottest", top.HottestWatts, watts, exact)
			for axis, span := range map[string]compare.Span{"VCC": top.Supply, "ambient": top.Ambient} {
				want := extremes(t, c, axis, q)
				near(t, axis+" low", span.Low, want.Low, refined)
				near(t, axis+" high", span.High, want.High, refined)
			}
			corners(t, c, q, top)
			found, err := limits.Find(c, limits.Options{})
			if err != nil {
				t.Fatal(err)
			}
			for _, r := range compare.Table([]*compare.Topology{top}) {
				for i, l := range found.Limits {
					reg := found.Regulation[i]
					switch {
					case r.Axis != l.Axis:
					case r.Key == "dropout":
						near(t, r.Key, r.Number(0), l.Low.At, exact)
					case r.Key == "load" && l.High.Reason != limits.End:
						near(t, r.Key, r.High[0], l.High.At, exact)
					case r.Key == "line" || r.Key == "tempco":
						near(t, r.Key, r.Number(0), reg.Relative, exact)
					case r.Key == "output":
						near(t, r.Key, r.Number(0), reg.Resistance, exact)
					}
				}
			}
		})
	}
}

// corners solves every corner of the toleranced resistors, and both ends of beta: what
// signs of slopes chose must be the outermost of them.
func corners(t *testing.T, c *netlist.Circuit, q string, top *compare.Topology) {
	t.Helper()
	var names []string
	for i := range c.Elements {
		if e := &c.Elements[i]; e.Kind == netlist.Resistor && c.Slots[e.Value].Bounds.Stated {
			names = append(names, e.Name)
		}
	}
	out := compare.Span{Low: top.Value, High: top.Value}
	for corner := range 1 << len(names) {
		var settings []netlist.Setting
		for i, n := range names {
			id, _ := c.Lookup(n)
			v := c.Slots[id].Bounds.Low
			if corner>>i&1 == 1 {
				v = c.Slots[id].Bounds.High
			}
			settings = append(settings, netlist.Setting{Name: n, Value: fmt.Sprintf("%.17g", v)})
		}
		v := solvedAt(t, c, q, settings...)
		out.Low, out.High = math.Min(out.Low, v), math.Max(out.High, v)
	}
	near(t, "resistors low", top.Resistors.Low, out.Low, 1e-12)
	near(t, "resistors high", top.Resistors.High, out.High, 1e-12)
	if top.Beta.Low == top.Beta.High { // no transistor
		return
	}
	a := solvedAt(t, c, q, netlist.Setting{Name: "gp.betaF", Value: "100"})
	b := solvedAt(t, c, q, netlist.Setting{Name: "gp.betaF", Value: "300"})
	near(t, "beta low", top.Beta.Low, math.Min(a, b), 1e-12)
	near(t, "beta high", top.Beta.High, math.Max(a, b), 1e-12)
}

// TestResistorClosedForm compares a plain resistor behind an ideal drop with Ohm's law.
func TestResistorClosedForm(t *testing.T) {
	c := read(t, "r.bias", []byte(`rail V = 10 V (9 V .. 11 V)
ambient = 25 degC (0 degC .. 50 degC)
path V -> RS 600 1% -> a -> RL 200 -> gnd
load RL
target RL.I = 12 mA within 10%
`))
	top := of(t, c)
	const exact = 1e-12
	near(t, "current", top.Value, 10.0/800, exact)
	near(t, "supply low", top.Supply.Low, 9.0/800, exact)
	near(t, "supply high", top.Supply.High, 11.0/800, exact)
	near(t, "resistors low", top.Resistors.Low, 10/(606+200.0), exact)
	near(t, "resistors high", top.Resistors.High, 10/(594+200.0), exact)
	near(t, "ambient", top.Ambient.High, top.Value, exact)
	near(t, "efficiency", top.Efficiency, 0.25, exact)
	near(t, "output", row(t, top, "output"), 600, 1e-9) // the load sees RS
	near(t, "line", row(t, top, "line"), 1.0/10, 1e-9)
	near(t, "dropout", row(t, top, "dropout"), 9, 1e-8)
	if top.Parts != 2 || top.Hottest != "RS" {
		t.Errorf("%d parts, %s the hottest; want 2 and RS", top.Parts, top.Hottest)
	}
}

func row(t *testing.T, top *compare.Topology, key string) float64 {
	t.Helper()
	for _, r := range compare.Table([]*compare.Topology{top}) {
		if r.Key == key {
			return r.Number(0)
		}
	}
	t.Fatalf("there is no row %s", key)
	return 0
}

// TestMirrorClosedForm compares the simple mirror with its closed form: of a reference
// current I, 1/(1 + 2/beta) arrives without an Early effect (common practice).
func TestMirrorClosedForm(t *testing.T) {
	c := read(t, "m.bias", []byte(`rail V = 10 V
part n npn Vbe = 0.65 V at 1 mA, betaF = 100 (50 .. 200)
path V -> I1 1 mA -> in -> Q1 n base=in -> gnd
path V -> RL 1k -> out -> Q2 n base=in -> gnd
load RL
target RL.I = 1 mA within 5%
`))
	top := of(t, c)
	closed := func(beta float64) float64 { return 1e-3 / (1 + 2/beta) }
	const leakage = 1e-9 // what the reverse saturation current of V_BC adds
	near(t, "current", top.Value, closed(100), leakage)
	near(t, "beta low", top.Beta.Low, closed(50), leakage)
	near(t, "beta high", top.Beta.High, closed(200), leakage)
}

// TestStiffDividerClosedForm compares a divider-biased sink of infinite beta with its
// formula: the tail stands one V_BE below the divider, exactly.
func TestStiffDividerClosedForm(t *testing.T) {
	c := read(t, "d.bias", []byte(`rail V = 12 V
part n npn Vbe = 0.65 V at 1 mA, betaF = infinite
path V -> R1 10k -> b -> R2 2k -> gnd
path V -> RL 1k -> out -> Q1 n base=b -> tail -> RE 1.3k -> gnd
load RL
target RL.I = 1 mA within 5%
`))
	top := of(t, c)
	vbe := solvedAt(t, c, "Q1.Vbe")
	near(t, "current", top.Value, (2-vbe)/1300, 1e-9)
	near(t, "V_BE", vbe, 0.65, 0.01) // near its stated point at 1 mA
	// dI/dV = (R2/(R1+R2)) / (RE + r_e), r_e = V_T/I (textbook): relative to I.
	const vt = 0.025692579 // V at 25 degC, from the exact SI constants
	near(t, "line", row(t, top, "line"), (2.0/12)/(1300+vt/top.Value)/top.Value, 1e-6)
}

// TestBest marks rows.
func TestBest(t *testing.T) {
	var ts []*compare.Topology
	for _, name := range mast {
		ts = append(ts, of(t, demo(t, name)))
	}
	broken := &compare.Topology{Circuit: demo(t, "mast-lamp"), Failure: fmt.Errorf("none")}
	for _, r := range compare.Table(append(ts, broken)) {
		if r.Best[len(mast)] || !math.IsNaN(r.Low[len(mast)]) {
			t.Errorf("%s: what has no figures is marked, or has one", r.Key)
		}
		if r.Key == "value" && slices.Contains(r.Best, true) {
			t.Error("a current is no better for being large")
		}
		if r.Key == "parts" && !slices.Equal(r.Best, []bool{true, false, false, false, false, false}) {
			t.Errorf("parts: best is %v, want the resistor", r.Best)
		}
	}
	for _, r := range compare.Table(ts[:1]) {
		if slices.Contains(r.Best, true) {
			t.Errorf("%s: a single topology is best", r.Key)
		}
	}
}

func TestDifferences(t *testing.T) {
	const base = "rail V = 10 V (9 V .. 11 V)\nambient = 25 degC\npath V -> RS 600 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n"
	a := read(t, "a.bias", []byte(base))
	for _, test := range []struct{ text, what string }{
		{base, ""},
		{"rail V = 12 V (9 V .. 13 V)\nambient = 25 degC\npath V -> RS 600 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n", "rail V"},
		{"rail W = 10 V (9 V .. 11 V)\nambient = 25 degC\npath W -> RS 600 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n", "rail V"},
		{"rail V = 10 V (9 V .. 11 V)\nambient = 25 degC (0 degC .. 50 degC)\npath V -> RS 600 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n", "ambient"},
		{"rail V = 10 V (9 V .. 11 V)\nambient = 25 degC\npath V -> RS 600 -> a -> RL 220 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n", "load"},
		{"rail V = 10 V (9 V .. 11 V)\nambient = 25 degC\npath V -> RS 600 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 5%\n", "target"},
		{"rail V = 10 V (9 V .. 11 V)\nambient = 25 degC\npath V -> R1 300 -> b -> RX 300 -> a -> RL 200 -> gnd\nload RL\ntarget RL.I = 12 mA within 10%\n", ""},
	} {
		got := compare.Differences(a, read(t, "b.bias", []byte(test.text)))
		switch {
		case test.what == "" && len(got) > 0:
			t.Errorf("alike, but %+v", got)
		case test.what != "" && (len(got) == 0 || got[0].What != test.what):
			t.Errorf("%+v, want %s", got, test.what)
		}
	}
}

func TestFailures(t *testing.T) {
	if top := compare.Of(read(t, "x.bias", []byte("rail V = 10 V\npath V -> R 1k -> gnd\n")), 1); top.Failure == nil {
		t.Error("there is no target, and no failure")
	}
	none := "part d diode Isat = 1e-14 A\npath gnd -> I1 1 mA -> a -> D1 d reversed -> gnd\ntarget a.V = 1 V within 5%\n"
	if top := compare.Of(read(t, "x.bias", []byte(none)), 1); top.Failure == nil {
		t.Error("there is no operating point, and no failure")
	}
}

// BenchmarkFive prints what it takes to compare the five.
func BenchmarkFive(b *testing.B) {
	var circuits []*netlist.Circuit
	for _, name := range mast {
		circuits = append(circuits, demo(b, name))
	}
	for b.Loop() {
		for _, c := range circuits {
			of(b, c)
		}
	}
}

// Tolerances of a value derived from another, and of a resistor that takes a given value:
// each its own draw about what it follows. By Ohm's law over all corners.
func TestDerivedTolerances(t *testing.T) {
	top := compare.Of(read(t, "x.bias", []byte(`rail V = 10 V
given RX = 1 kohm 5%
given W = RX * 2 3%
path V -> R1 W 2% -> a -> R2 1k 1% -> gnd
path a -> R3 RX -> gnd
target a.V = 2 V within 10%
`)), 1)
	if top.Failure != nil {
		t.Fatal(top.Failure)
	}
	low, high := math.Inf(1), math.Inf(-1)
	for corner := range 16 {
		side := func(bit int, tolerance float64) float64 {
			if corner>>bit&1 == 1 {
				return 1 + tolerance
			}
			return 1 - tolerance
		}
		rx := 1000 * side(0, .05)
		r1, r2 := 2*rx*side(1, .03)*side(2, .02), 1000*side(3, .01)
		below := 1 / (1/r2 + 1/rx)
		v := 10 * below / (r1 + below)
		low, high = math.Min(low, v), math.Max(high, v)
	}
	if got := top.Resistors; math.Abs(got.Low-low) > 1e-9 || math.Abs(got.High-high) > 1e-9 {
		t.Errorf("over tolerance %.9g .. %.9g V, by hand %.9g .. %.9g V", got.Low, got.High, low, high)
	}
}
