package netlist_test

import (
	"fmt"

	"biaswright/netlist"
)

// A divider is read, one of its values is set, and what follows it is asked for.
// A circuit with diodes or transistors needs the catalogue of package devices.
func Example() {
	text := []byte(`
rail  VCC = 12 V (10.8 V .. 13.2 V)
given RLOW = 2 kohm
path  VCC -> R1 10k 1% -> tap -> R2 RLOW -> gnd
keep  tap.V < VCC / 5
`)
	c, diags := netlist.Read("divider.bias", text, &netlist.Catalogue{}, nil)
	if diags.HasErrors() {
		fmt.Println(diags)
		return
	}
	for _, e := range c.Elements {
		fmt.Printf("%s leads from %s to %s: %g ohm\n", e.Name, c.Nodes[e.From].Name, c.Nodes[e.To].Name, c.Value(e.Value))
	}
	c, _ = c.With(netlist.Setting{Name: "RLOW", Value: "2.2k"})
	r2, _ := c.Lookup("R2")
	fmt.Printf("R2 follows RLOW: %g ohm\n", c.Value(r2))
	fmt.Println(c.Keeps[0].Text)
	// Output:
	// R1 leads from VCC to tap: 10000 ohm
	// R2 leads from tap to gnd: 2000 ohm
	// R2 follows RLOW: 2200 ohm
	// tap.V < VCC / 5
}
