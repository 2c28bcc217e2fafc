package limits_test

import (
	"fmt"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/sweep/limits"
)

// A divider's output follows its supply: a band of 10 % is left where the supply has
// moved by 10 %, and the divider's own resistors carry it there.
func ExampleFind() {
	text := "rail VCC = 9 V\npath VCC -> R1 2k -> tap -> R2 1k -> gnd\nhold tap.V within 10%\n"
	c, errs := netlist.Read("divider.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	a, err := limits.Find(c, limits.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	l := a.Limits[0]
	fmt.Printf("%s: %.2f .. %.2f V, %s, through %s\n", l.Axis, l.Low.At, l.High.At, l.Low.Reason, l.Low.Cause.Through)
	// Output:
	// VCC.V: 8.10 .. 9.90 V, band, through R1
}
