package physics

// The defining constants of the SI, exact since 20 May 2019 (SI Brochure, 9th
// edition, 2019, section 2.2).
const (
	Boltzmann        = 1.380649e-23    // k, J/K
	ElementaryCharge = 1.602176634e-19 // q, C
)

// VoltPerKelvin is k/q, about 86.17 µV/K. It is also Boltzmann's constant in
// electronvolt per kelvin.
const VoltPerKelvin = Boltzmann / ElementaryCharge

// ZeroCelsius is 0 degC in kelvin, exact by the definition of the Celsius scale.
const ZeroCelsius = 273.15

// ThermalVoltage is V_T = k T/q in V, about 25.69 mV at 25 degC.
func ThermalVoltage(kelvin float64) float64 { return VoltPerKelvin * kelvin }
