package sweep_test

import (
	"context"
	"fmt"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/sweep"
)

// A loaded divider over its supply.
func ExampleRun() {
	text := "rail VCC = 9 V\npath VCC -> R1 2k -> tap -> R2 1k -> gnd\n"
	c, errs := netlist.Read("divider.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if errs.HasErrors() {
		fmt.Println(errs[0].Message)
		return
	}
	supply, err := sweep.ParseAxis(c, "VCC=6V..12V", 3, false)
	if err != nil {
		fmt.Println(err)
		return
	}
	plan := sweep.Plan{Circuit: c, Axes: []sweep.Axis{supply}, Show: []string{"tap.V"}}
	err = sweep.Run(context.Background(), plan, func(r sweep.Row) error {
		fmt.Printf("%g V: %g V, %s\n", r.At[0], r.Values[0], r.Status)
		return nil
	})
	if err != nil {
		fmt.Println(err)
	}
	// Output:
	// 6 V: 2 V, ok
	// 9 V: 3 V, ok
	// 12 V: 4 V, ok
}
