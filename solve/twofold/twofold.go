// Package twofold computes with numbers of twice a double's precision: unevaluated
// sums of two doubles, good to about 32 digits.
//
// A network whose nodes hang together by ohms but are held by leakage alone needs
// it: there a balance is a difference of conductances that lie seventeen decades
// apart.
//
// Sources: T. J. Dekker, A floating-point technique for extending the available
// precision, Numer. Math. 18 (1971); D. E. Knuth, The Art of Computer Programming,
// vol. 2, section 4.2.2 (the exact sum).
package twofold

import "math"

// A Number is Hi + Lo, with Lo at most half a unit in the last place of Hi. The
// zero value is 0.
type Number struct{ Hi, Lo float64 }

// Of is x as it stands.
func Of(x float64) Number { return Number{Hi: x} }

// Sum is a + b exactly, of two doubles.
func Sum(a, b float64) Number {
	s := a + b
	t := s - a
	return Number{s, (a - (s - t)) + (b - t)}
}

// Product is a b exactly, of two doubles.
func Product(a, b float64) Number {
	p := a * b
	return Number{p, math.FMA(a, b, -p)}
}

// Value is the double next to x.
func (x Number) Value() float64 { return x.Hi + x.Lo }

// Neg is -x.
func (x Number) Neg() Number { return Number{-x.Hi, -x.Lo} }

// Add is x + y, within a few units of 2^-104.
func (x Number) Add(y Number) Number {
	s := Sum(x.Hi, y.Hi)
	t := Sum(x.Lo, y.Lo)
	s = quick(s.Hi, s.Lo+t.Hi)
	return quick(s.Hi, s.Lo+t.Lo)
}

// Sub is x - y.
func (x Number) Sub(y Number) Number { return x.Add(y.Neg()) }

// Mul is x y, within a few units of 2^-104.
func (x Number) Mul(y Number) Number {
	p := Product(x.Hi, y.Hi)
	return quick(p.Hi, p.Lo+(x.Hi*y.Lo+x.Lo*y.Hi))
}

// Div is x / y, within a few units of 2^-104.
func (x Number) Div(y Number) Number {
	q := x.Hi / y.Hi
	rest := x.Sub(y.Mul(Of(q)))
	r := rest.Hi / y.Hi
	rest = rest.Sub(y.Mul(Of(r)))
	return quick(q, r).Add(Of(rest.Hi / y.Hi))
}

// quick is a + b exactly where |a| >= |b|.
func quick(a, b float64) Number {
	s := a + b
	return Number{s, b - (s - a)}
}
