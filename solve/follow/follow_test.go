package follow

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"biaswright/solve/sparse"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// A system is a Problem for tests: eval gives F, ∂F/∂λ and, entry by entry, J.
type system struct {
	eval   func(x []float64, lambda float64, f, dl []float64, add func(i, j int, v float64))
	scale  []float64
	plan   *sparse.Plan
	values []float64
	at     []int // positions of the entries in the order in which eval adds them
	f, dl  []float64
	tol    []float64
	direct *sparse.Factors
	pivot  *sparse.Pivoting
	used   sparse.Solver
}

// newSystem makes a system of order n. Its pattern is what eval adds.
func newSystem(n int, tol float64, eval func(x []float64, lambda float64, f, dl []float64, add func(i, j int, v float64))) *system {
	var entries []sparse.Entry
	eval(make([]float64, n), 0, make([]float64, n), make([]float64, n), func(i, j int, _ float64) {
		entries = append(entries, sparse.Entry{Row: i, Col: j})
	})
	plan, err := sparse.Analyse(n, entries)
	if err != nil {
		panic(err)
	}
	s := &system{
		eval: eval, plan: plan, values: make([]float64, plan.NNZ()),
		f: make([]float64, n), dl: make([]float64, n), tol: make([]float64, n), scale: make([]float64, n),
		direct: plan.NewFactors(), pivot: plan.NewPivoting(),
	}
	for i := range n {
		s.tol[i], s.scale[i] = tol, 1
	}
	for _, e := range entries {
		s.at = append(s.at, plan.Index(e.Row, e.Col))
	}
	return s
}

func scalar(eval func(x, lambda float64) (f, fx, fl float64)) *system {
	return newSystem(1, 1e-13, func(x []float64, lambda float64, f, dl []float64, add func(i, j int, v float64)) {
		var fx float64
		f[0], fx, dl[0] = eval(x[0], lambda)
		add(0, 0, fx)
	})
}

func (s *system) Size() int         { return len(s.f) }
func (s *system) XScale() []float64 { return s.scale }
func (s *system) Linearise(x []float64, lambda float64) bool {
	clear(s.values)
	next := 0
	s.eval(x, lambda, s.f, s.dl, func(_, _ int, v float64) {
		s.values[s.at[next]] += v
		next++
	})
	s.used = s.direct
	if s.used.Factor(s.values) {
		return true
	}
	s.used = s.pivot
	return s.used.Factor(s.values)
}
func (s *system) Residual() (f, tol []float64) { return s.f, s.tol }
func (s *system) DLambda(dst []float64)        { copy(dst, s.dl) }
func (s *system) Solve(b []float64) bool       { s.used.Solve(b); return true }
func (s *system) SolveT(b []float64) bool      { s.used.SolveT(b); return true }
func (s *system) DetSign() int                 { return s.used.DetSign() }

// A reporter is a *testing.T or a *rapid.T.
type reporter interface {
	Helper()
	Errorf(format string, args ...any)
	Fatalf(format string, args ...any)
}

func near(t reporter, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.17g, want %.17g, off by %.2g", what, got, want, got-want)
	}
}

func outcome(t reporter, r Result, want Outcome) {
	t.Helper()
	if r.Outcome != want {
		t.Fatalf("the walk %v at x = %v, λ = %g (%+v), want: it %v", r.Outcome, r.X, r.Lambda, r.Stats, want)
	}
}

// cusp is the normal form λ + μ x - x³ of the cusp catastrophe. For μ > 0 it has
// folds at x = ±sqrt(μ/3), λ = ±2 (μ/3)^(3/2).
// Source: differentiate; the name is R. Thom's.
func cusp(mu float64) *system {
	return scalar(func(x, l float64) (f, fx, fl float64) { return l + mu*x - x*x*x, mu - 3*x*x, 1 })
}

func TestFoldIsExact(t *testing.T) {
	// y² + λ - 2 = 0 folds at λ = 2, y = 0.
	p := scalar(func(y, l float64) (f, fy, fl float64) { return y*y + l - 2, 2 * y, 1 })
	r := Follow(p, []float64{1}, 1, Options{StopAtFold: true})
	outcome(t, r, Folded)
	near(t, "λ", r.Lambda, 2, 2e-12)
	near(t, "y", r.X[0], 0, 1e-9)
	if len(r.Folds) != 1 {
		t.Errorf("%d folds", len(r.Folds))
	}
}

