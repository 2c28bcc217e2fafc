package netlist

import (
	"math"
	"strconv"
	"strings"
	"sync"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

// settings splits "VCC=9" and the like.
func settings(texts ...string) []Setting {
	var out []Setting
	for _, s := range texts {
		name, value, _ := strings.Cut(s, "=")
		out = append(out, Setting{name, value})
	}
	return out
}

func with(t testing.TB, c *Circuit, texts ...string) *Circuit {
	t.Helper()
	out, diags := c.With(settings(texts...)...)
	if out == nil {
		t.Fatalf("%v: %v", texts, diags)
	}
	return out
}

const follows = `
rail VCC = 12 V (10.8 V .. 13.2 V)
ambient = 25 degC (-20 degC .. 60 degC)
given RSET = 1 kohm 5%
given RTWO = 2 * RSET
given INOM = 1 mA
part gp npn Vbe = 0.65 V at 1 mA
part sig diode
path VCC -> R1 RSET -> b -> R2 RTWO 10% -> gnd
path VCC -> R3 47 1% -> c -> Q1 gp base=b -> e -> R4 0 -> gnd
path VCC -> R5 47 1% -> d -> Q2 gp base=b -> f -> R6 100 -> gnd
path VCC -> LAMP sig row=2 -> g -> I1 INOM -> gnd
path g -> R7 1k -> GND
target Q1.Ic = INOM within 10%
`

func TestWith(t *testing.T) {
	base := read(t, follows)
	nan := math.NaN()
	for _, tt := range []struct {
		set  []string
		want map[string]float64
	}{
		{[]string{"VCC=9"}, map[string]float64{"VCC": 9}},
		{[]string{"VCC.V=9 V"}, map[string]float64{"VCC": 9}},
		{[]string{"ambient=-40 degC"}, map[string]float64{"ambient": -40}},
		{[]string{"ambient=-40"}, map[string]float64{"ambient": -40}},
		{[]string{"R3=4k7"}, map[string]float64{"R3": 4700}},
		{[]string{"R3=10K"}, map[string]float64{"R3": 10e3}},
		{[]string{"RSET=3k"}, map[string]float64{"RSET": 3000, "R1": 3000, "RTWO": 6000, "R2": 6000}},
		{[]string{"R1=5k", "RSET=3k"}, map[string]float64{"R1": 5000, "RTWO": 6000, "R2": 6000}},
		{[]string{"RTWO=7k", "RSET=3k"}, map[string]float64{"R1": 3000, "RTWO": 7000, "R2": 7000}},
		{[]string{"gp.betaF=infinite"}, map[string]float64{"gp.betaF": math.Inf(1), "Q1.betaF": math.Inf(1), "Q2.betaF": math.Inf(1)}},
		{[]string{"Q1.betaF=50", "gp.betaF=70"}, map[string]float64{"Q1.betaF": 50, "Q2.betaF": 70}},
		{[]string{"Q1.Vbe=0.66 V at 2 mA"}, map[string]float64{"Q1.Vbe": 0.66, "Q1.Vbe.at": 2e-3, "Q2.Vbe": 0.65, "Q2.Vbe.at": 1e-3}},
		{[]string{"Q1.Vbe=0.66"}, map[string]float64{"Q1.Vbe": 0.66, "Q1.Vbe.at": 1e-3}},
		{[]string{"gp.Isat=1e-15"}, map[string]float64{"gp.Isat": 1e-15, "gp.Vbe": nan, "gp.Vbe.at": nan, "Q1.Isat": 1e-15, "Q1.Vbe": nan, "Q2.Vbe.at": nan}},
		{[]string{"Q1.Isat=1e-15"}, map[string]float64{"gp.Isat": nan, "Q1.Isat": 1e-15, "Q1.Vbe": nan, "Q1.Vbe.at": nan, "Q2.Vbe": 0.65, "Q2.Isat": nan}},
		{[]string{"Q1.Isat=1e-15", "gp.Vbe=0.7"}, map[string]float64{"Q1.Isat": 1e-15, "Q1.Vbe": nan, "Q2.Vbe": 0.7}},
		{[]string{"gp.Vbe.at=2 mA"}, map[string]float64{"gp.Vbe": 0.65, "gp.Vbe.at": 2e-3, "Q1.Vbe.at": 2e-3, "Q1.Isat": nan}},
		{[]string{"gp.Isat=1e-15", "gp.Vbe=0.7 V at 3 mA"}, map[string]float64{"gp.Vbe": 0.7, "Q1.Vbe.at": 3e-3, "Q1.Isat": nan}},
		{[]string{"Q1.size=8"}, map[string]float64{"Q1.size": 8}},
	} {
		t.Run(strings.Join(tt.set, " "), func(t *testing.T) {
			c := with(t, base, tt.set...)
			for name, want := range tt.want {
				if got := number(t, c, name); got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
					t.Errorf("%s = %v, want %v", name, got, want)
				}
			}
		})
	}
}

