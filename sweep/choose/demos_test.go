package choose_test

import (
	"os"
	"path/filepath"
	"testing"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/sweep/choose"
)

// TestDemosHaveChosenValues opens again the resistor that sets each demo's current: what
// ships is what a designer would choose from its series.
func TestDemosHaveChosenValues(t *testing.T) {
	for name, reopened := range map[string]choose.Reopening{
		"mast-resistor": {Name: "RS", Series: "E24"}, "mast-divider": {Name: "RE", Series: "E24"}, "mast-lamp": {Name: "RE", Series: "E24"},
		"mast-zener": {Name: "RE", Series: "E24"}, "mast-limiter": {Name: "RE", Series: "E24"}, "pressure-source": {Name: "RE", Series: "E24"},
		"bootstrap": {Name: "RE", Series: "E24"}, "bootstrap-start": {Name: "RE", Series: "E24"},
		"sensor-bank": {Name: "RSET", Series: "E96"}, // three targets, of 1 % parts
	} {
		resistor := reopened.Name
		t.Run(name, func(t *testing.T) {
			file := filepath.Join("..", "..", "testdata", "circuits", name+".bias")
			text, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			c, list := netlist.Read(file, text, devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
			if list.HasErrors() {
				t.Fatal(list)
			}
			id, ok := c.Lookup(resistor)
			if !ok {
				t.Fatalf("there is no %s", resistor)
			}
			a, err := choose.Find(c, choose.Options{Reopen: []choose.Reopening{reopened}, List: 1})
			if err != nil {
				t.Fatal(err)
			}
			if len(a.Choices) == 0 || a.Choices[0].Ohms[0] != c.Value(id) {
				t.Errorf("%s ships as %g ohm; the choice is %+v", resistor, c.Value(id), a.Choices)
			}
		})
	}
}
