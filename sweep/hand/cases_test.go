package hand_test

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep/hand"
)

// row finds a quantity's row.
func row(t rapid.TB, a *hand.Answer, quantity string) *hand.Row {
	t.Helper()
	for i := range a.Rows {
		if a.Rows[i].Q.Text == quantity {
			return &a.Rows[i]
		}
	}
	t.Fatalf("no row %s", quantity)
	return nil
}

// The idealised circuit against arithmetic on the schematic, which the comments do.
func TestIdealisedCircuits(t *testing.T) {
	const near = 1e-9
	for _, c := range []struct {
		name, text string
		want       map[string]float64
	}{
		// (9 - 0.7) V on 8.3 kohm is 1 mA, and each output its size of it.
		{"a mirror keeps its sizes", `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 80, VA = 40 V
path VCC -> R1 8.3k -> b -> Q1 gp base=b -> gnd
path VCC -> Q2 gp base=b size=2 -> gnd
path VCC -> Q3 gp base=b size=0.5 -> gnd
assume Vbe = 0.7 V, betaF = infinite, VA = infinite
hand Q1.Ic = 1 mA
hand Q2.Ic = 2 mA
hand Q3.Ic = 0.5 mA`, map[string]float64{"Q1.Ic": 1e-3, "Q2.Ic": 2e-3, "Q3.Ic": 0.5e-3}},
		// With beta 80: I = I_C (1 + 3.5/80).
		{"base currents follow the collector currents", `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 80
path VCC -> R1 8.3k -> b -> Q1 gp base=b -> gnd
path VCC -> Q2 gp base=b size=2 -> gnd
path VCC -> Q3 gp base=b size=0.5 -> gnd
assume Vbe = 0.7 V
hand R1.I = 1 mA
hand Q2.Ic = 2 mA`, map[string]float64{"R1.I": 1e-3, "Q2.Ic": 2e-3 / (1 + 3.5/80)}},
		// 3 V - 0.6 V on 2.4 kohm in cold and heat.
		{"no temperature moves a fixed drop", `
rail VCC = 3 V
ambient = 85 degC
part sig diode drop = 0.62 V at 1 mA, n = 1.8, Rbulk = 20 ohm
path VCC -> R1 2.4k -> a -> D1 sig -> gnd
assume drop(sig) = 0.6 V
hand a.V = 0.6 V
hand D1.I = 1 mA`, map[string]float64{"a.V": 0.6, "D1.I": 1e-3}},
		// Two of 2 V each, bulk resistance and all: 5 V - 4 V on 100 ohm.
		{"a row drops each member's", `
rail VCC = 5 V
part amber led drop = 2.05 V at 15 mA, n = 2, Rbulk = 5 ohm
path VCC -> LAMP amber row=2 -> a -> R1 100 -> gnd
assume drop(amber) = 2 V
hand LAMP.I = 10 mA
hand a.V = 1 V`, map[string]float64{"LAMP.I": 0.01, "a.V": 1}},
		// 12 V - 5 V on 700 ohm; the part's 5.6 V, its drift and slope are gone.
		{"a breakdown fixed", `
rail VCC = 12 V
ambient = 60 degC
part z56 zener Vz = 5.6 V at 5 mA, rz = 10 ohm, drift = 2 mV/K, Rbulk = 3 ohm
path VCC -> R1 700 -> a -> Z1 z56 reversed -> gnd
assume Vz(z56) = 5 V
hand Z1.I = 10 mA
hand Z1.V = 5 V`, map[string]float64{"Z1.I": 0.01, "Z1.V": 5}},
		// A divider of two like resistors, of which one has a coefficient: at 25 degC.
		{"ambient", `
rail VCC = 10 V
ambient = 75 degC
path VCC -> R1 1k 1000 ppm/K -> a -> R2 1k -> gnd
assume ambient = 25 degC
hand a.V = 5 V`, map[string]float64{"a.V": 5}},
		// A part's own line holds in place of that for all.
		{"one part apart", `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA
part hv npn Vbe = 0.65 V at 1 mA
path VCC -> R1 8.2k -> a -> Q1 gp base=a -> gnd
path VCC -> R2 8.2k -> b -> Q2 hv base=b -> gnd
assume Vbe = 0.7 V, Vbe(hv) = 0.6 V
hand a.V = 0.7 V
hand b.V = 0.6 V`, map[string]float64{"a.V": 0.7, "b.V": 0.6}},
		// I_B is I_C/50 and nothing else: 4.3 V on 43 kohm is 0.1 mA, for base and
		// collector together.
		{"an assumed beta is all there is", `
rail VCC = 5 V
ambient = 60 degC
part gp npn Vbe = 0.65 V at 1 mA, betaF = 180, betaDrift = 0.5 %/K, Irec = 1 pA
path VCC -> RB 43k -> b -> Q1 gp base=b -> gnd
path VCC -> RC 100 -> c -> Q1X 0 -> d
place Q2 gp collector=d base=b2 emitter=gnd
path VCC -> R2 1M -> b2
assume Vbe = 0.7 V, betaF = 50, betaR = infinite
hand Q1.Ib = 0.1 mA / 51
hand Q2.Ib = (VCC - 0.7 V) / R2
hand Q2.Ic = 50 * Q2.Ib`, map[string]float64{"Q1.Ib": 1e-4 / 51, "Q2.Ib": 4.3e-6, "Q2.Ic": 50 * 4.3e-6}},
		// Both junctions stand at 0.7 V: none is left between collector and emitter.
		{"saturated", `
rail VCC = 5 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 180
path VCC -> RB 4.3k -> b -> Q1 gp base=b -> gnd
path VCC -> RC 1k -> c -> Q2 gp base=b2 -> gnd
path VCC -> RB2 4.3k -> b2
assume Vbe = 0.7 V
hand Q2.Ic = 5 mA
hand Q2.Ib = 1 mA`, map[string]float64{"Q2.Ic": 5e-3, "Q2.Ib": 1e-3}},
		// A pnp, and the Early factor 1 + (9.3 V - 0.7 V)/43 V = 1.2 on what the base gives.
		{"the Early factor keeps its voltage", `
rail VCC = 10 V
part gpp pnp Veb = 0.65 V at 1 mA, betaF = 50, VA = 43 V
path VCC -> Q1 gpp base=b -> c -> RC 1k -> gnd
path b -> RB 930k -> gnd
assume Vbe = 0.7 V
hand Q1.Ib = 10 uA
hand c.V = 0.5 V`, map[string]float64{"Q1.Ib": 10e-6, "c.V": early}},
	} {
		t.Run(c.name, func(t *testing.T) {
			a := check(t, read(t, "test.bias", c.text))
			if a.Unsplit != nil {
				t.Fatal(a.Unsplit)
			}
			for q, want := range c.want {
				if got := row(t, a, q).Ideal; !(math.Abs(got-want) <= near*math.Abs(want)) {
					t.Errorf("%s = %.12g idealised, want %.12g", q, got, want)
				}
			}
		})
	}
}

