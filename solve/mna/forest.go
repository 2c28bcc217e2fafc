package mna

import "biaswright/netlist"

// A forest holds the ideal branches: rails, cells, drops and links. Its trees are
// groups of nodes at fixed distances from each other.
type forest struct {
	// branches in an order in which every branch's parent node comes before
	// its child.
	branches []branch
	// byRail and byElement find the branch of a rail, and the first branch of
	// an element's row (members follow by member index), or -1.
	byRail    []int32
	byElement [][]int32
}

// A branch leads from a parent node towards a child; the child's voltage is the
// parent's plus rise times the slot's value.
type branch struct {
	parent, child int32
	slot          netlist.SlotID // None for a link
	rise          float64        // +1 or -1
	// forward tells that the element's arrow (or gnd to a rail's node) leads
	// from parent to child.
	forward bool
}

type ideal struct {
	from, to int32
	slot     netlist.SlotID
	rise     float64 // along from -> to
	rail     int
	element  int
	member   int
}

// grow orders the ideal branches into trees, gnd's first. It returns the forest
// and each node's root (the node that its group's unknown stands for; gnd's
// group is known).
func grow(nodes int, ideals []ideal, rails, elements int) (forest, []int32) {
	f := forest{byRail: make([]int32, rails), byElement: make([][]int32, elements)}
	near := make([][]int32, nodes)
	for i, b := range ideals {
		near[b.from] = append(near[b.from], int32(i))
		near[b.to] = append(near[b.to], int32(i))
	}
	root := make([]int32, nodes)
	for i := range root {
		root[i] = -1
	}
	var queue []int32
	for start := range root { // gnd is node 0 and so comes first
		if root[start] >= 0 {
			continue
		}
		root[start] = int32(start)
		queue = append(queue[:0], int32(start))
		for len(queue) > 0 {
			node := queue[0]
			queue = queue[1:]
			for _, i := range near[node] {
				b := ideals[i]
				next, forward := b.to, true
				if next == node {
					next, forward = b.from, false
				}
				if root[next] >= 0 {
					continue
				}
				root[next] = int32(start)
				queue = append(queue, next)
				f.add(b, node, next, forward)
			}
		}
	}
	return f, root
}

func (f *forest) add(b ideal, parent, child int32, forward bool) {
	rise := b.rise
	if !forward {
		rise = -rise
	}
	at := int32(len(f.branches))
	f.branches = append(f.branches, branch{parent, child, b.slot, rise, forward})
	if b.rail >= 0 {
		f.byRail[b.rail] = at
		return
	}
	members := f.byElement[b.element]
	for len(members) <= b.member {
		members = append(members, -1)
	}
	members[b.member] = at
	f.byElement[b.element] = members
}

// setOffsets computes each node's distance from its group's unknown.
func (s *System) setOffsets() {
	for _, b := range s.forest.branches {
		rise := 0.0
		if b.slot != netlist.None {
			rise = b.rise * s.values[b.slot]
		}
		s.full[b.child] = s.full[b.parent] + rise
	}
	for i, v := range s.full {
		s.offset[i] = v * s.ramp.Source
	}
}

// behind adds up, for every node, what leaves it and all nodes behind it in its
// tree: sum[node] on entry is the current that leaves the node into devices.
// Afterwards the current through a branch, from parent to child, is sum[child].
func (f *forest) behind(sum []float64) {
	for i := len(f.branches) - 1; i >= 0; i-- {
		b := &f.branches[i]
		sum[b.parent] += sum[b.child]
	}
}

// spread is the transpose of behind: weights on branch currents (by child node)
// become weights on the currents that leave single nodes.
func (f *forest) spread(weight []float64) {
	for i := range f.branches {
		b := &f.branches[i]
		weight[b.child] += weight[b.parent]
	}
}
