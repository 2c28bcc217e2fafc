package render

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestNumberShowsThreeToFourDigits(t *testing.T) {
	for _, c := range []struct {
		x    float64
		want string
	}{
		{0, "0"},
		{math.Copysign(0, -1), "0"},
		{12, "12.00"},
		{-0.65, "-0.6500"},
		{0.0712349, "0.0712"},
		{999.96, "1000"},
		{123456, "123456"},
		{1.2e-9, "1.20e-9"},
		{2519149744431524352, "2.519e18"},
		{-12595748722157621248, "-1.260e19"},
		{math.Inf(1), "infinite"},
		{math.NaN(), "-"},
	} {
		if got := number(c.x); got != c.want {
			t.Errorf("number(%v) = %q, want %q", c.x, got, c.want)
		}
	}
}

func TestStatedWritesAsEngineersDo(t *testing.T) {
	for _, c := range []struct {
		x    float64
		unit string
		want string
	}{
		{1800, "Ω", "1.8 kΩ"},
		{47, "Ω", "47 Ω"},
		{4.7e6, "Ω", "4.7 MΩ"},
		{0.25, "W", "250 mW"},
		{0.05, "W", "50 mW"},
		{0.62, "V", "0.62 V"},
		{0.05, "Ω", "0.05 Ω"},
		{0.002, "V", "2 mV"},
		{0.005, "1/K", "0.5 %/K"},
		{200, "K/W", "200 K/W"},
		{1e-5, "A", "10 µA"},
		{2.6e-9, "A", "2.6 nA"},
		{-20, "°C", "-20 °C"},
		{180, "", "180"},
		{math.Inf(1), "V", "infinite"},
	} {
		if got := stated(c.x, c.unit); got != c.want {
			t.Errorf("stated(%v, %q) = %q, want %q", c.x, c.unit, got, c.want)
		}
	}
}

func TestScaleFollowsThePrintedNumber(t *testing.T) {
	for _, c := range []struct {
		values []float64
		want   string
	}{
		{[]float64{0.0059, 5e-8}, "m"},
		{[]float64{0.99996}, ""}, // printed 1.000
		{[]float64{0.0009999}, "µ"},
		{[]float64{0, 0}, ""},
		{[]float64{-1500}, "k"},
		{[]float64{1e-20}, ""}, // beyond the prefixes
		{[]float64{math.Inf(1), 2e-3, math.NaN()}, "m"},
	} {
		if got := scaleFor(c.values...).prefix; got != c.want {
			t.Errorf("scaleFor(%v) = %q, want %q", c.values, got, c.want)
		}
	}
}

// What a column shows reads back to the value within the digits promised.
func TestNumberReadsBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.Float64Range(-1e12, 1e12).Draw(t, "x")
		sc := scaleFor(x)
		text := number(sc.in(x))
		back, err := strconv.ParseFloat(text, 64)
		if err != nil {
			t.Fatal(err)
		}
		back *= math.Pow10(sc.exp)
		const threeDigits = 0.5e-2 // half a unit in the third digit
		if math.Abs(back-x) > threeDigits*math.Abs(x) {
			t.Fatalf("%v shown as %s %s", x, text, sc.prefix)
		}
	})
}

func TestTableAlignsDecimalPoints(t *testing.T) {
	tb := table{numeric: []bool{false, true}, most: []int{6, 0}}
	tb.add(row{head: true, cells: []cell{{"part", ""}, {"drop [V]", ""}}})
	tb.add(row{cells: []cell{{"R1", ""}, {"12.00", ""}}})
	tb.add(row{cells: []cell{{"R2", ""}, {"-0.6500", ""}}})
	tb.add(row{cells: []cell{{"a_long_name", ""}, {"1.20e-9", ""}}, lead: "|"})
	var b strings.Builder
	tb.print(&b, Look{})
	const want = `part  drop [V]
R1    12.00
R2    -0.6500
a_long_name
|      1.20e-9
`
	if b.String() != want {
		t.Errorf("got\n%swant\n%s", b.String(), want)
	}
}
