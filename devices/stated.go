package devices

import (
	"fmt"
	"math"

	"biaswright/devices/physics"
	"biaswright/netlist"
)

// A law is a saturation current at a temperature: what a stated value or point and
// the temperature make of it.
type law struct {
	amps float64 // A, at the temperature, of one area
	// What its derivatives are made of:
	sat     physics.Saturation
	pointed bool    // a point was stated, not the current itself
	x0      float64 // the point's v/(n V_T(T0))
	share   float64 // -d ln(Isat)/d x0 = 1/(1 - exp(-x0)); 0 unless pointed
}

// A statement is what fixes a saturation current at T0: itself, or, where it is
// NaN, a current amps in A at the junction voltage volts.
type statement struct {
	isat, volts, amps float64
	n, egap, t0       float64 // t0 in K
}

// at gives the saturation current at T.
func (s *statement) at(kelvin float64) law {
	l := law{amps: s.isat, sat: physics.SaturationLaw(kelvin, s.t0, s.egap, s.n)}
	if math.IsNaN(s.isat) {
		l.pointed = true
		// Multiplied by the inverse as the kernels do, so that at T0 the stated
		// point comes back to the last digit.
		l.x0 = s.volts * (1 / (s.n * physics.ThermalVoltage(s.t0)))
		e, em1 := physics.ExpExpm1(l.x0)
		l.amps, l.share = s.amps/em1, e/em1
	}
	l.amps *= l.sat.Ratio()
	return l
}

// slopes are the derivatives of ln(Isat(T)) by what was stated, and by T.
type slopes struct{ isat, volts, amps, n, egap, t0, kelvin float64 }

func (s *statement) slopes(l *law) slopes {
	d := slopes{n: l.sat.DN, egap: l.sat.DEgap, t0: l.sat.DT0, kelvin: l.sat.DT}
	if !l.pointed {
		d.isat = 1 / s.isat
		return d
	}
	d.volts = -l.share * l.x0 / s.volts
	d.amps = 1 / s.amps
	d.n += l.share * l.x0 / s.n
	d.t0 += l.share * l.x0 / s.t0
	return d
}

// kelvinOf is T0 in K, by the same addition that makes the ambient's kelvins, so
// that equal temperatures compare equal.
func kelvinOf(celsius float64) float64 { return celsius + physics.ZeroCelsius }

// Check tells what is wrong with a set of parameters that are each acceptable by
// themselves: p follows Kind.Params, kelvin is the part's temperature. DiodeOf,
// BipolarOf and Evaluate give numbers without meaning where Check fails.
func Check(k *netlist.Kind, p []float64, kelvin float64) error {
	t0, egapN := p[pT0], p[pN]
	if k.Shape == netlist.Transistor {
		t0, egapN = p[qT0], p[qN]
	}
	switch {
	case !(kelvin > 0):
		return fmt.Errorf("a temperature of %g K is not above absolute zero", kelvin)
	case !(kelvinOf(t0) > 0):
		return fmt.Errorf("T0 = %g degC is not above absolute zero", t0)
	}
	var isat float64
	if k.Shape == netlist.Transistor {
		b := BipolarOf(k, p, 1, kelvin)
		if !(b.InvBetaF >= 0) || math.IsInf(b.InvBetaF, 1) {
			return fmt.Errorf("betaDrift takes betaF below 0 at %.4g degC", kelvin-physics.ZeroCelsius)
		}
		isat = b.Isat
	} else {
		d, _ := DiodeOf(k, p, 1, kelvin)
		if d.Zener && !(d.Vz > 0) {
			return fmt.Errorf("drift takes Vz below 0 at %.4g degC", kelvin-physics.ZeroCelsius)
		}
		isat = d.Isat
		if math.IsNaN(p[pIsat]) && !(p[pDrop]-p[pRbulk]*p[pDropAt] > 0) {
			return fmt.Errorf("Rbulk takes all of the stated drop: %g ohm at %g A is %.4g V of %g V",
				p[pRbulk], p[pDropAt], p[pRbulk]*p[pDropAt], p[pDrop])
		}
	}
	if !(isat > 0) || math.IsInf(isat, 1) {
		return fmt.Errorf("a saturation current of %g A at %.4g degC (n = %g) is outside what numbers can hold",
			isat, kelvin-physics.ZeroCelsius, egapN)
	}
	return nil
}
