package netlist

import (
	"math"
	"slices"
	"strings"
	"testing"

	"biaswright/netlist/quantity"

	"github.com/google/go-cmp/cmp"
)

// lamp is the mast's lamp sink, as the language's own page writes it.
const lamp = `# Tide-gauge mast: keep the amber lamp string at a steady current.
title "Mast lamp sink, two-diode reference"

rail    VCC = 12 V (10.8 V .. 13.2 V)
ambient = 25 degC (-20 degC .. 60 degC)

part sig   diode  drop = 0.62 V at 1 mA, n = 1.8
part gp    npn    Vbe = 0.65 V at 1 mA, betaF = 180 (100 .. 300), VA = 80 V, Pmax = 500 mW, RthJA = 200 K/W
part amber led    drop = 2.05 V at 15 mA, n = 2, Rbulk = 5 ohm

path VCC -> R1 1.8k 5% -> bias -> D1 sig -> D2 sig -> gnd
path VCC -> LAMP amber row=2 -> out -> Q1 gp base=bias -> tail -> RE 47 1% 0.25 W -> gnd

load    LAMP
hold    LAMP.I within 5%
target  LAMP.I = 15 mA within 10%
keep    Q1.P < 250 mW

assume  Vbe = 0.7 V, drop(sig) = 0.7 V, betaF = infinite
hand    tail.V = 0.7 V
hand    LAMP.I = 0.7 V / RE
`

// read resolves a text that must have no errors.
func read(t testing.TB, text string) *Circuit {
	t.Helper()
	c, diags := Read("test.bias", []byte(text), testCatalogue(), Files{Shelves: testShelves})
	if c == nil {
		t.Fatalf("errors in\n%s\n%v", text, diags)
	}
	return c
}

func (c *Circuit) elementNamed(t testing.TB, name string) *Element {
	t.Helper()
	for i := range c.Elements {
		if c.Elements[i].Name == name {
			return &c.Elements[i]
		}
	}
	t.Fatalf("no element %s", name)
	return nil
}

// number is the value of a slot by name.
func number(t testing.TB, c *Circuit, name string) float64 {
	t.Helper()
	id, ok := c.Lookup(name)
	if !ok {
		t.Fatalf("there is no %s", name)
	}
	return c.Value(id)
}

func (c *Circuit) nodeName(id NodeID) string {
	if id == None {
		return ""
	}
	return c.Nodes[id].Name
}

func TestLampSink(t *testing.T) {
	c := read(t, lamp)
	if c.Title != "Mast lamp sink, two-diode reference" || c.File != "test.bias" {
		t.Errorf("title %q, file %q", c.Title, c.File)
	}
	var nodes []string
	for _, n := range c.Nodes {
		nodes = append(nodes, n.Name)
	}
	want := []string{"gnd", "VCC", "bias", "D1:D2", "LAMP.1:LAMP.2", "out", "tail"}
	slices.Sort(want[2:])
	slices.Sort(nodes[2:])
	if diff := cmp.Diff(want, nodes); diff != "" {
		t.Errorf("nodes (-want +got):\n%s", diff)
	}
	type ends struct{ From, To, Base string }
	got := map[string]ends{}
	for _, e := range c.Elements {
		got[e.Name] = ends{c.nodeName(e.From), c.nodeName(e.To), c.nodeName(e.Base)}
	}
	if diff := cmp.Diff(map[string]ends{
		"R1": {"VCC", "bias", ""}, "D1": {"bias", "D1:D2", ""}, "D2": {"D1:D2", "gnd", ""},
		"LAMP": {"VCC", "out", ""}, "Q1": {"out", "tail", "bias"}, "RE": {"tail", "gnd", ""},
	}, got); diff != "" {
		t.Errorf("ends (-want +got):\n%s", diff)
	}
	for name, want := range map[string]float64{
		"VCC": 12, "VCC.V": 12, "ambient": 25, "R1": 1800, "RE": 47, "RE.rating": 0.25, "sig.drop": 0.62, "sig.drop.at": 1e-3,
		"D1.drop": 0.62, "gp.betaF": 180, "Q1.betaF": 180, "Q1.VA": 80, "Q1.Pmax": 0.5, "Q1.RthJA": 200, "Q1.size": 1, "amber.Rbulk": 5,
	} {
		if got := number(t, c, name); got != want {
			t.Errorf("%s = %v, want %v", name, got, want)
		}
	}
	for _, name := range []string{"sig.Isat", "D1.Isat", "Q1.Isat"} {
		if got := number(t, c, name); !math.IsNaN(got) {
			t.Errorf("%s = %v although its rival is stated", name, got)
		}
	}
	if len(c.Load) != 1 || c.Hold == nil || c.Hold.Within != 0.05 || !c.Hold.Relative || len(c.Targets) != 1 || len(c.Keeps) != 1 || len(c.Hands) != 2 || len(c.Assumed) != 3 {
		t.Errorf("requirements: %+v %+v %+v %+v %+v %+v", c.Load, c.Hold, c.Targets, c.Keeps, c.Hands, c.Assumed)
	}
	if c.Targets[0].Value != 15e-3 || c.Targets[0].Within != 0.1 {
		t.Errorf("target %+v", c.Targets[0])
	}
	if len(c.Warnings) != 0 {
		t.Errorf("warnings: %v", c.Warnings)
	}
}

