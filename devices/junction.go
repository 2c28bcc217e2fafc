package devices

import (
	"math"

	"biaswright/devices/physics"
	"biaswright/netlist"
)

// A Diode is the junction of a diode, led or zener at one temperature, ready to
// be evaluated; Rbulk is not part of it. Area is included. Callers may read the
// fields; DiodeOf makes them.
type Diode struct {
	Isat, NVt, InvNVt float64 // A, V, 1/V
	// Knee is the argument v/(n V_T) at which the exponential gives way to its
	// tangent.
	Knee float64
	// Steep tells that Idealise has drawn the junction to a fixed drop: Isat is then
	// the current at Shift volts, less Floor of it: i = Isat (exp((v - Shift)/(n V_T))
	// - Floor), Floor = exp(-Shift/(n V_T)).
	Steep        bool
	Shift, Floor float64
	// Zener tells that the breakdown term is present.
	Zener                 bool
	Iz, Vz, NzVt, InvNzVt float64 // A (with area), V at temperature, V, 1/V
	E0, Inv1mE0           float64 // exp(-Vz/(nz Vt)), 1/(1-E0)
	KneeZ                 float64 // as Knee, of the breakdown's -(v + Vz)/(nz V_T)
}

// At returns the current from anode to cathode in A at the junction voltage v in
// V, and its derivative in S. It allocates nothing and is finite for every finite
// v.
func (d *Diode) At(v float64) (i, g float64) {
	f, df := physics.Junction((v-d.Shift)*d.InvNVt, d.Knee)
	if d.Steep {
		f = aboveFloor(f, df, d.Floor)
	}
	i, g = d.Isat*f, d.Isat*d.InvNVt*df
	if d.Zener {
		f, df = d.breakdown(v)
		i -= d.Iz * f
		g += d.Iz * d.InvNzVt * df
	}
	return i, g
}

// Terms gives At's current as three terms, in A: the exponential, the constant that
// belongs to it, and the breakdown. Of junctions in a row in reverse the constants
// cancel, and what is left decides how they share the voltage; a sum in one double
// would lose it.
func (d *Diode) Terms(v float64) (exponential, constant, breakdown float64) {
	f, df := physics.Junction((v-d.Shift)*d.InvNVt, d.Knee)
	switch exponential = d.Isat * f; {
	case d.Steep:
		exponential = d.Isat * aboveFloor(f, df, d.Floor)
	case v < 0:
		exponential, constant = d.Isat*df, -d.Isat
	}
	if d.Zener {
		f, _ = d.breakdown(v)
		breakdown = -d.Iz * f
	}
	return exponential, constant, breakdown
}

// breakdown is (exp(y) - e0)/(1 - e0) with y = -(v + Vz)/(nz V_T), and its
// derivative by y: 1 at v = -Vz, 0 at v = 0.
func (d *Diode) breakdown(v float64) (f, df float64) {
	e, above, beyond := d.aboveRest(v)
	df = e * d.Inv1mE0
	f = above * d.Inv1mE0
	if beyond > 0 {
		f += df * beyond
	}
	return f, df
}

// aboveRest gives e = exp(y) and e - e0, both at the knee where y is beyond it, and
// how far beyond.
func (d *Diode) aboveRest(v float64) (e, above, beyond float64) {
	// About v = 0 the difference is e0 times an expm1, which keeps its digits.
	if t := -v * d.InvNzVt; math.Abs(t) < 1 {
		e, above = physics.ExpExpm1(t)
		return d.E0 * e, d.E0 * above, 0
	}
	// The sum of the two large voltages comes first: it is exact near breakdown.
	y := -(v + d.Vz) * d.InvNzVt
	if y > d.KneeZ {
		e = physics.Exp(d.KneeZ)
		return e, e - d.E0, y - d.KneeZ
	}
	e = physics.Exp(y)
	return e, e - d.E0, 0
}

// DiodeOf makes the junction of kind k ("diode", "led", "zener") from its
// parameters p (following Kind.Params, NaN where not stated), its area relative to
// its part and its temperature in K. Rbulk is returned beside it, in ohm,
// divided by the area. The kind must come from Catalogue; p is only read.
func DiodeOf(k *netlist.Kind, p []float64, area, kelvin float64) (d Diode, rbulk float64) {
	said := junctionStatement(p)
	l := said.at(kelvin)
	vt := physics.ThermalVoltage(kelvin)
	d.Isat = area * l.amps
	d.NVt = p[pN] * vt
	d.InvNVt = 1 / d.NVt
	d.Knee = physics.Knee(d.Isat)
	if isZener(k) {
		d.Zener = true
		d.Iz = area * p[pVzAt]
		d.Vz = physics.Shifted(p[pVz], p[pDrift], kelvin, kelvinOf(p[pT0]))
		d.NzVt = zenerSlope(p, kelvin)
		d.InvNzVt = 1 / d.NzVt
		e0, e0m1 := physics.ExpExpm1(-d.Vz * d.InvNzVt)
		d.E0, d.Inv1mE0 = e0, -1/e0m1
		d.KneeZ = physics.Knee(d.Iz * d.Inv1mE0)
	}
	return d, p[pRbulk] / area
}

func isZener(k *netlist.Kind) bool { return k.Name == "zener" }

// junctionStatement is what p says of the saturation current.
func junctionStatement(p []float64) statement {
	return statement{
		isat: p[pIsat], volts: p[pDrop] - p[pRbulk]*p[pDropAt], amps: p[pDropAt],
		n: p[pN], egap: p[pEgap], t0: kelvinOf(p[pT0]),
	}
}

// zenerSlope is nz V_T in V at T. Where rz is stated, nz = rz I_z/V_T(T0), and the
// thermal voltages leave the ratio of their temperatures.
func zenerSlope(p []float64, kelvin float64) float64 {
	if math.IsNaN(p[pNz]) {
		return p[pRz] * p[pVzAt] * (kelvin / kelvinOf(p[pT0]))
	}
	return p[pNz] * physics.ThermalVoltage(kelvin)
}
