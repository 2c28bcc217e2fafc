package render

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/jsonschema-go/jsonschema"
	"pgregory.net/rapid"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

func screen(t *testing.T, a *Answer, l Look) string {
	t.Helper()
	var b bytes.Buffer
	if err := Screen(&b, a, l); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestScreenDrawsTheCurrentsWay(t *testing.T) {
	const want = `Mast lamp sink, two-diode reference
lamp-sink.bias, ambient 25 °C

VCC → gnd                     node [V]  drop [V]   current [mA]  power [mW]
┬ VCC                          12.00
│   R1       1.8 kΩ 5 %                  10.70           5.944       63.61
● bias                          1.300
├─▸ Q1 base                                              0.0712
│   D1       sig diode                    0.6500         5.873        3.818  conducts
○ D1:D2                         0.6500
│   D2       sig diode                    0.6500                      3.818  conducts
┴ gnd                           0

VCC → gnd                     node [V]  drop [V]   current [mA]  power [mW]
┬ VCC                          12.00
│   LAMP     amber led ×2                 4.100         12.82        52.57   2.050 V each
● out                           7.900
│   Q1       gp npn                       7.294                      93.58   active
├─◂ bias     base, Vbe                    0.6940         0.0712
● tail                          0.6060
│   RE       47 Ω 1 % 0.25 W              0.6060        12.89         7.814  over its rating
┴ gnd                           0

Rails                         node [V]            delivers [mA]  power [mW]
  VCC        10.8 .. 13.2 V    12.00                    18.77       225.2

Requirements                                        value  allowed            margin
  NOT MET     target LAMP.I = 15 mA within 10 %  12.82 mA  13.50 .. 16.50 mA  0.6777 mA beyond
  met         keep Q1.P < 100 mW                 93.58 mW  below 100.0 mW     6.425 mW inside

Cautions
  ! RE stands at 300.0 mW, above its rating of 250 mW (as stated, not derated for temperature).
    Reminders, not a safety assessment: local codes and licensed practice decide.

Found directly in 7 steps; largest imbalance 1.2e-17 A at tail; last step 3.1e-13 V.
`
	if d := cmp.Diff(want, screen(t, fixture(), Look{})); d != "" {
		t.Error(d)
	}
}

func TestPlainScreenIsASCII(t *testing.T) {
	a := fixture()
	a.Circuit.Title = "Mast – 2·µ lamp"
	for i, r := range screen(t, a, Look{Plain: true}) {
		if r > '~' {
			t.Fatalf("%q at byte %d", r, i)
		}
	}
}

// A title cannot make the terminal do anything.
func TestTitleIsOnlyText(t *testing.T) {
	a := fixture()
	a.Circuit.Title = "red \x1b[31m alert \a"
	if got := screen(t, a, Look{}); strings.ContainsAny(got, "\x1b\a") {
		t.Errorf("%q", got)
	}
}

func TestColourAddsNothingButColour(t *testing.T) {
	coloured := screen(t, fixture(), Look{Colour: true})
	for {
		i := strings.Index(coloured, "\x1b[")
		if i < 0 {
			break
		}
		end := strings.IndexByte(coloured[i:], 'm')
		coloured = coloured[:i] + coloured[i+end+1:]
	}
	if d := cmp.Diff(screen(t, fixture(), Look{}), coloured); d != "" {
		t.Error(d)
	}
}

// Names of any length must not widen a screen past its columns by more than the
// name itself, leave spaces at a line's end, or break the wire.
func TestScreenHoldsLongNames(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := fixture()
		name := rapid.StringMatching(`[A-Z][A-Za-z0-9_]{0,60}`)
		for i := range a.Circuit.Elements {
			a.Circuit.Elements[i].Name = name.Draw(t, "element")
		}
		for i := range a.Circuit.Nodes[2:] {
			a.Circuit.Nodes[i+2].Name = name.Draw(t, "node")
		}
		var b bytes.Buffer
		if err := Screen(&b, a, Look{}); err != nil {
			t.Fatal(err)
		}
		longest := 60 + len("├─▸ from  collector")
		for _, line := range strings.Split(b.String(), "\n") {
			if strings.TrimRight(line, " ") != line {
				t.Fatalf("spaces at the end of %q", line)
			}
			if width(line) > max(Columns, longest+Columns/2) {
				t.Fatalf("%d columns: %q", width(line), line)
			}
		}
	})
}

func TestFailureIsToldWithWhatWasTried(t *testing.T) {
	a := fixture()
	a.Result = nil
	a.Failure = &solve.Failure{
		Says: "no way of the ladder ended", Worst: "current balance at tail", By: 0.002,
		Tried: []solve.Attempt{{Way: "direct", Steps: 100, Ended: "too many steps"}},
	}
	got := screen(t, a, Look{})
	for _, want := range []string{"No operating point was found.", "no way of the ladder ended", "direct, 100 steps: too many steps"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is missing in\n%s", want, got)
		}
	}
	validate(t, "solve", JSON(a))
}

