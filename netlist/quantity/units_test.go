package quantity_test

import (
	"errors"
	"fmt"
	"math"
	"math/big"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"biaswright/netlist/quantity"
)

// The prefixes of the SI brochure that the language has, in all their spellings.
var siPrefixes = map[string]int{
	"f": -15, "p": -12, "n": -9, "u": -6, "µ": -6, "μ": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9,
}

// Each unit that takes a prefix reads with each, right behind its number and after
// a space; a prefix alone only right behind.
func TestEveryPrefixOfEveryUnit(t *testing.T) {
	units := map[string]quantity.Unit{
		"V": quantity.Volt, "A": quantity.Ampere, "W": quantity.Watt, "ohm": quantity.Ohm, "Ω": quantity.Ohm, "\u2126": quantity.Ohm,
		"S": quantity.Siemens, "K": quantity.Kelvin, "eV": quantity.EV, "V/K": quantity.VoltPerK, "": quantity.One,
	}
	for prefix, ten := range siPrefixes {
		for unit, dimension := range units {
			for _, space := range []string{"", " ", "\u00a0"} { // no-break as well
				text := "7.3" + space + prefix + unit
				r, err := quantity.Parse(text)
				if unit == "" && prefix != "" && space != "" {
					if err == nil {
						t.Errorf("%q is accepted as %v", text, r.Quantity)
					}
					continue
				}
				want, _ := strconv.ParseFloat(fmt.Sprintf("7.3e%d", ten), 64)
				if err != nil || r.Value != want || r.Unit != dimension || r.Bare != (unit == "") {
					t.Errorf("%q reads as %v, bare %v, %v; want %g %v", text, r.Quantity, r.Bare, err, want, dimension)
				}
			}
		}
	}
}

// Units that carry a scale of their own, and the Celsius scale, take no prefix.
func TestUnitsWithoutPrefix(t *testing.T) {
	for _, unit := range []string{"degC", "°C", "%", "ppm/K", "%/K", "K/W"} {
		if _, err := quantity.Parse("7 " + unit); err != nil {
			t.Errorf("7 %s: %v", unit, err)
		}
		for prefix := range siPrefixes {
			if _, err := quantity.Parse("7" + prefix + unit); err == nil && prefix != "" {
				t.Errorf("7%s%s is accepted", prefix, unit)
			}
		}
	}
}

// What is refused says why, and what to write instead.
func TestRefusalsAdvise(t *testing.T) {
	for text, want := range map[string]string{
		"":          "there is no number",
		"-":         "there is no number",
		"1.8 k":     "the prefix k stands apart from its number, without a unit (write 1.8k)",
		"10 megohm": "megohm is no SI prefix (mega is written M: 10Mohm)",
		"4,7k":      "4,7k is more than one number with a unit (the decimal point is a point: 4.7k)",
		"12 mamp":   "12 mamp is more than one number with a unit (write 12 mA)",
		"10KOhm":    "10KOhm is not a number with a unit (write 10 kohm)",
		"20°":       "20° has no unit that is known here (write 20 degC)",
		"5 ppm":     "5 ppm is more than one number with a unit (write 5 ppm/K)",
		"1e400 V":   "1e400 V is too large a number",
		"1e-400 V":  "1e-400 V is too small a number",
		// The exponent with its prefix is beyond the machine's integers.
		"1e-9223372036854775807 fA": "1e-9223372036854775807 fA is too small a number",
		"1e9223372036854775807 GV":  "1e9223372036854775807 GV is too large a number",
	} {
		_, err := quantity.Parse(text)
		if err == nil || err.Error() != want {
			t.Errorf("%q: %v, want %q", text, err, want)
		}
	}
	for _, text := range []string{"2N2222", "G10", "r22", "4r7", "-infinite", "0x10", "1_000", "5 V/s", "5 Vx", ".5 V", "5. V", "5e", "4.7k7"} {
		r, err := quantity.Parse(text)
		var e *quantity.Error
		if !errors.As(err, &e) || e.Code == "" || e.Message == "" || e.Length < 1 || e.Length > len(text) {
			t.Errorf("%q reads as %v, %#v", text, r.Quantity, err)
		}
	}
}

// A sign belongs to every form of a number.
func TestSigns(t *testing.T) {
	for _, text := range []string{"12 V", "4k7", "R22", "K47", "100R", "5%", "40 degC", "1.8k"} {
		plain, err := quantity.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		for sign, factor := range map[string]float64{"-": -1, "\u2212": -1, "- ": -1, "+": 1, "": 1} {
			r, err := quantity.Parse(sign + text)
			if err != nil || r.Value != factor*plain.Value || r.Unit != plain.Unit {
				t.Errorf("%q reads as %v, %v", sign+text, r.Quantity, err)
			}
		}
	}
}

