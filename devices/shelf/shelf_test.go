package shelf_test

import (
	"math"
	"slices"
	"testing"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
)

// source gives the shelves, as a user's file meets them.
var source = netlist.Files{Shelves: map[string][]byte{}}

func init() {
	for _, name := range shelf.Names() {
		source.Shelves[name], _ = shelf.Text(name)
	}
}

// read takes the shelf into the least circuit there is.
func read(t *testing.T) *netlist.Circuit {
	t.Helper()
	c, found := netlist.Read("probe.bias", []byte("use generic\nrail VCC = 5 V\npath VCC -> R1 1k -> gnd\n"), devices.Catalogue(), source)
	for _, d := range found {
		t.Errorf("%v", d)
	}
	if c == nil {
		t.Fatal("the shelf has errors")
	}
	return c
}

func numbers(c *netlist.Circuit, p *netlist.Part) []float64 {
	out := make([]float64, len(p.Params))
	for i, id := range p.Params {
		out[i] = c.Value(id)
	}
	return out
}

// What was promised: each class of part is there, and each has its ratings.
func TestShelfIsComplete(t *testing.T) {
	want := map[string]string{
		"sigdiode": "diode", "rectifier": "diode", "npnsmall": "npn", "pnpsmall": "pnp", "npnpower": "npn", "pnppower": "pnp",
		"red": "led", "amber": "led", "green": "led", "blue": "led", "white": "led", "infrared": "led",
		"z2v7": "zener", "z3v3": "zener", "z3v9": "zener", "z4v7": "zener", "z5v1": "zener", "z5v6": "zener", "z6v2": "zener",
		"z6v8": "zener", "z7v5": "zener", "z8v2": "zener", "z9v1": "zener", "z10": "zener", "z12": "zener", "z15": "zener",
	}
	c := read(t)
	for i := range c.Parts {
		p := &c.Parts[i]
		if want[p.Name] != p.Kind.Name {
			t.Errorf("%s is of kind %s, want %q", p.Name, p.Kind.Name, want[p.Name])
		}
		delete(want, p.Name)
		for k, param := range p.Kind.Params {
			if param.Rating && math.IsNaN(c.Value(p.Params[k])) {
				t.Errorf("%s has no %s", p.Name, param.Name)
			}
		}
		values := numbers(c, p)
		get := func(name string) float64 { return values[p.Kind.Index(name)] }
		if get("Pmax")*get("RthJA") > (get("Tjmax")-25)*1.001 {
			t.Errorf("%s: Pmax heats it beyond Tjmax", p.Name)
		}
		if p.Kind.Shape == netlist.Transistor && !(get("Irec") > 0) {
			t.Errorf("%s has no recombination current", p.Name)
		}
		for _, kelvin := range []float64{218.15, 298.15, 423.15} {
			if err := devices.Check(p.Kind, values, kelvin); err != nil {
				t.Errorf("%s: %v", p.Name, err)
			}
		}
	}
	for name := range want {
		t.Errorf("%s is missing", name)
	}
}

// What the trade expects of such parts (common practice), from the models.
func TestShelfIsTypical(t *testing.T) {
	const room = 298.15
	c := read(t)
	for i := range c.Parts {
		p := &c.Parts[i]
		values := numbers(c, p)
		if p.Kind.Shape == netlist.Transistor {
			transistor(t, p, values)
			continue
		}
		drop := func(amps, kelvin float64) float64 {
			d, bulk := devices.DiodeOf(p.Kind, values, 1, kelvin)
			return d.NVt*math.Log1p(amps/d.Isat) + bulk*amps
		}
		// A forward junction loses about 2 mV/K at some milliamperes.
		if slope := (drop(5e-3, room+5) - drop(5e-3, room-5)) / 10; slope > -1e-3 || slope < -3e-3 {
			t.Errorf("%s: its drop moves by %v V/K", p.Name, slope)
		}
		low, high := 0.6, 0.85 // silicon at 10 mA
		switch p.Name {
		case "infrared":
			low, high = 1.05, 1.35
		case "red", "amber", "green":
			low, high = 1.7, 2.3
		case "blue", "white":
			low, high = 2.7, 3.4
		}
		if v := drop(10e-3, room); v < low || v > high {
			t.Errorf("%s drops %v V at 10 mA", p.Name, v)
		}
		if p.Kind.Name == "zener" {
			zener(t, p, values)
		}
	}
}

// A zener's drift changes its sign at about 5 V (common practice), and a current of
// 5 mA stands at its voltage within its forward leakage.
func zener(t *testing.T, p *netlist.Part, values []float64) {
	vz, drift := values[p.Kind.Index("Vz")], values[p.Kind.Index("drift")]
	if (vz < 5) != (drift < 0) && (vz < 5 || vz > 5.6) {
		t.Errorf("%s: drift %v V/K at %v V", p.Name, drift, vz)
	}
	d, _ := devices.DiodeOf(p.Kind, values, 1, 298.15)
	if i, _ := d.At(-vz); math.Abs(i+5e-3) > 1e-9 {
		t.Errorf("%s passes %v A at its voltage", p.Name, i)
	}
}

// beta is near its statement where the part is used, and falls at small currents.
func transistor(t *testing.T, p *netlist.Part, values []float64) {
	b := devices.BipolarOf(p.Kind, values, 1, 298.15)
	beta := func(amps float64) float64 {
		var out devices.BipolarPoint
		b.At(math.Log1p(amps/b.Isat)/b.InvNVt, 0, &out)
		return out.Ic / out.Ib
	}
	work, small, stated := 10e-3, 1e-6, values[p.Kind.Index("betaF")]
	if slices.Contains([]string{"npnpower", "pnppower"}, p.Name) {
		work, small = 1, 1e-4
	}
	if r := beta(work) / stated; r < 0.9 || r > 1 {
		t.Errorf("%s: beta is %v of its statement at %v A", p.Name, r, work)
	}
	if r := beta(small) / stated; r < 0.4 || r > 0.6 {
		t.Errorf("%s: beta is %v of its statement at %v A", p.Name, r, small)
	}
}

func TestUnknownShelf(t *testing.T) {
	if _, ok := shelf.Text("none"); ok {
		t.Error("there is a shelf of that name")
	}
}