// What an element is follows from its second word, never from its designator.
func TestSecondWord(t *testing.T) {
	const frame = `
rail VCC = 12 V
given RSET = 470 ohm
given ISET = 2 mA
given R47 = 3 ohm
part sig diode
part gp npn
part gpp pnp
part K22 diode
path VCC -> X %s -> a -> RL 1k -> gnd
path VCC -> RB 10k -> b -> RC 10k -> gnd
keep RSET * ISET + R47 * RL.I < 10 V
`
	for _, tt := range []struct {
		word  string
		kind  ElementKind
		value float64
	}{
		{"68", Resistor, 68},
		{"1.8k", Resistor, 1800},
		{"4k7", Resistor, 4700},
		{"1.8 kohm", Resistor, 1800},
		{"68 Ω", Resistor, 68},
		{"R22", Resistor, 0.22},
		{"10K", Resistor, 10e3},
		{"0", Link, 0},
		{"RSET", Resistor, 470},
		{"R47", Resistor, 3}, // a given name wins over the code
		{"10 uA", CurrentSource, 10e-6},
		{"ISET", CurrentSource, 2e-3},
		{"drop 2.0 V", Drop, 2},
		{"cell 1.5 V", Cell, 1.5},
		{"sig", JunctionPart, math.NaN()},
		{"K22", JunctionPart, math.NaN()}, // and so does a part's
		{"sig reversed", JunctionPart, math.NaN()},
		{"gp base=b", TransistorPart, math.NaN()},
		{"gpp base=b", TransistorPart, math.NaN()},
		{"? E24", Open, math.NaN()},
	} {
		t.Run(tt.word, func(t *testing.T) {
			c := read(t, strings.Replace(frame, "%s", tt.word, 1))
			e := c.elementNamed(t, "X")
			if e.Kind != tt.kind {
				t.Errorf("kind %v, want %v", e.Kind, tt.kind)
			}
			if e.Kind == JunctionPart || e.Kind == TransistorPart {
				if e.Value != None || e.Part == None {
					t.Errorf("value %v, part %v", e.Value, e.Part)
				}
				return
			}
			if got := c.Value(e.Value); got != tt.value && !(math.IsNaN(got) && math.IsNaN(tt.value)) {
				t.Errorf("value %v, want %v", got, tt.value)
			}
		})
	}
}

// A pnp stands the other way round on its path; placed parts have their ends by
// their pins.
func TestEnds(t *testing.T) {
	c := read(t, `
rail VCC = 12 V
part gp npn
part gpp pnp
part sig diode
path VCC -> Q1 gpp base=b -> o -> R1 1k -> gnd
path VCC -> R2 10k -> b -> R3 10k -> gnd
place Q2 gpp collector=o base=b emitter=VCC
place Q3 gp collector=VCC base=b emitter=o
place D1 sig anode=o cathode=gnd
path VCC -> R4 1k -> z -> Z1 sig reversed -> gnd
`)
	type ends struct{ From, To, Base string }
	for name, want := range map[string]ends{
		"Q1": {"VCC", "o", "b"}, "Q2": {"VCC", "o", "b"}, "Q3": {"VCC", "o", "b"}, "D1": {"o", "gnd", ""}, "Z1": {"z", "gnd", ""},
	} {
		e := c.elementNamed(t, name)
		if got := (ends{c.nodeName(e.From), c.nodeName(e.To), c.nodeName(e.Base)}); got != want {
			t.Errorf("%s: %v, want %v", name, got, want)
		}
	}
	if len(c.Placed) != 3 || !c.elementNamed(t, "Z1").Reversed {
		t.Errorf("placed %v", c.Placed)
	}
}

