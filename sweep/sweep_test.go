package sweep_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/reftest"
	"biaswright/sweep"
)

func read(t testing.TB, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if list.HasErrors() {
		t.Fatalf("%d: %s\n%s", list[0].Span.Start.Line, list[0].Message, text)
	}
	return c
}

func shipped(t testing.TB, name string) *netlist.Circuit {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "testdata", "circuits", name))
	if err != nil {
		t.Fatal(err)
	}
	return read(t, string(text))
}

func axis(t testing.TB, c *netlist.Circuit, text string, points int, logarithmic bool) sweep.Axis {
	t.Helper()
	a, err := sweep.ParseAxis(c, text, points, logarithmic)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return a
}

func rows(t testing.TB, p sweep.Plan) []sweep.Row {
	t.Helper()
	var out []sweep.Row
	if err := sweep.Run(context.Background(), p, func(r sweep.Row) error { out = append(out, r); return nil }); err != nil {
		t.Fatal(err)
	}
	if len(out) != p.Points() {
		t.Fatalf("%d rows of %d", len(out), p.Points())
	}
	return out
}

const divider = "given G = 2 kohm\nrail VA = 10 V (8 V .. 12 V)\nrail VB = 5 V\nambient = 25 degC (-20 degC .. 60 degC)\npart d led Isat = 1e-18 A\n" +
	"path VA -> R1 1k 5% -> m -> R2 G -> gnd\npath VB -> R3 1k -> k -> D1 d row=2 -> gnd\n"

func TestParseAxis(t *testing.T) {
	c := read(t, divider)
	for _, test := range []struct {
		text   string
		points int
		log    bool
		name   string
		want   []float64
	}{
		{"VA=8V..12V", 3, false, "VA.V", []float64{8, 10, 12}},
		{"VA.V=12..8", 3, false, "VA.V", []float64{12, 10, 8}},
		{"VA=8V,9V,12V", 7, false, "VA.V", []float64{8, 9, 12}},
		{"VA+VB=1V..2V", 2, false, "VA.V+VB.V", []float64{1, 2}},
		{"R1=10..1k", 3, true, "R1", []float64{10, 100, 1000}},
		{"R1=4k7,1.5 kohm", 3, false, "R1", []float64{4700, 1500}},
		{"ambient=-20degC..60degC", 3, false, "ambient", []float64{-20, 20, 60}},
		{"d.n=1..2", 2, false, "d.n", []float64{1, 2}},
		{"G=1kohm..3kohm", 2, false, "G", []float64{1000, 3000}},
		{"D1.row=1..3", 99, false, "D1.row", []float64{1, 2, 3}},
		{"D1.row=3..1", 99, false, "D1.row", []float64{3, 2, 1}},
		{"D1.row=4,2", 99, false, "D1.row", []float64{4, 2}},
		{"VA=7V..7V", 1, false, "VA.V", []float64{7}},
	} {
		a := axis(t, c, test.text, test.points, test.log)
		if a.Name != test.name || len(a.Values) != len(test.want) {
			t.Errorf("%s: %s %v, want %s %v", test.text, a.Name, a.Values, test.name, test.want)
			continue
		}
		for i, v := range a.Values {
			if math.Abs(v-test.want[i]) > 1e-12*math.Abs(test.want[i]) {
				t.Errorf("%s: value %d is %g, want %g", test.text, i, v, test.want[i])
			}
		}
	}
}

