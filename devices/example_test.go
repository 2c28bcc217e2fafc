package devices_test

import (
	"fmt"
	"math"

	"biaswright/devices"
	"biaswright/devices/physics"
)

// A diode stated by one point of its curve carries that current at that drop, and
// ten times as much n·60 mV further up.
func ExampleDiodeOf() {
	kind, _ := devices.Catalogue().Kind("diode")
	p := make([]float64, len(kind.Params))
	for i, param := range kind.Params {
		p[i] = param.Default
	}
	state := func(name string, v float64) { p[kind.Index(name)] = v }
	state("Isat", math.NaN()) // not stated: the point of the curve stands for it
	state("drop", 0.62)
	state("drop.at", 1e-3)
	state("n", 1.8)
	const room = 298.15 // K
	d, _ := devices.DiodeOf(kind, p, 1, room)
	i, _ := d.At(0.62)
	fmt.Printf("%.6f mA at 620 mV\n", i*1e3)
	decade := 1.8 * physics.ThermalVoltage(room) * 2.302585 // ln 10
	i, _ = d.At(0.62 + decade)
	fmt.Printf("%.3f mA %.0f mV further up\n", i*1e3, decade*1e3)
	// Output:
	// 1.000000 mA at 620 mV
	// 10.000 mA 106 mV further up
}
