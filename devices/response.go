package devices

import (
	"math"

	"biaswright/devices/physics"
	"biaswright/netlist"
)

// A Response is what a model answers in full: currents into each terminal and
// every derivative. Slices are owned by the Response and reused by the next call.
type Response struct {
	// I[j] is the current into terminal j, in A. Junction: anode, cathode.
	// Transistor: collector, base, emitter (real senses, pnp included).
	I []float64
	// DV[j][k] is dI[j]/dV[k] in S; DT[j] dI[j]/dT in A/K; DArea[j] dI[j]/d(area)
	// in A; DP[j][p] dI[j]/d(param p), 0 for one that is not stated.
	DV    [][]float64
	DT    []float64
	DArea []float64
	DP    [][]float64
	// Rbulk in ohm (junctions; area included), and its derivatives.
	Rbulk, RbulkDArea float64
	RbulkDP           []float64
}

// Evaluate is the model in full: kind k, parameters p (following Kind.Params, NaN
// where not stated), area, terminal voltages v in V (of the junction itself, inside
// Rbulk; in the order of Response.I), temperature in K. The derivative by T0 is per
// kelvin of it. The kind must come from Catalogue; p and v are only read.
//
// Derivatives are analytic. By a parameter that is infinite they are 0.
func Evaluate(k *netlist.Kind, p []float64, area float64, v []float64, kelvin float64, out *Response) {
	if k.Shape == netlist.Transistor {
		evaluateTransistor(k, p, area, v, kelvin, out)
		return
	}
	evaluateJunction(k, p, area, v, kelvin, out)
}

// Resistance gives R(T) = r (1 + tc (T - 298.15 K)) in ohm, T in K, r in ohm, tc in
// 1/K.
func Resistance(r, tc, kelvin float64) float64 {
	return physics.Linear(r, tc, kelvin, kelvinOf(25))
}

// reset makes room for a model of so many terminals and parameters, all zero.
func (r *Response) reset(terminals, params int) {
	r.I, r.DT, r.DArea = zeroed(r.I, terminals), zeroed(r.DT, terminals), zeroed(r.DArea, terminals)
	r.DV, r.DP = zeroedRows(r.DV, terminals, terminals), zeroedRows(r.DP, terminals, params)
	r.Rbulk, r.RbulkDArea = 0, 0
	r.RbulkDP = zeroed(r.RbulkDP, params)
}

func zeroed(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	s = s[:n]
	clear(s)
	return s
}

func zeroedRows(s [][]float64, rows, n int) [][]float64 {
	if cap(s) < rows {
		s = append(make([][]float64, 0, rows), s[:cap(s)]...)
	}
	s = s[:rows]
	for i := range s {
		s[i] = zeroed(s[i], n)
	}
	return s
}

// evaluateJunction works on the current from anode to cathode and copies it, with
// the sign changed, to the cathode at the end.
func evaluateJunction(k *netlist.Kind, p []float64, area float64, v []float64, kelvin float64, out *Response) {
	out.reset(2, len(p))
	d, rbulk := DiodeOf(k, p, area, kelvin)
	across := v[0] - v[1]
	i, g := d.At(across)
	out.I[0] = i
	out.DV[0][0], out.DV[0][1] = g, -g
	dp := out.DP[0]

	said := junctionStatement(p)
	l := said.at(kelvin)
	s := said.slopes(&l)
	x := across * d.InvNVt
	byLog, byX := exponential(d.Isat, x, d.Knee)
	dp[pN] = byLog*s.n - byX*x/p[pN]
	dp[pEgap] = byLog * s.egap
	dp[pT0] = byLog * s.t0
	if l.pointed {
		// The stated voltage less what falls on Rbulk is the junction's.
		dp[pDrop] = byLog * s.volts
		dp[pDropAt] = byLog * (s.amps - s.volts*p[pRbulk])
		dp[pRbulk] = -byLog * s.volts * p[pDropAt]
	} else {
		dp[pIsat] = byLog * s.isat
	}
	out.DT[0] = byLog*s.kelvin - byX*x/kelvin
	out.DArea[0] = byLog / area
	if d.Zener {
		d.addBreakdown(p, area, across, kelvin, out)
	}

	out.Rbulk, out.RbulkDArea = rbulk, -rbulk/area
	out.RbulkDP[pRbulk] = 1 / area
	negate(out)
}