func TestCusp(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		mu := rapid.Float64Range(0.05, 3).Draw(rt, "mu")
		high := 2*math.Pow(mu/3, 1.5) + 1
		r := Follow(cusp(mu), []float64{-2}, -8+2*mu, Options{
			Low: -20, High: high, Target: 0, Use: EveryPassage,
		})
		outcome(rt, r, RangeEnd)
		if len(r.Folds) != 2 || len(r.Targets) != 3 {
			rt.Fatalf("%d folds and %d passages", len(r.Folds), len(r.Targets))
		}
		near(rt, "first fold", r.Folds[0].Lambda, 2*math.Pow(mu/3, 1.5), 1e-12*high)
		near(rt, "second fold", r.Folds[1].Lambda, -2*math.Pow(mu/3, 1.5), 1e-12*high)
		for i, want := range []float64{-math.Sqrt(mu), 0, math.Sqrt(mu)} {
			near(rt, "passage", r.Targets[i].X[0], want, 1e-12)
			if r.Targets[i].Lambda != 0 {
				rt.Errorf("λ = %g is not exact", r.Targets[i].Lambda)
			}
		}
		// J = μ - 3x² is positive on the middle sheet alone.
		for i, want := range []int{-1, 1, -1} {
			if r.Targets[i].DetSign != want {
				rt.Errorf("passage %d: sign %d", i, r.Targets[i].DetSign)
			}
		}
		if r.Lambda != high {
			rt.Errorf("ended at %g instead of %g", r.Lambda, high)
		}
		// The same walk back returns to the start.
		back := Follow(cusp(mu), r.X, r.Lambda, Options{Direction: -1, Low: -8 + 2*mu, High: 50})
		outcome(rt, back, RangeEnd)
		near(rt, "start", back.X[0], -2, 1e-12)
		if len(back.Folds) != 2 {
			rt.Errorf("%d folds on the way back", len(back.Folds))
		}
	})
}

func TestNaturalEndsAtFold(t *testing.T) {
	r := Follow(cusp(1), []float64{-2}, -6, Options{Mode: Natural, Target: 1, Use: FirstPassage})
	outcome(t, r, Folded)
	near(t, "λ", r.Lambda, 2/(3*math.Sqrt(3)), 1e-3)
	// Without a fold in its way it arrives.
	r = Follow(cusp(-1), []float64{-2}, -10, Options{Mode: Natural, Target: 10, Use: FirstPassage})
	outcome(t, r, Reached)
	near(t, "x", r.X[0], 2, 1e-13)
	if r.Lambda != 10 || len(r.Targets) != 1 {
		t.Errorf("λ = %g, %d targets", r.Lambda, len(r.Targets))
	}
}

// Bratu's problem u” + λ exp(u) = 0, u(0) = u(1) = 0. Its solutions are
// u = 2 ln(cosh θ / cosh(θ(1-2x))) with λ = 8 (θ/cosh θ)², so that the fold is
// at θ tanh θ = 1: λ = 3.513830719125…
// The figure is from memory (it is the customary check of continuation codes);
// the test derives it anew from the closed form.
func bratu(cells int) *system {
	n := cells - 1
	h2 := 1 / float64(cells*cells)
	// Numerov's scheme, of fourth order: u₋ - 2u + u₊ + h²/12 (g₋ + 10 g + g₊) = 0.
	return newSystem(n, 1e-13, func(u []float64, l float64, f, dl []float64, add func(i, j int, v float64)) {
		at := func(i int) float64 {
			if i < 0 || i >= n {
				return 0
			}
			return u[i]
		}
		for i := range n {
			g := [3]float64{math.Exp(at(i-1)) / 12, math.Exp(at(i)) * 10 / 12, math.Exp(at(i+1)) / 12}
			f[i] = at(i-1) - 2*at(i) + at(i+1) + l*h2*(g[0]+g[1]+g[2])
			dl[i] = h2 * (g[0] + g[1] + g[2])
			second := [3]float64{1, -2, 1}
			for k := range 3 {
				if j := i + k - 1; j >= 0 && j < n {
					add(i, j, second[k]+l*h2*g[k])
				}
			}
		}
	})
}

