package sparse

import "math"

// diagonalShare: the planned pivot is kept unless it is smaller than this share
// of the largest candidate of its column. A tenth is the customary compromise
// between fill and growth (threshold pivoting).
const diagonalShare = 0.1

// leftLooking is a sparse LU with threshold partial pivoting. Columns are taken
// in the plan's order; the entries that each column acquires are found by a
// depth-first search through the columns of L before any arithmetic, so that
// the work is proportional to the arithmetic.
//
// Rows and columns are numbered by the plan's pivots while factorising; then the
// rows of L are renumbered by the pivots chosen.
//
// Literature: J. R. Gilbert and T. Peierls, Sparse partial pivoting in time
// proportional to arithmetic operations, SIAM J. Sci. Stat. Comput. 9 (1988)
// 862-874.
type leftLooking struct {
	plan     *Plan
	colStart []int32 // entries of column k are colStart[k]:colStart[k+1] of …
	colRow   []int32 // … their rows
	colPos   []int32 // … and their places among the values
	lower    columns // unit diagonal left out
	upper    columns // diagonal left out
	pivot    []float64
	chosen   []int32 // chosen[row] is the pivot for which the row was taken, -1 before
	x        []float64
	seen     []int32 // seen[row] == k+1: the row is in column k's pattern
	pattern  []int32 // rows of the current column, in topological order from the back
	stack    []int32 // rows on the path of the search
	resume   []int32 // where in its column of L each of them goes on
	parity   int
}

// columns is a matrix by columns.
type columns struct {
	start, row []int32
	value      []float64
}

func (c *columns) reset() { c.start, c.row, c.value = append(c.start[:0], 0), c.row[:0], c.value[:0] }

func (c *columns) add(row int32, v float64) { c.row, c.value = append(c.row, row), append(c.value, v) }

func (c *columns) end() { c.start = append(c.start, int32(len(c.row))) }

func (c *columns) column(k int) ([]int32, []float64) {
	return c.row[c.start[k]:c.start[k+1]], c.value[c.start[k]:c.start[k+1]]
}

func newLeftLooking(s *Pivoting) *leftLooking {
	p := s.plan
	f := &leftLooking{
		plan:     p,
		colStart: make([]int32, p.n+1), colRow: make([]int32, p.NNZ()), colPos: make([]int32, p.NNZ()),
		pivot: make([]float64, p.n), chosen: make([]int32, p.n),
		x: make([]float64, p.n), seen: make([]int32, p.n),
	}
	for _, c := range s.colOf {
		f.colStart[p.pivotOfCol[c]+1]++
	}
	for k := range p.n {
		f.colStart[k+1] += f.colStart[k]
	}
	next := append([]int32(nil), f.colStart...)
	for pos, c := range s.colOf {
		k := p.pivotOfCol[c]
		f.colRow[next[k]], f.colPos[next[k]] = p.pivotOfRow[s.rowOf[pos]], int32(pos)
		next[k]++
	}
	return f
}

func (f *leftLooking) factor(s *Pivoting) bool {
	f.lower.reset()
	f.upper.reset()
	clear(f.seen)
	clear(f.x) // an earlier failure may have left some
	for i := range f.chosen {
		f.chosen[i] = -1
	}
	for k := range f.plan.n {
		f.reach(k, s.scaled)
		f.eliminate()
		row, ok := f.choose(int32(k))
		if !ok {
			return false
		}
		f.pivot[k] = f.x[row]
		for _, i := range f.pattern {
			switch v := f.x[i]; {
			case i == row:
			case f.chosen[i] >= 0:
				f.upper.add(f.chosen[i], v)
			case v != 0:
				f.lower.add(i, v/f.pivot[k])
			}
			f.x[i] = 0
		}
		f.chosen[row] = int32(k)
		f.lower.end()
		f.upper.end()
	}
	for i, row := range f.lower.row {
		f.lower.row[i] = f.chosen[row]
	}
	clear(f.seen)
	f.parity = f.plan.parity * parity(f.chosen, f.seen)
	return true
}

