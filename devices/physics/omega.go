package physics

import "math"

// WrightOmega is the Wright omega function on the real axis, the solution w > 0 of
//
//	w + ln w = z,
//
// within about two units in the last place for every finite z whose w is a normal
// double (z > -708). It gives the current of a junction behind a resistance in
// closed form: with a = Isat R/(n V_T),
//
//	V = R i + n V_T ln(1 + i/Isat)  <=>  i = Isat (omega(a + ln a + V/(n V_T))/a - 1).
//
// (Corless and Jeffrey, The Wright omega function, 2002, from memory.)
// WrightOmega(-Inf) is 0, WrightOmega(+Inf) is +Inf.
func WrightOmega(z float64) float64 {
	switch {
	case math.IsNaN(z), math.IsInf(z, 1):
		return z
	case z < -1:
		return omegaLeft(z)
	}
	return omegaRight(z)
}

// omegaLeft solves w = u e^-w with u = e^z for z < -1, where w < 0.279. There ln w
// would lose digits against z; this form has none to lose.
func omegaLeft(z float64) float64 {
	u := Exp(z)
	w := u / (1 + u) // e^-w ~ 1/(1+w): off by less than 0.04
	for range newtonSteps {
		g := u * Exp(-w)
		w -= (w - g) / (1 + g)
	}
	return w
}

// omegaRight solves w + ln w - z = 0 for z >= -1, where its derivative 1 + 1/w
// forgives every rounding in ln w.
func omegaRight(z float64) float64 {
	// The series about 0 to its second power: omega' = w/(1+w), omega'' =
	// w/(1+w)^3 at w = 0.567; off by less than 0.01 up to 2.
	w := 0.567 + z*(0.362+z*0.0737)
	if z > 2 {
		w = z - math.Log(z)
	}
	for range newtonSteps {
		w += (z - w - math.Log(w)) * w / (1 + w)
	}
	return w
}

// Newton's step squares a relative error that starts below 0.2 (at z just above 2)
// and has a factor below 1/2 before it: 0.02, 2e-4, 2e-8, 2e-16. A fifth settles
// the last digit.
const newtonSteps = 5
