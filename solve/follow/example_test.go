package follow_test

import (
	"fmt"

	"biaswright/solve/follow"
)

// cubic is λ + x - x³ = 0, whose branch is an S: for small |λ| it has three
// solutions.
type cubic struct{ f, fx float64 }

func (*cubic) Size() int         { return 1 }
func (*cubic) XScale() []float64 { return []float64{1} }

func (p *cubic) Linearise(x []float64, lambda float64) bool {
	p.f, p.fx = lambda+x[0]-x[0]*x[0]*x[0], 1-3*x[0]*x[0]
	return p.fx != 0
}

func (p *cubic) Residual() (f, tol []float64) { return []float64{p.f}, []float64{1e-14} }
func (p *cubic) DLambda(dst []float64)        { dst[0] = 1 }
func (p *cubic) Solve(b []float64) bool       { b[0] /= p.fx; return true }
func (p *cubic) SolveT(b []float64) bool      { return p.Solve(b) }

func (p *cubic) DetSign() int {
	if p.fx < 0 {
		return -1
	}
	return 1
}

func ExampleFollow() {
	r := follow.Follow(&cubic{}, []float64{-2}, -6, follow.Options{
		Low: -10, High: 6,
		Target: 0.375, Use: follow.EveryPassage,
		Events: []follow.Event{{Margin: func(x []float64, _ float64) float64 { return 1.5 - x[0] }}},
	})
	fmt.Println("the walk", r.Outcome)
	for _, p := range r.Targets {
		fmt.Printf("passes λ = %.3f at x = %+.6f\n", p.Lambda, p.X[0])
	}
	for _, p := range r.Folds {
		fmt.Printf("folds at λ = %+.10f\n", p.Lambda)
	}
	for _, c := range r.Crossings {
		fmt.Printf("x reaches %.1f at λ = %.10f\n", c.X[0], c.Lambda)
	}
	// Output:
	// the walk came to the end of the range
	// passes λ = 0.375 at x = -0.651388
	// passes λ = 0.375 at x = -0.500000
	// passes λ = 0.375 at x = +1.151388
	// folds at λ = +0.3849001795
	// folds at λ = -0.3849001795
	// x reaches 1.5 at λ = 1.8750000000
}
