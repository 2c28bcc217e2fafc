package choose_test

import (
	"fmt"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/sweep/choose"
)

// A divider for a third of its supply: its lower resistor is exactly 1.1 kohm, which
// E12 has not. Of its neighbours 1.2 kohm is off by less, tolerances included.
func ExampleFind() {
	text := "rail VCC = 9 V\npath VCC -> R1 2.2k 1% -> tap -> R2 ? E12 1% -> gnd\ntarget tap.V = 3 V within 10%\n"
	c, errs := netlist.Read("divider.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	a, err := choose.Find(c, choose.Options{List: 2})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("exactly %.1f ohm\n", a.Unknowns[0].Exact)
	for _, choice := range a.Choices {
		fmt.Printf("%.0f ohm, %v: at worst %.2f of the band\n", choice.Ohms[0], choose.SeriesOf(choice.Ohms[0]), choice.Score)
	}
	// Output:
	// exactly 1100.0 ohm
	// 1200 ohm, [E12 E24 E192]: at worst 0.73 of the band
	// 1000 ohm, [E3 E6 E12 E24 E48 E96 E192]: at worst 0.75 of the band
}
