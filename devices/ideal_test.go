package devices

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"biaswright/netlist"
)

// params are a kind's defaults with some values stated.
func idealParams(t rapid.TB, name string, stated map[string]float64) (*netlist.Kind, []float64) {
	k, ok := Catalogue().Kind(name)
	if !ok {
		t.Fatalf("no kind %s", name)
	}
	p := make([]float64, len(k.Params))
	for i := range p {
		p[i] = k.Params[i].Default
	}
	for key, v := range stated {
		p[k.Index(key)] = v
	}
	return k, p
}

const idealKelvin = 298.15

// A fixed drop at the model's own ideality, through a point of its own curve, is the
// model.
func TestFixedDropThroughItsOwnPointIsTheModel(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		size := rapid.Float64Range(0.1, 10).Draw(t, "size")
		volts := rapid.Float64Range(0.3, 0.8).Draw(t, "volts")
		v := rapid.Float64Range(-2, 0.9).Draw(t, "v")
		w := rapid.Float64Range(-2, 0.9).Draw(t, "w")

		k, p := idealParams(t, "diode", map[string]float64{"Isat": 1e-14, "n": 1.3})
		d, _ := DiodeOf(k, p, size, idealKelvin)
		at := d
		amps, _ := d.At(volts)
		at.Idealise(&Ideal{Drop: FixedDrop{Volts: volts, Amps: (amps + d.Isat) / size, Factor: 1}}, size)
		near(t, "I", first(at.At(v)), first(d.At(v)), 1e-11*d.Isat)

		kq, q := idealParams(t, "npn", map[string]float64{"Isat": 1e-14, "betaF": 120, "VA": 60, "Irec": 1e-12})
		b := BipolarOf(kq, q, size, idealKelvin)
		ideal := b
		carried := b.Isat * math.Exp(volts*b.InvNVt)
		ideal.Idealise(&Ideal{Drop: FixedDrop{Volts: volts, Amps: carried / size, Factor: 1}}, size)
		var x, y BipolarPoint
		b.At(v, w, &x)
		ideal.At(v, w, &y)
		near(t, "Ic", y.Ic, x.Ic, 1e-11*b.Isat)
		near(t, "Ib", y.Ib, x.Ib, 1e-11*b.Irec)
	})
}

func first(x, _ float64) float64 { return x }

// near compares to the last digits, or within a small current.
func near(t rapid.TB, what string, got, want, small float64) {
	const digits = 1e-11
	if !(math.Abs(got-want) <= digits*math.Abs(want)+small) {
		t.Fatalf("%s = %.15g, want %.15g", what, got, want)
	}
}

// However steep, a junction carries no current at 0 V, its stated current at its stated
// voltage, in proportion to its size, and its derivative is that of its current.
func TestFixedDrop(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		size := rapid.Float64Range(0.1, 10).Draw(t, "size")
		volts := rapid.Float64Range(0.2, 4).Draw(t, "volts")
		amps := math.Pow(10, rapid.Float64Range(-9, 0).Draw(t, "decade"))
		factor := math.Exp2(-rapid.Float64Range(1, 8).Draw(t, "halvings"))
		k, p := idealParams(t, "diode", map[string]float64{"Isat": 1e-14})
		d, _ := DiodeOf(k, p, size, idealKelvin)
		d.Idealise(&Ideal{Drop: FixedDrop{Volts: volts, Amps: amps, Factor: factor}}, size)
		if i, _ := d.At(0); i != 0 {
			t.Fatalf("%g A at 0 V", i)
		}
		near(t, "I", first(d.At(volts)), size*amps*(1-math.Exp(-volts*d.InvNVt)), 0)
		if back := d.Reach(first(d.At(volts))); math.Abs(back-volts) > 1e-12*volts {
			t.Fatalf("Reach gives %.15g V, want %.15g", back, volts)
		}
		v := volts + d.NVt*rapid.Float64Range(-20, 5).Draw(t, "at")
		step := 1e-4 * d.NVt
		_, g := d.At(v)
		slope := (first(d.At(v+step)) - first(d.At(v-step))) / (2 * step)
		// The differences round by 1e-16 of the current and of the voltage over the step.
		if !(math.Abs(g-slope) <= 1e-6*g+1e-10*size*amps*d.InvNVt) {
			t.Fatalf("derivative %g, differences give %g", g, slope)
		}
	})
}

