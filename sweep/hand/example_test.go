package hand_test

import (
	"fmt"
	"math"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/sweep/hand"
)

// A divider sink: the formula forgets nothing of the circuit that it idealises, and the
// two assumptions go opposite ways.
func ExampleCheck() {
	const text = `
rail VCC = 9 V
part gp npn Vbe = 0.65 V at 1 mA, betaF = 200
path VCC -> RU 8.2k -> base -> RD 1.5k -> gnd
path VCC -> RL 100 -> out -> Q1 gp base=base -> tail -> RE 130 -> gnd
assume Vbe = 0.7 V, betaF = infinite
hand Q1.Ic = (VCC * RD / (RU + RD) - 0.7 V) / RE
`
	c, errs := netlist.Read("sink.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	a, err := hand.Check(c, hand.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	r := &a.Rows[0]
	fmt.Printf("%s: %.3f mA by hand, %.3f mA in full\n", r.Q.Text, 1e3*r.Hand, 1e3*r.Full)
	fmt.Printf("left out by the formula: %.3f mA\n", 1e3*math.Abs(r.LeftOut()))
	for i := range a.Players {
		fmt.Printf("%s %+.3f mA\n", a.Players[i].Text, 1e3*r.Shares[i])
	}
	// Output:
	// Q1.Ic: 5.321 mA by hand, 5.109 mA in full
	// left out by the formula: 0.000 mA
	// Vbe +0.056 mA
	// betaF -0.268 mA
}