// early solves v = 1 kohm · 50 · 10 uA · (1 + (10 V - v - 0.7 V)/43 V) by hand: the
// collector's v_CB is what is left of 10 V less the emitter-base drop.
var early = func() float64 {
	const base = 0.5 // V on 1 kohm without the Early effect
	return base * (1 + 9.3/43) / (1 + base/43)
}()

// A divider sink of any values has (VCC R2/(R1 + R2) - V_BE)/RE, as every textbook says,
// where it is not saturated; and its shares add up.
func TestRandomDividerSinks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r1 := math.Round(math.Pow(10, rapid.Float64Range(3, 5).Draw(t, "R1")))
		r2 := math.Round(r1 * rapid.Float64Range(0.15, 0.4).Draw(t, "R2/R1"))
		re := math.Round(math.Pow(10, rapid.Float64Range(1, 3.5).Draw(t, "RE")))
		vbe := math.Round(1e3*rapid.Float64Range(0.5, 0.8).Draw(t, "Vbe")) / 1e3
		a := check(t, read(t, "test.bias", fmt.Sprintf(`
rail VCC = 12 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150, VA = 80 V, Irec = 0.1 pA
path VCC -> R1 %g -> b -> R2 %g -> gnd
path VCC -> Q1 gp base=b -> e -> RE %g -> gnd
assume Vbe = %g V, betaF = infinite, VA = infinite
hand RE.I = (VCC * R2 / (R1 + R2) - %g V) / RE
`, r1, r2, re, vbe, vbe)))
		r := row(t, a, "RE.I")
		if a.Unsplit != nil || !(math.Abs(r.LeftOut()) <= 1e-8*math.Abs(r.Hand)) {
			t.Fatalf("idealised %.12g, by hand %.12g: %v", r.Ideal, r.Hand, a.Unsplit)
		}
		sum := r.Hand + r.LeftOut()
		for _, s := range r.Shares {
			sum += s
		}
		if !(math.Abs(sum-r.Full) <= 1e-9*r.Full) {
			t.Fatalf("shares lead to %.12g, full is %.12g", sum, r.Full)
		}
	})
}

