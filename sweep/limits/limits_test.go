package limits_test

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/follow"
	"biaswright/solve/mna"
	"biaswright/solve/reftest"
	"biaswright/sweep/limits"
)

func read(t testing.TB, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if list.HasErrors() {
		t.Fatalf("%d: %s\n%s", list[0].Span.Start.Line, list[0].Message, text)
	}
	return c
}

func reference(name string) string { return filepath.Join("..", "..", "testdata", "reference", name) }

func find(t testing.TB, text string) *limits.Answer {
	t.Helper()
	a, err := limits.Find(read(t, text), limits.Options{})
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return a
}

func limit(t testing.TB, a *limits.Answer, axis string) limits.Limit {
	t.Helper()
	for _, l := range a.Limits {
		if l.Axis == axis {
			return l
		}
	}
	t.Fatalf("no axis %s", axis)
	return limits.Limit{}
}

// Where each figure of testdata/reference/limits.json is met: dropout supplies,
// compliance limits and exact output resistances (its own source and method).
func TestReferenceLimits(t *testing.T) {
	cases, err := reftest.Cases(reference("limits.json"))
	if err != nil {
		t.Fatal(err)
	}
	ran := map[string]int{}
	for i := range cases {
		k := &cases[i]
		if k.Analysis == "parameter_sweep" {
			continue // package sweep's
		}
		t.Run(k.ID, func(t *testing.T) {
			text, err := k.Text()
			if err != nil {
				t.Fatal(err)
			}
			rail := text.Rail[k.Detail.Source]
			held := "hold " + rail + ".I within 2%\n"
			if k.Analysis != "output_resistance" {
				probe := k.Expected[0].Probe
				held = fmt.Sprintf("hold %s.Ic within %g%%\n", probe.Element, 100*(1-k.Detail.Fraction))
			}
			a := find(t, string(text.Source)+held)
			check := func(what string, got float64, f *reftest.Figure) {
				t.Helper()
				if math.Abs(got-f.Value) > f.TolRel*math.Abs(f.Value)+f.TolAbs {
					t.Errorf("%s = %.15g, want %.15g within %g", what, got, f.Value, f.TolRel)
				}
			}
			ran[k.Analysis]++
			if k.Analysis == "output_resistance" {
				for _, r := range a.Regulation {
					if r.Axis == rail+".V" {
						check("output resistance", r.Resistance, &k.Expected[0])
					}
				}
				return
			}
			check("nominal current", a.Hold.Nominal, &k.Expected[0])
			low := limit(t, a, rail+".V").Low
			check("limit", low.At, &k.Expected[1])
			if low.Reason != limits.Band {
				t.Errorf("reason %s, want band", low.Reason)
			}
			// The side that holds, by a solution of its own.
			edge, list := read(t, string(text.Source)+held).With(netlist.Setting{Name: rail, Value: fmt.Sprintf("%.17g", low.At)})
			if list.HasErrors() {
				t.Fatal(list[0].Message)
			}
			r, err := solve.Solve(edge, solve.Options{})
			if err != nil {
				t.Fatal(err)
			}
			v, _ := a.Hold.Q.Eval(r.Point)
			if slack := 1e-9 * a.Hold.Nominal; v < a.Hold.Low-slack {
				t.Errorf("at the limit the current is %.15g, below the band's %.15g", v, a.Hold.Low)
			}
		})
	}
	if ran["dropout_supply"] != 4 || ran["compliance_limit"] != 4 || ran["output_resistance"] != 3 {
		t.Errorf("ran %v; expected 4 dropouts, 4 compliance limits, 3 output resistances", ran)
	}
}

