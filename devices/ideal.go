package devices

import (
	"math"

	"biaswright/devices/physics"
)

// A FixedDrop draws a junction towards one that stands at Volts whatever it carries:
// its exponential is made steeper, n (and nrec) times Factor, and goes through the
// point (Volts, Amps). As Factor goes to 0 the drop becomes fixed; at any Factor the
// ratio of two junctions' currents at one voltage stays that of their sizes, so that a
// mirror stays a circuit. The zero value leaves a junction as it is.
//
// A drop of hardly more than nothing is come to from above: 20 n V_T Factor are added to
// one below 5 n V_T, so that no current of the size of Amps flows in reverse.
type FixedDrop struct {
	Volts float64 // V, not negative; of a breakdown its magnitude
	Amps  float64 // A per unit of size, positive
	// Factor is of the ideality, above 0; 0 is no fixed drop.
	Factor float64
}

// An Ideal is what is idealised of one element's model. The language cannot state it:
// no part behaves so.
type Ideal struct {
	// Drop fixes a diode's forward drop, or both junctions of a transistor; the Early
	// factor keeps the true v_BC.
	Drop FixedDrop
	// Breakdown fixes a zener's breakdown.
	Breakdown FixedDrop
	// NoCollector takes a transistor's collector junction away, so that it never
	// saturates: I_r = 0.
	NoCollector bool
}

// The bounds of a drop of hardly more than nothing, in n V_T: e^-20 is 2e-9 of Amps.
const (
	slightDrop = 5
	clearance  = 20
)

// volts is where the drop stands, for a junction of n V_T in V at its own ideality.
func (f *FixedDrop) volts(nVt float64) float64 {
	if f.Volts < slightDrop*nVt {
		return f.Volts + clearance*nVt*f.Factor
	}
	return f.Volts
}

// aboveFloor is exp(x) - floor from f = exp(x) - 1 and df = exp(x), by the form that
// keeps its digits; beyond the knee f and df are the tangent's.
func aboveFloor(f, df, floor float64) float64 {
	if f < 0 {
		return df - floor
	}
	return f + (1 - floor)
}

// Idealise puts an idealisation of a junction of this size in force.
func (d *Diode) Idealise(o *Ideal, size float64) {
	if drop := &o.Drop; drop.Factor > 0 {
		d.Steep = true
		d.Isat = size * drop.Amps
		d.Shift = drop.volts(d.NVt)
		d.NVt *= drop.Factor
		d.InvNVt = 1 / d.NVt
		d.Floor, _ = physics.ExpExpm1(-d.Shift * d.InvNVt) // as At has it, so that 0 V is 0 A
		d.Knee = physics.Knee(d.Isat)
	}
	if stand := &o.Breakdown; d.Zener && stand.Factor > 0 {
		d.Iz, d.Vz = size*stand.Amps, stand.Volts
		d.NzVt *= stand.Factor
		d.InvNzVt = 1 / d.NzVt
		e0, e0m1 := physics.ExpExpm1(-d.Vz * d.InvNzVt)
		d.E0, d.Inv1mE0 = e0, -1/e0m1
		d.KneeZ = physics.Knee(d.Iz * d.Inv1mE0)
	}
}

// Idealise puts an idealisation of a transistor of this size in force. The recombination
// current is steepened with the transport current, so that the base current remains the
// same function of the collector current: at Volts it is Irec (Amps/Isat)^(n/nrec).
func (b *Bipolar) Idealise(o *Ideal, size float64) {
	b.NoCollector = o.NoCollector
	drop := &o.Drop
	if !(drop.Factor > 0) {
		return
	}
	amps := size * drop.Amps
	if b.Irec > 0 {
		b.Irec *= math.Pow(amps/b.Isat, b.InvNrecVt/b.InvNVt)
		b.KneeRec = physics.Knee(b.Irec)
	}
	b.Steep = true
	b.Isat = amps
	b.Knee = physics.Knee(amps)
	b.Shift = drop.volts(1 / b.InvNVt)
	b.InvNVt /= drop.Factor
	b.InvNrecVt /= drop.Factor
	b.Floor, _ = physics.ExpExpm1(-b.Shift * b.InvNVt)
	b.FloorRec, _ = physics.ExpExpm1(-b.Shift * b.InvNrecVt)
}

// Reach is the voltage in V at which the forward exponential carries amps, not
// negative, in A.
func (d *Diode) Reach(amps float64) float64 {
	if d.Steep {
		return d.Shift + d.NVt*math.Log(amps/d.Isat+d.Floor)
	}
	return d.NVt * math.Log1p(amps/d.Isat)
}

// Reach is the voltage in V at which a junction's transport term, times scale, carries
// amps, not negative, in A: I_f or I_r at scale 1.
func (b *Bipolar) Reach(amps, scale float64) float64 {
	if b.Steep {
		return b.Shift + math.Log(amps/(b.Isat*scale)+b.Floor)/b.InvNVt
	}
	return math.Log1p(amps/(b.Isat*scale)) / b.InvNVt
}
