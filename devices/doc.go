// Package devices holds the models: pure functions from terminal voltages,
// temperature and parameters to currents and all their derivatives.
//
// A model exists in two forms that agree to a few units in the last place. The
// kernels [Diode.At] and [Bipolar.At] answer with currents and conductances, for
// the solver's inner loop. [Evaluate] answers with every derivative there is, for
// sensitivities, self-heating and fitting. Neither has state, hidden limits or
// added conductances; both follow these equations, V_T = k T/q, T the temperature
// of the part and T0 the one at which its values are stated.
//
// Junction (diode, led, zener), v across the junction, inside Rbulk:
//
//	i = Isat (exp(v/(n V_T)) - 1)
//	zener also: - I_z (exp(-(v + Vz)/(nz V_T)) - e0)/(1 - e0), e0 = exp(-Vz/(nz V_T))
//
// Transistor in npn senses (pnp with all voltages and currents turned round):
//
//	I_f = Isat (exp(v_BE/(n V_T)) - 1)       I_r = Isat (exp(v_BC/(n V_T)) - 1)
//	I_C = (I_f - I_r)(1 - v_BC/VA) - I_r/betaR
//	I_B = I_f/betaF + I_r/betaR + Irec (exp(v_BE/(nrec V_T)) - 1)
//
// Temperature:
//
//	Isat(T) = Isat(T0) (T/T0)^(3/n) exp((q Egap/(n k)) (1/T0 - 1/T)), Irec alike with nrec
//	betaF(T) = betaF (1 + betaDrift (T - T0))      Vz(T) = Vz + drift (T - T0)
//
// A stated point of the curve fixes Isat at T0: a drop with the part of it that
// falls on Rbulk taken off, or a base-emitter voltage at a collector current with
// v_CB = 0. Of a slope rz, nz = rz I_z/V_T(T0). An area multiplies Isat, Irec and
// I_z and divides Rbulk. Above physics.MaxCurrent an exponential goes on as its
// tangent.
package devices