func TestParseAxisRefuses(t *testing.T) {
	c := read(t, divider)
	for _, test := range []struct {
		text         string
		points       int
		log          bool
		says, advice string
	}{
		{"VAA=8V..12V", 3, false, "there is no value VAA", "VA"},
		{"VA=8..12 mA", 3, false, "VA is in volts, not in amps", ""},
		{"VA=8V..12V", 0, false, "0 points", ""},
		{"VA=0V..12V", 3, true, "cannot touch or cross 0", ""},
		{"VA=-1V..12V", 3, true, "cannot touch or cross 0", ""},
		{"VA", 3, false, "no axis", "VCC=5V..15V"},
		{"VA=", 3, false, "no axis", ""},
		{"D1.row=1.5..3", 3, false, "whole numbers", ""},
		{"D1.row=0..3", 3, false, "whole number", ""},
		{"VA+R1=1..3", 3, false, "cannot move together", ""},
		{"VA=1V,2V", 3, true, "no logarithmic steps", ""},
		{"d.drop=0.5..0.6", 3, false, "not stated", ""},
	} {
		_, err := sweep.ParseAxis(c, test.text, test.points, test.log)
		e, ok := sweep.IsError(err)
		if !ok {
			t.Errorf("%s: error %v", test.text, err)
			continue
		}
		if !strings.Contains(e.Message, test.says) || !strings.Contains(e.Hint, test.advice) {
			t.Errorf("%s: %q, hint %q; want %q, hint %q", test.text, e.Message, e.Hint, test.says, test.advice)
		}
	}
}

// Nested axes of a loaded divider, whose voltage Ohm's law gives.
func TestRowsOfADivider(t *testing.T) {
	c := read(t, divider)
	p := sweep.Plan{
		Circuit: c, Show: []string{"m.V", "R1.I*R2"},
		Axes: []sweep.Axis{axis(t, c, "R1=1k,3k", 0, false), axis(t, c, "VA=8V..12V", 5, false)},
	}
	for i, row := range rows(t, p) {
		r1, va := []float64{1000, 3000}[i/5], 8+float64(i%5)
		if row.At[0] != r1 || row.At[1] != va {
			t.Fatalf("row %d is at %v, want %g and %g", i, row.At, r1, va)
		}
		want := va * 2000 / (2000 + r1)
		if row.Status != sweep.OK || math.Abs(row.Values[0]-want) > 1e-12 || math.Abs(row.Values[1]-want) > 1e-12 {
			t.Errorf("row %d: %s %v, want %g twice", i, row.Status, row.Values, want)
		}
		// 3k is outside R1's 5 %.
		if row.Inside != (r1 == 1000) {
			t.Errorf("row %d: inside %v", i, row.Inside)
		}
	}
}