// A circuit that lives on a difference of two V_BE has no current where both are fixed.
func TestDifferenceOfDropsComesToNothing(t *testing.T) {
	a := check(t, read(t, "test.bias", `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 200, VA = 80 V
path VCC -> R1 8.3k -> b -> Q1 gp base=b -> gnd
path VCC -> Q2 gp base=b size=8 -> e -> RE 100 -> gnd
assume Vbe = 0.7 V, betaF = infinite, VA = infinite
hand RE.I = 0 A`))
	if r := row(t, a, "RE.I"); a.Unsplit != nil || math.Abs(r.Ideal) > 1e-5*r.Full {
		t.Errorf("%g A of %g A: %v", r.Ideal, r.Full, a.Unsplit)
	}
}

// Of a latch's two states the check takes the one asked for, in full and idealised: with
// 5 V through 11 kohm on 0.7 V, the other base's side stands at 5 V less 4.3 V/11.
func TestNearChoosesThePoint(t *testing.T) {
	c := read(t, "test.bias", `
rail V = 5 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 100
path V -> R1 1k -> a -> Q1 gp base=x -> gnd
path V -> R2 1k -> b -> Q2 gp base=y -> gnd
path b -> R3 10k -> x
path a -> R4 10k -> y
assume Vbe = 0.7 V, betaF = infinite
hand a.V = 0 V
hand b.V = V - (V - 0.7 V) / 11`)
	for high, low := range map[string]string{"a": "b", "b": "a"} {
		at := netlist.NodeID(slices.IndexFunc(c.Nodes, func(n netlist.Node) bool { return n.Name == high }))
		a, err := hand.Check(c, hand.Options{Near: map[netlist.NodeID]float64{at: 4}})
		if err != nil {
			t.Fatal(err)
		}
		if got, want := row(t, a, high+".V").Ideal, 5-4.3/11; a.Unsplit != nil || math.Abs(got-want) > 1e-9 {
			t.Errorf("%s high: %.12g idealised, want %.12g: %v", high, got, want, a.Unsplit)
		}
		if got := row(t, a, low+".V").Ideal; math.Abs(got) > 1e-9 {
			t.Errorf("%s low: %g idealised", low, got)
		}
	}
}

