package physics

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// The law's derivatives are those of its logarithm, and T = T0 is no special case
// but for its digits.
func TestSaturationLaw(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		kelvin := rapid.Float64Range(200, 450).Draw(t, "T")
		t0 := rapid.Float64Range(200, 450).Draw(t, "T0")
		egap := rapid.Float64Range(0.6, 3).Draw(t, "Egap")
		n := rapid.Float64Range(1, 3).Draw(t, "n")
		log := func(kelvin, t0, egap, n float64) float64 {
			return 3/n*math.Log(kelvin/t0) + egap/(n*VoltPerKelvin)*(1/t0-1/kelvin)
		}
		s := SaturationLaw(kelvin, t0, egap, n)
		near := func(what string, got, want, tol float64) {
			if !(math.Abs(got-want) <= tol) {
				t.Errorf("%s is %v, want %v", what, got, want)
			}
		}
		near("ln(ratio)", s.Log, log(kelvin, t0, egap, n), 1e-11)
		near("ratio", s.Ratio()/math.Exp(s.Log), 1, 4e-16)
		const h = 1e-4 // relative; the third derivative leaves about h^2
		central := func(f func(h float64) float64) float64 { return (f(h) - f(-h)) / (2 * h) }
		near("T dlog/dT", kelvin*s.DT, central(func(h float64) float64 { return log(kelvin*(1+h), t0, egap, n) }), 1e-5)
		near("T0 dlog/dT0", t0*s.DT0, central(func(h float64) float64 { return log(kelvin, t0*(1+h), egap, n) }), 1e-5)
		near("n dlog/dn", n*s.DN, central(func(h float64) float64 { return log(kelvin, t0, egap, n*(1+h)) }), 1e-5)
		near("Egap dlog/dEgap", egap*s.DEgap, central(func(h float64) float64 { return log(kelvin, t0, egap*(1+h), n) }), 1e-5)

		same, close := SaturationLaw(t0, t0, egap, n), SaturationLaw(t0*(1+1e-13), t0, egap, n)
		near("T dlog/dT at T0", t0*same.DT, t0*close.DT, 1e-9)
		near("T0 dlog/dT0 at T0", t0*same.DT0, t0*close.DT0, 1e-9)
		if same.Ratio() != 1 {
			t.Errorf("the ratio at T0 is %v", same.Ratio())
		}
	})
}

// The guarded exponential rises everywhere and has no corner at its knee.
func TestJunctionIsGuarded(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		isat := math.Pow(10, rapid.Float64Range(-30, 0).Draw(t, "lg Isat"))
		knee := Knee(isat)
		x := rapid.Float64Range(-1e8, 1e8).Draw(t, "x")
		f, df := Junction(x, knee)
		if math.IsNaN(f) || math.IsInf(f, 0) || math.IsNaN(df) || math.IsInf(df, 0) || f < -1 || df < 0 {
			t.Errorf("at %v: %v, %v", x, f, df)
		}
		if isat*f > MaxCurrent*(1+math.Abs(x)) {
			t.Errorf("at %v: %v A", x, isat*f)
		}
		at, slope := Junction(knee, knee)
		after, steep := Junction(math.Nextafter(knee, 1e9), knee)
		if slope != steep || after < at || after-at > 1e-13*at {
			t.Errorf("at the knee %v: from %v, %v to %v, %v", knee, at, slope, after, steep)
		}
	})
}

// Far in reverse the derivative stays until doubles end, near x = -745.
func TestJunctionKeepsItsSlopeInReverse(t *testing.T) {
	for _, x := range []float64{-40, -300, -700, -709, -740} {
		if f, df := Junction(x, 50); f != -1 || !(df > 0) {
			t.Errorf("at %v: %v, %v", x, f, df)
		}
	}
}