// Every fold that operating-points.json lists ends a branch that starts at a listed
// point; following each stable point both ways must meet just those.
func TestReferenceFolds(t *testing.T) {
	circuits, err := reftest.Points(reference("operating-points.json"))
	if err != nil {
		t.Fatal(err)
	}
	folds := 0
	for i := range circuits {
		k := &circuits[i]
		if len(k.Folds) == 0 {
			continue
		}
		t.Run(k.ID, func(t *testing.T) {
			text, err := k.Text()
			if err != nil {
				t.Fatal(err)
			}
			// Room for folds outside the usual search, and a band that nothing
			// leaves. A source that is no rail has no limits: its branches are
			// followed as they are.
			rail := text.Rail[k.FoldOf]
			wide := string(text.Source) + "hold " + text.Node[anyNode(k)] + ".V within 1000 V\n"
			if rail != "" {
				line := regexp.MustCompile(`(?m)^rail ` + rail + ` = (\S+) V$`)
				wide = line.ReplaceAllString(wide, "rail "+rail+" = $1 V (-5 V .. 25 V)")
			}
			c := read(t, wide)
			id := map[string]netlist.NodeID{}
			for i, n := range c.Nodes {
				id[n.Name] = netlist.NodeID(i)
			}
			met := make([]bool, len(k.Folds))
			for _, p := range k.Points {
				if p.Sign < 0 {
					continue
				}
				near := map[netlist.NodeID]float64{}
				for name, v := range p.Volts {
					near[id[text.Node[name]]] = v
				}
				for _, at := range foldsFrom(t, c, near, rail, k.FoldOf) {
					listed := false
					for j, v := range k.Folds {
						if math.Abs(at-v) < 1e-8 {
							met[j], listed = true, true
						}
					}
					if !listed {
						t.Errorf("a fold at %.12g V is not listed", at)
					}
				}
			}
			for j, v := range k.Folds {
				if folds++; !met[j] {
					t.Errorf("the fold at %.12g V was not met", v)
				}
			}
		})
	}
	if folds < 12 {
		t.Errorf("%d folds, expected 12", folds)
	}
}

func anyNode(k *reftest.Known) string {
	for name := range k.Points[0].Volts {
		return name
	}
	return ""
}

// foldsFrom follows the branch of one point both ways, by limits for a rail and by
// itself for another source.
func foldsFrom(t *testing.T, c *netlist.Circuit, near map[netlist.NodeID]float64, rail, source string) (folds []float64) {
	t.Helper()
	if rail != "" {
		a, err := limits.Find(c, limits.Options{Near: near})
		if err != nil {
			t.Fatal(err)
		}
		l := limit(t, a, rail+".V")
		for _, side := range []limits.Side{l.Low, l.High} {
			if side.Reason == limits.Fold {
				folds = append(folds, side.At)
			}
		}
		return folds
	}
	r, err := solve.Solve(c, solve.Options{Near: near})
	if err != nil {
		t.Fatal(err)
	}
	slot, ok := c.Lookup(source)
	if !ok {
		t.Fatalf("no value %s", source)
	}
	for _, direction := range []int{-1, 1} {
		s, err := mna.New(c)
		if err != nil {
			t.Fatal(err)
		}
		const volts = 25.0 // beyond the listed folds
		w := follow.Follow(s.Numbers(s.NewTuner(slot), volts), r.Point.Unknowns(), c.Value(slot), follow.Options{
			Direction: direction, StopAtFold: true, LambdaScale: volts, Low: -volts, High: volts,
		})
		if w.Outcome == follow.Folded {
			folds = append(folds, w.Folds[0].Lambda)
		}
	}
	return folds
}

const dividerSink = `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 200
path VCC -> RU 4.1k -> base -> RD 910 -> gnd
path VCC -> RL 100 -> out -> Q1 gp base=base -> tail -> RE 25.5 -> gnd
hold Q1.Ic within 22%
`

const diodeSink = `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 200
part sig diode drop = 0.62 V at 1 mA, n = 1.8
path VCC -> R1 1.8k -> base -> D1 sig -> D2 sig -> gnd
path VCC -> RL 100 -> out -> Q1 gp base=base -> tail -> RE 62 -> gnd
hold Q1.Ic within 22%
`

