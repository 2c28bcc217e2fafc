package physics

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/cockroachdb/apd/v3"
)

// omegaOf solves w + ln w = z at fifty digits by Newton's method on w - u e^-w with
// u = e^z for z < 1 and on w + ln w - z otherwise, from the double's answer.
func omegaOf(t *testing.T, z, start float64) *apd.Decimal {
	t.Helper()
	w, x := decimal(t, start), decimal(t, z)
	one := apd.New(1, 0)
	for range 4 { // 15, 30, 60 digits, and one more
		log, r, slope := new(apd.Decimal), new(apd.Decimal), new(apd.Decimal)
		exact.Ln(log, w)
		exact.Sub(r, x, w)
		exact.Sub(r, r, log) // z - w - ln w
		exact.Add(slope, one, w)
		exact.Quo(r, r, slope)
		exact.Mul(r, r, w)
		exact.Add(w, w, r)
	}
	return w
}

func TestWrightOmegaAgainstFiftyDigits(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	zs := []float64{-700, -100, -40, -20, -2, -1, -1e-9, 0, 1e-9, 1, 1.9999, 2, 2.0001, 3, 10, 40, 1e3, 1e6, 1e15}
	for range 300 {
		zs = append(zs, -40+80*r.Float64(), -3+6*r.Float64())
	}
	worst := 0.0
	for _, z := range zs {
		w := WrightOmega(z)
		u := ulps(t, w, omegaOf(t, z, w))
		worst = max(worst, u)
		if u > 2 {
			t.Errorf("omega(%v) = %v is off by %.2f units in the last place", z, w, u)
		}
	}
	t.Logf("worst: %.2f units in the last place", worst)
}

// omega(1) = 1 and omega(0) is the omega constant (OEIS A030178: 0.56714 32904 09783
// 87299 …); omega(1 + e) = e by the defining equation.
func TestWrightOmegaOfKnownArguments(t *testing.T) {
	for _, c := range []struct{ z, w float64 }{
		{1, 1}, {0, 0.56714329040978387300}, {1 + math.E, math.E}, {math.Inf(-1), 0}, {math.Inf(1), math.Inf(1)},
	} {
		if got := WrightOmega(c.z); got != c.w && !(math.Abs(got-c.w) < 3e-16*c.w) {
			t.Errorf("omega(%v) = %v, want %v", c.z, got, c.w)
		}
	}
	if w := WrightOmega(math.NaN()); !math.IsNaN(w) {
		t.Errorf("omega(NaN) = %v", w)
	}
	if w := WrightOmega(-720); math.Abs(w/math.Exp(-720)-1) > 1e-6 { // a subnormal
		t.Errorf("omega(-720) = %v", w)
	}
}