func TestWithCarriesToTolerancesAndRequirements(t *testing.T) {
	c := with(t, read(t, follows), "RSET=3k", "INOM=2 mA")
	id, _ := c.Lookup("R2")
	if b := c.Slots[id].Bounds; math.Abs(b.Low-5400) > 1e-9 || math.Abs(b.High-6600) > 1e-9 {
		t.Errorf("10%% of 6 kohm: %+v", b)
	}
	if got := c.Targets[0].Value; got != 2e-3 {
		t.Errorf("target at %v, want 2 mA", got)
	}
	wide := with(t, read(t, follows), "VCC=30")
	if id, _ := wide.Lookup("VCC"); wide.Slots[id].Bounds.High != 13.2 {
		t.Error("stated ends stay, whatever the value is set to")
	}
}

func TestWithChangesStructure(t *testing.T) {
	base := read(t, follows)
	if e := base.elementNamed(t, "R4"); e.Kind != Link {
		t.Fatalf("R4 is %v, not a link", e.Kind)
	}
	c := with(t, base, "R4=10", "R6=0")
	if c.elementNamed(t, "R4").Kind != Resistor || c.elementNamed(t, "R6").Kind != Link {
		t.Error("a resistance of 0 is a link, and one above is not")
	}
	if base.elementNamed(t, "R4").Kind != Link {
		t.Error("the circuit that was copied has changed")
	}
	c = with(t, c, "LAMP.row=3")
	if got := len(c.elementNamed(t, "LAMP").Chain); got != 4 {
		t.Errorf("a row of 3 has 4 nodes, not %d", got)
	}
	if number(t, c, "R4") != 10 || c.elementNamed(t, "R4").Kind != Resistor {
		t.Error("earlier settings are lost when the row changes")
	}
	if c = with(t, c, "LAMP.row=1", "VCC=9"); len(c.elementNamed(t, "LAMP").Chain) != 2 || number(t, c, "VCC") != 9 {
		t.Error("a row of 1 has its ends alone")
	}
}

func TestWithRefuses(t *testing.T) {
	base := read(t, follows)
	for set, want := range map[string]string{
		"VCC=9 ohm":             "VCC is in volts, not in ohms",
		"VC=9":                  "there is no value VC",
		"R3=-5":                 "R3 cannot be negative",
		"gp.Isat=0":             "gp.Isat must be greater than 0",
		"VCC=infinite":          "VCC cannot be infinite",
		"ambient=-300":          "ambient must lie above absolute zero",
		"gp=3":                  "gp is a part; its parameters are written gp.Isat",
		"b=3 V":                 "b is a node, whose voltage the circuit decides",
		"LAMP.row=0":            "a row is a whole number of parts from 1 to 1000",
		"LAMP.row=1e9":          "a row is a whole number of parts from 1 to 1000",
		"Q1.row=2":              "Q1 is an npn and cannot stand in a row",
		"sig.drop=0.6":          "it is a point of a curve and needs its second co-ordinate",
		"sig.drop.at=2 mA":      "it is where drop is stated, and drop is not",
		"VCC=9 at 1 mA":         "VCC is one number, not a point of a curve",
		"R3=1k 5%":              "1k 5% is more than one number with a unit",
		"RSET=-1k":              "R1 cannot be negative, and the settings make it",
		"gp.Vbe=0.7 V at 3 ohm": "gp.Vbe is in amps, not in ohms",
	} {
		c, diags := base.With(settings(set)...)
		if c != nil || len(diags) == 0 || !strings.Contains(diags[0].Message, want) {
			t.Errorf("%s: %v, want %q", set, diags, want)
		}
	}
	loop := read(t, "rail A = 5 V\nrail B = 5 V\npath A -> R1 1 -> B\n")
	if c, diags := loop.With(settings("R1=0")...); c != nil || diags[0].Code != "voltage-loop" {
		t.Errorf("a link between two rails: %v", diags)
	}
}

func TestAt(t *testing.T) {
	base := read(t, `
rail VCC = 12 V (10.8 V .. 13.2 V)
rail VEE = -12 V 5%
rail VREF = 5 V
ambient = 25 degC (-20 degC .. 60 degC)
path VCC -> R1 1k -> VEE
path VREF -> R2 1k -> gnd
`)
	for end, want := range map[string]float64{"VCC=low": 10.8, "VCC=high": 13.2, "VCC=nominal": 12, "VEE=low": -12.6, "VEE=high": -11.4, "ambient=low": -20, "ambient=high": 60} {
		s := settings(end)
		c, diags := base.At(s...)
		if c == nil {
			t.Errorf("%s: %v", end, diags)
			continue
		}
		if got := number(t, c, s[0].Name); math.Abs(got-want) > 1e-12*math.Abs(want) {
			t.Errorf("%s is %v, want %v", end, got, want)
		}
		id, _ := c.Lookup(s[0].Name)
		if c.Slots[id].Bounds.Low != base.Slots[id].Bounds.Low || c.Slots[id].Bounds.High != base.Slots[id].Bounds.High {
			t.Errorf("%s moved the stated ends", end)
		}
	}
	for end, want := range map[string]string{
		"VREF=low": "VREF has no stated range", "R1=low": "there is no rail R1", "VCC=lo": "an end is low, high or nominal",
	} {
		if c, diags := base.At(settings(end)...); c != nil || !strings.Contains(diags[0].Message, want) {
			t.Errorf("%s: %v, want %q", end, diags, want)
		}
	}
}