// negate fills a junction's cathode, whose current is the anode's turned round.
func negate(out *Response) {
	out.I[1], out.DT[1], out.DArea[1] = -out.I[0], -out.DT[0], -out.DArea[0]
	for j := range out.DV[0] {
		out.DV[1][j] = -out.DV[0][j]
	}
	for j := range out.DP[0] {
		out.DP[1][j] = -out.DP[0][j]
	}
}

// exponential gives the derivatives of isat times the guarded exponential of x: by
// ln(isat), and by x. Beyond the knee, which moves with isat, the first is the
// current at the knee.
func exponential(isat, x, knee float64) (byLog, byX float64) {
	e, em1 := physics.ExpExpm1(math.Min(x, knee))
	return isat * em1, isat * e
}

// addBreakdown adds the derivatives of the breakdown current
//
//	-S (exp(y) - e0),  S = I_z/(1 - e0),  y = -(v + V)/w,  e0 = exp(-V/w),
//
// in which V is Vz(T) and w is nz V_T.
func (d *Diode) addBreakdown(p []float64, area, v, kelvin float64, out *Response) {
	t0 := kelvinOf(p[pT0])
	dp := out.DP[0]
	e, above, _ := d.aboveRest(v)
	scale := d.Iz * d.Inv1mE0
	byLog := -scale * above // by ln(S)
	byV := -byLog * d.Inv1mE0 * d.InvNzVt
	// By ln(w) there are two forms of one formula: the first has digits left
	// about v = 0, the second near breakdown.
	t, vw := -v*d.InvNzVt, d.Vz*d.InvNzVt
	byLogW := scale*e*t + byLog*d.Inv1mE0*vw
	if math.Abs(t) >= 1 {
		y := -(v + d.Vz) * d.InvNzVt
		byLogW = scale * (e*y + d.Inv1mE0*d.E0*(1-e)*vw)
	}

	dp[pVzAt] = byLog / p[pVzAt]
	out.DArea[0] += byLog / area
	dp[pVz] = byV
	dp[pDrift] = byV * (kelvin - t0)
	dp[pT0] -= byV * p[pDrift]
	out.DT[0] += byV*p[pDrift] + byLogW/kelvin
	if math.IsNaN(p[pNz]) {
		dp[pRz] = byLogW / p[pRz]
		dp[pVzAt] += byLogW / p[pVzAt]
		dp[pT0] -= byLogW / t0
		return
	}
	dp[pNz] = byLogW / p[pNz]
}

// The rows of a transistor's Response.
const (
	collector = iota
	base
	emitter
)

// evaluateTransistor works in npn senses on collector and base; a pnp's voltages
// and currents are turned round on the way in and out, which leaves conductances
// what they are.
func evaluateTransistor(k *netlist.Kind, p []float64, area float64, v []float64, kelvin float64, out *Response) {
	out.reset(3, len(p))
	sense := 1.0
	if k.PNP {
		sense = -1
	}
	vbe, vbc := sense*(v[base]-v[emitter]), sense*(v[base]-v[collector])
	b := BipolarOf(k, p, area, kelvin)
	var at BipolarPoint
	b.At(vbe, vbc, &at)
	out.I[collector], out.I[base] = at.Ic, at.Ib
	setConductances(out.DV[collector], at.IcVbe, at.IcVbc)
	setConductances(out.DV[base], at.IbVbe, at.IbVbc)
	b.addTransport(p, area, vbe, vbc, kelvin, out)
	b.addGains(p, &at, vbc, kelvin, out)
	b.addRecombination(p, area, vbe, kelvin, out)
	finish(sense, out)
}

// setConductances turns derivatives by v_BE and v_BC into those by the terminals'
// voltages.
func setConductances(row []float64, byVbe, byVbc float64) {
	row[collector], row[base], row[emitter] = -byVbc, byVbe+byVbc, -byVbe
}