func TestBratu(t *testing.T) {
	theta, _, _ := zero(func(x float64) (float64, bool) { return x*math.Tanh(x) - 1, true }, 1, 2, math.Tanh(1)-1, 2*math.Tanh(2)-1, 0)
	want := 8 * math.Pow(theta/math.Cosh(theta), 2)
	near(t, "the closed form against the published figure", want, 3.513830719, 5e-10)
	var folds [2]float64
	for i, cells := range []int{40, 80} {
		p := bratu(cells)
		r := Follow(p, make([]float64, p.Size()), 0, Options{Low: -1, High: 10, Target: 1, Use: EveryPassage, MaxSteps: 200})
		if len(r.Folds) != 1 || len(r.Targets) != 2 {
			t.Fatalf("%d folds, %d passages, %v, %+v", len(r.Folds), len(r.Targets), r.Outcome, r.Stats)
		}
		folds[i] = r.Folds[0].Lambda
		// The two solutions at λ = 1, both by the closed form: half of the
		// unknowns' midpoint value is ln cosh θ.
		for k, bracket := range [][2]float64{{0, theta}, {theta, 10}} {
			f := func(x float64) (float64, bool) { return 8*math.Pow(x/math.Cosh(x), 2) - 1, true }
			fa, _ := f(bracket[0])
			fb, _ := f(bracket[1])
			x, _, _ := zero(f, bracket[0], bracket[1], fa, fb, 0)
			// Numerov's error on the steeper solution.
			near(t, "u(1/2)", r.Targets[k].X[cells/2-1], 2*math.Log(math.Cosh(x)), []float64{1e-8, 2e-4}[k])
		}
	}
	near(t, "fold", folds[1], want, 1e-6)
	// Richardson: the error falls sixteenfold.
	near(t, "extrapolated fold", folds[1]+(folds[1]-folds[0])/15, want, 2e-9)
}

// Freudenstein and Roth's system from the start (15, -2) by the homotopy
// F(x) - (1-λ) F(x0): Newton's method fails from there, and the path has folds;
// the solution is (5, 4).
// Source, from memory: F. Freudenstein and B. Roth, Numerical solutions of systems
// of nonlinear equations, J. ACM 10 (1963) 550-556; the path, W. C. Rheinboldt,
// Numerical Analysis of Parametrized Nonlinear Equations, 1986. That (5, 4) is a
// solution is checked by inserting it.
func TestFreudensteinRoth(t *testing.T) {
	roth := func(x, y float64) (f, g float64) {
		return x - y*y*y + 5*y*y - 2*y - 13, x + y*y*y + y*y - 14*y - 29
	}
	x0 := []float64{15, -2}
	if f, g := roth(5, 4); f != 0 || g != 0 {
		t.Fatalf("(5, 4) leaves %g and %g", f, g)
	}
	f0, g0 := roth(x0[0], x0[1])
	p := newSystem(2, 1e-12, func(x []float64, l float64, f, dl []float64, add func(i, j int, v float64)) {
		a, b := roth(x[0], x[1])
		f[0], f[1] = a-(1-l)*f0, b-(1-l)*g0
		dl[0], dl[1] = f0, g0
		y := x[1]
		add(0, 0, 1)
		add(0, 1, -3*y*y+10*y-2)
		add(1, 0, 1)
		add(1, 1, 3*y*y+2*y-14)
	})
	copy(p.scale, []float64{10, 1})
	r := Follow(p, x0, 0, Options{Target: 1, Use: FirstPassage, Low: -10, High: 10})
	outcome(t, r, Reached)
	near(t, "x", r.X[0], 5, 1e-11)
	near(t, "y", r.X[1], 4, 1e-12)
	if len(r.Folds) == 0 {
		t.Error("the path is known to fold")
	}
}