// equalSolve holds each row of a sweep against what solve gives with the value set.
func equalSolve(t *testing.T, c *netlist.Circuit, over string, show []string) {
	t.Helper()
	a := axis(t, c, over, 7, false)
	for i, row := range rows(t, sweep.Plan{Circuit: c, Axes: []sweep.Axis{a}, Show: show}) {
		changed, list := c.With(netlist.Setting{Name: strings.TrimSuffix(a.Name, ".V"), Value: fmt.Sprint(a.Values[i])})
		if list.HasErrors() {
			t.Fatal(list[0].Message)
		}
		res, err := solve.Solve(changed, solve.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for k, q := range show {
			e, _ := changed.ParseExpr(q)
			want, _ := e.Eval(res.Point)
			if math.Abs(row.Values[k]-want) > 1e-9*math.Abs(want) {
				t.Errorf("%s at %g: %s = %.12g, solve gives %.12g", over, a.Values[i], q, row.Values[k], want)
			}
		}
	}
}

func TestRowsEqualSolve(t *testing.T) {
	c := shipped(t, "mast-lamp.bias")
	for _, over := range []string{"VCC=2V..20V", "ambient=-40degC..80degC", "gp.betaF=20..500", "RE=10..1k", "LAMP.row=1..6", "sig.Rbulk=0ohm..10ohm", "RE=100,47,0,51", "RE=30..0"} {
		equalSolve(t, c, over, []string{"LAMP.I", "Q1.Vce", "VCC.P"})
	}
}

// A value that follows others has the swept number all the same, and what follows it
// follows that.
func TestSweptFollowersAreFollowed(t *testing.T) {
	c := read(t, `rail VCC = VS
rail V2 = VH
given VS = 10 V
given VH = VS / 2
given BF = 100
given BG = BF * 2
given RT = 1 kohm
given RU = RT * 2
given IT = VS / RT / 10
part q npn Vbe = 0.65 V at 1 mA, betaF = BG
path VCC -> R1 RU -> a -> Q1 q base=b -> gnd
path V2 -> RB 100k -> b
path VCC -> I1 IT -> c -> R3 RT -> gnd
`)
	for _, over := range []string{"RU=500,2k", "VH=3,6", "IT=1m,3m", "BG=50,300", "q.betaF=50,300", "VS=5,12", "BF=50,150", "RT=500,2k", "VCC=5,12", "Q1.betaF=30,60"} {
		equalSolve(t, c, over, []string{"R1.V / R1.I", "V2.V", "c.V", "a.V", "I1.I"})
	}
}

// With the load's voltage held, the number in its row does not matter, and moving it is no
// harm, in either order of the axes.
func TestRowsOfAHeldLoad(t *testing.T) {
	c := shipped(t, "mast-lamp.bias")
	res, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	held := c.HoldLoad(res.Point.LoadV)
	volts, lots := axis(t, held, "load.V=1V..9V", 2, false), axis(t, held, "LAMP.row=1..3", 2, false)
	for _, axes := range [][]sweep.Axis{{volts, lots}, {lots, volts}} {
		want := map[float64]float64{} // current by load voltage
		for _, r := range rows(t, sweep.Plan{Circuit: held, Axes: axes, Show: []string{"LAMP.I"}}) {
			at := r.At[0]
			if axes[1].Name == volts.Name {
				at = r.At[1]
			}
			if was, seen := want[at]; r.Status != sweep.OK || seen && math.Abs(r.Values[0]/was-1) > 1e-9 {
				t.Errorf("%v: %v, %s", r.At, r.Values, r.Status)
			}
			want[at] = r.Values[0]
		}
	}
}

func TestSameRowsWhateverTheWorkers(t *testing.T) {
	c := shipped(t, "mast-lamp.bias")
	text := func(workers int) string {
		var b strings.Builder
		p := sweep.Plan{
			Circuit: c, Show: []string{"LAMP.I"}, Workers: workers,
			Axes: []sweep.Axis{axis(t, c, "ambient=-20degC..60degC", 9, false), axis(t, c, "VCC=3V..15V", 700, false)},
		}
		for _, r := range rows(t, p) {
			fmt.Fprintln(&b, r)
		}
		return b.String()
	}
	if one, eight := text(1), text(8); one != eight {
		t.Error("1 and 8 workers differ")
	}
}

// A hold and a keep are judged inside the stated range only.
func TestRequirementsAreCounted(t *testing.T) {
	c := read(t, divider+"hold m.V within 10%\nkeep m.V < 7.5 V\n")
	nominal, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	p := sweep.Plan{Circuit: c, Axes: []sweep.Axis{axis(t, c, "VA=7V,8V,9.5V,12V,13V", 0, false)}, Nominal: nominal.Point}
	want := []struct {
		inside bool
		unmet  int
	}{{false, 0}, {true, 1}, {true, 0}, {true, 2}, {false, 0}} // 8 V: hold; 12 V: hold and keep
	for i, row := range rows(t, p) {
		if row.Inside != want[i].inside || row.Unmet != want[i].unmet {
			t.Errorf("at %g V: inside %v, %d unmet; want %+v", row.At[0], row.Inside, row.Unmet, want[i])
		}
	}
}

// A point that does not exist keeps its row.
func TestFailedPointKeepsItsRow(t *testing.T) {
	c := read(t, "rail V = 5 V\npart d diode Isat = 1e-14 A\npath V -> R1 1k -> a -> D1 d -> gnd\npath b -> I1 -1 mA -> gnd\npath b -> D2 d -> gnd\n")
	got := rows(t, sweep.Plan{Circuit: c, Show: []string{"b.V"}, Axes: []sweep.Axis{axis(t, c, "I1=-1 mA,1 mA,-2 mA", 0, false)}})
	want := []sweep.Status{sweep.OK, sweep.Failed, sweep.OK} // D2 passes no 1 mA in reverse
	for i, row := range got {
		if row.Status != want[i] || (row.Status == sweep.Failed) != math.IsNaN(row.Values[0]) {
			t.Errorf("row %d: %s %v, want %s", i, row.Status, row.Values, want[i])
		}
	}
}

func TestStops(t *testing.T) {
	c := read(t, divider)
	p := sweep.Plan{Circuit: c, Show: []string{"m.V"}, Workers: 2, Axes: []sweep.Axis{axis(t, c, "R1=1k..2k", 50, false), axis(t, c, "VA=1V..9V", 1000, false)}}
	enough := errors.New("enough")
	seen := 0
	err := sweep.Run(context.Background(), p, func(sweep.Row) error {
		if seen++; seen == 777 {
			return enough
		}
		return nil
	})
	if !errors.Is(err, enough) || seen != 777 {
		t.Errorf("error %v after %d rows", err, seen)
	}
	ctx, cancel := context.WithCancel(context.Background())
	seen = 0
	err = sweep.Run(ctx, p, func(sweep.Row) error {
		if seen++; seen == 10 {
			cancel()
		}
		return nil
	})
	if !errors.Is(err, context.Canceled) || seen != 10 {
		t.Errorf("error %v after %d rows", err, seen)
	}
}

// The load held at a voltage is an axis; its current is still known, its own
// voltage is the axis.
func TestLoadVoltage(t *testing.T) {
	c := read(t, "rail V = 10 V\npart d led Isat = 1e-18 A\npath V -> R1 1k -> a -> L1 d row=2 -> L2 100 -> b -> R2 1k -> gnd\nload L1 L2\nhold L1.I within 5%\n")
	held := c.HoldLoad(3)
	got := rows(t, sweep.Plan{Circuit: held, Show: []string{"L1.I", "load.I", "load.V", "L2.P", "b.V"}, Axes: []sweep.Axis{axis(t, held, "load.V=0V..8V", 3, false)}})
	for i, row := range got {
		v := 4 * float64(i)
		amps := (10 - v) / 2000
		for k, want := range []float64{amps, amps, v, math.NaN(), 1000 * amps} {
			if g := row.Values[k]; math.Abs(g-want) > 1e-12 || math.IsNaN(g) != math.IsNaN(want) {
				t.Errorf("load at %g V: value %d is %g, want %g", v, k, g, want)
			}
		}
	}
}

func BenchmarkSweepPoint(b *testing.B) {
	for _, test := range []struct{ file, over, show string }{
		{"w1.bias", "VCC=6V..18V", "LAMP.I"},
		{"w2.bias", "VCC=6V..18V", "VCC.I"},
	} {
		b.Run(test.file, func(b *testing.B) {
			c := shipped(b, test.file)
			const points = 10000
			p := sweep.Plan{Circuit: c, Show: []string{test.show}, Axes: []sweep.Axis{axis(b, c, test.over, points, false)}}
			for b.Loop() {
				failed := 0
				err := sweep.Run(context.Background(), p, func(r sweep.Row) error {
					if r.Status != sweep.OK {
						failed++
					}
					return nil
				})
				if err != nil || failed > 0 {
					b.Fatal(err, failed)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/points, "ns/point")
		})
	}
}

// Currents over beta: the parameter_sweep cases of testdata/reference/limits.json
// (its own source and method).
func TestReferenceBetaSpread(t *testing.T) {
	cases, err := reftest.Cases(filepath.Join("..", "testdata", "reference", "limits.json"))
	if err != nil {
		t.Fatal(err)
	}
	figures := 0
	for i := range cases {
		k := &cases[i]
		if k.Analysis != "parameter_sweep" {
			continue
		}
		text, err := k.Text()
		if err != nil {
			t.Fatal(err)
		}
		c := read(t, string(text.Source))
		var values []string
		for _, v := range k.Detail.Values {
			values = append(values, fmt.Sprint(v))
		}
		over := text.Part[k.Detail.Model] + ".betaF=" + strings.Join(values, ",")
		got := rows(t, sweep.Plan{Circuit: c, Show: []string{k.Expected[0].Probe.Element + ".Ic"}, Axes: []sweep.Axis{axis(t, c, over, 0, false)}})
		for j, f := range k.Expected {
			figures++
			if v := got[j].Values[0]; math.Abs(v-f.Value) > f.TolRel*f.Value {
				t.Errorf("%s %s = %.15g, want %.15g", k.ID, f.Name, v, f.Value)
			}
		}
	}
	if figures != 8 {
		t.Errorf("%d figures compared, expected 8", figures)
	}
}