// reach spreads column k of the matrix into x and lists the rows that its
// elimination touches, each row after all those it depends on when read from
// the back.
func (f *leftLooking) reach(k int, values []float64) {
	f.pattern = f.pattern[:0]
	for e := f.colStart[k]; e < f.colStart[k+1]; e++ {
		v := values[f.colPos[e]]
		if v == 0 {
			continue
		}
		f.x[f.colRow[e]] = v
		f.search(f.colRow[e], int32(k+1))
	}
}

func (f *leftLooking) search(root, round int32) {
	if f.seen[root] == round {
		return
	}
	f.seen[root] = round
	f.stack, f.resume = append(f.stack[:0], root), append(f.resume[:0], 0)
	for len(f.stack) > 0 {
		top := len(f.stack) - 1
		row := f.stack[top]
		descended := false
		if j := f.chosen[row]; j >= 0 {
			rows, _ := f.lower.column(int(j))
			for int(f.resume[top]) < len(rows) && !descended {
				next := rows[f.resume[top]]
				f.resume[top]++
				if f.seen[next] != round {
					f.seen[next] = round
					f.stack, f.resume = append(f.stack, next), append(f.resume, 0)
					descended = true
				}
			}
		}
		if !descended {
			f.pattern = append(f.pattern, row)
			f.stack, f.resume = f.stack[:top], f.resume[:top]
		}
	}
}

// eliminate solves with the columns of L that exist.
func (f *leftLooking) eliminate() {
	for i := len(f.pattern) - 1; i >= 0; i-- {
		row := f.pattern[i]
		j := f.chosen[row]
		if j < 0 {
			continue
		}
		x := f.x[row]
		rows, values := f.lower.column(int(j))
		for q, r := range rows {
			f.x[r] -= values[q] * x
		}
	}
}

// choose picks the row of pivot k: the planned one if it is large enough,
// otherwise the largest.
func (f *leftLooking) choose(k int32) (row int32, ok bool) {
	most := 0.0
	for _, i := range f.pattern {
		if f.chosen[i] >= 0 {
			continue
		}
		v := math.Abs(f.x[i])
		if !(v <= math.MaxFloat64) {
			return 0, false
		}
		if v > most {
			most, row = v, i
		}
	}
	if f.chosen[k] < 0 && f.seen[k] == k+1 && math.Abs(f.x[k]) >= diagonalShare*most {
		row = k
	}
	return row, most > 0
}

func (f *leftLooking) solve(x []float64, transposed bool) {
	if transposed {
		f.solveTransposed(x)
		return
	}
	p, w := f.plan, f.x
	for i, row := range p.rowOf {
		w[f.chosen[i]] = x[row]
	}
	for k := range w {
		rows, values := f.lower.column(k)
		for q, i := range rows {
			w[i] -= values[q] * w[k]
		}
	}
	for k := len(w) - 1; k >= 0; k-- {
		w[k] /= f.pivot[k]
		rows, values := f.upper.column(k)
		for q, i := range rows {
			w[i] -= values[q] * w[k]
		}
	}
	for k, col := range p.colOf {
		x[col] = w[k]
	}
	clear(w) // factor expects zeros
}

func (f *leftLooking) solveTransposed(x []float64) {
	p, w := f.plan, f.x
	for k, col := range p.colOf {
		w[k] = x[col]
	}
	for k := range w {
		rows, values := f.upper.column(k)
		for q, i := range rows {
			w[k] -= values[q] * w[i]
		}
		w[k] /= f.pivot[k]
	}
	for k := len(w) - 1; k >= 0; k-- {
		rows, values := f.lower.column(k)
		for q, i := range rows {
			w[k] -= values[q] * w[i]
		}
	}
	for i, row := range p.rowOf {
		x[row] = w[f.chosen[i]]
	}
	clear(w)
}

func (f *leftLooking) det() (sign int, log float64) {
	sign = f.parity
	for _, pivot := range f.pivot {
		if pivot < 0 {
			sign = -sign
		}
		log += math.Log(math.Abs(pivot))
	}
	return sign, log
}