func TestVerdictFigures(t *testing.T) {
	for _, c := range []struct {
		unit              string
		value, low, high  float64
		wantValue, wantIn string
	}{
		{"A", 0.0128223, 0.0135, 0.0165, "12.82 mA", "13.50 .. 16.50 mA"},
		{"A", 0.042, 0.999e-6, 1.001e-6, "42.00 mA", "0.9990 .. 1.001 µA"}, // far apart
		{"V", 10.0004, 9.999, 10.001, "10.000 V", "9.9990 .. 10.001 V"},    // a narrow band
		{"W", 0.2, math.Inf(-1), 0.25, "200.0 mW", "below 250.0 mW"},
		{"V", 0.2, 1, math.Inf(1), "0.2000 V", "above 1.000 V"},
		{"", 0.25, math.Inf(-1), 0.5, "0.2500", "below 0.5000"},
		{"°C", 25, math.Inf(-1), 100, "25.00 °C", "below 100.0 °C"},
		{"V", 0, -0.001, 0.001, "0 mV", "-1.000 .. 1.000 mV"},
	} {
		v := &solve.Verdict{Value: c.value, Low: c.low, High: c.high}
		f := figuresOf(v, c.unit)
		if got := f.value(c.value); got != c.wantValue {
			t.Errorf("value %q, want %q", got, c.wantValue)
		}
		if got := f.allowed(v); got != c.wantIn {
			t.Errorf("allowed %q, want %q", got, c.wantIn)
		}
	}
}

func TestCautionsSayWhatAndHowMuch(t *testing.T) {
	for _, c := range []struct {
		caution solve.Caution
		want    []string
	}{
		{solve.Caution{Kind: "high-voltage", Subject: "VCC", Other: "gnd", Value: 120, Limit: 60}, []string{"120.0 V between VCC and gnd", "60 V DC", "local electrical code", "licensed"}},
		{solve.Caution{Kind: "rating", Subject: "Q1", Rating: "Imax", Value: 0.3, Limit: 0.2}, []string{"Q1", "300.0 mA", "Imax of 200 mA", "not derated"}},
		{solve.Caution{Kind: "rating", Subject: "Q1", Rating: "VCEOmax", Value: 50, Limit: 40}, []string{"50.00 V", "40 V"}},
		{solve.Caution{Kind: "zener-forward", Subject: "Z1", Value: 0.01}, []string{"Z1 conducts forward", "10.00 mA", "reversed"}},
		{solve.Caution{Kind: "beta-current", Subject: "Q1", Value: 2, Limit: 0.1}, []string{"Q1 carries 2.000 A", "100 mA", "beta"}},
		{solve.Caution{Kind: "slip", Subject: "R1", Rating: "ohms", Value: 0.018, Limit: 0.1}, []string{"R1 is 0.018 Ω", "less than 0.1 Ω", "slip"}},
		{solve.Caution{Kind: "slip", Subject: "gp", Rating: "betaF", Value: 18000, Limit: 5000}, []string{"gp's betaF is 18000", "more than 5000"}},
		{solve.Caution{Kind: "hot", Subject: "Q1", Value: 3, Limit: 1}, []string{"Q1 dissipates 3.000 W", "1 W", "burn"}},
		{solve.Caution{Kind: "bright", Subject: "LAMP", Value: 0.5, Limit: 0.35}, []string{"LAMP runs at 500.0 mA", "IEC 62471"}},
	} {
		got := CautionText(&c.caution)
		for _, want := range c.want {
			if !strings.Contains(got, want) {
				t.Errorf("%s: %q is missing in %q", c.caution.Kind, want, got)
			}
		}
	}
}

func validate(t *testing.T, name string, v any) []byte {
	t.Helper()
	text, ok := Schema(name)
	if !ok {
		t.Fatalf("no schema %s", name)
	}
	var s jsonschema.Schema
	if err := json.Unmarshal([]byte(text), &s); err != nil {
		t.Fatal(err)
	}
	resolved, err := s.Resolve(nil)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := WriteJSON(&b, v); err != nil {
		t.Fatal(err)
	}
	var instance any
	if err := json.Unmarshal(b.Bytes(), &instance); err != nil {
		t.Fatal(err)
	}
	if err := resolved.Validate(instance); err != nil {
		t.Errorf("%v\n%s", err, b.Bytes())
	}
	return b.Bytes()
}