// Fixed drops of 1 V in all across 1.2 V leave no operating point: that is said, and the
// rest of the answer stands.
func TestDropsAcrossASupply(t *testing.T) {
	a := check(t, read(t, "test.bias", `
rail VCC = 1.2 V
part sig diode drop = 0.62 V at 1 mA, n = 1.8
path VCC -> D1 sig -> D2 sig -> gnd
assume drop(sig) = 0.5 V
hand D1.V = 0.6 V`))
	r := row(t, a, "D1.V")
	if a.Unsplit == nil || !math.IsNaN(r.Ideal) || r.Shares != nil || r.Full != 0.6 {
		t.Errorf("%v, %+v", a.Unsplit, r)
	}
	if a.Unsplit != nil && !strings.Contains(a.Unsplit.Error(), "straight across a supply") {
		t.Error(a.Unsplit)
	}
}

// More assumptions than are weighed singly: those of single parts become one.
func TestManyAssumptions(t *testing.T) {
	text := "rail VCC = 24 V\npart q npn\npath VCC -> R1 8.2k -> n1"
	assume, parts := "assume Vbe = 0.7 V, betaF = infinite", ""
	for i := range 9 {
		parts += fmt.Sprintf("part d%d diode\n", i)
		text += fmt.Sprintf(" -> D%d d%d", i, i)
		assume += fmt.Sprintf(", drop(d%d) = 0.7 V", i)
	}
	text = parts + text + " -> n2 -> R2 1k -> gnd\npath VCC -> Q1 q base=n2 -> e -> RE 470 -> gnd\n" + assume +
		"\nhand R1.I = (VCC - 9 * 0.7 V) / (R1 + R2)\n"
	a := check(t, read(t, "test.bias", text))
	r := row(t, a, "R1.I")
	if len(a.Players) != 3 || !a.Merged || a.Unsplit != nil {
		t.Fatalf("%d players, merged %v: %v", len(a.Players), a.Merged, a.Unsplit)
	}
	if got := r.Ideal + r.Shares[0] + r.Shares[1] + r.Shares[2]; math.Abs(got-r.Full) > 1e-9*r.Full || math.Abs(r.LeftOut()) > 1e-8*r.Hand {
		t.Errorf("%+v", r)
	}
	// One fewer is weighed singly.
	single := check(t, read(t, "test.bias", strings.Replace(text, ", betaF = infinite", "", 1)))
	if len(single.Players) != hand.MostPlayers || single.Merged {
		t.Errorf("%d players, merged %v", len(single.Players), single.Merged)
	}
}

// The rules' figures against arithmetic on the point, and what they cost against the
// circuit solved again with the setting that takes the base current away.
func TestRules(t *testing.T) {
	c := read(t, "test.bias", `
rail VCC = 12 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150
part sig diode drop = 0.62 V at 1 mA
path VCC -> R1 6.8k -> b -> R2 1.2k -> gnd
path VCC -> RC 100 -> c -> Q1 gp base=b -> e -> RE 220 -> gnd
path VCC -> R3 8.2k -> d -> D1 sig -> gnd
path VCC -> R4 1k -> f -> Q2 gp base=d -> g -> RG 10 -> gnd
hand Q1.Ic = 5 mA
hand Q2.Ic = 5 mA`)
	a := check(t, c)
	want := func(kind hand.RuleKind, element string, figure, cost float64, kept bool) {
		t.Helper()
		i := slices.IndexFunc(a.Rules, func(r hand.Rule) bool {
			return r.Kind == kind && c.Elements[r.Element].Name == element
		})
		if i < 0 {
			t.Fatalf("no rule %s of %s", kind, element)
		}
		r := &a.Rules[i]
		got := r.Costs[0] // Q1.Ic
		if element == "D1" || element == "Q2" {
			got = r.Costs[1]
		}
		if math.Abs(r.Figure-figure) > 1e-6*math.Abs(figure) || r.Kept() != kept || math.Abs(got-cost) > 1e-9 {
			t.Errorf("%s of %s: %g, cost %g, kept %v; want %g, %g, %v", kind, element, r.Figure, got, r.Kept(), figure, cost, kept)
		}
	}
	solved := func(set string, quantity string) float64 {
		t.Helper()
		changed, diags := c.With(netlist.Setting{Name: set, Value: "infinite"})
		if diags.HasErrors() {
			t.Fatal(diags)
		}
		res, err := solve.Solve(changed, solve.Options{})
		if err != nil {
			t.Fatal(err)
		}
		q, _ := changed.ParseExpr(quantity)
		v, _ := q.Eval(res.Point)
		return row(t, a, quantity).Full/v - 1
	}
	parallel := 1 / (1/6800.0 + 1/1200.0)
	want(hand.Stiffness, "Q1", 150*220/parallel, solved("Q1.betaF", "Q1.Ic"), true)
	element := func(name string) *solve.ElementPoint {
		at := slices.IndexFunc(c.Elements, func(e netlist.Element) bool { return e.Name == name })
		return &a.Full.Elements[at]
	}
	want(hand.Reference, "D1", element("D1").I/element("Q2").Ib, solved("Q2.betaF", "Q2.Ic"), true)
	for _, q := range []string{"Q1", "Q2"} {
		at := slices.IndexFunc(c.Elements, func(e netlist.Element) bool { return e.Name == q })
		want(hand.Saturation, q, a.Full.SpareVolts(at), 0, true)
	}
	if len(a.Rules) != 4 {
		t.Errorf("%d rules, want 4", len(a.Rules))
	}
}

