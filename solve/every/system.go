// Package every finds all solutions of a system of balances with exponentials, and proves
// that there are no others: by interval arithmetic throughout, so that rounding cannot
// lose one. It knows no circuits: a System is linear rows over unknowns, shared
// exponentials of their differences, and products of the kind that an Early effect
// makes.
//
// The search begins with a box that the caller knows to hold all solutions of its scope.
// In each box the balances narrow what they can (propagation, and Kolev's operator:
// L. V. Kolev, Interval Methods for Circuit Analysis, World Scientific 1993); a Newton
// point is verified by Krawczyk's test; and a box is discarded where the slopes between
// it and a known solution make a regular matrix, which then has no room for a second. What
// is left is split. The claims hold for the System as its doubles state it.
package every

import (
	"math"

	"biaswright/solve/interval"
)

// A System is F(x) = 0 in unknowns x, one row each. It is not modified by this package.
type System struct {
	N     int
	Exps  []Exponential
	Prods []Product
	Rows  []Row // N of them
	Start []interval.I
	// Monotone tells that the system is known to have at most one solution: its caller
	// says so of networks whose parts all have two terminals and a current that rises
	// with the voltage (R. J. Duffin, Nonlinear networks IIa, Bulletin of the American
	// Mathematical Society 53, 1947).
	Monotone bool
}

// An Exponential is y = exp((u - Offset0)/Phi) - exp(-Offset0/Phi), with u = x[A] - x[B] +
// Offset; A or B is -1 where there is none. Most bounds y from above in the search.
type Exponential struct {
	A, B            int
	Offset, Offset0 float64
	Phi             float64
	Most            float64
}

// A Product is W = (y[F] - y[R]) (1 - u[R] Slope), with Slope above 0; its second factor is
// above 0 in the search.
type Product struct {
	F, R  int
	Slope float64
}

// A Term is a coefficient of an unknown, exponential or product.
type Term struct {
	At   int
	Coef float64
}

// A Row is Const + Σ Lin x + Σ Exp y + Σ Prod W = 0.
type Row struct {
	Const          float64
	Lin, Exp, Prod []Term
}

// y of an exponential's argument, as an interval.
func (e *Exponential) of(u interval.I) interval.I {
	y := u.Sub(interval.Of(e.Offset0)).Over(e.Phi)
	if e.Offset0 == 0 {
		return y.Expm1()
	}
	return y.Exp().Sub(e.rest())
}

// rest is exp(-Offset0/Phi).
func (e *Exponential) rest() interval.I { return interval.Of(-e.Offset0).Over(e.Phi).Exp() }

// argument is the u at which y is reached.
func (e *Exponential) argument(y interval.I) interval.I {
	if e.Offset0 == 0 {
		return y.Log1p().Scale(e.Phi)
	}
	return y.Add(e.rest()).Log().Scale(e.Phi).Add(interval.Of(e.Offset0))
}

// slope is dy/du, as an interval.
func (e *Exponential) slope(u interval.I) interval.I {
	s := u.Sub(interval.Of(e.Offset0)).Over(e.Phi).Exp().Over(e.Phi)
	return interval.I{Lo: math.Max(0, s.Lo), Hi: s.Hi}
}

// chord is (y(b) - y(a))/(b - a), for any a in the first and b in the second interval: the
// exponential is convex, so that it rises with both.
func (e *Exponential) chord(a, b interval.I) interval.I {
	return interval.I{Lo: e.chordAt(a.Lo, b.Lo).Lo, Hi: e.chordAt(a.Hi, b.Hi).Hi}
}

// chordAt is exp(a') expm1(t)/t / Phi with t = (b - a)/Phi.
func (e *Exponential) chordAt(a, b float64) interval.I {
	t := interval.Of(b).Sub(interval.Of(a)).Over(e.Phi)
	rise := interval.I{Lo: growth(t.Lo), Hi: growth(t.Hi)}
	const digits = 8 // units in the last place: expm1, the division, and reserve
	for range digits {
		rise = interval.I{Lo: math.Max(0, interval.Down(rise.Lo)), Hi: interval.Up(rise.Hi)}
	}
	return e.slope(interval.Of(a)).Mul(rise)
}

// growth is expm1(t)/t, which rises from 0 to infinity.
func growth(t float64) float64 {
	if t == 0 {
		return 1
	}
	if math.IsInf(t, 1) {
		return t
	}
	return math.Expm1(t) / t
}

// difference is x[a] - x[b] + offset on a box.
func difference(x []interval.I, a, b int, offset float64) interval.I {
	u := interval.Of(offset)
	if a >= 0 {
		u = u.Add(x[a])
	}
	if b >= 0 {
		u = u.Sub(x[b])
	}
	return u
}

// Residual is F on a box of unknowns.
func (s *System) Residual(x []interval.I) []interval.I {
	y := make([]interval.I, len(s.Exps))
	u := make([]interval.I, len(s.Exps))
	for k := range s.Exps {
		e := &s.Exps[k]
		u[k] = difference(x, e.A, e.B, e.Offset)
		y[k] = e.of(u[k])
	}
	out := make([]interval.I, s.N)
	for i := range s.Rows {
		r := &s.Rows[i]
		sum := interval.Of(r.Const)
		for _, t := range r.Lin {
			sum = sum.Add(x[t.At].Scale(t.Coef))
		}
		for _, t := range r.Exp {
			sum = sum.Add(y[t.At].Scale(t.Coef))
		}
		for _, t := range r.Prod {
			p := &s.Prods[t.At]
			q := interval.Of(1).Sub(u[p.R].Scale(p.Slope))
			sum = sum.Add(y[p.F].Sub(y[p.R]).Mul(q).Scale(t.Coef))
		}
		out[i] = sum
	}
	return out
}

// columns are the rows' coefficients by exponential and by product.
type columns struct{ exp, prod [][]Term }

func (s *System) columns() columns {
	c := columns{make([][]Term, len(s.Exps)), make([][]Term, len(s.Prods))}
	for i := range s.Rows {
		for _, t := range s.Rows[i].Exp {
			c.exp[t.At] = append(c.exp[t.At], Term{i, t.Coef})
		}
		for _, t := range s.Rows[i].Prod {
			c.prod[t.At] = append(c.prod[t.At], Term{i, t.Coef})
		}
	}
	return c
}