// Chandrasekhar's H equation, discretised by the midpoint rule. Summing it shows
// that the mean of H is (2/c)(1 ± sqrt(1-c)) for any number of points, so that it
// folds at c = 1 with mean 2.
// Source, from memory: C. T. Kelley, Solution of the Chandrasekhar H-equation by
// Newton's method, J. Math. Phys. 21 (1980) 1625-1628.
func TestChandrasekhar(t *testing.T) {
	const n = 24
	p := newSystem(n, 1e-12, func(h []float64, c float64, f, dl []float64, add func(i, j int, v float64)) {
		for i := range n {
			mu := float64(i) + 0.5
			sum := 0.0
			for j := range n {
				k := mu / (mu + float64(j) + 0.5) / (2 * n)
				sum += k * h[j]
				add(i, j, -c*h[i]*k)
			}
			f[i] = h[i] - 1 - c*h[i]*sum
			dl[i] = -h[i] * sum
			add(i, i, 1-c*sum)
		}
	})
	h := make([]float64, n)
	for i := range h {
		h[i] = 1
	}
	r := Follow(p, h, 0, Options{Low: 0.3, High: 2, Target: 0.5, Use: EveryPassage})
	outcome(t, r, RangeEnd)
	mean := func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum += v / n
		}
		return sum
	}
	if len(r.Folds) != 1 || len(r.Targets) != 2 {
		t.Fatalf("%d folds, %d passages", len(r.Folds), len(r.Targets))
	}
	near(t, "fold", r.Folds[0].Lambda, 1, 2e-12)
	near(t, "mean of H at the fold", mean(r.Folds[0].X), 2, 1e-8)
	near(t, "lower mean", mean(r.Targets[0].X), 4*(1-math.Sqrt(0.5)), 1e-12)
	near(t, "upper mean", mean(r.Targets[1].X), 4*(1+math.Sqrt(0.5)), 1e-11)
}

func TestCircleCloses(t *testing.T) {
	p := scalar(func(x, l float64) (f, fx, fl float64) { return x*x + l*l - 1, 2 * x, 2 * l })
	r := Follow(p, []float64{0.8}, 0.6, Options{Target: 0, Use: EveryPassage, Direction: 1})
	outcome(t, r, Closed)
	if len(r.Folds) != 2 || len(r.Targets) != 2 {
		t.Fatalf("%d folds, %d passages", len(r.Folds), len(r.Targets))
	}
	near(t, "right", r.Folds[0].Lambda, 1, 1e-12)
	near(t, "left", r.Folds[1].Lambda, -1, 1e-12)
	near(t, "bottom", r.Targets[0].X[0], -1, 1e-13)
	near(t, "top", r.Targets[1].X[0], 1, 1e-13)
}

func TestPitchfork(t *testing.T) {
	fork := func(tilt float64) *system {
		return scalar(func(x, l float64) (f, fx, fl float64) { return l*x - x*x*x + tilt, l - 3*x*x, x })
	}
	// Perfect: the walk goes straight on, and says that it crossed a branch.
	r := Follow(fork(0), []float64{0}, -1, Options{Target: 1, Use: FirstPassage})
	outcome(t, r, Reached)
	near(t, "x", r.X[0], 0, 1e-13)
	if r.Stats.BranchPoints != 1 {
		t.Errorf("%d branch points", r.Stats.BranchPoints)
	}
	// Tilted, however little: it follows the bend, and never jumps.
	rapid.Check(t, func(rt *rapid.T) {
		tilt := math.Pow(10, -rapid.Float64Range(0.5, 6).Draw(rt, "decades"))
		r := Follow(fork(tilt), []float64{tilt}, -1, Options{Target: 1, Use: FirstPassage})
		outcome(rt, r, Reached)
		if !(r.X[0] > 0.9) || r.Stats.BranchPoints != 0 || len(r.Folds) != 0 {
			rt.Fatalf("tilt %g: x = %g, %+v", tilt, r.X[0], r.Stats)
		}
	})
}

// x² - λ² = gap² has two branches that come close to each other at λ = 0.
func TestNoJump(t *testing.T) {
	for _, mode := range []Mode{ArcLength, Natural} {
		rapid.Check(t, func(rt *rapid.T) {
			gap := math.Pow(10, -rapid.Float64Range(0.3, 4).Draw(rt, "decades"))
			p := scalar(func(x, l float64) (f, fx, fl float64) { return x*x - l*l - gap*gap, 2 * x, -2 * l })
			r := Follow(p, []float64{1}, -1, Options{Mode: mode, Target: 1, Use: FirstPassage})
			outcome(rt, r, Reached)
			near(rt, "x", r.X[0], math.Sqrt(1+gap*gap), 1e-13)
		})
	}
}

