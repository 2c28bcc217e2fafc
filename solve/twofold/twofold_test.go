package twofold_test

import (
	"math/big"
	"testing"

	"pgregory.net/rapid"

	"biaswright/solve/twofold"
)

// exact is a number as a fraction, from the standard library's own arithmetic.
func exact(x twofold.Number) *big.Rat {
	hi, lo := new(big.Rat).SetFloat64(x.Hi), new(big.Rat).SetFloat64(x.Lo)
	return hi.Add(hi, lo)
}

// bound is the relative error allowed: a few units of 2^-104.
var bound = new(big.Rat).SetFrac(big.NewInt(16), new(big.Int).Lsh(big.NewInt(1), 104))

func check(t *rapid.T, what string, got twofold.Number, want *big.Rat, scale *big.Rat) {
	diff := new(big.Rat).Sub(exact(got), want)
	if diff.Abs(diff).Cmp(scale.Mul(scale.Abs(scale), bound)) > 0 {
		t.Fatalf("%s is off by %s", what, diff.FloatString(60))
	}
}

func TestAgainstFractions(t *testing.T) {
	number := rapid.Custom(func(t *rapid.T) twofold.Number {
		size := rapid.SampledFrom([]float64{1, 1e-9, 1e7, 1e-18}).Draw(t, "size")
		hi := rapid.Float64Range(0.5, 2).Draw(t, "hi") * size
		lo := rapid.Float64Range(-0x1p-53, 0x1p-53).Draw(t, "lo") * hi
		if rapid.Bool().Draw(t, "negative") {
			hi, lo = -hi, -lo
		}
		return twofold.Sum(hi, lo)
	})
	rapid.Check(t, func(t *rapid.T) {
		x, y := number.Draw(t, "x"), number.Draw(t, "y")
		ex, ey := exact(x), exact(y)
		size := new(big.Rat).Add(new(big.Rat).Abs(ex), new(big.Rat).Abs(ey))
		check(t, "sum", x.Add(y), new(big.Rat).Add(ex, ey), new(big.Rat).Set(size))
		check(t, "difference", x.Sub(y), new(big.Rat).Sub(ex, ey), size)
		product := new(big.Rat).Mul(ex, ey)
		check(t, "product", x.Mul(y), product, new(big.Rat).Set(product))
		quotient := new(big.Rat).Quo(ex, ey)
		check(t, "quotient", x.Div(y), quotient, new(big.Rat).Set(quotient))
	})
}

// 1 + 1e-25 - 1 is lost to doubles.
func TestKeepsWhatDoublesLose(t *testing.T) {
	got := twofold.Of(1).Add(twofold.Of(1e-25)).Sub(twofold.Of(1)).Value()
	if diff := got - 1e-25; diff > 1e-32 || diff < -1e-32 {
		t.Errorf("1 + 1e-25 - 1 = %g", got)
	}
}
