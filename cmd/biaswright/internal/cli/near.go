package cli

import (
	"fmt"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// nearPoint binds the settings of --near to nodes of c. A value is a number of
// volts, with or without its unit, or an expression of the circuit's own values
// ("VCC - 1 V").
func nearPoint(c *netlist.Circuit, near []netlist.Setting) (map[netlist.NodeID]float64, diag.List) {
	if len(near) == 0 {
		return nil, nil
	}
	var wrong diag.List
	volts := map[netlist.NodeID]float64{}
	for _, s := range near {
		n, hint := nodeOf(c, s.Name)
		if n == netlist.Gnd {
			wrong = append(wrong, diag.Diagnostic{Code: "unknown-name", Message: fmt.Sprintf("--near: there is no node %s", s.Name), Hint: hint})
			continue
		}
		v, found := voltsOf(c, s)
		wrong = append(wrong, found...)
		volts[n] = v
	}
	return volts, wrong
}

// nodeOf finds a node by its name; Gnd, which no start can move, where there is
// none.
func nodeOf(c *netlist.Circuit, name string) (netlist.NodeID, string) {
	var known []string
	for i := range c.Nodes {
		n := netlist.NodeID(i)
		if n == netlist.Gnd {
			continue
		}
		if c.Nodes[i].Name == name {
			return n, ""
		}
		known = append(known, c.Nodes[i].Name)
	}
	return netlist.Gnd, diag.DidYouMean(name, known)
}

func voltsOf(c *netlist.Circuit, s netlist.Setting) (float64, diag.List) {
	e, found := c.ParseExpr(s.Value)
	if found.HasErrors() {
		for i := range found { // the place is in what was typed, not in a file
			found[i].Message = fmt.Sprintf("--near %s=%s: %s", s.Name, s.Value, found[i].Message)
			found[i].Span = diag.Span{}
		}
		return 0, found
	}
	v, ok := e.Eval(stated{c})
	if !ok || (e.Unit != quantity.Volt && e.Unit != quantity.One) {
		return 0, diag.List{{Code: "unit", Message: fmt.Sprintf("--near %s=%s: a start is a number of volts", s.Name, s.Value), Hint: "write --near " + s.Name + "=0.7"}}
	}
	return v, nil
}

// stated gives a circuit's values to an expression, and no solution.
type stated struct{ c *netlist.Circuit }

func (s stated) Slot(id netlist.SlotID) float64             { return s.c.Value(id) }
func (stated) Quantity(netlist.Ref) (v float64, known bool) { return 0, false }
