package netlist

import (
	"math"

	"biaswright/netlist/quantity"
)

// testCatalogue has the kinds and parameters that the language knows, with
// defaults that need not be those of the models.
func testCatalogue() *Catalogue {
	nan := math.NaN()
	ratings := []Param{
		{Name: "T0", Unit: quantity.Celsius, Default: 25},
		{Name: "Pmax", Unit: quantity.Watt, Default: nan, Sign: Positive, Rating: true},
		{Name: "RthJA", Unit: quantity.KelvinPerW, Default: nan, Sign: Positive, Rating: true},
	}
	diode := []Param{
		{Name: "Isat", Unit: quantity.Ampere, Default: 1e-14, Sign: Positive, Rivals: []string{"drop", "drop.at"}},
		{Name: "drop", Unit: quantity.Volt, Default: nan, Sign: Positive, At: "drop.at", Rivals: []string{"Isat"}},
		{Name: "drop.at", Unit: quantity.Ampere, Default: nan, Sign: Positive, Hidden: true},
		{Name: "n", Unit: quantity.One, Default: 1, Sign: Positive},
		{Name: "Rbulk", Unit: quantity.Ohm, Default: 0, Sign: NotNegative},
		{Name: "Egap", Unit: quantity.EV, Default: 1.12, Sign: Positive},
	}
	zener := append(append([]Param(nil), diode...),
		Param{Name: "Vz", Unit: quantity.Volt, Default: 5.6, Sign: Positive, At: "Vz.at"},
		Param{Name: "Vz.at", Unit: quantity.Ampere, Default: 5e-3, Sign: Positive, Hidden: true},
		Param{Name: "nz", Unit: quantity.One, Default: 1, Sign: Positive, Rivals: []string{"rz"}},
		Param{Name: "rz", Unit: quantity.Ohm, Default: nan, Sign: Positive, Rivals: []string{"nz"}},
		Param{Name: "drift", Unit: quantity.VoltPerK, Default: 0},
	)
	bipolar := func(point string) []Param {
		return []Param{
			{Name: "Isat", Unit: quantity.Ampere, Default: 1e-14, Sign: Positive, Rivals: []string{point, point + ".at"}},
			{Name: point, Unit: quantity.Volt, Default: nan, Sign: Positive, At: point + ".at", Rivals: []string{"Isat"}},
			{Name: point + ".at", Unit: quantity.Ampere, Default: nan, Sign: Positive, Hidden: true},
			{Name: "betaF", Unit: quantity.One, Default: 100, Sign: Positive, Infinite: true},
			{Name: "betaR", Unit: quantity.One, Default: 1, Sign: Positive, Infinite: true},
			{Name: "VA", Unit: quantity.Volt, Default: math.Inf(1), Sign: Positive, Infinite: true},
			{Name: "n", Unit: quantity.One, Default: 1, Sign: Positive},
			{Name: "Egap", Unit: quantity.EV, Default: 1.12, Sign: Positive},
			{Name: "betaDrift", Unit: quantity.PerKelvin, Default: 0},
			{Name: "Irec", Unit: quantity.Ampere, Default: 0, Sign: NotNegative},
			{Name: "nrec", Unit: quantity.One, Default: 2, Sign: Positive},
		}
	}
	with := func(p []Param) []Param { return append(append([]Param(nil), p...), ratings...) }
	return &Catalogue{Kinds: []Kind{
		{Name: "diode", Params: with(diode)},
		{Name: "led", Params: with(diode)},
		{Name: "zener", Params: with(zener)},
		{Name: "npn", Shape: Transistor, Params: with(bipolar("Vbe"))},
		{Name: "pnp", Shape: Transistor, PNP: true, Params: with(bipolar("Veb"))},
	}}
}