// A transistor drawn to a fixed drop keeps its currents' balance: base and collector
// current stay in the relation that the model has at that collector current, and the
// derivatives are those of the currents.
func TestFixedDropOfATransistor(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		size := rapid.Float64Range(0.1, 10).Draw(t, "size")
		volts := rapid.Float64Range(0.2, 1).Draw(t, "volts")
		amps := math.Pow(10, rapid.Float64Range(-6, 0).Draw(t, "decade"))
		factor := math.Exp2(-rapid.Float64Range(1, 10).Draw(t, "halvings"))
		k, p := idealParams(t, "npn", map[string]float64{"Isat": 1e-15, "betaF": 150, "betaR": 2, "VA": 70, "Irec": 1e-13})
		b := BipolarOf(k, p, size, idealKelvin)
		real := b
		b.Idealise(&Ideal{Drop: FixedDrop{Volts: volts, Amps: amps, Factor: factor}}, size)

		// Active, the collector at the base's voltage; what the exponentials
		// are less at 0 V differs.
		x := rapid.Float64Range(-3, 3).Draw(t, "x") // of ln(I/Amps)
		var steep, model BipolarPoint
		b.At(volts+x/b.InvNVt, 0, &steep)
		real.At(math.Log(size*amps/real.Isat)/real.InvNVt+x/real.InvNVt, 0, &model)
		near(t, "Ic", steep.Ic, model.Ic, 2*(real.Isat+size*amps*b.Floor))
		near(t, "Ib", steep.Ib, model.Ib, 2*(real.Isat+real.Irec+size*amps*b.Floor+b.Irec*b.FloorRec))

		// Derivatives, saturation included.
		vbe := volts + rapid.Float64Range(-5, 5).Draw(t, "be")/b.InvNVt
		vbc := volts + rapid.Float64Range(-5, 5).Draw(t, "bc")/b.InvNVt
		step := 1e-4 / b.InvNVt
		var at, up, down BipolarPoint
		b.At(vbe, vbc, &at)
		scale := b.InvNVt * size * amps * math.Exp(5)
		for _, c := range []struct {
			what   string
			be, bc float64
			ic, ib float64
		}{{"v_BE", step, 0, at.IcVbe, at.IbVbe}, {"v_BC", 0, step, at.IcVbc, at.IbVbc}} {
			b.At(vbe+c.be, vbc+c.bc, &up)
			b.At(vbe-c.be, vbc-c.bc, &down)
			if d := (up.Ic - down.Ic) / (2 * step); !(math.Abs(d-c.ic) <= 1e-6*scale) {
				t.Fatalf("dIc/d%s %g, differences give %g", c.what, c.ic, d)
			}
			if d := (up.Ib - down.Ib) / (2 * step); !(math.Abs(d-c.ib) <= 1e-6*scale) {
				t.Fatalf("dIb/d%s %g, differences give %g", c.what, c.ib, d)
			}
		}
	})
}

// Without its collector junction a transistor does not saturate: its collector current
// is that of the forward term, its base current the forward one.
func TestNoCollector(t *testing.T) {
	k, p := idealParams(t, "npn", map[string]float64{"Isat": 1e-15, "betaF": 100, "betaR": 1})
	b := BipolarOf(k, p, 1, idealKelvin)
	b.Idealise(&Ideal{NoCollector: true}, 1)
	var deep, active BipolarPoint
	b.At(0.7, 0.69, &deep)
	b.At(0.7, 0, &active)
	if deep.Ic != active.Ic || deep.Ib != active.Ib || deep.IcVbc != 0 {
		t.Errorf("saturated %+v, active %+v", deep, active)
	}
	near(t, "Ic/Ib", deep.Ic/deep.Ib, 100, 0)
}

// A fixed breakdown carries its stated current at its stated voltage, and none at 0 V.
func TestFixedBreakdown(t *testing.T) {
	k, p := idealParams(t, "zener", map[string]float64{"Isat": 1e-14, "Vz": 4.7, "Vz.at": 5e-3, "rz": 20})
	for _, factor := range []float64{1, 0.1, 1e-3} {
		d, _ := DiodeOf(k, p, 2, idealKelvin)
		d.Idealise(&Ideal{Breakdown: FixedDrop{Volts: 5, Amps: 3e-3, Factor: factor}}, 2)
		near(t, "I", first(d.At(-5)), -6e-3, 2e-14) // and Isat forward
		if i, _ := d.At(0); i != 0 {
			t.Errorf("%g A at 0 V", i)
		}
	}
}