func TestEvents(t *testing.T) {
	p := func() *system {
		return scalar(func(x, l float64) (f, fx, fl float64) { return x - l*l, 1, -2 * l })
	}
	for _, mode := range []Mode{ArcLength, Natural} {
		t.Run(fmt.Sprint(mode), func(t *testing.T) {
			events := []Event{
				{Margin: func(x []float64, _ float64) float64 { return 0.5 - x[0] }},
				{Margin: func(_ []float64, l float64) float64 { return math.Exp(3*l) - math.Exp(2.7) }, Stop: true},
			}
			r := Follow(p(), []float64{0}, 0, Options{Mode: mode, Events: events, High: 2})
			outcome(t, r, Stopped)
			if len(r.Crossings) != 2 {
				t.Fatalf("%d crossings", len(r.Crossings))
			}
			near(t, "first", r.Crossings[0].Lambda, math.Sqrt(0.5), 1e-12)
			near(t, "second", r.Crossings[1].Lambda, 0.9, 1e-12)
			if !r.Crossings[0].Falling || r.Crossings[1].Falling {
				t.Error("senses are wrong")
			}
			for _, c := range r.Crossings {
				if m := events[c.Event].Margin(c.X, c.Lambda); !(m >= 0) {
					t.Errorf("event %d: margin %g is not on the side that holds", c.Event, m)
				}
			}
			if r.Lambda != r.Crossings[1].Lambda {
				t.Errorf("ended at %g", r.Lambda)
			}
		})
	}
}

// A margin that dips below zero and back between two steps.
func TestDipOfMargin(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		at := rapid.Float64Range(0.2, 0.8).Draw(rt, "at")
		half := math.Pow(10, -rapid.Float64Range(1, 5).Draw(rt, "decades"))
		p := scalar(func(x, l float64) (f, fx, fl float64) { return x - l, 1, -1 })
		margin := func(x []float64, _ float64) float64 { return (x[0]-at)*(x[0]-at) - half*half }
		r := Follow(p, []float64{0}, 0, Options{High: 1, Events: []Event{{Margin: margin}}})
		outcome(rt, r, RangeEnd)
		if len(r.Crossings) != 2 {
			rt.Fatalf("%d crossings", len(r.Crossings))
		}
		near(rt, "down", r.Crossings[0].Lambda, at-half, 1e-11)
		near(rt, "up", r.Crossings[1].Lambda, at+half, 1e-11)
	})
}

// A branch that is flat but for a narrow excursion: the step control sees its
// foot and goes through it, so that the margin's crossings are found.
func TestNarrowExcursion(t *testing.T) {
	for _, mode := range []Mode{ArcLength, Natural} {
		rapid.Check(t, func(rt *rapid.T) {
			at := rapid.Float64Range(0.2, 0.8).Draw(rt, "at")
			width := rapid.Float64Range(0.01, 0.1).Draw(rt, "width")
			p := scalar(func(x, l float64) (f, fx, fl float64) {
				u := (l - at) / width
				q := 1 + u*u
				return x - 1/q, 1, 2 * u / (q * q * width)
			})
			u := at / width
			margin := func(x []float64, _ float64) float64 { return 0.9 - x[0] }
			r := Follow(p, []float64{1 / (1 + u*u)}, 0, Options{Mode: mode, High: 1, Events: []Event{{Margin: margin}}})
			outcome(rt, r, RangeEnd)
			if len(r.Crossings) != 2 {
				rt.Fatalf("%v: %d crossings, %+v", mode, len(r.Crossings), r.Stats)
			}
			// 1/(1+u²) = 0.9 at u = 1/3.
			near(rt, "up", r.Crossings[0].Lambda, at-width/3, 1e-12)
			near(rt, "down", r.Crossings[1].Lambda, at+width/3, 1e-12)
		})
	}
}