// addTransport adds what comes through I_f and I_r.
func (b *Bipolar) addTransport(p []float64, area, vbe, vbc, kelvin float64, out *Response) {
	said := transportStatement(p)
	l := said.at(kelvin)
	s := said.slopes(&l)
	xf, xr := vbe*b.InvNVt, vbc*b.InvNVt
	logF, byXf := exponential(b.Isat, xf, b.Knee)
	logR, byXr := exponential(b.Isat, xr, b.Knee)
	early := 1 - vbc*b.InvVA
	// through turns changes of I_f and I_r into those of I_C and I_B.
	through := func(f, r float64) (ic, ib float64) {
		return (f-r)*early - r*b.InvBetaR, f*b.InvBetaF + r*b.InvBetaR
	}
	logC, logB := through(logF, logR)               // by ln(Isat)
	stretchC, stretchB := through(byXf*xf, byXr*xr) // by ln of both arguments
	add := func(param int, byLog, byStretch float64) {
		out.DP[collector][param] += logC*byLog + stretchC*byStretch
		out.DP[base][param] += logB*byLog + stretchB*byStretch
	}
	if l.pointed {
		add(qVbe, s.volts, 0)
		add(qVbeAt, s.amps, 0)
	} else {
		add(qIsat, s.isat, 0)
	}
	add(qN, s.n, -1/p[qN])
	add(qEgap, s.egap, 0)
	add(qT0, s.t0, 0)
	out.DT[collector] = logC*s.kelvin - stretchC/kelvin
	out.DT[base] = logB*s.kelvin - stretchB/kelvin
	out.DArea[collector], out.DArea[base] = logC/area, logB/area
}

// addGains adds what comes through the gains and the Early voltage.
func (b *Bipolar) addGains(p []float64, at *BipolarPoint, vbc, kelvin float64, out *Response) {
	c, d := out.DP[collector], out.DP[base]
	c[qVA] = (at.If - at.Ir) * vbc * b.InvVA * b.InvVA
	byBetaR := b.InvBetaR * b.InvBetaR * at.Ir
	c[qBetaR], d[qBetaR] = byBetaR, -byBetaR
	if b.InvBetaF == 0 {
		return
	}
	t := kelvin - kelvinOf(p[qT0])
	loss := at.If * b.InvBetaF
	byDrift := -loss / (1 + p[qBetaDrift]*t) // by betaDrift (T - T0)
	d[qBetaF] = -loss / p[qBetaF]
	d[qBetaDrift] = byDrift * t
	d[qT0] -= byDrift * p[qBetaDrift]
	out.DT[base] += byDrift * p[qBetaDrift]
}

// addRecombination adds what comes through the base's recombination current. The
// derivative by Irec is there also where Irec is 0; a current that is not there has
// no knee, so the transport's ends its exponential.
func (b *Bipolar) addRecombination(p []float64, area, vbe, kelvin float64, out *Response) {
	d := out.DP[base]
	said := recombinationStatement(p)
	l := said.at(kelvin)
	x := vbe * b.InvNrecVt
	if p[qIrec] == 0 {
		byIrec, _ := exponential(area*l.sat.Ratio(), x, b.Knee)
		d[qIrec] = byIrec
		return
	}
	s := said.slopes(&l)
	byLog, byX := exponential(b.Irec, x, b.KneeRec)
	d[qIrec] = byLog * s.isat
	d[qNrec] = byLog*s.n - byX*x/p[qNrec]
	d[qEgap] += byLog * s.egap
	d[qT0] += byLog * s.t0
	out.DT[base] += byLog*s.kelvin - byX*x/kelvin
	out.DArea[base] += byLog / area
}

// finish turns collector and base into real senses and fills the emitter, into
// which flows what leaves by the others.
func finish(sense float64, out *Response) {
	emit := func(rows ...[]float64) {
		for i := range rows[emitter] {
			rows[emitter][i] = -(rows[collector][i] + rows[base][i])
		}
	}
	emit(out.DV...)
	for _, s := range [...][]float64{out.I, out.DT, out.DArea} {
		s[collector] *= sense
		s[base] *= sense
		s[emitter] = -(s[collector] + s[base])
	}
	for i := range out.DP[emitter] {
		out.DP[collector][i] *= sense
		out.DP[base][i] *= sense
	}
	emit(out.DP...)
}
