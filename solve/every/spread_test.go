package every

import (
	"math"
	"testing"
)

// A column of many entries, as of an exponential that a bank of transistors shares, adds up
// to a rounding error of as many units: each of these small entries is lost beside the
// first. The error is arithmetic: what is lost is their plain sum.
func TestSpreadCoversManyRoundings(t *testing.T) {
	const small = 1.1e-16 // below half a unit in the last place of 1
	for _, count := range []int{1, 7, 8, 130, 1000} {
		col := []Term{{At: 0, Coef: 1}}
		for range count {
			col = append(col, Term{At: 0, Coef: small})
		}
		c := &centre{n: 1, c: []float64{1}}
		s := c.times([][]Term{col})
		lost := (1 - s.move[0]) + float64(count)*small
		if s.move[0] != 1 {
			t.Fatalf("%d entries: the sum is %v: none is lost, the test shows nothing", count, s.move[0])
		}
		if bound := terms * eps * s.size[0]; lost > bound {
			t.Errorf("%d entries: %.3g is lost, the bound says %.3g", count, lost, bound)
		}
		if exact := 1 + float64(count)*small; s.big[0] < exact {
			t.Errorf("%d entries: big is %.17g, below %.17g", count, s.big[0], exact)
		}
		if _, err := s.between(c, 0, 0, -1); lost > err || math.IsNaN(err) {
			t.Errorf("%d entries: %.3g is lost, between says %.3g", count, lost, err)
		}
	}
}