// Common practice: behind a divider the current follows the supply (a sink of
// 9.7 mA from 9 V falls to about 7.6 mA near 7.85 V), behind two diodes it hardly
// moves. The causes must tell the two apart.
func TestDividerFollowsItsSupply(t *testing.T) {
	a := find(t, strings.Replace(dividerSink, "RE 25.5", "RE 87", 1))
	if math.Abs(a.Hold.Nominal-9.7e-3) > 0.5e-3 {
		t.Fatalf("the sink passes %.3g mA, want about 9.7 mA", a.Hold.Nominal*1e3)
	}
	low := limit(t, a, "VCC.V").Low
	if math.Abs(low.At-7.4) > 0.6 || low.Reason != limits.Band {
		t.Errorf("22 %% less at %.3g V (%s), want near 7.5 V", low.At, low.Reason)
	}
	if len(low.Cause.Left) != 0 || low.Cause.Through != "RU" || low.Cause.Share < 0.8 {
		t.Errorf("cause %+v: no part left its region, and RU carries the drift", low.Cause)
	}
	d := find(t, diodeSink)
	low = limit(t, d, "VCC.V").Low
	if low.At > 5.5 {
		t.Errorf("two diodes hold down to %.3g V only", low.At)
	}
	slopes := map[bool]float64{}
	for divider, answer := range map[bool]*limits.Answer{true: a, false: d} {
		for _, r := range answer.Regulation {
			if r.Axis == "VCC.V" {
				slopes[divider] = math.Abs(r.Relative)
			}
		}
	}
	if slopes[true] < 5*slopes[false] {
		t.Errorf("line regulation %.3g /V behind a divider, %.3g /V behind diodes: want at least five times", slopes[true], slopes[false])
	}
}

// A saturated output: the load's voltage takes the transistor's.
func TestCompliance(t *testing.T) {
	a := find(t, strings.Replace(diodeSink, "RL 100", "RL 100", 1)+"load RL\n")
	l := limit(t, a, "load.V")
	if l.Low.Reason != limits.End || l.High.Reason != limits.Band {
		t.Fatalf("load.V: %s and %s, want end and band", l.Low.Reason, l.High.Reason)
	}
	left := l.High.Cause.Left
	if len(left) != 1 || left[0].Name != "Q1" || left[0].State != "saturated" || left[0].Volts > 0.3 {
		t.Errorf("cause %+v, want Q1 saturated", left)
	}
	if a.Load == nil || len(a.Load.Outputs) != 1 || a.Load.Outputs[0].Node != "out" {
		t.Fatalf("load answers %+v", a.Load)
	}
	if out := a.Load.Outputs[0]; math.Abs(out.AtHigh-(9-l.High.At)) > 1e-9 {
		t.Errorf("out stands at %g V where the load takes %g V of 9 V", out.AtHigh, l.High.At)
	}
	// The largest resistance, put in the load's place, is at the band's edge.
	r := find(t, strings.Replace(diodeSink, "RL 100", fmt.Sprintf("RL %.12g", a.Load.MaxOhms*(1-1e-9)), 1)+"load RL\n")
	if math.Abs(r.Hold.Nominal/a.Hold.Low-1) > 1e-6 {
		t.Errorf("with %g Ω the current is %g A, want the band's %g A", a.Load.MaxOhms, r.Hold.Nominal, a.Hold.Low)
	}
}

