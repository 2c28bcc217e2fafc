package devices_test

import (
	"fmt"
	"math"
	"testing"

	"biaswright/devices/conform"
)

// A set is what a part states; invented, spread over what parts state.
type set struct {
	kind   string
	stated map[string]float64
}

var sets = []set{
	{"diode", nil},
	{"diode", map[string]float64{"Isat": 2.6e-9, "n": 1.8, "Rbulk": 0.4, "T0": 27}},
	{"diode", map[string]float64{"drop": 0.62, "drop.at": 1e-3, "n": 1.8, "Rbulk": 12, "Egap": 1.206, "T0": 50}},
	{"led", nil},
	{"led", map[string]float64{"drop": 2.05, "drop.at": 15e-3, "Rbulk": 5, "T0": -10}},
	{"zener", nil},
	{"zener", map[string]float64{"Vz": 5.6, "Vz.at": 5e-3, "rz": 12, "drift": 2e-3, "T0": 30}},
	{"zener", map[string]float64{"Vz": 2.7, "Vz.at": 5e-3, "rz": 90, "drift": -2e-3, "drop": 0.72, "drop.at": 10e-3, "Rbulk": 0.5}},
	{"zener", map[string]float64{"Vz": 6.2, "Vz.at": 2e-3, "nz": 3, "Isat": 1e-15, "n": 1.1}},
	{"npn", nil},
	{"npn", map[string]float64{"Vbe": 0.65, "Vbe.at": 1e-3, "betaF": 180, "betaR": 2, "VA": 80, "betaDrift": 5e-3, "T0": 27}},
	{"npn", map[string]float64{"Isat": 2e-14, "n": 1.02, "VA": 20, "Irec": 1e-13, "nrec": 1.9, "betaF": math.Inf(1), "betaR": math.Inf(1)}},
	{"pnp", nil},
	{"pnp", map[string]float64{"Veb": 0.62, "Veb.at": 2e-3, "betaF": 140, "betaR": 2.5, "VA": 50, "Irec": 3e-14, "Egap": 1.17, "betaDrift": -2e-3, "T0": 60}},
}

// cases are the sets at several temperatures and areas; one is at its own T0,
// where the temperature law is the identity.
func cases(t testing.TB) []conform.Case {
	var out []conform.Case
	for _, s := range sets {
		c := conform.Stated(t, s.kind, s.stated)
		out = append(out, c)
		c.Kelvin = c.Params[c.Kind.Index("T0")] + 273.15
		c.Area = 8
		out = append(out, c)
		c.Kelvin, c.Area = 398.15, 0.25
		out = append(out, c)
		c.Kelvin = 233.15
		out = append(out, c)
	}
	return out
}

func TestConformance(t *testing.T) {
	for i, c := range cases(t) {
		t.Run(fmt.Sprintf("%d-%s-%.0fK", i/4, c.Kind.Name, c.Kelvin), func(t *testing.T) { conform.Check(t, c) })
	}
}