func TestJSONKeepsToItsSchema(t *testing.T) {
	a := fixture()
	a.Set = []netlist.Setting{{Name: "VCC", Value: "9"}}
	a.At = []netlist.Setting{{Name: "VCC", Value: "low"}}
	a.Nominal = a.Result.Point
	a.Inner = true
	a.Result.Point.Inner = []solve.InnerPoint{{Name: "LAMP.1 inside", V: 9.9}}
	a.Result.Others = []*solve.Point{a.Result.Point}
	a.Verdicts[0].Value, a.Verdicts[0].Margin = math.NaN(), math.NaN()
	a.Warnings = diag.List{{Severity: diag.Warning, Code: "unused-part", Message: "nothing uses sig"}}
	got := string(validate(t, "solve", JSON(a)))
	for _, want := range []string{
		`"VCC": {"V": 12, "I": 0.0187661, "P": 0.225193}`,
		`"Q1": {"Ic": 0.0128223, "Ib": 0.000071235, "Ie": 0.0128936, "Vbe": 0.694, "Vce": 7.294, "P": 0.0935753, "Tj": 25, "state": "active"}`,
		`"LAMP.2": {"V": 2.05, "I": 0.0128223, "P": 0.0262857, "Tj": 25}`,
		`"load": {"V": 4.1, "I": 0.0128223}`,
		`"value": null`,
		`"reason": "the quantity has no number at this point"`,
		`nothing uses sig`,
	} {
		if !strings.Contains(got, want) {
			t.Errorf("%s is missing in\n%s", want, got)
		}
	}
	// Names keep the order of the file, not of the alphabet.
	order := []string{`"R1"`, `"D1"`, `"D2"`, `"LAMP"`, `"LAMP.1"`, `"Q1"`, `"RE"`}
	at := -1
	for _, name := range order {
		i := strings.Index(got, name)
		if i < at {
			t.Errorf("%s stands too early", name)
		}
		at = i
	}
	validate(t, "errors", Errors("f.bias", diag.List{{Code: "unknown-name", Message: "m", Hint: "h"}}))
	validate(t, "errors", Problem("f.bias", "unreadable", "m", ""))
}

func TestPNPHasItsOwnKeys(t *testing.T) {
	a := fixture()
	a.Circuit.Parts[2].Kind = &netlist.Kind{Name: "pnp", Shape: netlist.Transistor, PNP: true}
	got := string(validate(t, "solve", JSON(a)))
	if !strings.Contains(got, `"Veb": 0.694, "Vec": 7.294`) {
		t.Error(got)
	}
	if s := screen(t, a, Look{}); !strings.Contains(s, "base, Veb") || !strings.Contains(s, "├─▸ bias") {
		t.Error(s)
	}
}

// Laying out changes white space alone.
func TestLayoutKeepsTheValue(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.Map(rapid.String(), func(s string) any { return s })
		num := rapid.Map(rapid.Float64(), func(x float64) any { return x })
		leaf := rapid.OneOf(text, num, rapid.Just(any(nil)), rapid.Just(any(true)))
		sub := rapid.OneOf(leaf, rapid.Map(rapid.SliceOfN(leaf, 0, 30), func(s []any) any { return s }))
		v := rapid.MapOf(rapid.String(), sub).Draw(t, "value")
		compact, err := marshal(v)
		if err != nil {
			t.Skip("no JSON")
		}
		var laid, back bytes.Buffer
		if err := WriteJSON(&laid, v); err != nil {
			t.Fatal(err)
		}
		if err := json.Compact(&back, laid.Bytes()); err != nil {
			t.Fatalf("%v in %s", err, laid.Bytes())
		}
		if back.String() != string(compact) {
			t.Fatalf("%s became %s", compact, back.String())
		}
	})
}

// A part that stands on no path is told by its pins; a bus tells its branches as
// a sum where they are many; two rails have a total.
func TestPlacedPartsBranchesAndTotal(t *testing.T) {
	a := fixture()
	c, p := a.Circuit, a.Result.Point
	c.Placed = []int{4}
	c.Paths = c.Paths[:1]
	c.Rails = append(c.Rails, c.Rails[0])
	p.Rails = append(p.Rails, solve.RailPoint{V: 12, I: -0.001, P: -0.012})
	for range 8 { // eight more bases on the first path's node
		c.Elements = append(c.Elements, c.Elements[4])
		p.Elements = append(p.Elements, p.Elements[4])
	}
	got := screen(t, a, Look{})
	for _, want := range []string{
		`
Placed                               node [V]  drop [V]   current [mA]  power [mW]
  Q1                 gp npn                      7.294                      93.58   active
    collector ◂ out                    7.900                   12.82
    base ◂ bias      Vbe               1.300     0.6940         0.0712
    emitter ▸ tail                     0.6060                  12.89
`,
		"├─▸ Q1 base                                                     0.0712\n├─▸ 4 more                                                      0.2849\n",
		"  all rails                                                                213.2\n",
	} {
		if !strings.Contains(got, want) {
			t.Errorf("missing\n%s\nin\n%s", want, got)
		}
	}
}

// A path whose currents are far smaller than the screen's has its own prefix.
func TestSmallPathHasItsOwnPrefix(t *testing.T) {
	a := fixture()
	for i := range 3 {
		a.Result.Point.Elements[i].I *= 1e-6
		a.Result.Point.Elements[i].P *= 1e-6
	}
	a.Result.Point.Elements[4].Ib *= 1e-6 // the path's one branch
	got := screen(t, a, Look{})
	if !strings.Contains(got, "current [nA]  power [nW]") || !strings.Contains(got, "current [mA]  power [mW]") {
		t.Error(got)
	}
}
