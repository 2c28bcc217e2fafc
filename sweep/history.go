package sweep

import "math"

var nan = math.NaN()

// A history is the last points of a branch, from which the next is predicted by
// the polynomial through them.
type history struct {
	at [depth]float64
	x  [depth][]float64
	n  int
}

// depth points make a cubic; higher orders swing.
const depth = 4

func (h *history) clear() { h.n = 0 }

// add takes a copy of a point.
func (h *history) add(at float64, x []float64) {
	if h.n == depth {
		first := h.x[0]
		copy(h.at[:], h.at[1:])
		copy(h.x[:], h.x[1:])
		h.x[depth-1] = first
		h.n--
	}
	if len(h.x[h.n]) != len(x) {
		h.x[h.n] = make([]float64, len(x))
	}
	h.at[h.n] = at
	copy(h.x[h.n], x)
	h.n++
}

// predict writes the polynomial's value at a new place to x. It reports false
// without a point to start from. Points that lie on one another are left out.
func (h *history) predict(at float64, x []float64) bool {
	if h.n == 0 {
		return false
	}
	clear(x)
	// A jump much longer than the steps behind it is better left to fewer points.
	use := h.n
	if use > 1 && math.Abs(at-h.at[h.n-1]) > 3*math.Abs(h.at[h.n-1]-h.at[h.n-2]) {
		use = 1
	}
	first := h.n - use
	for i := first; i < h.n; i++ {
		weight := 1.0
		for j := first; j < h.n; j++ {
			if j != i {
				weight *= (at - h.at[j]) / (h.at[i] - h.at[j])
			}
		}
		if weight-weight != 0 { // two points at one place
			copy(x, h.x[h.n-1])
			return true
		}
		for k, v := range h.x[i] {
			x[k] += weight * v
		}
	}
	return true
}