// A divider's legs and an emitter resistor may be several in a row; a leg that ends on a
// free node is none, and a diode by which a base is fed is no reference.
func TestWhereRulesApply(t *testing.T) {
	for _, c := range []struct {
		name, text string
		want       map[hand.RuleKind]float64 // figure; 0 where the rule does not apply
	}{
		{
			"rows", `
path VCC -> R1A 3k -> R1B 3.8k -> b -> R2 600 -> m -> LINK 0 -> n -> R2B 600 -> gnd
path VCC -> Q1 gp base=b -> e -> RE 100 -> REB 120 -> gnd`,
			map[hand.RuleKind]float64{hand.Stiffness: 150 * 220 / (1 / (1/6800.0 + 1/1200.0))},
		},
		{"no divider", `
path VCC -> R1 100k -> b
path VCC -> Q1 gp base=b -> e -> RE 220 -> gnd`, map[hand.RuleKind]float64{}},
		{"no emitter resistor", `
path VCC -> R1 68k -> b -> R2 4k -> gnd
path VCC -> RC 1k -> c -> Q1 gp base=b -> gnd`, map[hand.RuleKind]float64{}},
		{"a side branch", `
path VCC -> R1 6.8k -> b -> R2 600 -> m -> R3 600 -> gnd
path m -> R4 10k -> VCC
path VCC -> Q1 gp base=b -> e -> RE 220 -> gnd`, map[hand.RuleKind]float64{}},
		{"a diode feeds the base", `
path VCC -> R1 100k -> D1 sig -> b
path VCC -> RC 1k -> c -> Q1 gp base=b -> gnd`, map[hand.RuleKind]float64{}},
	} {
		t.Run(c.name, func(t *testing.T) {
			a := check(t, read(t, "test.bias", `rail VCC = 12 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150
part sig diode drop = 0.62 V at 1 mA`+c.text+"\nhand Q1.Ic = 1 mA"))
			for _, kind := range []hand.RuleKind{hand.Stiffness, hand.Reference} {
				got := 0.0
				if i := slices.IndexFunc(a.Rules, func(r hand.Rule) bool { return r.Kind == kind }); i >= 0 {
					got = a.Rules[i].Figure
				}
				if want := c.want[kind]; math.Abs(got-want) > 1e-9*want {
					t.Errorf("%s: %g, want %g", kind, got, want)
				}
			}
		})
	}
}

