package newton_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"biaswright/solve/newton"
)

// dense is a system given by functions, for the tests.
type dense struct {
	n   int
	f   func(x, f []float64)
	j   func(x []float64, j *mat.Dense)
	tol float64

	fx, balance []float64
	lu          mat.LU
	calls       int
}

func (d *dense) Size() int { return d.n }

func (d *dense) Linearise(x []float64) bool {
	d.calls++
	d.fx, d.balance = make([]float64, d.n), make([]float64, d.n)
	d.f(x, d.fx)
	copy(d.balance, d.fx)
	jac := mat.NewDense(d.n, d.n, nil)
	d.j(x, jac)
	d.lu.Factorize(jac)
	return true
}

func (d *dense) solve(dx []float64) bool {
	var out mat.VecDense
	rhs := mat.NewVecDense(d.n, nil)
	rhs.ScaleVec(-1, mat.NewVecDense(d.n, d.fx))
	if d.lu.Cond() > 1e15 {
		return false
	}
	_ = d.lu.SolveVecTo(&out, false, rhs)
	copy(dx, out.RawVector().Data)
	return true
}

func (d *dense) Step(dx []float64) bool { return d.solve(dx) }

func (d *dense) Balanced() bool {
	for _, f := range d.balance {
		if math.Abs(f) > d.tol {
			return false
		}
	}
	return true
}

func (d *dense) Correct(x, dx []float64) bool {
	d.f(x, d.fx)
	return d.solve(dx)
}

// The systems are numbers 1, 2 and 12 of J. J. Moré, B. S. Garbow and K. E.
// Hillstrom, Testing Unconstrained Optimization Software, ACM TOMS 7 (1981),
// where they have zero residual; starts and roots as given there.
func rosenbrock() *dense {
	return &dense{
		n: 2, tol: 1e-12,
		f: func(x, f []float64) { f[0], f[1] = 10*(x[1]-x[0]*x[0]), 1-x[0] },
		j: func(x []float64, j *mat.Dense) { j.SetRow(0, []float64{-20 * x[0], 10}); j.SetRow(1, []float64{-1, 0}) },
	}
}

func freudensteinRoth() *dense {
	return &dense{
		n: 2, tol: 1e-10,
		f: func(x, f []float64) {
			f[0] = -13 + x[0] + ((5-x[1])*x[1]-2)*x[1]
			f[1] = -29 + x[0] + ((x[1]+1)*x[1]-14)*x[1]
		},
		j: func(x []float64, j *mat.Dense) {
			j.SetRow(0, []float64{1, 10*x[1] - 3*x[1]*x[1] - 2})
			j.SetRow(1, []float64{1, 3*x[1]*x[1] + 2*x[1] - 14})
		},
	}
}

func helicalValley() *dense {
	return &dense{
		n: 3, tol: 1e-10,
		f: func(x, f []float64) {
			f[0] = 10 * (x[2] - 10*math.Atan2(x[1], x[0])/(2*math.Pi))
			f[1] = 10 * (math.Hypot(x[0], x[1]) - 1)
			f[2] = x[2]
		},
		j: func(x []float64, j *mat.Dense) {
			r2 := x[0]*x[0] + x[1]*x[1]
			r := math.Sqrt(r2)
			c := 100 / (2 * math.Pi)
			j.SetRow(0, []float64{c * x[1] / r2, -c * x[0] / r2, 10})
			j.SetRow(1, []float64{10 * x[0] / r, 10 * x[1] / r, 0})
			j.SetRow(2, []float64{0, 0, 1})
		},
	}
}

func TestPublishedSystems(t *testing.T) {
	for _, test := range []struct {
		name        string
		system      *dense
		start, root []float64
		damped      bool
	}{
		{"Rosenbrock", rosenbrock(), []float64{-1.2, 1}, []float64{1, 1}, false},
		{"Rosenbrock, damped", rosenbrock(), []float64{-1.2, 1}, []float64{1, 1}, true},
		{"Freudenstein and Roth", freudensteinRoth(), []float64{6, 5}, []float64{5, 4}, false},
		{"helical valley", helicalValley(), []float64{-1, 0.5, 0}, []float64{1, 0, 0}, true},
	} {
		t.Run(test.name, func(t *testing.T) {
			var w newton.Work
			x := append([]float64(nil), test.start...)
			r := newton.Solve(test.system, x, &w, newton.Options{Damped: test.damped})
			if r.Outcome != newton.Converged {
				t.Fatalf("it %s after %d steps at %v", r.Outcome, r.Steps, x)
			}
			for i, want := range test.root {
				if math.Abs(x[i]-want) > 1e-9 {
					t.Errorf("x[%d] = %.12g, want %g", i, x[i], want)
				}
			}
			if r.LastStep >= newton.StepLimit {
				t.Errorf("last step %g is not below the rule's %g", r.LastStep, newton.StepLimit)
			}
		})
	}
}

// From its standard start, Freudenstein and Roth's function leads damped Newton to
// a local minimum of |F| near (11.41, -0.8968), which is no root: the iteration
// must say that it came to a stand, not that it converged.
func TestNoFalseRoot(t *testing.T) {
	var w newton.Work
	x := []float64{0.5, -2}
	r := newton.Solve(freudensteinRoth(), x, &w, newton.Options{Damped: true, MaxSteps: 40})
	if r.Outcome == newton.Converged {
		t.Fatalf("converged to %v, where there is no root", x)
	}
}

func TestOutcomes(t *testing.T) {
	flat := &dense{n: 1, f: func(x, f []float64) { f[0] = x[0]*x[0] + 1 }, j: func(x []float64, j *mat.Dense) { j.Set(0, 0, 2*x[0]) }}
	var w newton.Work
	if r := newton.Solve(flat, []float64{0}, &w, newton.Options{}); r.Outcome != newton.Singular {
		t.Errorf("a flat start: it %s", r.Outcome)
	}
	if r := newton.Solve(flat, []float64{0.3}, &w, newton.Options{MaxSteps: 7}); r.Outcome != newton.TooManySteps || r.Steps != 7 {
		t.Errorf("no root: it %s after %d steps, want the 7 allowed", r.Outcome, r.Steps)
	}
}

// A guarded system whose answer is for another point must not end the iteration.
type guarded struct {
	*dense
	guardFor int
}

func (g *guarded) Linearise(x []float64) bool {
	g.dense.Linearise(x)
	g.guardFor--
	return g.guardFor < 0
}

func TestGuardedAnswerDoesNotEnd(t *testing.T) {
	g := &guarded{rosenbrock(), 9}
	var w newton.Work
	r := newton.Solve(g, []float64{1, 1}, &w, newton.Options{}) // starts at the root
	if r.Outcome != newton.Converged || r.Steps != 10 {
		t.Errorf("it %s after %d steps, want convergence at the first exact answer, the tenth", r.Outcome, r.Steps)
	}
}

// The rule asks for balance as well as for a small step.
func TestBalanceIsAsked(t *testing.T) {
	d := rosenbrock()
	d.tol = -1 // nothing is ever balanced
	var w newton.Work
	if r := newton.Solve(d, []float64{1, 1}, &w, newton.Options{MaxSteps: 5}); r.Outcome != newton.TooManySteps {
		t.Errorf("it %s without a balance", r.Outcome)
	}
}
