package quantity_test

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"biaswright/netlist/quantity"
)

// What texts mean: the SI brochure's prefixes, IEC 60062's letters as resistors are
// marked (common practice), and the language's own units.
func TestParse(t *testing.T) {
	for _, test := range []struct {
		text string
		want float64
		unit quantity.Unit
	}{
		{"68", 68, quantity.One},
		{"1.8k", 1800, quantity.One},
		{"1.8 kohm", 1800, quantity.Ohm},
		{"1.8kΩ", 1800, quantity.Ohm}, // ohm sign
		{"68 Ω", 68, quantity.Ohm},    // Greek omega
		{"10 uA", 10e-6, quantity.Ampere},
		{"10 µA", 10e-6, quantity.Ampere}, // micro sign
		{"10 μA", 10e-6, quantity.Ampere}, // Greek mu
		{"1e-12", 1e-12, quantity.One},
		{"10K", 10, quantity.Kelvin}, // what stands in a resistance's place is the netlist's business
		{"2.6 nA", 2.6e-9, quantity.Ampere},
		{"1 fA", 1e-15, quantity.Ampere},
		{"3 pA", 3e-12, quantity.Ampere},
		{"1M", 1e6, quantity.One},
		{"1 Gohm", 1e9, quantity.Ohm},
		{"5V", 5, quantity.Volt},
		{"-12 V", -12, quantity.Volt},
		{"−12 V", -12, quantity.Volt}, // the minus sign of typesetting
		{"+3 mV", 3e-3, quantity.Volt},
		{"250 mW", 0.25, quantity.Watt},
		{"2 mS", 2e-3, quantity.Siemens},
		{"-40 degC", -40, quantity.Celsius},
		{"25°C", 25, quantity.Celsius},
		{"300 K", 300, quantity.Kelvin},
		{"1.12 eV", 1.12, quantity.EV},
		{"5%", 0.05, quantity.One},
		{"100 ppm/K", 1e-4, quantity.PerKelvin},
		{"0.5 %/K", 5e-3, quantity.PerKelvin},
		{"-2 mV/K", -2e-3, quantity.VoltPerK},
		{"200 K/W", 200, quantity.KelvinPerW},
		{"1e-14 A", 1e-14, quantity.Ampere},
		{"1.5e3", 1500, quantity.One},
		{"4k7", 4700, quantity.Ohm},
		{"4K7", 4700, quantity.Ohm},
		{"1M5", 1.5e6, quantity.Ohm},
		{"100R", 100, quantity.Ohm},
		{"R22", 0.22, quantity.Ohm},
		{"K47", 470, quantity.Ohm},
		{"M10", 1e5, quantity.Ohm},
		{"0.62 V", 0.62, quantity.Volt},
		{"5e-2 A", 0.05, quantity.Ampere},
	} {
		r, err := quantity.Parse(test.text)
		// No tolerance: a decimal text means the float nearest to it.
		if err != nil || r.Value != test.want || r.Unit != test.unit {
			t.Errorf("%q reads as %v %v, %v; want %v %v", test.text, r.Value, r.Unit, err, test.want, test.unit)
		}
	}
	if r, err := quantity.Parse("infinite"); err != nil || !r.Infinite || !math.IsInf(r.Value, 1) {
		t.Errorf("infinite reads as %+v, %v", r, err)
	}
}

func TestParseRefuses(t *testing.T) {
	for _, test := range []struct{ text, says, advice string }{
		{"", "there is no number", ""},
		{"V", "not a number", ""},
		{"1.8 k", "prefix k stands apart", "1.8k"},
		{"10meg", "meg", "M"},
		{"4,7 kohm", "more than one number", "4.7"},
		{"5 volts", "more than one number", "5 V"},
		{"12 v", "more than one number", "12 V"},
		{"12 foo", "foo", ""},
		{"1 2", "more than one number", ""},
		{"--5", "not a number", ""},
		{"1e999 V", "too large", ""},
	} {
		_, err := quantity.Parse(test.text)
		var e *quantity.Error
		if !errors.As(err, &e) {
			t.Errorf("%q: error %v", test.text, err)
			continue
		}
		if !strings.Contains(e.Message, test.says) || !strings.Contains(e.Hint, test.advice) {
			t.Errorf("%q: %q, hint %q; want %q, hint %q", test.text, e.Message, e.Hint, test.says, test.advice)
		}
	}
}

func TestReads(t *testing.T) {
	for word, want := range map[string]bool{
		"5V": true, "4k7": true, "1e3": true, "100R": true, "47": true,
		"2N2222": false, "R22": false, "tail": false, "1x": false, "K47": false, "": false,
	} {
		if got := quantity.Reads(word); got != want {
			t.Errorf("%q reads as a quantity: %v, want %v", word, got, want)
		}
	}
}

func q(value float64, unit quantity.Unit) quantity.Quantity {
	return quantity.Quantity{Value: value, Unit: unit}
}

