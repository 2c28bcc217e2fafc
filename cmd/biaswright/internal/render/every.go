package render

import (
	"fmt"
	"io"
	"math"
	"strings"

	"biaswright/netlist"
	"biaswright/solve"
)

// scopeText is what a proof covers.
func scopeText(s *solve.Search) string {
	text := "junction currents up to " + stated(s.Scope.Amps, "A")
	if !s.Scope.Proved {
		text += fmt.Sprintf(", node voltages from %s to %s", stated(s.Scope.Low, "V"), stated(s.Scope.High, "V"))
	}
	return text
}

// printSearch says how many points there are, how far that can be trusted, which the
// supplies lead to, and what parts them.
func printSearch(w io.Writer, r *solve.EveryResult, l Look) {
	for _, line := range searchText(r) {
		wrap(w, "", l.text(line))
	}
	fmt.Fprintln(w)
}

func boxes(n int) string {
	if n == 1 {
		return "1 box"
	}
	return fmt.Sprintf("%d boxes", n)
}

func searchText(r *solve.EveryResult) []string {
	all, s := r.All(), &r.Search
	number := count(len(all), "operating point")
	var out []string
	switch {
	case s.Proven && len(all) == 1:
		out = append(out, fmt.Sprintf("1 operating point, and proven: there is no other in this model with %s (%s).", scopeText(s), boxes(s.Boxes)+" looked at"))
	case s.Proven:
		out = append(out, fmt.Sprintf("%s, and proven: there are no others in this model with %s (%s).", number, scopeText(s), boxes(s.Boxes)+" looked at"))
	case s.Open > 0:
		out = append(out, fmt.Sprintf("%s found; the search ended with %s open, in which others may lie (%s).", number, boxes(s.Open), scopeText(s)))
	default:
		out = append(out, fmt.Sprintf("%s found by following branches; nothing is proven.", number))
	}
	for i := range all {
		if s.Proven && !r.Verified(i) {
			out = append(out, fmt.Sprintf("Point %d lies outside of what was searched, or too near its edge for a proof.", i+1))
		}
	}
	if len(all) > 1 {
		out = append(out, partedText(all))
	}
	out = append(out, reachText(r))
	if !s.Proven && s.Signs != 1 {
		out = append(out, fmt.Sprintf("The determinant signs add up to %+d; over a complete list they are +1, so some point is missing.", s.Signs))
	} else if !s.Proven {
		out = append(out, "The determinant signs add up to +1, as over a complete list; a pair of points that is missing would not show in it.")
	}
	if len(all) == 1 && !s.Leaks && hasTransistor(r.Point.Circuit) {
		out = append(out, "No transistor here has a recombination current (Irec): a dead state that the real circuit has may be missing in this model.")
	}
	return out
}

func hasTransistor(c *netlist.Circuit) bool {
	for i := range c.Elements {
		if c.Elements[i].Kind == netlist.TransistorPart {
			return true
		}
	}
	return false
}

// partedText names the node that tells the points best apart, and its voltage in each.
func partedText(all []*solve.Point) string {
	node, most := 0, -1.0
	for n := range all[0].NodeV {
		low, high := math.Inf(1), math.Inf(-1)
		for _, p := range all {
			low, high = math.Min(low, p.NodeV[n]), math.Max(high, p.NodeV[n])
		}
		if high-low > most {
			node, most = n, high-low
		}
	}
	var volts []string
	for i, p := range all {
		text := fmt.Sprintf("%s in point %d", Measured(p.NodeV[node], "V"), i+1)
		if p.Unstable {
			text += ", which cannot be stable"
		}
		volts = append(volts, text)
	}
	return fmt.Sprintf("They are parted by %s: %s.", all[0].Circuit.Nodes[node].Name, strings.Join(volts, "; "))
}

// reachText says where the supplies lead as they rise from zero.
func reachText(r *solve.EveryResult) string {
	const percent = 100
	switch {
	case r.Reached < 0 && r.TurnsAt > 0:
		return fmt.Sprintf("Raised from zero, the supplies lead to a point where the way turns back, at %.3g %% of them; from there the circuit jumps, and DC alone does not tell where to.", r.TurnsAt*percent)
	case r.Reached < 0:
		return "Where the supplies lead, raised from zero, was not found."
	case len(r.Others) == 0:
		return "The supplies lead there when they rise from zero."
	case r.All()[r.Reached].Unstable:
		return fmt.Sprintf("Raised from zero, the supplies lead to point %d, which cannot be stable: the circuit leaves that way to one side, and DC alone does not tell to which.", r.Reached+1)
	case r.Reached > 0:
		return fmt.Sprintf("Raised from zero, the supplies lead to point %d, not to point 1: a start-up hazard.", r.Reached+1)
	}
	return "Raised from zero, the supplies lead to point 1; a disturbance may leave the circuit in another that is stable."
}

// pointHead heads the staircase of one of several points.
func pointHead(r *solve.EveryResult, i int) string {
	p := r.All()[i]
	says := fmt.Sprintf("Point %d", i+1)
	if i == 0 && len(r.Others) > 0 {
		says += ", the one that solve gives"
	}
	if p.Unstable {
		says += ", cannot be stable"
	}
	if i == r.Reached && len(r.Others) > 0 {
		says += ", reached when the supplies rise"
	}
	return says
}

type searchJSON struct {
	Complete string `json:"complete"`
	Scope    string `json:"scope"`
	Boxes    int    `json:"boxes"`
	Open     int    `json:"open"`
	Signs    int    `json:"signs"`
	// Reached is the index of the point that the supplies lead to; null where that was
	// not found.
	Reached *int `json:"reached"`
	Leaks   bool `json:"recombination"`
}

func search(s *solve.Search) *searchJSON {
	j := &searchJSON{Complete: "searched", Scope: ascii.Replace(scopeText(s)), Boxes: s.Boxes, Open: s.Open, Signs: s.Signs, Leaks: s.Leaks}
	if s.Proven {
		j.Complete = "proven"
	}
	return j
}