func shipped(t testing.TB, name string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "circuits", name))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// The numbers in a row, by solving the neighbours: the last holds, the next not.
func TestCountIsTheLast(t *testing.T) {
	text := shipped(t, "mast-lamp.bias")
	a := find(t, text)
	if a.Load == nil || a.Load.Row != "LAMP" || len(a.Load.Counts) != 4 {
		t.Fatalf("load answers %+v", a.Load)
	}
	c := read(t, text)
	ends := map[string][]netlist.Setting{
		"nominal": nil, "low rails": {{Name: "VCC", Value: "low"}},
		"coldest": {{Name: "ambient", Value: "low"}}, "hottest": {{Name: "ambient", Value: "high"}},
	}
	for _, count := range a.Load.Counts {
		for k, want := range map[int]bool{count.Most: true, count.Most + 1: false} {
			row, _ := c.With(netlist.Setting{Name: "LAMP.row", Value: fmt.Sprint(k)})
			row, list := row.At(ends[count.Where]...)
			if list.HasErrors() {
				t.Fatal(list[0].Message)
			}
			r, err := solve.Solve(row, solve.Options{})
			if err != nil {
				t.Fatal(err)
			}
			v, _ := r.Point.Quantity(netlist.Ref{Subject: netlist.OfLoad, Symbol: "I"})
			if holds := v >= a.Hold.Low && v <= a.Hold.High; holds != want {
				t.Errorf("%s: %d in a row: %g A, holds %v, want %v", count.Where, k, v, holds, want)
			}
		}
	}
}

// A narrow excursion out of the band between two wide steps: a divider whose output
// a second transistor pulls down in a window of the supply that is a hundredth of
// the range searched.
func TestNarrowDipIsSeen(t *testing.T) {
	a := find(t, `
rail VCC = 10 V
rail VX = 0.2 V (0 V .. 20 V)
part gp npn Isat = 1e-14 A, betaF = 200
part d diode Isat = 1e-14 A
path VCC -> R1 1k -> out -> R2 1k -> gnd
path VX -> RA 1k -> x -> RB 1k -> gnd
path out -> Q1 gp base=x -> e -> Q2 gp base=VX -> gnd
hold out.V within 30%
`)
	high := limit(t, a, "VX.V").High
	if high.Reason != limits.Band || high.At > 3 {
		t.Errorf("VX: %s at %g V, want the band left below 3 V", high.Reason, high.At)
	}
}

func TestErrors(t *testing.T) {
	const plain = "rail V = 5 V\npath V -> R1 1k -> a -> R2 1k -> gnd\n"
	for _, test := range []struct {
		text string
		want error
	}{
		{plain, limits.ErrNoHold},
		{"rail V = 5 V\nrail W = 0 V\npath V -> R1 1k -> gnd\npath W -> R2 1k -> gnd\nhold W.I within 5%\n", limits.ErrZeroHold},
	} {
		if _, err := limits.Find(read(t, test.text), limits.Options{}); !errors.Is(err, test.want) {
			t.Errorf("error %v, want %v", err, test.want)
		}
	}
	var f *solve.Failure
	_, err := limits.Find(read(t, "part d diode Isat = 1e-14 A\npath gnd -> I1 1 mA -> a -> D1 d reversed -> gnd\nhold a.V within 5%\n"), limits.Options{})
	if !errors.As(err, &f) {
		t.Errorf("error %v, want a Failure", err)
	}
}

// The same answer whatever the number of workers.
func TestWorkers(t *testing.T) {
	c := read(t, shipped(t, "mast-lamp.bias"))
	var texts [2]string
	for i, n := range []int{1, 4} {
		a, err := limits.Find(c, limits.Options{Workers: n})
		if err != nil {
			t.Fatal(err)
		}
		for _, l := range a.Limits {
			texts[i] += fmt.Sprintln(l.Axis, l.Low.At, l.Low.Reason, l.High.At, l.High.Reason, l.Low.Cause, l.High.Cause)
		}
	}
	if texts[0] != texts[1] {
		t.Errorf("1 worker:\n%s4 workers:\n%s", texts[0], texts[1])
	}
}