// Ohm's law and its kin in dimensions, and the Celsius scale, on which a
// difference is in kelvin and a sum means nothing.
func TestArithmetic(t *testing.T) {
	type op func(a, b quantity.Quantity) (quantity.Quantity, error)
	for _, test := range []struct {
		name string
		op   op
		a, b quantity.Quantity
		want quantity.Quantity
		says string
	}{
		{"V/ohm", quantity.Div, q(10, quantity.Volt), q(2000, quantity.Ohm), q(5e-3, quantity.Ampere), ""},
		{"A*ohm", quantity.Mul, q(2, quantity.Ampere), q(3, quantity.Ohm), q(6, quantity.Volt), ""},
		{"V*A", quantity.Mul, q(2, quantity.Volt), q(3, quantity.Ampere), q(6, quantity.Watt), ""},
		{"V+V", quantity.Add, q(2, quantity.Volt), q(3, quantity.Volt), q(5, quantity.Volt), ""},
		{"V+ohm", quantity.Add, q(2, quantity.Volt), q(3, quantity.Ohm), q(0, quantity.One), "cannot add ohms to volts"},
		{"V-A", quantity.Sub, q(2, quantity.Volt), q(3, quantity.Ampere), q(0, quantity.One), "subtract"},
		{"degC-degC", quantity.Sub, q(60, quantity.Celsius), q(25, quantity.Celsius), q(35, quantity.Kelvin), ""},
		{"degC+K", quantity.Add, q(25, quantity.Celsius), q(10, quantity.Kelvin), q(35, quantity.Celsius), ""},
		{"degC+degC", quantity.Add, q(25, quantity.Celsius), q(10, quantity.Celsius), q(0, quantity.One), "add"},
		{"parallel", quantity.Parallel, q(6, quantity.Ohm), q(3, quantity.Ohm), q(2, quantity.Ohm), ""},
		{"V^2", quantity.Pow, q(3, quantity.Volt), q(2, quantity.One), q(9, quantity.Unit{Volt: 2}), ""},
		{"V^V", quantity.Pow, q(3, quantity.Volt), q(2, quantity.Volt), q(0, quantity.One), "power"},
	} {
		got, err := test.op(test.a, test.b)
		if test.says != "" {
			if err == nil || !strings.Contains(err.Error(), test.says) {
				t.Errorf("%s: error %v, want one that says %q", test.name, err, test.says)
			}
			continue
		}
		if err != nil || got != test.want {
			t.Errorf("%s = %v, %v; want %v", test.name, got, err, test.want)
		}
	}
	if r, err := quantity.Sqrt(q(9, quantity.Unit{Volt: 2})); err != nil || r != q(3, quantity.Volt) {
		t.Errorf("sqrt of 9 V² = %v, %v", r, err)
	}
	if _, err := quantity.Ln(q(2, quantity.Volt)); err == nil {
		t.Error("the logarithm of volts was taken")
	}
	if r, err := quantity.Exp(q(0, quantity.One)); err != nil || r.Value != 1 {
		t.Errorf("exp(0) = %v, %v", r, err)
	}
}

func TestFormat(t *testing.T) {
	for _, test := range []struct {
		q      quantity.Quantity
		digits int
		want   string
	}{
		{q(1800, quantity.Ohm), 4, "1.8 kΩ"},
		{q(999.96, quantity.Ohm), 4, "1 kΩ"}, // rounds over the prefix's edge
		{q(-40, quantity.Celsius), 4, "-40 °C"},
		{q(10e-6, quantity.Ampere), 3, "10 µA"},
		{q(1e-4, quantity.PerKelvin), 3, "100 ppm/K"},
		{q(0, quantity.Volt), 3, "0 V"},
		{q(math.Inf(1), quantity.Volt), 3, "infinite"},
	} {
		if got := quantity.Format(test.q, test.digits); got != test.want {
			t.Errorf("%v writes as %q, want %q", test.q, got, test.want)
		}
	}
}

func TestCommonPrefix(t *testing.T) {
	for _, test := range []struct {
		values []float64
		want   string
	}{
		{[]float64{0.0145, 5.8e-3, 7e-5}, "m"},
		{[]float64{0.99996, 0.5}, ""}, // prints as 1.000
		{[]float64{999.4e-6, 2e-6}, "µ"},
		{[]float64{999.96e-6}, "m"},
		{[]float64{0, math.NaN()}, ""},
		{nil, ""},
		{[]float64{4700, math.Inf(1)}, "k"},
	} {
		if got := quantity.CommonPrefix(test.values, 4); got.Symbol != test.want {
			t.Errorf("%v: prefix %q, want %q", test.values, got.Symbol, test.want)
		}
	}
}

