package interval_test

import (
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"

	"biaswright/solve/interval"
)

func drawn(t *rapid.T, name string) (interval.I, float64) {
	a := rapid.Float64Range(-1e6, 1e6).Draw(t, name)
	b := a + math.Abs(a)*rapid.Float64Range(0, 2).Draw(t, name+" width")
	share := rapid.Float64Range(0, 1).Draw(t, name+" at")
	x := math.Min(math.Max(a+share*(b-a), a), b)
	return interval.I{Lo: a, Hi: b}, x
}

// TestHolds draws intervals and a point of each: what an operation gives in exact
// arithmetic lies in what it gives on the intervals.
func TestHolds(t *testing.T) {
	exact := func(x float64) *big.Float { return new(big.Float).SetPrec(400).SetFloat64(x) }
	rapid.Check(t, func(t *rapid.T) {
		a, x := drawn(t, "a")
		b, y := drawn(t, "b")
		holds := func(name string, i interval.I, v *big.Float) {
			if v.Cmp(exact(i.Lo)) < 0 || v.Cmp(exact(i.Hi)) > 0 {
				t.Fatalf("%s of %v and %v is %v, which leaves out %v at %g and %g", name, a, b, i, v, x, y)
			}
		}
		z := func() *big.Float { return new(big.Float).SetPrec(400) }
		holds("sum", a.Add(b), z().Add(exact(x), exact(y)))
		holds("difference", a.Sub(b), z().Sub(exact(x), exact(y)))
		holds("product", a.Mul(b), z().Mul(exact(x), exact(y)))
		holds("multiple", a.Scale(y), z().Mul(exact(x), exact(y)))
		if y != 0 {
			holds("quotient by a number", a.Over(y), z().Quo(exact(x), exact(y)))
		}
		if q := a.Div(b); b.Lo > 0 || b.Hi < 0 {
			holds("quotient", q, z().Quo(exact(x), exact(y)))
		} else if q != interval.Whole {
			t.Fatalf("divided by what holds 0: %v", q)
		}
	})
}

// TestFunctions compares with the series of the exponential in 400 bits.
func TestFunctions(t *testing.T) {
	exp := func(x float64) *big.Float { // by halving the argument and squaring back
		const halvings = 20
		r := new(big.Float).SetPrec(400).SetFloat64(x)
		r.SetMantExp(r, -halvings)
		sum, term := big.NewFloat(1).SetPrec(400), big.NewFloat(1).SetPrec(400)
		for k := 1; k < 60; k++ {
			term.Mul(term, r)
			term.Quo(term, new(big.Float).SetPrec(400).SetInt64(int64(k)))
			sum.Add(sum, term)
		}
		for range halvings {
			sum.Mul(sum, sum)
		}
		return sum
	}
	rapid.Check(t, func(t *rapid.T) {
		x := math.Pow(10, rapid.Float64Range(-30, 1.6).Draw(t, "ten")) // 400 bits tell 1 + x apart
		if rapid.Bool().Draw(t, "negative") {
			x = -x
		}
		holds := func(name string, i interval.I, v *big.Float) {
			lo, hi := new(big.Float).SetFloat64(i.Lo), new(big.Float).SetFloat64(i.Hi)
			if v.Cmp(lo) < 0 || v.Cmp(hi) > 0 {
				t.Fatalf("%s(%g) is %v, which leaves out %v", name, x, i, v)
			}
		}
		e := exp(x)
		holds("exp", interval.Of(x).Exp(), e)
		holds("expm1", interval.Of(x).Expm1(), new(big.Float).SetPrec(400).Sub(e, big.NewFloat(1)))
		back := interval.Of(x).Expm1().Log1p()
		if !back.Has(x) {
			t.Fatalf("log1p(expm1(%g)) is %v", x, back)
		}
		if back = interval.Of(x).Exp().Log(); !back.Has(x) {
			t.Fatalf("log(exp(%g)) is %v", x, back)
		}
	})
}

func TestEnds(t *testing.T) {
	inf := math.Inf(1)
	if got := (interval.I{Lo: 0, Hi: 0}).Mul(interval.Whole); !got.Has(0) || got.Width() > 1e-300 {
		t.Errorf("0 times everything is %v", got)
	}
	if got := interval.Whole.Expm1(); got.Lo != -1 || got.Hi != inf {
		t.Errorf("expm1 of everything is %v", got)
	}
	if !(interval.I{Lo: -3, Hi: -2}).Log1p().Empty() || !(interval.I{Lo: 2, Hi: 1}).Empty() || !(interval.I{Lo: math.NaN()}).Empty() {
		t.Error("what is empty is not")
	}
	if interval.Up(math.MaxFloat64) != inf || interval.Up(inf) != inf || interval.Down(0) >= 0 || interval.Up(-inf) != -math.MaxFloat64 {
		t.Error("neighbours of the ends are wrong")
	}
}
