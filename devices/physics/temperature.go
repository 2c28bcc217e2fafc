package physics

import "math"

// A Saturation is the law by which a saturation current depends on temperature,
//
//	ratio = Isat(T)/Isat(T0) = (T/T0)^(3/n) exp((q Egap/(n k)) (1/T0 - 1/T)),
//
// the diffusion current of a junction of band gap Egap, its exponent shared among
// n so that an ideality of n leaves the slope of the forward drop over temperature
// what it is at n = 1 (textbook form: Sze, Physics of Semiconductor Devices,
// from memory). Log is the logarithm of the ratio, the other fields its
// derivatives.
type Saturation struct {
	Log      float64 // ln(ratio)
	DT, DT0  float64 // 1/K
	DN       float64 // by n
	DEgap    float64 // 1/eV
	Identity bool    // T = T0: the ratio is exactly 1
}

// SaturationLaw evaluates the law at T with values stated at T0, both in K and
// above 0, a band gap in eV and an ideality n > 0.
func SaturationLaw(kelvin, t0, egap, n float64) Saturation {
	if kelvin == t0 {
		// Nothing moved, so nothing may be rounded.
		slope := (3 + egap/(VoltPerKelvin*t0)) / (n * t0)
		return Saturation{DT: slope, DT0: -slope, Identity: true}
	}
	perN := 1 / n
	// (T - T0)/(T T0) keeps the digits that 1/T0 - 1/T loses.
	shift := (kelvin - t0) / (kelvin * t0) / VoltPerKelvin
	log := (3*math.Log(kelvin/t0) + egap*shift) * perN
	return Saturation{
		Log:   log,
		DT:    (3 + egap/(VoltPerKelvin*kelvin)) * perN / kelvin,
		DT0:   -(3 + egap/(VoltPerKelvin*t0)) * perN / t0,
		DN:    -log * perN,
		DEgap: shift * perN,
	}
}

// Ratio is Isat(T)/Isat(T0).
func (s *Saturation) Ratio() float64 {
	if s.Identity {
		return 1
	}
	return Exp(s.Log)
}

// Linear is the law value (1 + drift (T - T0)) of betas and resistances: value in
// any unit, drift in 1/K.
func Linear(value, drift, kelvin, t0 float64) float64 {
	return value * (1 + drift*(kelvin-t0))
}

// Shifted is the law value + drift (T - T0) of a breakdown voltage: value in V,
// drift in V/K.
func Shifted(value, drift, kelvin, t0 float64) float64 {
	return value + drift*(kelvin-t0)
}