// A node that the language names may be referred to before and behind the path that
// makes it.
func TestMadeNodes(t *testing.T) {
	c := read(t, `
rail VCC = 12 V
part amber led
part gp npn
path D1:D2 -> R1 1k -> gnd
path VCC -> D1 amber -> D2 amber -> a -> RA 1k -> gnd
path VCC -> LAMP amber row=3 -> b -> RB 1k -> gnd
path VCC -> Q1 gp base=LAMP.2:LAMP.3 -> gnd
`)
	if e := c.elementNamed(t, "R1"); e.From != c.elementNamed(t, "D1").To || c.nodeName(e.From) != "D1:D2" {
		t.Errorf("R1 begins at %s", c.nodeName(e.From))
	}
	if e := c.elementNamed(t, "LAMP"); c.elementNamed(t, "Q1").Base != e.Chain[2] {
		t.Errorf("Q1's base is at %s", c.nodeName(c.elementNamed(t, "Q1").Base))
	}
	_, diags := Read("test.bias", []byte("rail VCC = 12 V\npath VCC -> R1 1k -> R2 1k -> gnd\npath VCC -> R3 1k -> R1:R3\n"), testCatalogue(), nil)
	if len(diags) != 1 || !strings.HasPrefix(diags[0].Message, "there is no node R1:R3") || diags[0].Hint != "did you mean R1:R2?" {
		t.Errorf("%v", diags)
	}
}

func TestBounds(t *testing.T) {
	c := read(t, `
given G = 2 mA 10%
rail VCC = 12 V (10.8 V .. 13.2 V)
rail VEE = -12 V 5%
part sig diode n = 1.8 (1.5 .. 2) normal, drop = 0.62 V (0.6 V .. 0.64 V) at 1 mA
path VCC -> R1 1k 5% -> a -> D1 sig -> VEE
path VCC -> R2 1k (950 .. 1.1k) -> a -> I1 G -> VEE
path VCC -> R3 150 pick 100 150 250 -> a
`)
	for _, tt := range []struct {
		name      string
		low, high float64
		spread    Spread
	}{
		{"VCC", 10.8, 13.2, Uniform},
		{"VEE", -12.6, -11.4, Uniform}, // the lower end is the one further from 0
		{"R1", 950, 1050, Uniform},
		{"R2", 950, 1100, Uniform},
		{"R3", 100, 250, Pick},
		{"G", 1.8e-3, 2.2e-3, Uniform},
		{"sig.n", 1.5, 2, Normal},
		{"D1.n", 1.5, 2, Normal},
		{"D1.drop", 0.6, 0.64, Uniform},
	} {
		id, _ := c.Lookup(tt.name)
		b := c.Slots[id].Bounds
		if !b.Stated || math.Abs(b.Low-tt.low) > 1e-12*math.Abs(tt.low) || math.Abs(b.High-tt.high) > 1e-12*math.Abs(tt.high) || b.Spread != tt.spread {
			t.Errorf("%s: %+v", tt.name, b)
		}
	}
	if id, _ := c.Lookup("I1"); c.Slots[id].Bounds.Stated {
		t.Error("the tolerance of a given value is one draw, and I1 has none of its own")
	}
}

func TestGivens(t *testing.T) {
	c := read(t, `
given PTOT = VCC * ITOT
given RSUM = parallel(R1, R2)
given ITOT = VCC / RSUM
given TWARM = ambient + 10 K
given DT = TWARM - ambient
given RT = R1 * sqrt(2) ^ 2
rail VCC = 10 V
path VCC -> R1 RX -> gnd
path VCC -> R2 3k -> gnd
given RX = 2 * 3 kohm
keep VCC.P < PTOT
`)
	for name, want := range map[string]float64{"RX": 6000, "RSUM": 2000, "ITOT": 5e-3, "PTOT": 0.05, "TWARM": 35, "DT": 10, "RT": 12000} {
		if got := number(t, c, name); math.Abs(got-want) > 1e-12*want {
			t.Errorf("%s = %v, want %v", name, got, want)
		}
	}
}