// A junction behind a resistor: the current spans fifteen decades and the
// voltage has a sharp knee. The closed form is checked by its own equation.
func TestJunctionRamp(t *testing.T) {
	const vt, isat, r, v = 0.025852, 1e-14, 1e3, 200.0
	for _, mode := range []Mode{ArcLength, Natural} {
		p := scalar(func(x, l float64) (f, fx, fl float64) {
			return (x-l*v)/r + isat*math.Expm1(x/vt), 1/r + isat/vt*math.Exp(x/vt), -v / r
		})
		p.tol[0] = 1e-12 * v / r
		res := Follow(p, []float64{0}, 0, Options{Mode: mode, Target: 1, Use: FirstPassage})
		outcome(t, res, Reached)
		i := (v - res.X[0]) / r
		near(t, "v", res.X[0], vt*math.Log1p(i/isat), 1e-13)
		if res.Stats.Steps > 200 {
			t.Errorf("%d steps", res.Stats.Steps)
		}
	}
}

func TestEnds(t *testing.T) {
	line := func() *system { return scalar(func(x, l float64) (f, fx, fl float64) { return x - l, 1, -1 }) }
	none := scalar(func(x, l float64) (f, fx, fl float64) { return x*x + 1, 2 * x, 0 })
	nan := scalar(func(x, l float64) (f, fx, fl float64) { return math.NaN(), 1, 0 })
	wall := scalar(func(x, l float64) (f, fx, fl float64) { return x - math.Sqrt(0.5-l), 1, 0.5 / math.Sqrt(0.5-l) })
	count := 0
	tests := []struct {
		name   string
		p      *system
		x      float64
		o      Options
		want   Outcome
		lambda float64
	}{
		{"no solution", none, 1, Options{}, BadStart, 0},
		{"not a number", nan, 1, Options{}, BadStart, 0},
		{"budget", line(), 0, Options{MaxSteps: 3, InitialStep: 0.1}, OutOfSteps, 0.3},
		{"upper end", line(), 0, Options{Low: -1, High: 0.77}, RangeEnd, 0.77},
		{"lower end", line(), 0, Options{Low: -0.3, High: 0.77, Direction: -1}, RangeEnd, -0.3},
		{"at the end already", line(), 0, Options{Low: 0, High: 1, Direction: -1}, RangeEnd, 0},
		{"at the target already", line(), 0, Options{Use: FirstPassage}, Reached, 0},
		{"target below", line(), 0, Options{Use: FirstPassage, Target: -0.3}, Reached, -0.3},
		{"by the callback", line(), 0, Options{InitialStep: 0.1, OnPoint: func([]float64, float64) bool { count++; return count < 3 }}, Stopped, 0.2},
		{"no model beyond", wall, math.Sqrt(0.5), Options{Mode: Natural}, Folded, 0.5},
	}
	for _, test := range tests {
		for _, mode := range []Mode{ArcLength, Natural} {
			t.Run(fmt.Sprintf("%s/%d", test.name, mode), func(t *testing.T) {
				if test.o.Mode == Natural && mode == ArcLength {
					t.Skip("a natural walk alone")
				}
				count = 0
				test.o.Mode = mode
				x := []float64{test.x}
				r := Follow(test.p, x, 0, test.o)
				outcome(t, r, test.want)
				near(t, "λ", r.Lambda, test.lambda, 1e-3)
				if x[0] != test.x {
					t.Error("the start was modified")
				}
			})
		}
	}
}

// Many unknowns: each step must cost a bounded number of linearisations.
func TestCost(t *testing.T) {
	p := bratu(400)
	r := Follow(p, make([]float64, p.Size()), 0, Options{Low: -1, High: 10, StopAtFold: true})
	outcome(t, r, Folded)
	if r.Stats.Steps > 100 || r.Stats.Corrections > 8*r.Stats.Steps+50 {
		t.Errorf("%+v", r.Stats)
	}
}

