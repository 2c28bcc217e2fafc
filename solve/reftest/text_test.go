package reftest

import (
	"flag"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// filtered tells that only some of the subtests were asked for.
func filtered() bool { return strings.Contains(flag.Lookup("test.run").Value.String(), "/") }

// TestText writes a network with everything that the converter knows, and names
// that clash.
func TestText(t *testing.T) {
	n := Network{
		Title: "everything", Ground: "0", Kelvin: 300.15,
		Elements: []Element{
			{Name: "V1", Type: "voltage_source", Pins: map[string]string{"plus": "5V", "minus": "0"}, Value: 5},
			{Name: "V2", Type: "voltage_source", Pins: map[string]string{"plus": "0", "minus": "vm"}, Value: 3},
			{Name: "V3", Type: "voltage_source", Pins: map[string]string{"plus": "Q1", "minus": "load"}, Value: 0.64},
			{Name: "R1", Type: "resistor", Pins: map[string]string{"a": "5V", "b": "load"}, Value: 1e7},
			{Name: "I1", Type: "current_source", Pins: map[string]string{"from": "5V", "to": "Q1"}, Value: 1.5e-5},
			{Name: "D1", Type: "diode", Pins: map[string]string{"anode": "vm", "cathode": "Q1"}, Model: "Z", Area: 1},
			{Name: "Q1", Type: "npn", Pins: map[string]string{"collector": "5V", "base": "Q1", "emitter": "vm"}, Model: "Q", Area: 8},
			{Name: "Q2", Type: "npn", Pins: map[string]string{"collector": "load", "base": "load", "emitter": "vm"}, Model: "Q", Area: 1},
		},
		Models: map[string]Model{
			"Q": {Kind: "npn", Isat: 1e-16, N: 1, BetaF: 100, BetaR: 1, KelvinRef: room},
			"Z": {Kind: "zener", Isat: 1e-14, N: 1, IZ0: 0.005, VZ: 5.1, NZ: 3, Egap: 1.12, KelvinRef: room},
		},
	}
	for i := range n.Elements {
		if n.Elements[i].Area == 0 {
			n.Elements[i].Area = 1
		}
	}
	want := `title "everything"

rail n_5V = 5 V
rail vm = -3 V
ambient = 27 degC

part Q npn Isat = 1e-16 A, n = 1, betaF = 100, betaR = 1, VA = infinite, T0 = 25 degC
part Z zener Isat = 1e-14 A, n = 1, Vz = 5.1 V at 0.005 A, nz = 3, Egap = 1.12 eV, T0 = 25 degC

path load_1 -> V3 cell 0.64 V -> Q1_1
path n_5V -> R1 1e7 -> load_1
path n_5V -> I1 1.5e-5 A -> Q1_1
path vm -> D1 Z -> Q1_1
path n_5V -> Q1 Q base=Q1_1 size=8 -> vm
place Q2 Q collector=load_1 base=load_1 emitter=vm
`
	got, err := n.Text()
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(want, string(got.Source)); d != "" {
		t.Errorf("text differs (-want +got):\n%s", d)
	}
	if got.Sign["V2"] != -1 || got.Rail["V2"] != "vm" {
		t.Errorf("V2 became rail %q, sign %g", got.Rail["V2"], got.Sign["V2"])
	}

	n.Elements = append(n.Elements, Element{Name: "A1", Type: "ideal_opamp"})
	if _, err := n.Text(); err == nil {
		t.Error("an ideal amplifier was written")
	}
}
