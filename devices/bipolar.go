package devices

import (
	"math"

	"biaswright/devices/physics"
	"biaswright/netlist"
)

// A Bipolar is a transistor at one temperature, in npn senses: for a pnp all
// voltages and currents change sign outside.
type Bipolar struct {
	Isat, InvNVt       float64 // A with area, 1/V
	InvBetaF, InvBetaR float64 // 0 for infinite
	InvVA              float64 // 1/V; 0 for infinite
	Irec, InvNrecVt    float64 // A with area, 1/V
	// Knee and KneeRec are the arguments at which the exponentials of Isat and
	// Irec give way to their tangents.
	Knee, KneeRec float64
	// Steep tells that Idealise has drawn both junctions to a fixed drop, as a
	// Diode's; FloorRec belongs to Irec. NoCollector takes the collector junction away.
	Steep, NoCollector     bool
	Shift, Floor, FloorRec float64
}

// A BipolarPoint is a transistor's currents in A and conductances in S.
type BipolarPoint struct {
	Ic, Ib                     float64
	IcVbe, IcVbc, IbVbe, IbVbc float64 // dIc/dVbe …
	// If and Ir are the forward and reverse exponential terms, with their
	// derivatives Gf = dIf/dVbe, Gr = dIr/dVbc.
	If, Ir, Gf, Gr float64
	// IcGain and IbGain are dIc/dgain and dIb/dgain; AtGain alone fills them.
	IcGain, IbGain float64
}

// At evaluates at v_BE and v_BC in V. It allocates nothing.
func (b *Bipolar) At(vbe, vbc float64, out *BipolarPoint) {
	transport := b.exponentials(vbe, vbc, out)
	early := 1 - vbc*b.InvVA
	out.Ic = transport*early - out.Ir*b.InvBetaR
	out.IcVbe = out.Gf * early
	out.IcVbc = -out.Gr*(early+b.InvBetaR) - transport*b.InvVA
	out.Ib = out.If*b.InvBetaF + out.Ir*b.InvBetaR
	out.IbVbe = out.Gf * b.InvBetaF
	out.IbVbc = out.Gr * b.InvBetaR
	if b.Irec > 0 {
		b.recombine(vbe, out)
	}
}

// AtGain evaluates a transistor whose coupling between its junctions is scaled by
// gain: 1 is the transistor, as At gives it; 0 leaves two diodes, which share the
// base and nothing else,
//
//	I_C = gain (I_f e + I_r (1 - e)) - I_r (1 + 1/betaR)
//	I_E = I_f (1 + 1/betaF) - gain (I_r e + I_f (1 - e)),  e = 1 - gain v_BC/VA,
//
// with I_B = I_E - I_C and the recombination current added to both. The
// derivatives by gain are filled too. It allocates nothing.
func (b *Bipolar) AtGain(vbe, vbc, gain float64, out *BipolarPoint) {
	transport := b.exponentials(vbe, vbc, out)
	slope := vbc * b.InvVA
	early := 1 - gain*slope
	// What the coupling does not carry across returns through the base.
	lossF, lossR := (1-gain)+b.InvBetaF, (1-gain)+b.InvBetaR
	out.Ic = gain*transport*early - out.Ir*lossR
	out.IcVbe = gain * out.Gf * early
	out.IcVbc = -out.Gr*(gain*early+lossR) - gain*gain*transport*b.InvVA
	out.Ib = out.If*lossF + out.Ir*lossR
	out.IbVbe = out.Gf * lossF
	out.IbVbc = out.Gr * lossR
	out.IcGain = transport*(early-gain*slope) + out.Ir
	out.IbGain = -(out.If + out.Ir)
	if b.Irec > 0 {
		b.recombine(vbe, out)
	}
}

// closeBy is the difference of the junctions' arguments, in n V_T, below which the
// transport current is formed from that difference.
const closeBy = 0.25

// exponentials fills If, Ir, Gf, Gr, and returns the transport current If - Ir.
func (b *Bipolar) exponentials(vbe, vbc float64, out *BipolarPoint) (transport float64) {
	xf, xr := (vbe-b.Shift)*b.InvNVt, (vbc-b.Shift)*b.InvNVt
	ff, dff := physics.Junction(xf, b.Knee)
	fr, dfr := physics.Junction(xr, b.Knee)
	if b.Steep {
		ff, fr = aboveFloor(ff, dff, b.Floor), aboveFloor(fr, dfr, b.Floor)
	}
	if b.NoCollector {
		fr, dfr = 0, 0
	}
	g := b.Isat * b.InvNVt
	out.If, out.Gf = b.Isat*ff, g*dff
	out.Ir, out.Gr = b.Isat*fr, g*dfr
	// With the junctions close together, deep in saturation, the difference of
	// two large exponentials is one of them times an expm1, to all digits.
	if apart := (vbe - vbc) * b.InvNVt; math.Abs(apart) < closeBy && xf < b.Knee && xr < b.Knee && !b.NoCollector {
		_, em1 := physics.ExpExpm1(apart)
		return b.Isat * dfr * em1
	}
	return out.If - out.Ir
}

// recombine adds the base's recombination current.
func (b *Bipolar) recombine(vbe float64, out *BipolarPoint) {
	f, df := physics.Junction((vbe-b.Shift)*b.InvNrecVt, b.KneeRec)
	if b.Steep {
		f = aboveFloor(f, df, b.FloorRec)
	}
	out.Ib += b.Irec * f
	out.IbVbe += b.Irec * b.InvNrecVt * df
}

// BipolarOf makes a transistor of kind k ("npn", "pnp") from its parameters, as
// DiodeOf does.
func BipolarOf(k *netlist.Kind, p []float64, area, kelvin float64) Bipolar {
	vt := physics.ThermalVoltage(kelvin)
	said := transportStatement(p)
	l := said.at(kelvin)
	b := Bipolar{
		Isat:      area * l.amps,
		InvNVt:    1 / (p[qN] * vt),
		InvBetaF:  1 / physics.Linear(p[qBetaF], p[qBetaDrift], kelvin, said.t0),
		InvBetaR:  1 / p[qBetaR],
		InvVA:     1 / p[qVA],
		InvNrecVt: 1 / (p[qNrec] * vt),
	}
	b.Knee = physics.Knee(b.Isat)
	if p[qIrec] > 0 {
		rec := recombinationStatement(p)
		r := rec.at(kelvin)
		b.Irec = area * r.amps
		b.KneeRec = physics.Knee(b.Irec)
	}
	return b
}

// transportStatement and recombinationStatement are what p says of the two
// saturation currents.
func transportStatement(p []float64) statement {
	return statement{
		isat: p[qIsat], volts: p[qVbe], amps: p[qVbeAt],
		n: p[qN], egap: p[qEgap], t0: kelvinOf(p[qT0]),
	}
}

func recombinationStatement(p []float64) statement {
	return statement{isat: p[qIrec], n: p[qNrec], egap: p[qEgap], t0: kelvinOf(p[qT0])}
}