func BenchmarkLimits(b *testing.B) {
	for _, name := range []string{"mast-lamp.bias", "sensor-bank.bias"} {
		b.Run(name, func(b *testing.B) {
			c := read(b, shipped(b, name))
			for b.Loop() {
				if _, err := limits.Find(c, limits.Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// Between the limits the circuit holds, and a little beyond each it does not: each
// point by a solution of its own.
func TestHoldsBetweenTheLimits(t *testing.T) {
	for _, name := range []string{"mast-lamp.bias", "pressure-source.bias", "sensor-bank.bias"} {
		c := read(t, shipped(t, name))
		a, err := limits.Find(c, limits.Options{})
		if err != nil {
			t.Fatal(err)
		}
		holds := func(axis string, v float64) bool {
			circuit, setting := c, netlist.Setting{Name: strings.TrimSuffix(axis, ".V"), Value: fmt.Sprintf("%.17g", v)}
			if axis == netlist.LoadName {
				circuit, setting.Name = c.HoldLoad(a.Nominal.LoadV), axis
			}
			moved, list := circuit.With(setting)
			if list.HasErrors() {
				t.Fatal(list[0].Message)
			}
			r, err := solve.Solve(moved, solve.Options{})
			if err != nil {
				return false
			}
			q, list := moved.ParseExpr(a.Hold.Q.Text)
			if list.HasErrors() {
				t.Fatal(list[0].Message)
			}
			got, ok := q.Eval(r.Point)
			slack := 1e-9 * math.Abs(a.Hold.Nominal)
			return ok && got >= a.Hold.Low-slack && got <= a.Hold.High+slack
		}
		for _, l := range a.Limits {
			ends := [2]float64{l.Low.SearchedTo, l.High.SearchedTo}
			const steps = 60
			for i := 0; i <= steps; i++ {
				if v := ends[0] + (ends[1]-ends[0])*float64(i)/steps; !holds(l.Axis, v) {
					t.Errorf("%s: %s does not hold at %g, between %g and %g", name, l.Axis, v, ends[0], ends[1])
				}
			}
			const beyond = 1e-4 // of the range
			for i, side := range []limits.Side{l.Low, l.High} {
				past := ends[i] + beyond*(ends[i]-ends[1-i])
				if side.Reason == limits.Band && holds(l.Axis, past) {
					t.Errorf("%s: %s still holds at %g, beyond its limit %g", name, l.Axis, past, side.At)
				}
			}
		}
	}
}

// Where contributions cancel no part is named: a sink into a mirror, in which emitter
// resistor and junction undo each other, beside the Early effect of the mirror's output, which is what
// moves the current: without it next to nothing is left of the slope.
func TestCancellingPartsCarryNothing(t *testing.T) {
	const text = `rail VCC = 10 V
rail VB = 3 V
part q npn Vbe = 0.66 V at 2 mA, betaF = 150, VA = 60 V
part p pnp Veb = 0.64 V at 1 mA, betaF = 90, VA = 40 V
path VB -> R1 10k -> b
path VCC -> Q2 p base=m -> m -> Q1 q base=b -> e -> RE 1k -> gnd
path VCC -> Q3 p%s base=m -> out -> RL 400 -> gnd
hold RL.I within 5%%
`
	slope := func(text string) limits.Regulation {
		for _, r := range find(t, text).Regulation {
			if r.Axis == "VCC.V" {
				return r
			}
		}
		t.Fatal("VCC.V has no slope")
		return limits.Regulation{}
	}
	r := slope(fmt.Sprintf(text, ""))
	if r.Through != "" || !math.IsNaN(r.Share) {
		t.Errorf("VCC.V acts through %s, %g of it", r.Through, r.Share)
	}
	flat := slope(strings.Replace(fmt.Sprintf(text, "f"), "path VB", "part pf pnp Veb = 0.64 V at 1 mA, betaF = 90\npath VB", 1))
	if math.Abs(flat.Relative) > 0.1*math.Abs(r.Relative) {
		t.Errorf("without Q3's Early effect the slope is %g of %g: it is not what moves the current", flat.Relative, r.Relative)
	}
}