// What is written exactly reads back exactly.
func TestExactRoundTrip(t *testing.T) {
	units := []quantity.Unit{
		quantity.Volt, quantity.Ampere, quantity.Watt, quantity.Ohm, quantity.Siemens, quantity.Kelvin,
		quantity.Celsius, quantity.EV, quantity.PerKelvin, quantity.VoltPerK, quantity.KelvinPerW, quantity.One,
	}
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(-1e12, 1e12).Draw(t, "v") * math.Pow10(rapid.IntRange(-20, 3).Draw(t, "ten"))
		want := q(v, rapid.SampledFrom(units).Draw(t, "unit"))
		text := quantity.Exact(want)
		r, err := quantity.Parse(text)
		if err != nil || r.Quantity != want {
			t.Fatalf("%v writes as %q, which reads as %v, %v", want, text, r.Quantity, err)
		}
	})
}

// IEC 60063 as testdata/reference/preferred-numbers.json has it (its own source).
func TestSeries(t *testing.T) {
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "reference", "preferred-numbers.json"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Series []struct {
			Name string
			List []float64
		}
		Picks []struct {
			Series                      string
			Target, Below, Above, Ratio float64
			Nearest                     float64 `json:"nearest_ratio"`
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Series) != 4 || len(file.Picks) != 5*19 { // E3 to E24; 19 targets in each of five series
		t.Fatalf("%d series and %d picks to compare", len(file.Series), len(file.Picks))
	}
	for _, s := range file.Series {
		got, ok := quantity.Series(s.Name)
		if !ok || !slices.Equal(got.Values(), s.List) {
			t.Errorf("%s is %v, want %v", s.Name, got.Values(), s.List)
		}
	}
	for _, p := range file.Picks {
		s, ok := quantity.Series(p.Series)
		if !ok {
			t.Fatalf("no series %s", p.Series)
		}
		below, above := s.Neighbours(p.Target)
		if below != p.Below || above != p.Above || s.Nearest(p.Target) != p.Nearest {
			t.Errorf("%s around %g: %g, %g, nearest %g; want %g, %g, %g", p.Series, p.Target, below, above, s.Nearest(p.Target), p.Below, p.Above, p.Nearest)
		}
	}
}

// Facts of IEC 60063: E24 is no part of E96, every number of E48 is one of E96 and
// of E96 one of E192, and each series has as many numbers as its name says.
func TestSeriesContainOneAnother(t *testing.T) {
	has := func(name string, n int) bool {
		s, _ := quantity.Series(name)
		return slices.Contains(s, n)
	}
	for _, pair := range [][2]string{{"E3", "E6"}, {"E6", "E12"}, {"E12", "E24"}, {"E48", "E96"}, {"E96", "E192"}} {
		s, _ := quantity.Series(pair[0])
		for _, n := range s {
			if !has(pair[1], n) {
				t.Errorf("%d of %s is not in %s", n, pair[0], pair[1])
			}
		}
	}
	if has("E96", 470) || !has("E96", 475) || !has("E192", 920) || has("E192", 919) {
		t.Error("E96 or E192 is not the standard's")
	}
	for _, name := range quantity.SeriesNames {
		s, _ := quantity.Series(name)
		if want := strings.TrimPrefix(name, "E"); fmt.Sprint(len(s)) != want {
			t.Errorf("%s has %d numbers", name, len(s))
		}
	}
	if _, ok := quantity.Series("E25"); ok {
		t.Error("there is an E25")
	}
}

// Reading never panics, and what reads writes a text that reads as the same.
func FuzzQuantity(f *testing.F) {
	for _, s := range []string{"4k7", "1.8 kohm", "-40 degC", "100 ppm/K", "R22", "infinite", "1e-14 A", "10meg", "4,7k", "5%", "Ω", "1e309", "-R22", "1e-9223372036854775807 fA"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		r, err := quantity.Parse(text)
		if err != nil {
			return
		}
		again, err := quantity.Parse(r.Text())
		if err != nil || again.Quantity != r.Quantity {
			t.Fatalf("%q writes as %q, which reads as %v, %v; want %v", text, r.Text(), again.Quantity, err, r.Quantity)
		}
		if math.IsInf(r.Value, 0) && !r.Infinite {
			t.Fatalf("%q reads as infinite", text)
		}
	})
}

func ExampleParse() {
	for _, text := range []string{"4k7", "10 uA", "25 degC", "10meg"} {
		r, err := quantity.Parse(text)
		if err != nil {
			fmt.Println("error:", err)
			continue
		}
		fmt.Println(r.Value, r.Unit.Words())
	}
	// Output:
	// 4700 ohms
	// 1e-05 amps
	// 25 degrees Celsius
	// error: meg is no SI prefix (mega is written M: 10M)
}

func ExampleSeries() {
	e24, _ := quantity.Series("E24")
	fmt.Println(e24.Neighbours(4500))
	fmt.Println(e24.Nearest(4500))
	// Output:
	// 4300 4700
	// 4700
}
