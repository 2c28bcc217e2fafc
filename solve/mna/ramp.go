package mna

import (
	"math"

	"biaswright/netlist"
)

// DetSign is the sign of the Jacobian's determinant at x, over the sign that it
// has with every junction a positive conductance, which is +1: -1 marks a point
// that cannot be stable (M. M. Green and A. N. Willson, IEEE Trans. Circuits Syst.
// I 39, 1992). It is 0 where the Jacobian is singular.
func (s *System) DetSign(x []float64) int {
	s.currents(x)
	if !s.factor() {
		return 0
	}
	return s.active.DetSign()
}

// Residual is the largest balance at x in A, and its row; row is -1 without
// unknowns. Balanced then judges the same evaluation.
func (s *System) Residual(x []float64) (amps float64, row int) {
	s.currents(x)
	row = -1
	for i, f := range s.f[:s.n] {
		if a := math.Abs(f); a > amps || row < 0 {
			amps, row = a, i
		}
	}
	return amps, row
}

// Worst is the row whose balance at x exceeds its tolerance most, and its
// imbalance in A; row is -1 without unknowns.
func (s *System) Worst(x []float64) (amps float64, row int) {
	s.currents(x)
	s.tolerances()
	row, most := -1, -1.0
	for i, f := range s.f[:s.n] {
		if over := math.Abs(f) / s.tol[i]; over > most {
			most, row, amps = over, i, math.Abs(f)
		}
	}
	return amps, row
}

// Place sets the unknown of x that node hangs on so that the node comes to v
// volts; a known node is left alone.
func (s *System) Place(x []float64, node netlist.NodeID, v float64) {
	if r := int(s.row[node]); r < s.n {
		x[r] = v - s.offset[node]
	}
}

// LastSign is the sign of the determinant of the Jacobian that the last Step used,
// which near a solution is the solution's.
func (s *System) LastSign() int { return s.active.DetSign() }