// The canonical text keeps digits and prefix and writes the unit in ASCII; a kelvin
// without a space stays one word, which in a resistance's place is a kilohm.
func TestCanonicalText(t *testing.T) {
	for text, want := range map[string]string{
		"1.80kΩ": "1.80 kohm", "10µA": "10 uA", "−12V": "-12 V", "25 °C": "25 degC", "5 %": "5%", "1.8k": "1.8k", "5µ": "5u",
		"10K": "10K", "10 K": "10 K", "4K7": "4K7", "+3 mV": "3 mV", "-R22": "-R22", "1E3": "1E3",
	} {
		r, err := quantity.Parse(text)
		if err != nil || r.Text() != want {
			t.Errorf("%q becomes %q, %v; want %q", text, r.Text(), err, want)
		}
	}
}

func TestUnitNames(t *testing.T) {
	for _, test := range []struct {
		unit                 quantity.Unit
		ascii, symbol, words string
	}{
		{quantity.Ohm, "ohm", "Ω", "ohms"},
		{quantity.Celsius, "degC", "°C", "degrees Celsius"},
		{quantity.One, "", "", "a plain number"},
		{quantity.Unit{Volt: 2, Ampere: -3}, "V^2 A^-3", "V^2 A^-3", "V^2 A^-3"},
	} {
		if u := test.unit; u.String() != test.ascii || u.Symbol() != test.symbol || u.Words() != test.words {
			t.Errorf("%#v is %q, %q, %q", u, u.String(), u.Symbol(), u.Words())
		}
	}
}

// What is no number is written in words, and what no prefix reaches without one.
func TestFormatExtremes(t *testing.T) {
	for _, test := range []struct {
		q    quantity.Quantity
		want string
	}{
		{q(math.NaN(), quantity.Volt), "no number"},
		{q(math.Inf(-1), quantity.Volt), "no number"},
		{q(1e-20, quantity.Ampere), "1e-20 A"},
		{q(1e15, quantity.Ohm), "1e15 Ω"},
		{q(999.94, quantity.Ohm), "999.9 Ω"}, // four digits stay below the prefix's edge
		{q(-0.99996e-3, quantity.Ampere), "-1 mA"},
		{q(5, quantity.Unit{Volt: 2}), "5 V^2"},
		{q(math.Copysign(0, -1), quantity.Volt), "0 V"},
	} {
		if got := quantity.Format(test.q, 4); got != test.want {
			t.Errorf("%g %v writes as %q, want %q", test.q.Value, test.q.Unit, got, test.want)
		}
	}
}

// The sums and products that mean nothing say so.
func TestArithmeticRefuses(t *testing.T) {
	type op func(a, b quantity.Quantity) (quantity.Quantity, error)
	celsius, kelvin, volt, one := q(25, quantity.Celsius), q(10, quantity.Kelvin), q(2, quantity.Volt), q(2, quantity.One)
	steep := q(2, quantity.Unit{Volt: math.MaxInt8})
	for _, test := range []struct {
		op   op
		a, b quantity.Quantity
		says string
	}{
		{quantity.Add, celsius, celsius, "cannot add degrees Celsius to degrees Celsius"},
		{quantity.Sub, kelvin, celsius, "cannot subtract degrees Celsius from kelvin"},
		{quantity.Mul, celsius, one, "cannot multiply degrees Celsius"},
		{quantity.Div, one, celsius, "cannot divide degrees Celsius"},
		{quantity.Pow, celsius, one, "cannot raise degrees Celsius to a power"},
		{quantity.Pow, volt, q(0.5, quantity.One), "cannot raise volts to the power 0.5"},
		{quantity.Pow, volt, q(math.NaN(), quantity.One), "cannot raise volts to the power NaN"},
		{quantity.Parallel, volt, q(2, quantity.Ohm), "cannot put ohms in parallel with volts"},
		{quantity.Parallel, celsius, celsius, "cannot put degrees Celsius in parallel"},
		{quantity.Mul, steep, volt, "the unit's powers are too high"},
	} {
		if got, err := test.op(test.a, test.b); err == nil || err.Error() != test.says {
			t.Errorf("%v, %v gives %v, %v; want %q", test.a, test.b, got, err, test.says)
		}
	}
	for name, f := range map[string]func(quantity.Quantity) (quantity.Quantity, error){"square root": quantity.Sqrt, "logarithm": quantity.Ln, "exponential": quantity.Exp} {
		if _, err := f(volt); err == nil || err.Error() != "cannot take the "+name+" of volts" {
			t.Errorf("%s of volts: %v", name, err)
		}
	}
	for _, pair := range [][2]quantity.Quantity{{celsius, kelvin}, {kelvin, celsius}} {
		if got, err := quantity.Add(pair[0], pair[1]); err != nil || got != q(35, quantity.Celsius) {
			t.Errorf("%v + %v = %v, %v", pair[0], pair[1], got, err)
		}
	}
	if got, err := quantity.Sub(celsius, kelvin); err != nil || got != q(15, quantity.Celsius) {
		t.Errorf("25 degC - 10 K = %v, %v", got, err)
	}
	if got, err := quantity.Parallel(q(0, quantity.Ohm), q(5, quantity.Ohm)); err != nil || got != q(0, quantity.Ohm) {
		t.Errorf("parallel with a link is %v, %v", got, err)
	}
}

