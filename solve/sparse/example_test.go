package sparse_test

import (
	"fmt"

	"biaswright/solve/sparse"
)

// Two nodes, each held by 2 S and joined by a bridge: the pattern is analysed once, then solved
// for two sets of conductances.
func Example() {
	entries := []sparse.Entry{{Row: 0, Col: 0}, {Row: 0, Col: 1}, {Row: 1, Col: 0}, {Row: 1, Col: 1}}
	plan, err := sparse.Analyse(2, entries)
	if err != nil {
		fmt.Println(err)
		return
	}
	factors := plan.NewFactors()
	values := make([]float64, plan.NNZ())
	for _, bridge := range []float64{1, 3} {
		clear(values)
		for _, e := range entries {
			v := -bridge
			if e.Row == e.Col {
				v = 2 + bridge
			}
			values[plan.Index(e.Row, e.Col)] += v
		}
		x := []float64{8, 0}
		if !factors.Factor(values) {
			fmt.Println("needs pivoting")
			return
		}
		factors.Solve(x)
		fmt.Printf("%.3f, determinant %+d\n", x, factors.DetSign())
	}
	// Output:
	// [3.000 1.000], determinant +1
	// [2.500 1.500], determinant +1
}
