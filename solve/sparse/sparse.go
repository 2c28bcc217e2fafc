// Package sparse solves many linear systems A x = b of one sparsity pattern.
//
// [Analyse] looks at the pattern once: which row answers for which unknown, in
// which order to eliminate, where fill appears. The [Plan] it returns holds a
// flat elimination program. [Factors] runs that program over new numbers, as
// often as wanted, without allocating and without moving rows: on a system of
// seven unknowns a factorisation costs some tens of nanoseconds.
//
// A fixed order of pivots is not always good enough. Factors.Factor says so by
// returning false, and [Pivoting], which scales the system and then chooses its
// pivots by size, takes over for that one matrix.
//
// Neither type is safe for use by several goroutines at once; a Plan is, and
// each goroutine makes its own Factors from it.
package sparse

import (
	"errors"
	"fmt"
	"slices"
)

// An Entry is a place of the matrix that may be nonzero.
type Entry struct{ Row, Col int }

// A SingularError says that no choice of values makes the pattern invertible.
// Row is an equation and Col an unknown that are left over when equations and
// unknowns are paired; both count from 0.
type SingularError struct{ Row, Col int }

func (e *SingularError) Error() string {
	return fmt.Sprintf("structurally singular: no pivot for row %d, column %d", e.Row, e.Col)
}

// A Plan is the analysed pattern. It is not modified after Analyse.
type Plan struct {
	n int
	// Pivot k stands in row rowOf[k] and column colOf[k]; pivotOfRow and
	// pivotOfCol are the inverses.
	rowOf, colOf           []int32
	pivotOfRow, pivotOfCol []int32
	// The later pivots that pivot k reaches are later[start[k]:start[k+1]],
	// ascending. Values of pivot k stand together from base(k) = k + 2 start[k]:
	// its diagonal, its row of U, its column of L.
	start, later []int32
	steps        []step
	ops          []op
	parity       int // of the row and the column permutation together
	updates      int // multiply-subtract operations of one factorisation
}

// A step eliminates one pivot.
type step struct {
	diag, reach int32 // its place among the values; the number of later pivots it reaches
	ops, opsEnd int32 // its updates in Plan.ops; none if reach is above wideReach
	first       int32 // the target of the first update
}

// An op is a[target] -= a[lower] * a[upper].
type op struct{ target, lower, upper int32 }

// wideReach is the largest reach whose reach² updates are spelled out. Beyond
// it, memory would grow with the cube of a dense block, and looking the targets
// up while running costs little against the arithmetic.
const wideReach = 16

// maxValues keeps every position within an int32 with room for sums of two.
const maxValues = 1 << 30

// Analyse plans the elimination of an n by n matrix whose nonzeros are among
// entries; duplicates are merged. Every unknown is paired with an equation in
// which it appears (with its own, where the diagonal is present), and the pairs
// are eliminated in an order of small degree. The error is a *SingularError if
// no pairing exists.
func Analyse(n int, entries []Entry) (*Plan, error) {
	if n < 0 {
		return nil, fmt.Errorf("order %d is negative", n)
	}
	rows := make([][]int32, n)
	for _, e := range entries {
		if e.Row < 0 || e.Row >= n || e.Col < 0 || e.Col >= n {
			return nil, fmt.Errorf("entry (%d, %d) outside a matrix of order %d", e.Row, e.Col, n)
		}
		rows[e.Row] = append(rows[e.Row], int32(e.Col))
	}
	for i := range rows {
		slices.Sort(rows[i])
		rows[i] = slices.Compact(rows[i])
	}
	rowOfCol, err := transversal(rows)
	if err != nil {
		return nil, err
	}
	adj := symmetrised(rows, rowOfCol)
	p := &Plan{n: n, colOf: minimumDegree(adj)}
	p.rowOf = make([]int32, n)
	p.pivotOfRow, p.pivotOfCol = make([]int32, n), make([]int32, n)
	for k, col := range p.colOf {
		row := rowOfCol[col]
		p.rowOf[k] = row
		p.pivotOfCol[col], p.pivotOfRow[row] = int32(k), int32(k)
	}
	p.parity = parity(p.rowOf, make([]int32, n)) * parity(p.colOf, make([]int32, n))
	if err := p.fill(adj); err != nil {
		return nil, err
	}
	p.program()
	return p, nil
}

