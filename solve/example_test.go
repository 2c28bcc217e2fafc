package solve_test

import (
	"fmt"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve"
)

// The operating point of a small sink, and what its current owes to the emitter
// resistor and to beta.
func ExampleSolve() {
	text := `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 150
path VCC -> RU 6.8k -> base -> RD 1.5k -> gnd
path VCC -> RL 330 -> Q1 gp base=base -> tail -> RE 100 -> gnd
`
	c, errs := netlist.Read("sink.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	r, err := solve.Solve(c, solve.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	q, _ := c.ParseExpr("Q1.Ic")
	ic, slope, err := r.Point.Sensitivity(q)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("I_C = %.3f mA, Q1 %s\n", ic*1e3, r.Point.Elements[3].State)
	for _, name := range []string{"RE", "gp.betaF"} {
		id, _ := c.Lookup(name)
		fmt.Printf("1 %% more %s: %+.3f %%\n", name, slope[id]*c.Value(id)/ic)
	}
	// Output:
	// I_C = 8.466 mA, Q1 active
	// 1 % more RE: -0.900 %
	// 1 % more gp.betaF: +0.079 %
}
