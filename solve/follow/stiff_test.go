package follow

import (
	"math"
	"testing"
)

// regenerative is an emitter-coupled pair with positive feedback, the input
// ramped by λ from 0 to 12 V: exponentials of 26 mV beside volts, and a
// hysteresis between two folds. Unknowns: the first collector, the second base,
// the second collector, the common emitter. Transport equations with gain 100
// forward and 2 in reverse; invented values.
func regenerative() *system {
	const vt, isat, supply, input = 0.025852, 1e-14, 12.0, 12.0
	const g1, g2, gf, gb, ge = 1 / 4.7e3, 1 / 1e3, 1 / 10e3, 1 / 15e3, 1 / 1.5e3
	expm1 := func(v float64) (f, df float64) {
		// Continued by its tangent where a double would overflow.
		if u := v / vt; u < 80 {
			return math.Expm1(u), math.Exp(u) / vt
		}
		e := math.Exp(80)
		return e * (1 + v/vt - 80), e / vt
	}
	p := newSystem(4, 1e-14, func(x []float64, l float64, f, dl []float64, add func(i, j int, v float64)) {
		clear(f)
		clear(dl)
		resist := func(a, b int, va, vb, g float64) {
			i := g * (va - vb)
			if a >= 0 {
				f[a] += i
				add(a, a, g)
			}
			if b >= 0 {
				f[b] -= i
				add(b, b, g)
			}
			if a >= 0 && b >= 0 {
				add(a, b, -g)
				add(b, a, -g)
			}
		}
		// A transistor's base is at index base, or at the input if that is -1.
		transistor := func(c, base, e int, vb float64) {
			ef, df := expm1(vb - x[e])
			er, dr := expm1(vb - x[c])
			ic := isat * (ef - er - er/2)
			ib := isat * (ef/100 + er/2)
			// Derivatives to the base-emitter and base-collector voltages.
			icf, icr := isat*df, -1.5*isat*dr
			ibf, ibr := isat*df/100, isat*dr/2
			for _, row := range []struct {
				at        int
				i, df, dr float64
			}{{c, ic, icf, icr}, {base, ib, ibf, ibr}, {e, -ic - ib, -icf - ibf, -icr - ibr}} {
				if row.at < 0 {
					continue
				}
				f[row.at] += row.i
				add(row.at, e, -row.df)
				add(row.at, c, -row.dr)
				if base >= 0 {
					add(row.at, base, row.df+row.dr)
				} else {
					dl[row.at] += input * (row.df + row.dr)
				}
			}
		}
		resist(0, -1, x[0], supply, g1)
		resist(2, -1, x[2], supply, g2)
		resist(0, 1, x[0], x[1], gf)
		resist(1, -1, x[1], 0, gb)
		resist(3, -1, x[3], 0, ge)
		transistor(0, -1, 3, input*l)
		transistor(2, 1, 3, x[1])
	})
	return p
}

func TestHysteresis(t *testing.T) {
	// With the input at 0 the first transistor is off: a hand calculation with
	// drops of 0.7 V is near enough.
	start := []float64{9.7, 5.8, 8.5, 5.1}
	p := regenerative()
	up := Follow(p, start, 0, Options{Low: -0.1, High: 1})
	outcome(t, up, RangeEnd)
	if len(up.Folds) != 2 {
		t.Fatalf("%d folds, %+v", len(up.Folds), up.Stats)
	}
	high, low := up.Folds[0].Lambda, up.Folds[1].Lambda
	if !(low < high) {
		t.Fatalf("folds at %g and %g", high, low)
	}
	// Ramps up and down end at the same folds.
	ramp := Follow(p, start, 0, Options{Mode: Natural, High: 1})
	outcome(t, ramp, Folded)
	near(t, "upper fold", ramp.Lambda, high, 1e-8)
	ramp = Follow(p, up.X, 1, Options{Mode: Natural, Low: -1, High: 1, Direction: -1})
	outcome(t, ramp, Folded)
	near(t, "lower fold", ramp.Lambda, low, 1e-8)
	// Between them three solutions exist, and their signs alternate.
	middle := (high + low) / 2
	all := Follow(p, start, 0, Options{Low: -0.1, High: 1, Target: middle, Use: EveryPassage})
	if len(all.Targets) != 3 {
		t.Fatalf("%d solutions", len(all.Targets))
	}
	for i, want := range []int{1, -1, 1} {
		if all.Targets[i].DetSign != want {
			t.Errorf("solution %d: sign %d", i, all.Targets[i].DetSign)
		}
		if !p.Linearise(all.Targets[i].X, middle) || !within(p.f, p.tol) {
			t.Errorf("solution %d leaves %v", i, p.f)
		}
	}
	t.Logf("folds at %.6f and %.6f; %+v", high, low, up.Stats)
}
