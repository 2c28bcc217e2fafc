package render

import (
	"math"
	"strconv"
	"strings"

	"biaswright/netlist/quantity"
)

// A scale is the SI prefix of a column and the power of ten it stands for.
type scale struct {
	prefix string
	exp    int
}

var noScale = scale{}

// digits is how many significant digits a screen shows: what a good multimeter
// does, and less than any part's tolerance.
const digits = 4

// scaleFor picks the prefix in which the largest of the values has one to three
// digits before the point, as it will be printed: 999.96 mA is 1.000 A.
func scaleFor(values ...float64) scale {
	p := quantity.CommonPrefix(values, digits)
	return scale{p.Symbol, p.Ten}
}

// in gives x in the scale's unit, by a division that keeps exact powers exact.
func (s scale) in(x float64) float64 {
	if s.exp < 0 {
		return x * math.Pow10(-s.exp)
	}
	return x / math.Pow10(s.exp)
}

// number writes x, already in its column's unit, with four significant digits
// from 0.1 up, three below it, and a power of ten where a row of zeros would
// follow the point, or digits that mean nothing stand before it.
func number(x float64) string {
	switch a := math.Abs(x); {
	case math.IsNaN(x):
		return "-"
	case math.IsInf(x, 1):
		return "infinite"
	case math.IsInf(x, -1):
		return "-infinite"
	case a == 0:
		return "0"
	case a < 1e-4: // four zeros after the point are no longer read at a glance
		return power(x, 2)
	case a >= 1e9: // of no use in any unit; all its digits would tell of rounding
		return power(x, digits-1)
	case a < 0.1:
		return significant(x, digits-1)
	default:
		return significant(x, digits)
	}
}

// significant writes x with n significant digits, without an exponent.
func significant(x float64, n int) string {
	printed := strconv.FormatFloat(x, 'e', n-1, 64)
	exp, _ := strconv.Atoi(printed[strings.IndexByte(printed, 'e')+1:])
	return strconv.FormatFloat(x, 'f', max(0, n-1-exp), 64)
}

// power writes x as 1.2e-17 with that many decimals.
func power(x float64, decimals int) string {
	s := strconv.FormatFloat(x, 'e', decimals, 64)
	mantissa, exp, _ := strings.Cut(s, "e")
	n, _ := strconv.Atoi(exp)
	return mantissa + "e" + strconv.Itoa(n)
}

// stated writes a number as an engineer states it: its own prefix, a space, the
// unit, and no more digits than it takes (1.8 kΩ, 0.25 W), at most six.
func stated(x float64, unit string) string {
	if math.IsInf(x, 1) {
		return "infinite"
	}
	if math.IsInf(x, -1) {
		return "-infinite"
	}
	if unit == "1/K" {
		const toPercent = 100
		x, unit = x*toPercent, "%/K"
	}
	s := noScale
	// Volts and ohms of the usual size stand as they are: 0.65 V, 0.1 Ω.
	const least, most = 0.01, 1000
	plain := (unit == "V" || unit == "Ω") && math.Abs(x) >= least && math.Abs(x) < most
	if !plain && Prefixable(unit) {
		s = scaleFor(x)
	}
	const atMost = 6 // enough for any stated value, and hides binary fractions
	v := strconv.FormatFloat(s.in(x), 'g', atMost, 64)
	return strings.TrimRight(v+" "+s.prefix+unit, " ")
}

// Measured writes a number with its own prefix and four significant digits.
func Measured(x float64, unit string) string {
	s := noScale
	if Prefixable(unit) {
		s = scaleFor(x)
	}
	return strings.TrimRight(number(s.in(x))+" "+s.prefix+unit, " ")
}

// heading is a column's title with its unit: "drop [mV]".
func heading(what string, s scale, unit string) string { return what + " [" + s.prefix + unit + "]" }