// symmetrised returns the pattern, without diagonal, of B + Bᵀ, where B has its
// rows permuted so that row j is the one paired with column j.
func symmetrised(rows [][]int32, rowOfCol []int32) [][]int32 {
	adj := make([][]int32, len(rows))
	for j, row := range rowOfCol {
		for _, c := range rows[row] {
			if int(c) != j {
				adj[j] = append(adj[j], c)
				adj[c] = append(adj[c], int32(j))
			}
		}
	}
	for j := range adj {
		slices.Sort(adj[j])
		adj[j] = slices.Compact(adj[j])
	}
	return adj
}

// fill finds the later pivots that each pivot reaches: its own neighbours, and
// what the pivots before it hand on. Pivot k hands its reach to the first pivot
// of it, its parent in the elimination tree.
func (p *Plan) fill(adj [][]int32) error {
	n := p.n
	p.start = make([]int32, n+1)
	children := make([][]int32, n)
	seen := make([]int32, n) // seen[j] == k+1: j is in k's reach already
	for k := range n {
		begin := len(p.later)
		add := func(j int32) {
			if j > int32(k) && seen[j] != int32(k+1) {
				seen[j] = int32(k + 1)
				p.later = append(p.later, j)
			}
		}
		for _, v := range adj[p.colOf[k]] {
			add(p.pivotOfCol[v])
		}
		for _, c := range children[k] {
			for _, j := range p.later[p.start[c]:p.start[c+1]] {
				add(j)
			}
		}
		if n+2*len(p.later) > maxValues {
			return errors.New("too much fill to hold")
		}
		reach := p.later[begin:]
		slices.Sort(reach)
		p.start[k+1] = int32(len(p.later))
		if len(reach) > 0 {
			children[reach[0]] = append(children[reach[0]], int32(k))
		}
	}
	return nil
}

// program writes the elimination down as flat lists of positions.
func (p *Plan) program() {
	p.steps = make([]step, p.n)
	for k := range p.steps {
		later := p.reach(k)
		m := int32(len(later))
		s := &p.steps[k]
		s.diag, s.reach, s.ops = p.base(k), m, int32(len(p.ops))
		p.updates += len(later) * len(later)
		if m <= wideReach {
			for i, row := range later {
				for j, col := range later {
					p.ops = append(p.ops, op{
						target: p.at(row, col),
						lower:  s.diag + 1 + m + int32(i),
						upper:  s.diag + 1 + int32(j),
					})
				}
			}
		}
		if s.opsEnd = int32(len(p.ops)); s.opsEnd > s.ops {
			s.first = p.ops[s.ops].target
		}
	}
}

func (p *Plan) reach(k int) []int32 { return p.later[p.start[k]:p.start[k+1]] }

// base is the position of the diagonal of pivot k.
func (p *Plan) base(k int) int32 { return int32(k) + 2*p.start[k] }

// at is the position of row and column given as pivots, -1 outside the fill.
func (p *Plan) at(row, col int32) int32 {
	if row == col {
		return p.base(int(row))
	}
	k, other := int(min(row, col)), max(row, col)
	later := p.reach(k)
	i, found := slices.BinarySearch(later, other)
	if !found {
		return -1
	}
	pos := p.base(k) + 1 + int32(i)
	if row > col {
		pos += int32(len(later))
	}
	return pos
}

// Order is the number of unknowns.
func (p *Plan) Order() int { return p.n }

// NNZ is the length of a slice of values: the entries of the pattern and its
// fill. Values that belong to fill must be 0 when a matrix is factorised.
func (p *Plan) NNZ() int { return p.n + 2*len(p.later) }

// Updates is the number of multiply-subtract operations of one factorisation.
func (p *Plan) Updates() int { return p.updates }

// Index is the position of the entry (row, col) in a slice of values, -1 if it
// is neither in the pattern nor fill. It is meant for set-up: keep the result.
func (p *Plan) Index(row, col int) int {
	return int(p.at(p.pivotOfRow[row], p.pivotOfCol[col]))
}

// parity is +1 for an even permutation, -1 for an odd one. seen is scratch, all
// zeros.
func parity(perm, seen []int32) int {
	sign := 1
	for i := range perm {
		for j := perm[i]; int(j) != i && seen[i] == 0; j = perm[j] {
			seen[j] = 1
			sign = -sign
		}
		seen[i] = 1
	}
	return sign
}