// What no part can be explains nothing: a base-emitter voltage of a volt.
func TestImpossibleSuspectsAreLeftOut(t *testing.T) {
	a := check(t, read(t, "test.bias", `rail VCC = 12 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150
path VCC -> R1 6.8k -> b -> R2 1.2k -> gnd
path VCC -> RC 470 -> c -> Q1 gp base=b -> e -> RE 220 -> gnd
hand e.V = 1 V
measured e.V = 0.6 V
`))
	for _, s := range a.Suspects {
		if s.Name == "gp.Vbe" && s.To > 0.9 {
			t.Errorf("%s = %g is to explain %g", s.Name, s.To, s.Explained)
		}
	}
	if len(a.Suspects) == 0 {
		t.Error("nothing explains a reading that a resistor does")
	}
}

// A transistor that stands on gnd and is driven by resistors into saturation is judged as
// a switch, whatever saturation costs; one with an emitter resistor, in a mirror or in
// its active region is not.
func TestSwitchesAreJudgedAsSwitches(t *testing.T) {
	for _, c := range []struct {
		name, text string
		kind       hand.RuleKind
		kept       bool
	}{
		{"driven hard", "path VCC -> RC 1k -> c -> Q1 gp base=b -> gnd\npath VCC -> RB 10k -> b", hand.Switch, true},
		{"hardly saturated", "path VCC -> RC 1k -> c -> Q1 gp base=b -> gnd\npath VCC -> RB 100k -> b", hand.Switch, false},
		{"active", "path VCC -> RC 100 -> c -> Q1 gp base=b -> gnd\npath VCC -> RB 100k -> b", hand.Saturation, true},
		{"an emitter resistor", "path VCC -> RC 10k -> c -> Q1 gp base=b -> e -> RE 100 -> gnd\npath VCC -> RB 10k -> b", hand.Saturation, false},
		{"a mirror", "path VCC -> R1 1k -> b -> Q2 gp base=b -> gnd\npath VCC -> RC 100k -> c -> Q1 gp base=b -> gnd", hand.Saturation, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			a := check(t, read(t, "test.bias", "rail VCC = 12 V\npart gp npn Vbe = 0.65 V at 1 mA, betaF = 150, betaR = 3\n"+c.text+"\nhand Q1.Ic = 1 mA"))
			q := slices.IndexFunc(a.Circuit.Elements, func(e netlist.Element) bool { return e.Name == "Q1" })
			for i := range a.Rules {
				r := &a.Rules[i]
				if r.Element != q {
					continue
				}
				if r.Kind != c.kind || r.Kept() != c.kept {
					t.Errorf("%s, kept %v; want %s, %v", r.Kind, r.Kept(), c.kind, c.kept)
				}
				if forced := a.Full.Elements[q].Ic / a.Full.Elements[q].Ib; r.Kind == hand.Switch && r.Figure != forced {
					t.Errorf("figure %g, want I_C/I_B, %g", r.Figure, forced)
				}
				return
			}
			t.Error("no rule of Q1")
		})
	}
}