// A product divided by one of its factors has the other's dimension.
func TestDimensionsCancel(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		power := rapid.Int8Range(-60, 60) // so that a product's powers fit
		draw := func(name string) quantity.Quantity {
			return q(rapid.Float64Range(1, 10).Draw(t, name), quantity.Unit{Volt: power.Draw(t, "V"), Ampere: power.Draw(t, "A"), Kelvin: power.Draw(t, "K")})
		}
		a, b := draw("a"), draw("b")
		product, err := quantity.Mul(a, b)
		if err != nil {
			t.Fatal(err)
		}
		if back, err := quantity.Div(product, b); err != nil || back.Unit != a.Unit {
			t.Fatalf("%v × %v / %v is in %v, %v", a, b, b, back.Unit, err)
		}
	})
}

// E48 to E192 are 100 × 10^(i/N) rounded, in whole numbers without any rounding of
// ours: n - 1/2 <= 100 × 10^(i/N) < n + 1/2 to the power N. E192's 920 stands where
// the rule gives 919 (IEC 60063).
func TestFineSeriesFollowTheRule(t *testing.T) {
	power := func(base, exponent int64) *big.Int {
		return new(big.Int).Exp(big.NewInt(base), big.NewInt(exponent), nil)
	}
	for _, count := range []int64{48, 96, 192} {
		s, _ := quantity.Series(fmt.Sprint("E", count))
		for i, n := range s {
			if n == 920 {
				n = 919
			}
			value := new(big.Int).Mul(power(200, count), power(10, int64(i))) // of twice the number
			if power(int64(2*n-1), count).Cmp(value) > 0 || power(int64(2*n+1), count).Cmp(value) <= 0 {
				t.Errorf("E%d has %d in place %d", count, s[i], i)
			}
		}
	}
}

// Neighbours enclose a value with nothing preferred between them, and a preferred
// value is its own nearest, in any decade.
func TestNeighboursEnclose(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, _ := quantity.Series(rapid.SampledFrom(quantity.SeriesNames).Draw(t, "series"))
		v := rapid.Float64Range(1, 10).Draw(t, "v") * math.Pow10(rapid.IntRange(-12, 12).Draw(t, "decade"))
		below, above := s.Neighbours(v)
		if !(below <= v && v <= above) {
			t.Fatalf("%g is not within %g and %g", v, below, above)
		}
		if s.Nearest(below) != below || s.Nearest(above) != above {
			t.Fatalf("%g or %g is not preferred", below, above)
		}
		if next := math.Nextafter(below, math.Inf(1)); below < v {
			if b, a := s.Neighbours(next); b != below || a != above {
				t.Fatalf("beside %g stands %g, not %g", below, a, above)
			}
		}
	})
	s, _ := quantity.Series("E24")
	for _, v := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if n := s.Nearest(v); !math.IsNaN(n) {
			t.Errorf("the nearest to %g is %g", v, n)
		}
	}
	if n := s.Nearest(math.MaxFloat64); n != 1.6e308 { // 1.8e308 is beyond the floats
		t.Errorf("the nearest to the largest float is %g", n)
	}
}

func ExampleCommonPrefix() {
	column := []float64{14.5e-3, 5.8e-3, 70e-6}
	p := quantity.CommonPrefix(column, 3)
	for _, v := range column {
		fmt.Printf("%6.2f %sA\n", v*math.Pow10(-p.Ten), p.ASCII)
	}
	// Output:
	//  14.50 mA
	//   5.80 mA
	//   0.07 mA
}

func ExampleDiv() {
	i, err := quantity.Div(q(0.7, quantity.Volt), q(47, quantity.Ohm))
	fmt.Println(quantity.Format(i, 3), err)
	_, err = quantity.Add(q(0.7, quantity.Volt), q(47, quantity.Ohm))
	fmt.Println(err)
	// Output:
	// 14.9 mA <nil>
	// cannot add ohms to volts
}

// A column's prefix is that which its largest number prints with.
func TestCommonPrefixAgreesWithFormat(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(1, 10).Draw(t, "v") * math.Pow10(rapid.IntRange(-15, 10).Draw(t, "decade"))
		digits := rapid.IntRange(1, 9).Draw(t, "digits")
		p := quantity.CommonPrefix([]float64{v, -v / 3, v / 1e3}, digits)
		if text := quantity.FormatASCII(q(v, quantity.Volt), digits); !strings.HasSuffix(text, " "+p.ASCII+"V") {
			t.Fatalf("%g prints as %q, its column in %sV", v, text, p.ASCII)
		}
	})
}