// settable are values that may be set without a change of structure.
var settable = []string{"VCC", "ambient", "RSET", "RTWO", "R1", "R2", "R3", "gp.betaF", "Q1.betaF", "Q1.size", "sig.n", "LAMP.n"}

func TestWithThenBackIsTheIdentity(t *testing.T) {
	base := read(t, follows)
	rapid.Check(t, func(t *rapid.T) {
		name := rapid.SampledFrom(settable).Draw(t, "name")
		value := rapid.Float64Range(1, 100).Draw(t, "value")
		id, _ := base.Lookup(name)
		there, _ := base.With(Setting{name, format(value)})
		back, _ := there.With(Setting{name, format(base.Value(id))})
		if diff := cmp.Diff(numbers(base.Values()), numbers(back.Values())); diff != "" {
			t.Fatalf("%s there and back (-before +after):\n%s", name, diff)
		}
	})
}

// numbers makes NaN equal to itself.
func numbers(values []float64) []string {
	out := make([]string, len(values))
	for i, v := range values {
		out[i] = format(v)
	}
	return out
}

func TestPropagateEqualsWith(t *testing.T) {
	base := read(t, follows)
	rapid.Check(t, func(t *rapid.T) {
		name := rapid.SampledFrom(settable).Draw(t, "name")
		value := rapid.Float64Range(1, 100).Draw(t, "value")
		id, _ := base.Lookup(name)
		if base.Slots[id].def.follows {
			t.Skip("Propagate would overwrite it")
		}
		values := base.Values()
		values[id] = value
		base.Propagate(values)
		fresh, _ := base.With(Setting{name, format(value)})
		if diff := cmp.Diff(numbers(fresh.Values()), numbers(values)); diff != "" {
			t.Fatalf("(-with +propagated):\n%s", diff)
		}
	})
}

// What Propagate computes is what the text with that number says.
func TestPropagateEqualsFreshText(t *testing.T) {
	base := read(t, follows)
	for stated, name := range map[string]string{
		"given RSET = 1 kohm": "RSET", "given INOM = 1 mA": "INOM", "rail VCC = 12 V (10.8 V .. 13.2 V)": "VCC", "Vbe = 0.65 V": "gp.Vbe",
	} {
		rapid.Check(t, func(t *rapid.T) {
			value := rapid.Float64Range(0.1, 100).Draw(t, name)
			id, _ := base.Lookup(name)
			head, _, _ := strings.Cut(stated, "= ")
			text := strings.Replace(follows, stated, head+"= "+strconv.FormatFloat(value, 'f', -1, 64)+" "+base.Slots[id].Unit.String(), 1)
			fresh, diags := Read("fresh.bias", []byte(text), testCatalogue(), nil)
			if fresh == nil {
				t.Fatalf("%v", diags)
			}
			values := base.Values()
			values[id] = value
			base.Propagate(values)
			if diff := cmp.Diff(numbers(fresh.Values()), numbers(values)); diff != "" {
				t.Fatalf("(-fresh +propagated):\n%s", diff)
			}
		})
	}
}

func TestPropagateAllocatesNothing(t *testing.T) {
	c := read(t, follows)
	values := c.Values()
	if n := testing.AllocsPerRun(10, func() { c.Propagate(values) }); n != 0 {
		t.Errorf("%v allocations", n)
	}
}

// A change of a given value reaches what follows it with the slope that Chain
// says.
func TestChain(t *testing.T) {
	c := read(t, follows)
	d := make([]float64, len(c.Slots))
	at := func(name string) *float64 { id, _ := c.Lookup(name); return &d[id] }
	*at("R1"), *at("R2"), *at("Q1.betaF"), *at("Q2.betaF") = 1, 10, 3, 4
	c.Chain(d)
	for name, want := range map[string]float64{"RSET": 1 + 2*10, "RTWO": 10, "gp.betaF": 7, "R1": 1} {
		if got := *at(name); got != want {
			t.Errorf("d/d%s = %v, want %v", name, got, want)
		}
	}
}

// Workers make changed copies of one circuit at once, the structure included.
func TestWithFromManyGoroutines(t *testing.T) {
	c := read(t, "use generic\npart sig diode\nrail VCC = 12 V\ngiven RX = 1 kohm\npath VCC -> LAMP red -> a -> R1 RX -> gnd\npath a -> D1 sig -> gnd\n")
	var group sync.WaitGroup
	for i := 1; i <= 8; i++ {
		group.Go(func() {
			out, diags := c.With(settings("LAMP.row="+strconv.Itoa(i), "RX="+strconv.Itoa(i))...)
			if out == nil {
				t.Errorf("%v", diags)
				return
			}
			if id, _ := out.Lookup("R1"); out.Value(id) != float64(i) || len(out.Elements[0].Chain) != i+1 {
				t.Errorf("row of %d: %v ohm, %v", i, out.Value(id), out.Elements[0].Chain)
			}
		})
	}
	group.Wait()
}
