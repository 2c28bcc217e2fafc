package mna_test

import (
	"fmt"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// The balances of a circuit, solved from a cold start, and one of its quantities.
func Example() {
	text := "rail VCC = 5 V\npart d diode drop = 0.62 V at 1 mA, n = 1.8\npath VCC -> R1 4.38k -> a -> D1 d -> gnd\n"
	c, errs := netlist.Read("diode.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	s, err := mna.New(c)
	if err != nil {
		fmt.Println(err)
		return
	}
	x := make([]float64, s.Size())
	var w newton.Work
	s.Restart()
	r := newton.Solve(s, x, &w, newton.Options{})
	q, _ := c.ParseExpr("D1.I")
	i, _ := q.Eval(s.StateAt(x))
	// (5 V - 0.62 V)/4.38 kohm is the milliamp at which the drop is stated.
	fmt.Printf("%s: it %s, D1 passes %.6f mA\n", s.Label(0), r.Outcome, i*1e3)
	// Output:
	// current balance at a: it converged, D1 passes 1.000000 mA
}
