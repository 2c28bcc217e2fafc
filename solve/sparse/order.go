package sparse

import (
	"math"
	"slices"
)

// transversal pairs every column with a row that has an entry there and returns
// the row of each column. Entries of the diagonal are kept where they exist;
// the rest is found by shortest augmenting paths (a breadth-first search), so
// that few rows move: an ideal source in a circuit trades its row with the
// balance of one of its own two nodes.
//
// Literature: I. S. Duff, On algorithms for obtaining a maximum transversal,
// ACM Trans. Math. Softw. 7 (1981) 315-330.
func transversal(rows [][]int32) ([]int32, error) {
	n := len(rows)
	rowOfCol := make([]int32, n)
	for j := range rowOfCol {
		rowOfCol[j] = -1
		if _, found := slices.BinarySearch(rows[j], int32(j)); found {
			rowOfCol[j] = int32(j)
		}
	}
	from := make([]int32, n)    // the row from which a column was reached
	visited := make([]int32, n) // visited[col] == root+1: reached in this search
	paired := make([]int32, n)  // the column of a row, -1 for none
	copy(paired, rowOfCol)
	var queue []int32
	for root := range n {
		if paired[root] >= 0 {
			continue
		}
		free := int32(-1)
		queue = append(queue[:0], int32(root))
	search:
		for head := 0; head < len(queue); head++ {
			row := queue[head]
			for _, col := range rows[row] {
				if visited[col] == int32(root+1) {
					continue
				}
				visited[col] = int32(root + 1)
				from[col] = row
				if rowOfCol[col] < 0 {
					free = col
					break search
				}
				queue = append(queue, rowOfCol[col])
			}
		}
		if free < 0 {
			return nil, &SingularError{Row: root, Col: slices.Index(rowOfCol, -1)}
		}
		for col := free; ; {
			row := from[col]
			previous := paired[row]
			paired[row], rowOfCol[col] = col, row
			if row == int32(root) {
				break
			}
			col = previous
		}
	}
	return rowOfCol, nil
}

// minimumDegree returns an elimination order of small fill for a symmetric
// pattern, given as neighbours without the diagonal.
//
// Eliminated variables live on as elements, the cliques they leave, so that the
// graph never grows (the quotient graph); an element covered by a later one is
// absorbed. Degrees are the upper bounds of Amestoy, Davis and Duff (An
// approximate minimum degree ordering algorithm, SIAM J. Matrix Anal. Appl. 17
// (1996) 886-905). Among equals the one that has waited longest goes first,
// which makes independent eliminations alternate. Variables with very many
// neighbours are set aside and go last.
func minimumDegree(adj [][]int32) []int32 {
	n := len(adj)
	// The bound 10 sqrt(n) is the one customary for approximate minimum degree;
	// below 16 neighbours setting aside saves nothing.
	hub := max(16, int(10*math.Sqrt(float64(n))))
	g := &quotient{
		vars: make([][]int32, n), elems: make([][]int32, n), members: make([][]int32, n),
		absorbed: make([]bool, n), mark: make([]int32, n),
		outside: make([]int32, n), stamp: make([]int32, n),
		queue: newBuckets(n),
	}
	order := make([]int32, 0, n)
	var hubs []int32
	for v := range adj {
		if len(adj[v]) > hub {
			hubs = append(hubs, int32(v))
		}
	}
	for v := range adj {
		if len(adj[v]) > hub {
			continue
		}
		for _, u := range adj[v] {
			if len(adj[u]) <= hub {
				g.vars[v] = append(g.vars[v], u)
			}
		}
		g.queue.put(int32(v), int32(len(g.vars[v])))
	}
	for left := n - len(hubs); left > 0; left-- {
		order = append(order, g.eliminate(int32(left), int32(len(order)+1)))
	}
	slices.SortStableFunc(hubs, func(a, b int32) int { return len(adj[a]) - len(adj[b]) })
	return append(order, hubs...)
}

// A quotient is the graph that is left while variables are eliminated.
type quotient struct {
	vars     [][]int32 // neighbours of a variable by an edge of their own
	elems    [][]int32 // elements a variable belongs to
	members  [][]int32 // variables of an element
	absorbed []bool
	mark     []int32 // mark[v] == round: v is a member of this round's element
	outside  []int32 // members of an element that are not in this round's
	stamp    []int32 // stamp[e] == round: outside[e] is valid
	queue    *buckets
}

// eliminate takes the variable of least degree of the left ones, and round is a
// positive number not used before.
func (g *quotient) eliminate(left, round int32) int32 {
	p := g.queue.take()
	g.mark[p] = round
	var clique []int32
	join := func(u int32) {
		if g.mark[u] != round {
			g.mark[u] = round
			clique = append(clique, u)
		}
	}
	for _, u := range g.vars[p] {
		join(u)
	}
	for _, e := range g.elems[p] {
		if g.absorbed[e] {
			continue
		}
		for _, u := range g.members[e] {
			join(u)
		}
		g.absorbed[e], g.members[e] = true, nil
	}
	g.members[p], g.vars[p], g.elems[p] = clique, nil, nil

	for _, v := range clique {
		for _, e := range g.elems[v] {
			if g.stamp[e] != round {
				g.stamp[e], g.outside[e] = round, int32(len(g.members[e]))
			}
			g.outside[e]--
		}
	}
	others := int32(len(clique)) - 1
	for _, v := range clique {
		degree := others
		elems := g.elems[v][:0]
		for _, e := range g.elems[v] {
			if g.absorbed[e] {
				continue
			}
			if g.outside[e] == 0 {
				g.absorbed[e], g.members[e] = true, nil
				continue
			}
			degree += g.outside[e]
			elems = append(elems, e)
		}
		g.elems[v] = append(elems, p)
		g.vars[v] = slices.DeleteFunc(g.vars[v], func(u int32) bool { return g.mark[u] == round })
		degree = min(degree+int32(len(g.vars[v])), g.queue.key[v]+others, left-2)
		g.queue.remove(v)
		g.queue.put(v, max(degree, 0))
	}
	return p
}

// buckets is a priority queue of the numbers 0 … n-1 with keys 0 … n-1, first
// in, first out among equal keys. Each bucket is a ring through its own anchor,
// which stands at n + key.
type buckets struct {
	next, prev []int32
	key        []int32
	least      int32 // no bucket below it has a member
}

func newBuckets(n int) *buckets {
	b := &buckets{next: make([]int32, 2*n), prev: make([]int32, 2*n), key: make([]int32, n)}
	for i := range b.next {
		b.next[i], b.prev[i] = int32(i), int32(i)
	}
	return b
}

func (b *buckets) put(v, key int32) {
	anchor := int32(len(b.key)) + key
	last := b.prev[anchor]
	b.next[last], b.prev[v] = v, last
	b.next[v], b.prev[anchor] = anchor, v
	b.key[v] = key
	b.least = min(b.least, key)
}

func (b *buckets) remove(v int32) {
	b.next[b.prev[v]], b.prev[b.next[v]] = b.next[v], b.prev[v]
}

// take removes the first member of the lowest bucket; there must be one.
func (b *buckets) take() int32 {
	n := int32(len(b.key))
	for b.next[n+b.least] == n+b.least {
		b.least++
	}
	v := b.next[n+b.least]
	b.remove(v)
	return v
}
