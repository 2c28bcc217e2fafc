// Package quantity reads, writes and combines numbers with SI prefixes and
// checked units, and knows the IEC 60062 letter codes and the IEC 60063
// preferred number series.
package quantity

// A Unit is a physical dimension as powers of the volt, the ampere, the kelvin
// and the electronvolt, which are all that a DC bias network needs: ohm is V/A,
// watt is V·A. Absolute marks a temperature on the Celsius scale (degC), whose
// numbers are held in degrees Celsius; a difference of two is in kelvin.
type Unit struct {
	Volt, Ampere, Kelvin, ElectronVolt int8
	Absolute                           bool
}

// The units that the language names. PerCent and ppm are scales of One.
var (
	One        = Unit{}
	Volt       = Unit{Volt: 1}
	Ampere     = Unit{Ampere: 1}
	Watt       = Unit{Volt: 1, Ampere: 1}
	Ohm        = Unit{Volt: 1, Ampere: -1}
	Siemens    = Unit{Volt: -1, Ampere: 1}
	Kelvin     = Unit{Kelvin: 1}
	Celsius    = Unit{Kelvin: 1, Absolute: true}
	EV         = Unit{ElectronVolt: 1}
	PerKelvin  = Unit{Kelvin: -1}
	VoltPerK   = Unit{Volt: 1, Kelvin: -1}
	KelvinPerW = Unit{Kelvin: 1, Volt: -1, Ampere: -1}
)

// A Quantity is a number in the coherent unit of its dimension (volts, amperes,
// ohms, kelvin; degrees Celsius where Unit.Absolute). 5 % is 0.05 of One,
// 100 ppm/K is 1e-4 PerKelvin.
type Quantity struct {
	Value float64
	Unit  Unit
}
