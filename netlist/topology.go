package netlist

import (
	"fmt"
	"strings"

	"biaswright/netlist/diag"
)

// mostFindings bounds what is said of one kind of fault, and namesShown the names
// in one message: nobody reads more before mending the first ones.
const (
	mostFindings = 20
	namesShown   = 6
)

// connections counts, for each node, the ends of elements at it. An element with
// all its ends at one node does not count, for it connects nothing.
func (c *Circuit) connections() []int {
	count := make([]int, len(c.Nodes))
	for i := range c.Elements {
		e := &c.Elements[i]
		if c.idle(e) {
			continue
		}
		count[e.From]++
		count[e.To]++
		if e.Base != None {
			count[e.Base]++
		}
		for _, inner := range e.Chain[1:e.Row] {
			count[inner] += 2
		}
	}
	return count
}

// idle tells that all ends of an element are at one node.
func (c *Circuit) idle(e *Element) bool {
	return e.From == e.To && (e.Base == None || e.Base == e.From)
}

// topology says what no numbers can mend: nodes that lead nowhere, parts of the
// circuit without ground, loops of ideal voltages, cut sets of ideal currents.
func (c *Circuit) topology() diag.List {
	var l diag.List
	l = c.idleElements(l)
	l = c.deadEnds(l)
	all := c.joined(func(*Element) bool { return true })
	l = c.islands(l, all)
	l = c.voltageLoops(l)
	return c.currentCuts(l, all)
}

func (c *Circuit) idleElements(l diag.List) diag.List {
	for i := range c.Elements {
		e := &c.Elements[i]
		if !c.idle(e) || c.idealVoltage(e) && e.Kind != Link { // a loop of its own, told of there
			continue
		}
		l = append(l, diag.Diagnostic{
			Severity: diag.Warning, Code: "idle", Span: e.Span,
			Message: fmt.Sprintf("%s does nothing: all its ends are at %s", e.Name, c.Nodes[e.From].Name),
		})
	}
	return l
}

// deadEnds finds nodes with one connection, through which no current can flow.
func (c *Circuit) deadEnds(l diag.List) diag.List {
	count := c.connections()
	lone := map[NodeID]string{} // the element at it
	for i := range c.Elements {
		e := &c.Elements[i]
		for _, n := range []NodeID{e.From, e.To, e.Base} {
			if n > Gnd && count[n] == 1 && !c.idle(e) {
				lone[n] = e.Name
			}
		}
	}
	found := 0
	for id := range c.Nodes {
		n := &c.Nodes[id]
		at, ok := lone[NodeID(id)]
		if !ok || n.Rail != None || found == mostFindings {
			continue
		}
		found++
		l = append(l, diag.Diagnostic{
			Code: "dead-end", Span: n.Span, Hint: c.likeNode(NodeID(id)),
			Message: fmt.Sprintf("%s has one connection, to %s: no current can flow through it", n.Name, at),
		})
	}
	return l
}

// likeNode proposes the node whose name is nearest, for a dead end is often a slip
// of the keyboard.
func (c *Circuit) likeNode(id NodeID) string {
	var others []string
	for i := range c.Nodes {
		if NodeID(i) != id && !c.Nodes[i].Made {
			others = append(others, c.Nodes[i].Name)
		}
	}
	return didYouMean(c.Nodes[id].Name, others)
}

// A union holds sets of nodes, each known by one of its members.
type union []int32

func newUnion(n int) union {
	u := make(union, n)
	for i := range u {
		u[i] = int32(i)
	}
	return u
}

func (u union) find(n NodeID) int32 {
	at := int32(n)
	for u[at] != at {
		u[at] = u[u[at]] // halve the way, which keeps it short
		at = u[at]
	}
	return at
}

// join unites two sets and tells whether they were two.
func (u union) join(a, b NodeID) bool {
	x, y := u.find(a), u.find(b)
	if x == y {
		return false
	}
	u[max(x, y)] = min(x, y) // gnd, then the earlier node, stays the one it is known by
	return true
}

// joined unites the nodes that rails and the elements asked for connect.
func (c *Circuit) joined(by func(*Element) bool) union {
	u := newUnion(len(c.Nodes))
	for i := range c.Rails {
		u.join(Gnd, c.Rails[i].Node)
	}
	for i := range c.Elements {
		e := &c.Elements[i]
		if !by(e) {
			continue
		}
		for m := 1; m < len(e.Chain); m++ {
			u.join(e.Chain[m-1], e.Chain[m])
		}
		if e.Base != None {
			u.join(e.From, e.Base)
		}
	}
	return u
}

// islands finds parts of the circuit from which nothing leads to ground.
func (c *Circuit) islands(l diag.List, all union) diag.List {
	for _, group := range c.groups(all) {
		l = append(l, diag.Diagnostic{
			Code: "no-ground", Span: c.Nodes[group[0]].Span,
			Hint:    "connect one of its nodes to gnd or to a rail",
			Message: fmt.Sprintf("nothing leads from %s to ground", c.nodeNames(group)),
		})
	}
	return l
}

