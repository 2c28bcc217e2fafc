// Package interval is arithmetic on closed intervals of doubles, rounded outward: a
// result contains every value that the operation takes on its operands. An interval
// whose Lo lies above its Hi is empty. Ends may be infinite; 0 times infinity is 0, as
// for an interval that holds reals alone.
//
// Source: R. E. Moore, R. B. Kearfott and M. J. Cloud, Introduction to Interval Analysis,
// SIAM 2009.
package interval

import "math"

// An I is an interval.
type I struct{ Lo, Hi float64 }

// Whole holds every real number.
var Whole = I{math.Inf(-1), math.Inf(1)}

// Of is the interval of one number.
func Of(x float64) I { return I{x, x} }

// Up is the next double above x, Down the next below; infinities and NaN stay.
func Up(x float64) float64 {
	switch {
	case x > 0:
		if x > math.MaxFloat64 {
			return x
		}
		return math.Float64frombits(math.Float64bits(x) + 1)
	case x < 0:
		return math.Float64frombits(math.Float64bits(x) - 1)
	case x == 0:
		return math.SmallestNonzeroFloat64
	}
	return x // NaN
}

// Down is the next double below x.
func Down(x float64) float64 { return -Up(-x) }

// Empty tells an interval that holds nothing; one with a NaN is none either.
func (a I) Empty() bool { return !(a.Lo <= a.Hi) }

// Width is Hi - Lo, rounded.
func (a I) Width() float64 { return a.Hi - a.Lo }

// Mid is a double about the middle, inside where the interval is not empty; of a
// half-line, one far out.
func (a I) Mid() float64 {
	m := a.Lo/2 + a.Hi/2
	return math.Min(math.Max(m, a.Lo), a.Hi)
}

// Mag is the largest magnitude.
func (a I) Mag() float64 { return math.Max(math.Abs(a.Lo), math.Abs(a.Hi)) }

// Has tells whether x lies within.
func (a I) Has(x float64) bool { return a.Lo <= x && x <= a.Hi }

// Meet is what both hold.
func (a I) Meet(b I) I { return I{math.Max(a.Lo, b.Lo), math.Min(a.Hi, b.Hi)} }

// Hull holds both and what lies between.
func (a I) Hull(b I) I { return I{math.Min(a.Lo, b.Lo), math.Max(a.Hi, b.Hi)} }

// Neg is -a, exactly.
func (a I) Neg() I { return I{-a.Hi, -a.Lo} }

// Add is a + b.
func (a I) Add(b I) I { return I{Down(a.Lo + b.Lo), Up(a.Hi + b.Hi)} }

// Sub is a - b.
func (a I) Sub(b I) I { return I{Down(a.Lo - b.Hi), Up(a.Hi - b.Lo)} }

// product is x·y with 0·Inf = 0.
func product(x, y float64) float64 {
	if x == 0 || y == 0 {
		return 0
	}
	return x * y
}

// Mul is a·b.
func (a I) Mul(b I) I {
	p, q, r, s := product(a.Lo, b.Lo), product(a.Lo, b.Hi), product(a.Hi, b.Lo), product(a.Hi, b.Hi)
	return I{Down(math.Min(math.Min(p, q), math.Min(r, s))), Up(math.Max(math.Max(p, q), math.Max(r, s)))}
}

// Scale is c·a for a finite c.
func (a I) Scale(c float64) I {
	p, q := product(c, a.Lo), product(c, a.Hi)
	if c < 0 {
		p, q = q, p
	}
	return I{Down(p), Up(q)}
}

// Over is a/c for a finite c other than 0.
func (a I) Over(c float64) I {
	p, q := a.Lo/c, a.Hi/c
	if c < 0 {
		p, q = q, p
	}
	return I{Down(p), Up(q)}
}

// Div is a/b; everything where b holds 0.
func (a I) Div(b I) I {
	if b.Lo <= 0 && b.Hi >= 0 {
		return Whole
	}
	p, q, r, s := quotient(a.Lo, b.Lo), quotient(a.Lo, b.Hi), quotient(a.Hi, b.Lo), quotient(a.Hi, b.Hi)
	return I{Down(math.Min(math.Min(p, q), math.Min(r, s))), Up(math.Max(math.Max(p, q), math.Max(r, s)))}
}

// quotient is x/y with Inf/Inf = 0, which lies between what it may be.
func quotient(x, y float64) float64 {
	if math.IsInf(x, 0) && math.IsInf(y, 0) {
		return 0
	}
	return x / y
}

// slack is how many units in the last place the functions below are widened by: more
// than the errors of the library's (math.Exp and Expm1 are within 1, from their
// documentation; the rest is reserve).
const slack = 4

func lower(x float64) float64 {
	for range slack {
		x = Down(x)
	}
	return x
}

func upper(x float64) float64 {
	for range slack {
		x = Up(x)
	}
	return x
}

// Exp is e^a.
func (a I) Exp() I { return I{math.Max(0, lower(math.Exp(a.Lo))), upper(math.Exp(a.Hi))} }

// Expm1 is e^a - 1.
func (a I) Expm1() I { return I{math.Max(-1, lower(math.Expm1(a.Lo))), upper(math.Expm1(a.Hi))} }

// Log1p is ln(1 + a) of the part of a at or above -1.
func (a I) Log1p() I {
	if a.Hi < -1 {
		return I{1, -1}
	}
	return I{lower(math.Log1p(math.Max(-1, a.Lo))), upper(math.Log1p(a.Hi))}
}

// Log is ln(a) of the part of a at or above 0.
func (a I) Log() I {
	if a.Hi < 0 {
		return I{1, -1}
	}
	return I{lower(math.Log(math.Max(0, a.Lo))), upper(math.Log(a.Hi))}
}
