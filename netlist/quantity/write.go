package quantity

import (
	"math"
	"strconv"
	"strings"
)

// join puts a unit behind a number: a space before a unit, none before a percent
// sign or a prefix alone.
func join(number, suffix string) string {
	if suffix == "" || suffix == "%" || suffixes[suffix].bare {
		return number + suffix
	}
	return number + " " + suffix
}

// Text returns the canonical text of a reading: the digits and the prefix as
// written, units in ASCII, one space before a unit.
func (r *Reading) Text() string {
	number := r.Number
	if math.Signbit(r.Value) {
		number = "-" + number
	}
	if r.Suffix == "" || r.Suffix == "K" && !r.Spaced { // 10K may be a letter code
		return number + r.Suffix
	}
	return join(number, suffixes[r.Suffix].ascii)
}

// Exact returns the shortest text that reads as exactly q, with the SI prefix
// that leaves one to three digits before the point where there is one: "1.8
// kohm", "-40 degC", "100 ppm/K". It returns "infinite" for +Inf. A plain number
// has no prefix; a unit that no text can name is written by its powers.
func Exact(q Quantity) string {
	switch {
	case math.IsInf(q.Value, 1):
		return "infinite"
	case math.IsInf(q.Value, 0) || math.IsNaN(q.Value):
		return "no number"
	}
	unit, ten, scaled := outer(q.Unit)
	d := decimal(q.Value, -1)
	prefix, p := "", 0
	if scaled {
		prefix, p = enough(d.exponent)
	}
	return join(d.shift(-ten-p), strings.TrimSpace(prefix+unit))
}

// outer is how a unit is written, the power of ten in that writing, and whether
// it takes prefixes.
func outer(u Unit) (text string, ten int, prefixed bool) {
	if u == PerKelvin {
		return "ppm/K", -6, false
	}
	switch u {
	case One, Celsius, KelvinPerW, Kelvin:
		return u.String(), 0, false
	}
	_, known := names[u]
	return u.String(), 0, known
}

// enough is the prefix for a number whose first digit counts 10^exponent. Numbers
// more than a thousand times beyond the prefixes have none.
func enough(exponent int) (string, int) {
	const femto, giga = -15, 9
	p := int(math.Floor(float64(exponent)/3)) * 3 // prefixes count in thousands
	if p < femto-3 || p > giga+3 {
		return "", 0
	}
	p = max(min(p, giga), femto)
	return prefixText(p), p
}

func prefixText(ten int) string {
	for _, p := range prefixes {
		if p.ten == ten {
			return p.ascii
		}
	}
	return ""
}

// A decimalNumber is 0.d1d2d3… × 10^(exponent+1), d1 not 0 except for zero.
type decimalNumber struct {
	negative bool
	digits   string
	exponent int
}

// decimal gives the digits of v: so many, or the fewest that read back for -1.
func decimal(v float64, digits int) decimalNumber {
	precision := digits - 1
	if digits < 0 {
		precision = -1
	}
	s := strconv.FormatFloat(math.Abs(v), 'e', precision, 64)
	mantissa, exponent, _ := strings.Cut(s, "e")
	d := decimalNumber{negative: math.Signbit(v) && v != 0, digits: strings.Replace(mantissa, ".", "", 1)}
	d.exponent, _ = strconv.Atoi(exponent) // FormatFloat writes a small integer
	return d
}

// The plain notation is used where it needs no more than so many zeros.
const mostZeros = 6

// shift writes the number times 10^ten, without zeros at its end.
func (d decimalNumber) shift(ten int) string {
	digits := strings.TrimRight(d.digits, "0")
	if digits == "" {
		return "0"
	}
	sign := ""
	if d.negative {
		sign = "-"
	}
	point := d.exponent + ten + 1 // digits before the point
	switch {
	case point > len(digits)+mostZeros || point < -mostZeros:
		mantissa := digits[:1]
		if len(digits) > 1 {
			mantissa += "." + digits[1:]
		}
		return sign + mantissa + "e" + strconv.Itoa(point-1)
	case point >= len(digits):
		return sign + digits + strings.Repeat("0", point-len(digits))
	case point > 0:
		return sign + digits[:point] + "." + digits[point:]
	}
	return sign + "0." + strings.Repeat("0", -point) + digits
}

// Format writes q with so many significant digits (1 to 17), an SI prefix and a
// space before the unit, for people: "1.8 kΩ", "-40 °C". Zeros at the end
// are left out.
func Format(q Quantity, digits int) string {
	if math.IsInf(q.Value, 0) || math.IsNaN(q.Value) {
		return Exact(q) // words, in which a u is a u
	}
	return strings.NewReplacer("ohm", "Ω", "degC", "°C", "u", "µ").Replace(FormatASCII(q, digits))
}

// FormatASCII is Format in ASCII: "1.8 kohm", "10 uA".
func FormatASCII(q Quantity, digits int) string {
	if math.IsInf(q.Value, 0) || math.IsNaN(q.Value) {
		return Exact(q)
	}
	unit, ten, scaled := outer(q.Unit)
	d := decimal(q.Value, digits) // rounds first, so that 999.96 becomes 1.000 k
	prefix, p := "", 0
	if scaled {
		prefix, p = enough(d.exponent)
	}
	return join(d.shift(-ten-p), prefix+unit)
}

// A Prefix is the SI prefix of a column of numbers.
type Prefix struct {
	Symbol string // "µ"
	ASCII  string // "u"
	Ten    int    // the power of ten
}

// CommonPrefix picks the one prefix for a column: that of the number which is the
// largest once rounded to so many significant digits, as it will be printed. NaN
// and infinities are passed over; a column of zeros has no prefix.
func CommonPrefix(values []float64, digits int) Prefix {
	largest, found := 0, false
	for _, v := range values {
		if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		if e := decimal(v, digits).exponent; !found || e > largest {
			largest, found = e, true
		}
	}
	if !found {
		return Prefix{}
	}
	ascii, ten := enough(largest)
	return Prefix{strings.Replace(ascii, "u", "µ", 1), ascii, ten}
}