// groups lists the sets of a union that gnd is not in, in node order, as many as
// are told of.
func (c *Circuit) groups(u union) [][]NodeID {
	at := map[int32]int{}
	var out [][]NodeID
	for id := range c.Nodes {
		root := u.find(NodeID(id))
		if root == int32(Gnd) {
			continue
		}
		i, ok := at[root]
		if !ok {
			i = len(out)
			at[root] = i
			out = append(out, nil)
		}
		out[i] = append(out[i], NodeID(id))
	}
	return out[:min(len(out), mostFindings)]
}

func (c *Circuit) nodeNames(ids []NodeID) string {
	names := make([]string, len(ids))
	for i, id := range ids {
		names[i] = c.Nodes[id].Name
	}
	return list(names, "and")
}

// list writes names as a sentence has them, the first few of many.
func list(names []string, last string) string {
	if len(names) > namesShown {
		return fmt.Sprintf("%s and %d more", strings.Join(names[:namesShown-1], ", "), len(names)-namesShown+1)
	}
	if len(names) < 2 {
		return strings.Join(names, "")
	}
	return strings.Join(names[:len(names)-1], ", ") + " " + last + " " + names[len(names)-1]
}

// idealVoltage tells an element that fixes the voltage between its ends.
func (c *Circuit) idealVoltage(e *Element) bool {
	return e.Kind == Drop || e.Kind == Cell || e.Kind == Link
}

// A tie is an ideal voltage between two nodes.
type tie struct {
	a, b NodeID
	name string
	span diag.Span
}

func (c *Circuit) ties() []tie {
	var ties []tie
	for i := range c.Rails {
		r := &c.Rails[i]
		ties = append(ties, tie{Gnd, r.Node, "rail " + r.Name, r.Span})
	}
	for i := range c.Elements {
		e := &c.Elements[i]
		if c.idealVoltage(e) && (e.Kind != Link || !c.idle(e)) {
			ties = append(ties, tie{e.From, e.To, e.Name, e.Span})
		}
	}
	return ties
}

// voltageLoops finds loops of ideal voltages, in which no equation says what
// current flows. Every tie that closes a loop is told of with its members: the
// way between its ends in the forest of the ties before it.
func (c *Circuit) voltageLoops(l diag.List) diag.List {
	ties := c.ties()
	u := newUnion(len(c.Nodes))
	var closing []tie
	near := map[NodeID][]int{} // ties of the forest, by node
	for i, t := range ties {
		if !u.join(t.a, t.b) {
			closing = append(closing, t)
			continue
		}
		near[t.a] = append(near[t.a], i)
		near[t.b] = append(near[t.b], i)
	}
	for _, t := range closing[:min(len(closing), mostFindings)] {
		names := append(forestWay(ties, near, t.a, t.b), t.name)
		message := fmt.Sprintf("%s make a loop of ideal voltages, in which any current could flow", list(names, "and"))
		if len(names) == 1 {
			message = fmt.Sprintf("%s has both ends at %s, so any current could flow through it", t.name, c.Nodes[t.a].Name)
		}
		l = append(l, diag.Diagnostic{Code: "voltage-loop", Span: t.span, Hint: "put a resistance into the loop", Message: message})
	}
	return l
}

// forestWay names the ties on the way from a to b.
func forestWay(ties []tie, near map[NodeID][]int, a, b NodeID) []string {
	came := map[NodeID]int{a: -1} // the tie by which each node was reached
	queue := []NodeID{a}
	for len(queue) > 0 {
		n := queue[0]
		queue = queue[1:]
		if n == b {
			break
		}
		for _, i := range near[n] {
			next := ties[i].a + ties[i].b - n
			if _, seen := came[next]; !seen {
				came[next] = i
				queue = append(queue, next)
			}
		}
	}
	var names []string
	for n := b; n != a; {
		t := ties[came[n]]
		names = append(names, t.name)
		n = t.a + t.b - n
	}
	for i, j := 0, len(names)-1; i < j; i, j = i+1, j-1 {
		names[i], names[j] = names[j], names[i]
	}
	return names
}

// currentCuts finds parts of the circuit that ideal currents alone reach. Their
// balance fixes no voltage, and need not even add up.
func (c *Circuit) currentCuts(l diag.List, all union) diag.List {
	u := c.joined(func(e *Element) bool { return e.Kind != CurrentSource })
	for _, group := range c.groups(u) {
		if all.find(group[0]) != int32(Gnd) {
			continue // an island, told of already
		}
		inside := u.find(group[0])
		var names []string
		for i := range c.Elements {
			e := &c.Elements[i]
			if e.Kind == CurrentSource && (u.find(e.From) == inside) != (u.find(e.To) == inside) {
				names = append(names, e.Name)
			}
		}
		only := "only the ideal currents " + list(names, "and") + " reach "
		if len(names) == 1 {
			only = "only the ideal current " + names[0] + " reaches "
		}
		l = append(l, diag.Diagnostic{
			Code: "current-cut", Span: c.Nodes[group[0]].Span,
			Hint:    "give it a resistance or a part that leads on",
			Message: only + c.nodeNames(group) + ", so nothing sets the voltage there",
		})
	}
	return l
}