// The bordered solve keeps its digits while J becomes singular, where plain
// block elimination loses them.
func TestBorderedNearSingular(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		n := rapid.IntRange(2, 8).Draw(rt, "n")
		gap := math.Pow(10, -rapid.Float64Range(0, 16).Draw(rt, "decades"))
		rnd := rand.New(rand.NewPCG(rapid.Uint64().Draw(rt, "seed"), 1))
		// J = Q diag(1 … 1, gap) Rᵀ with random orthogonal Q and R.
		orthogonal := func() *mat.Dense {
			m := mat.NewDense(n, n, nil)
			for i := range n {
				for j := range n {
					m.Set(i, j, rnd.NormFloat64())
				}
			}
			var qr mat.QR
			qr.Factorize(m)
			var q mat.Dense
			qr.QTo(&q)
			return &q
		}
		q, rr := orthogonal(), orthogonal()
		var j mat.Dense
		d := mat.NewDiagDense(n, nil)
		for i := range n {
			d.SetDiag(i, 1)
		}
		d.SetDiag(n-1, gap)
		j.Product(q, d, rr.T())
		p := newSystem(n, 1, func(_ []float64, _ float64, _, dl []float64, add func(i, k int, v float64)) {
			for i := range n {
				dl[i] = q.At(i, n-1) + 0.1*rnd.NormFloat64()
				for k := range n {
					add(i, k, j.At(i, k))
				}
			}
		})
		border := make([]float64, n+1)
		for i := range n {
			border[i] = rr.At(i, n-1)
		}
		// Then det [J b; cᵀ d] is far from 0 whatever the gap: d - cᵀ J⁻¹ b < -1.
		border[n] = -0.5
		if !p.Linearise(border[:n], 0) {
			return // exactly singular after rounding
		}
		if p.used = p.pivot; !p.used.Factor(p.values) {
			return
		}
		sys := newBordered(p)
		if !sys.prepare(border, false) {
			rt.Fatal("not solved")
		}
		f := make([]float64, n)
		for i := range f {
			f[i] = rnd.NormFloat64()
		}
		const g = 0.7
		move, ok := sys.solve(f, 1, g)
		if !ok {
			rt.Fatal("not solved")
		}
		// The bordered matrix is well-conditioned: residuals are roundings.
		for i := range n {
			sum := p.dl[i]*move[n] - f[i]
			for k := range n {
				sum += j.At(i, k) * move[k]
			}
			if math.Abs(sum) > 1e-10 {
				rt.Fatalf("gap %g: row %d is off by %g", gap, i, sum)
			}
		}
		if off := dot(border, move) - g; math.Abs(off) > 1e-10 {
			rt.Fatalf("gap %g: the border is off by %g", gap, off)
		}
	})
}

func TestZero(t *testing.T) {
	tests := []struct {
		name       string
		f          func(float64) float64
		a, b, want float64
	}{
		{"line", func(x float64) float64 { return x - 0.25 }, 0, 1, 0.25},
		{"reversed", func(x float64) float64 { return x - 0.25 }, 1, 0, 0.25},
		{"cosine", math.Cos, 1, 2, math.Pi / 2},
		{"exponential", func(x float64) float64 { return math.Expm1(40*x) - 1 }, -1, 1, math.Ln2 / 40},
		{"flat", func(x float64) float64 { return math.Pow(x-0.3, 9) }, 0, 1, 0.3},
		{"step", func(x float64) float64 { return math.Copysign(1, x-0.7) }, 0, 1, 0.7},
		{"at an end", func(x float64) float64 { return x }, 0, 1, 0},
		{"at the other end", func(x float64) float64 { return x - 1 }, 0, 1, 1},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			calls := 0
			f := func(x float64) (float64, bool) { calls++; return test.f(x), true }
			x, across, ok := zero(f, test.a, test.b, test.f(test.a), test.f(test.b), 1e-13)
			if !ok {
				t.Fatal("not ok")
			}
			near(t, "root", x, test.want, 1e-12)
			if test.f(x) != 0 && (test.f(x) < 0) == (test.f(across) < 0) || math.Abs(across-x) > 1e-12 && test.f(x) != 0 {
				t.Errorf("%g and %g do not bracket", x, across)
			}
			if calls > 150 {
				t.Errorf("%d calls", calls)
			}
		})
	}
	if _, _, ok := zero(func(float64) (float64, bool) { return 0, false }, 0, 1, -1, 1, 0); ok {
		t.Error("a function that fails was accepted")
	}
}