// A bench on which one value differs from the file's: its readings name that value.
func TestMeasuredNamesTheValue(t *testing.T) {
	const text = `
rail VCC = 12 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150 (100 .. 200), VA = 80 V
path VCC -> R1 6.8k 1%% -> b -> R2 1.2k 1%% -> gnd
path VCC -> RC 470 1%% -> c -> Q1 gp base=b -> e -> RE 220 20%% -> gnd
hand e.V = 1 V
measured b.V = %.15g V
measured c.V = %.15g V
measured e.V = %.15g V
`
	for _, at := range []struct {
		setting, value string
		want           float64
		agreement      hand.Agreement
		stated, inside bool
	}{
		{"RE", "330", 330, hand.Apart, true, false},
		{"R1", "6.2k", 6200, hand.Apart, true, false},
		{"gp.betaF", "60", 60, hand.Reachable, true, false},
		{"RE", "250", 250, hand.Reachable, true, true},
		{"VCC", "11 V", 11, hand.Apart, false, false},
	} {
		t.Run(at.setting+"="+at.value, func(t *testing.T) {
			bench, diags := read(t, "test.bias", fmt.Sprintf(text, 1.0, 1.0, 1.0)).With(netlist.Setting{Name: at.setting, Value: at.value})
			if diags.HasErrors() {
				t.Fatal(diags)
			}
			res, err := solve.Solve(bench, solve.Options{})
			if err != nil {
				t.Fatal(err)
			}
			var readings []any
			for i := range bench.Measured {
				v, _ := bench.Measured[i].Q.Eval(res.Point)
				readings = append(readings, v)
			}
			a := check(t, read(t, "test.bias", fmt.Sprintf(text, readings...)))
			if len(a.Suspects) == 0 {
				t.Fatal("no suspect")
			}
			s := &a.Suspects[0]
			stated, inside := s.Stated(a.Circuit)
			if s.Name != at.setting || math.Abs(s.To/at.want-1) > 1e-6 || s.Explained < 1-1e-9 || stated != at.stated || inside != at.inside {
				t.Errorf("%+v, stated %v, inside %v", *s, stated, inside)
			}
			furthest := hand.Agrees
			for i := range a.Rows {
				if r := &a.Rows[i]; r.Agreement == hand.Apart || r.Agreement == hand.Reachable && furthest == hand.Agrees {
					furthest = r.Agreement
				}
			}
			if furthest != at.agreement {
				t.Errorf("%s, want %s", furthest, at.agreement)
			}
			for i := range a.Rows {
				if r := &a.Rows[i]; math.Abs(s.After[i]-r.Measured) > 1e-6*r.Measured {
					t.Errorf("%s would be %g, measured %g", r.Q.Text, s.After[i], r.Measured)
				}
			}
		})
	}
}

// What agrees is not explained.
func TestMeasuredAgrees(t *testing.T) {
	a := check(t, read(t, "test.bias", `
rail VCC = 10 V
path VCC -> R1 1k -> a -> R2 1k -> gnd
hand a.V = 5 V
measured a.V = 5.03 V
measured R1.I = 4.97 mA`))
	if len(a.Suspects) > 0 || row(t, a, "a.V").Agreement != hand.Agrees || row(t, a, "R1.I").Agreement != hand.Agrees {
		t.Errorf("%+v", a)
	}
	if r := row(t, a, "R1.I"); r.HandLine != netlist.None || !math.IsNaN(r.Hand) {
		t.Errorf("%+v", r)
	}
}

// Refusals.
func TestRefused(t *testing.T) {
	for _, c := range []struct{ name, text, code string }{
		{"no hand line", "rail V = 5 V\npath V -> R1 1k -> a -> R2 1k -> gnd\nmeasured a.V = 2 V\n", "no-hand"},
		{"no number", "rail V = 5 V\npath V -> R1 1k -> a -> R2 2k -> gnd\nhand a.V = V * sqrt((R1 - R2) / R2)\n", "no-number"},
		{"division by nothing", "rail V = 5 V\npath V -> R1 1k -> a -> R2 1k -> gnd\nhand a.V = V * R1 / (R1 - R2)\n", "no-number"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := hand.Check(read(t, "test.bias", c.text), hand.Options{})
			var wrong *hand.Error
			if !errors.As(err, &wrong) || wrong.Code != c.code {
				t.Errorf("%v", err)
			}
		})
	}
	_, err := hand.Check(read(t, "test.bias", "part d diode\npath gnd -> I1 1 mA -> a -> D1 d reversed -> gnd\nhand a.V = 1 V\n"), hand.Options{})
	var none *solve.Failure
	if !errors.As(err, &none) {
		t.Errorf("%v, want a failure of the solver", err)
	}
}
