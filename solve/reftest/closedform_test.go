package reftest

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"testing"

	"pgregory.net/rapid"

	"biaswright/devices"
	"biaswright/devices/physics"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/solve"
)

// diodeResistor is the current of V behind R and a diode by the Wright omega
// function: with w = omega(ln(Isat R/(n V_T)) + (V + Isat R)/(n V_T)),
// i = n V_T/R w - Isat (W_0(exp z) = omega(z); Corless and Jeffrey, The Wright
// omega function, 2002).
func diodeResistor(v, r, isat, nvt float64) float64 {
	return nvt/r*physics.WrightOmega(math.Log(isat*r/nvt)+(v+isat*r)/nvt) - isat
}

func TestDiodeResistorByWrightOmega(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		volts := rapid.Float64Range(0.05, 200).Draw(r, "V")
		ohms := math.Pow(10, rapid.Float64Range(0, 6).Draw(r, "log10 R"))
		isat := math.Pow(10, rapid.Float64Range(-18, -8).Draw(r, "log10 Isat"))
		n := rapid.Float64Range(1, 2).Draw(r, "n")
		text := fmt.Sprintf("rail VS = %s V\npart d diode Isat = %s A, n = %s\npath VS -> R1 %s -> a -> D1 d -> gnd\n",
			number(volts), number(isat), number(n), number(ohms))
		c, list := netlist.Read("closed.bias", []byte(text), devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
		if list.HasErrors() {
			r.Fatalf("%v\n%s", list, text)
		}
		result, err := solve.Solve(c, solve.Options{})
		if err != nil {
			r.Fatalf("%v\n%s", err, text)
		}
		got, nvt := result.Point.Elements[1].I, n*thermalVoltage(room)
		want := diodeResistor(volts, ohms, isat, nvt)
		// 1e-12 as the stopping rule; a current near Isat is a difference of the
		// exponential and 1, and its node's rounding is worth 8 eps V/R.
		if !within(got, want, 2e-12, 4e-16*(volts/ohms+isat)+1e-13*isat) {
			r.Fatalf("%.17g A, closed form %.17g A\n%s", got, want, text)
		}
	})
}

// TestDiodeResistorFigures meets the figures of case X56, computed by the same
// formula elsewhere: a junction with its bulk resistance behind a resistor.
func TestDiodeResistorFigures(t *testing.T) {
	cases, err := Cases(networksFile)
	if err != nil {
		t.Fatal(err)
	}
	name := regexp.MustCompile(`^I\(V=([0-9.]+),R=([0-9.]+)\+([0-9.]+)\)$`)
	ran := 0
	for _, c := range cases {
		if c.ID != "X56" {
			continue
		}
		for _, f := range c.Expected {
			m := name.FindStringSubmatch(f.Name)
			if m == nil {
				t.Fatalf("%s does not read as a voltage and two resistances", f.Name)
			}
			bulk := parse(t, m[3])
			text, err := (&Network{
				ID: c.ID, Title: c.Title, Ground: "gnd", Kelvin: c.Kelvin,
				Elements: []Element{
					{Name: "VS", Type: "voltage_source", Pins: map[string]string{"plus": "vs", "minus": "gnd"}, Value: parse(t, m[1])},
					{Name: "R1", Type: "resistor", Pins: map[string]string{"a": "vs", "b": "a"}, Value: parse(t, m[2])},
					{Name: "D1", Type: "diode", Pins: map[string]string{"anode": "a", "cathode": "gnd"}, Model: "J", Area: 1},
				},
				// The case's own description: 25 fA, n = 1, at its temperature.
				Models: map[string]Model{"J": {Kind: "diode", Isat: 25e-15, N: 1, RbulkR: bulk, KelvinRef: c.Kelvin}},
			}).Text()
			if err != nil {
				t.Fatal(err)
			}
			got := value(t, point(t, read(t, "x56.bias", text.Source)), "D1.I")
			if !within(got, f.Value, f.TolRel, 0) {
				t.Errorf("%s: %.15g A, want %.15g", f.Name, got, f.Value)
			}
			ran++
		}
	}
	if ran != 3 {
		t.Errorf("%d figures, expected 3", ran)
	}
}

func parse(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}