func TestQuantities(t *testing.T) {
	c := read(t, lamp)
	for text, unit := range map[string]quantity.Unit{
		"tail.V": quantity.Volt, "RE.I": quantity.Ampere, "RE.V": quantity.Volt, "RE.P": quantity.Watt, "Q1.Ic": quantity.Ampere,
		"Q1.Vbe": quantity.Volt, "Q1.Vce": quantity.Volt, "Q1.Tj": quantity.Celsius, "D1.Tj": quantity.Celsius, "VCC.I": quantity.Ampere,
		"VCC.P": quantity.Watt, "load.V": quantity.Volt, "load.I": quantity.Ampere, "LAMP.1.V": quantity.Volt, "LAMP.2.Tj": quantity.Celsius,
		"D1:D2.V": quantity.Volt, "gnd.V": quantity.Volt,
	} {
		e, diags := c.ParseExpr(text)
		if e == nil {
			t.Errorf("%s: %v", text, diags)
			continue
		}
		if ref, ok := e.Ref(); !ok || ref.Unit != unit || e.Unit != unit || ref.Text != text || e.Text != text {
			t.Errorf("%s: %+v %v", text, ref, e)
		}
	}
	for text, want := range map[string]string{
		"Q1.I":           "Q1 is an npn; there is Q1.Ic, Q1.Ib, Q1.Ie, Q1.Vbe, Q1.Vce, Q1.P or Q1.Tj, not I",
		"tail.I":         "tail is a node; there is tail.V, not I",
		"LAMP.3.V":       "LAMP is a row of 2 and has no number 3",
		"tial.V":         "there is no node, element or rail called tial",
		"gp.Vbe":         "gp is a part, which has no quantities",
		"RE.V + RE":      "cannot add ohms to volts",
		"ambient + 3 V":  "cannot add volts to degrees Celsius",
		"Q1.Tj + Q1.Tj":  "cannot add degrees Celsius to degrees Celsius",
		"-Q1.Tj":         "degrees Celsius cannot change sign",
		"ln(RE)":         "cannot take the logarithm of ohms",
		"sqrt(RE)":       "cannot take the square root of ohms",
		"RE ^ RE":        "the exponent of what is in ohms must be a number",
		"RE ^ 0.5":       "cannot raise ohms to the power 0.5",
		"parallel(RE)":   "parallel takes two values or more, not 1",
		"cosine(1)":      "there is no function cosine; there are parallel, sqrt, ln and exp",
		"RE * infinite":  "infinite stands for a parameter's value, not in an expression",
		"2 * bias":       "bias is a node, whose voltage the circuit decides",
		"parallel(RE,1)": "cannot put a plain number in parallel with ohms",
	} {
		e, diags := c.ParseExpr(text)
		if e != nil || len(diags) == 0 || diags[0].Message != want {
			t.Errorf("%s: %v, want %q", text, diags, want)
		}
	}
}

// A given value may stand wherever a number may, and reaches all of them.
func TestGivensEverywhere(t *testing.T) {
	c := read(t, `
use generic
given VG = 5 V
given TG = 30 degC
given RG = 1 kohm
given IG = 2 mA
given PG = 0.25 W
given SG = 4
given WG = 5%
given VD = 0.6 V
given BG = 150
rail VCC = VG (4 V .. 6 V)
ambient = TG
part sig diode drop = VD at IG
part gp npn betaF = BG
path VCC -> R1 RG -> a -> D1 sig size=SG -> gnd
path VCC -> D2 drop VD -> b -> I1 IG -> gnd
path b -> R3 1k 0.25 W -> gnd
path VCC -> R2 1k -> c -> D4 red -> e -> Q1 gp base=c -> gnd
hold R1.I within WG
target R1.I = IG within WG
assume Vbe = VD, betaF = BG
measured D1.V = VD
keep R1.P < PG
`)
	c = with(t, c, "VG=6", "TG=40", "RG=2k", "IG=3 mA", "SG=8", "WG=10%", "VD=0.7", "BG=200")
	for name, want := range map[string]float64{
		"VCC": 6, "ambient": 40, "R1": 2000, "D1.size": 8, "D1.drop": 0.7, "D1.drop.at": 3e-3, "I1": 3e-3, "D2": 0.7, "Q1.betaF": 200,
		"D4.drop": 1.8, "red.drop": 1.8,
	} {
		if got := number(t, c, name); got != want {
			t.Errorf("%s = %v, want %v", name, got, want)
		}
	}
	if c.Hold.Within != 0.1 || c.Targets[0].Value != 3e-3 || c.Targets[0].Within != 0.1 || c.Assumed[0].Value != 0.7 || c.Assumed[1].Value != 200 || c.Measured[0].Value != 0.7 {
		t.Errorf("requirements: %+v %+v %+v %+v", c.Hold, c.Targets, c.Assumed, c.Measured)
	}
}
