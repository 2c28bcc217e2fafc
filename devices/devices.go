// Package devices holds the models: pure functions from terminal voltages,
// temperature and parameters to currents and all their derivatives.
package devices

import "biaswright/netlist"

// CONTRACT STUBS: to be replaced by real files; signatures stay.

// Catalogue tells the language which kinds exist and what may be stated. The
// result is shared and must not be modified.
func Catalogue() *netlist.Catalogue { panic("contract") }

// A Diode is the junction of a diode, led or zener at one temperature, ready to
// be evaluated; Rbulk is not part of it. Area is included. Fields are unexported
// or read-only for callers; see JunctionOf.
type Diode struct {
	Isat, NVt, InvNVt float64 // A, V, 1/V
	// Zener tells that the breakdown term is present.
	Zener                 bool
	Iz, Vz, NzVt, InvNzVt float64 // A (with area), V at temperature, V, 1/V
	E0, Inv1mE0           float64 // exp(-Vz/(nz Vt)), 1/(1-E0)
}

// At returns the current from anode to cathode in A at the junction voltage v in
// V, and its derivative in S. It allocates nothing and is finite for every finite
// v.
func (d *Diode) At(v float64) (i, g float64) { panic("contract") }

// DiodeOf makes the junction of kind k ("diode", "led", "zener") from its
// parameters p (following Kind.Params, NaN where not stated), its area relative to
// its part and its temperature in K. Rbulk is returned beside it, in ohm,
// divided by the area.
func DiodeOf(k *netlist.Kind, p []float64, area, kelvin float64) (d Diode, rbulk float64) {
	panic("contract")
}

// A Bipolar is a transistor at one temperature, in npn senses: for a pnp all
// voltages and currents change sign outside.
type Bipolar struct {
	Isat, InvNVt       float64 // A with area, 1/V
	InvBetaF, InvBetaR float64 // 0 for infinite
	InvVA              float64 // 1/V; 0 for infinite
	Irec, InvNrecVt    float64
}

// A BipolarPoint is a transistor's currents in A and conductances in S.
type BipolarPoint struct {
	Ic, Ib                     float64
	IcVbe, IcVbc, IbVbe, IbVbc float64 // dIc/dVbe …
	// If and Ir are the forward and reverse exponential terms, with their
	// derivatives Gf = dIf/dVbe, Gr = dIr/dVbc.
	If, Ir, Gf, Gr float64
}

// At evaluates at v_BE and v_BC in V. It allocates nothing.
func (b *Bipolar) At(vbe, vbc float64, out *BipolarPoint) { panic("contract") }

// BipolarOf makes a transistor from its parameters, as DiodeOf does.
func BipolarOf(k *netlist.Kind, p []float64, area, kelvin float64) Bipolar { panic("contract") }

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

// Evaluate is the model in full: kind k, parameters p (NaN where not stated),
// area, terminal voltages v in V (of the junction itself, inside Rbulk),
// temperature in K. With T0 in p in degC.
func Evaluate(k *netlist.Kind, p []float64, area float64, v []float64, kelvin float64, out *Response) {
	panic("contract")
}

// Resistance gives R(T) = r (1 + tc (T - 298.15 K)) in ohm, T in K.
func Resistance(r, tc, kelvin float64) float64 { panic("contract") }
