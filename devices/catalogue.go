package devices

import (
	"math"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
)

// Positions in Kind.Params: the models read parameters by place. All junctions
// begin alike, so that a zener is a diode with more behind it; ratings come last.
const (
	pIsat = iota
	pDrop
	pDropAt
	pN
	pRbulk
	pEgap
	pT0
	pVz // zener from here
	pVzAt
	pNz
	pRz
	pDrift
)

// Positions of a transistor's parameters.
const (
	qIsat = iota
	qVbe
	qVbeAt
	qBetaF
	qBetaR
	qVA
	qN
	qEgap
	qBetaDrift
	qIrec
	qNrec
	qT0
)

// Where defaults are from.
const (
	language = "the bias language"
	practice = "common practice"
	memory   = "from memory"
)

var none = math.NaN()

var catalogue = netlist.Catalogue{Kinds: []netlist.Kind{
	{Name: "diode", Shape: netlist.Junction, Params: junction(siliconJunction)},
	{Name: "led", Shape: netlist.Junction, Params: junction(emitterJunction)},
	{Name: "zener", Shape: netlist.Junction, Params: zener()},
	{Name: "npn", Shape: netlist.Transistor, Params: transistor("Vbe")},
	{Name: "pnp", Shape: netlist.Transistor, PNP: true, Params: transistor("Veb")},
}}

// Catalogue tells the language which kinds exist and what may be stated. The
// result is shared and must not be modified.
func Catalogue() *netlist.Catalogue { return &catalogue }

// A nature is what distinguishes the junctions of diode and led.
type nature struct {
	isat, n, egap        float64
	isatFrom, nFrom, gap string
}

var siliconJunction = nature{
	isat: 1e-14, isatFrom: practice + ": a small silicon junction, 0.71 V at 10 mA",
	n: 1, nFrom: language,
	egap: 1.12, gap: language + ": silicon",
}

var emitterJunction = nature{
	isat: 1e-19, isatFrom: practice + ": a red emitter, 2.0 V at 10 mA with n = 2",
	n: 2, nFrom: language,
	egap: 1.9, gap: language + ": a red emitter",
}

// shared lists what every junction has, in the order of pIsat .. pT0.
func shared(j nature) []netlist.Param {
	return []netlist.Param{
		{
			Name: "Isat", Unit: quantity.Ampere, Default: j.isat, Sign: netlist.Positive,
			Rivals: []string{"drop", "drop.at"}, Doc: "saturation current", Source: j.isatFrom,
		},
		{
			Name: "drop", Unit: quantity.Volt, Default: none, Sign: netlist.Positive, At: "drop.at",
			Rivals: []string{"Isat"}, Doc: "forward drop at a stated current, Rbulk included; fixes Isat",
		},
		{
			Name: "drop.at", Unit: quantity.Ampere, Default: none, Sign: netlist.Positive, Hidden: true,
			Doc: "the current at which drop is stated",
		},
		{
			Name: "n", Unit: quantity.One, Default: j.n, Sign: netlist.Positive,
			Doc: "ideality of the junction", Source: j.nFrom,
		},
		{
			Name: "Rbulk", Unit: quantity.Ohm, Default: 0, Sign: netlist.NotNegative,
			Doc: "resistance in series with the junction", Source: language,
		},
		{
			Name: "Egap", Unit: quantity.EV, Default: j.egap, Sign: netlist.NotNegative,
			Doc: "band gap, for Isat over temperature", Source: j.gap,
		},
		t0(),
	}
}

func t0() netlist.Param {
	return netlist.Param{
		Name: "T0", Unit: quantity.Celsius, Default: 25,
		Doc: "temperature at which the values hold", Source: language,
	}
}

func junction(j nature) []netlist.Param {
	return append(shared(j), ratings(
		rating("Imax", quantity.Ampere, "largest current"),
		rating("VRmax", quantity.Volt, "largest reverse voltage"))...)
}

func zener() []netlist.Param {
	return append(append(shared(siliconJunction),
		netlist.Param{
			Name: "Vz", Unit: quantity.Volt, Default: 5.6, Sign: netlist.Positive, At: "Vz.at",
			Doc: "breakdown voltage at a stated current, Rbulk not included", Source: language + "'s example",
		},
		netlist.Param{
			Name: "Vz.at", Unit: quantity.Ampere, Default: 5e-3, Sign: netlist.Positive, Hidden: true,
			Doc: "I_z, the current at which Vz is stated", Source: practice + ": the test current of small zeners",
		},
		netlist.Param{
			Name: "nz", Unit: quantity.One, Default: 2, Sign: netlist.Positive, Rivals: []string{"rz"},
			Doc: "ideality of the breakdown", Source: memory + ": a slope of about 10 ohm at 5 mA",
		},
		netlist.Param{
			Name: "rz", Unit: quantity.Ohm, Default: none, Sign: netlist.Positive, Rivals: []string{"nz"},
			Doc: "slope resistance at the stated point; fixes nz",
		},
		netlist.Param{
			Name: "drift", Unit: quantity.VoltPerK, Default: 0,
			Doc: "change of Vz with temperature", Source: "none unless stated; near 0 about 5 V, " + practice,
		},
	), ratings(rating("Imax", quantity.Ampere, "largest current, either way"))...)
}

// transistor lists an npn's or pnp's parameters; vbe is what the trade calls its
// base-emitter voltage.
func transistor(vbe string) []netlist.Param {
	return append([]netlist.Param{
		{
			Name: "Isat", Unit: quantity.Ampere, Default: 1e-14, Sign: netlist.Positive,
			Rivals: []string{vbe, vbe + ".at"}, Doc: "transport saturation current",
			Source: practice + ": a small silicon transistor, 0.65 V at 1 mA",
		},
		{
			Name: vbe, Unit: quantity.Volt, Default: none, Sign: netlist.Positive, At: vbe + ".at", Rivals: []string{"Isat"},
			Doc: "base-emitter voltage at a stated collector current, base and collector at one voltage; fixes Isat",
		},
		{
			Name: vbe + ".at", Unit: quantity.Ampere, Default: none, Sign: netlist.Positive, Hidden: true,
			Doc: "the collector current at which " + vbe + " is stated",
		},
		{
			Name: "betaF", Unit: quantity.One, Default: 100, Sign: netlist.Positive, Infinite: true,
			Doc: "forward current gain", Source: language,
		},
		{
			Name: "betaR", Unit: quantity.One, Default: 1, Sign: netlist.Positive, Infinite: true,
			Doc: "reverse current gain", Source: language,
		},
		{
			Name: "VA", Unit: quantity.Volt, Default: math.Inf(1), Sign: netlist.Positive, Infinite: true,
			Doc: "Early voltage", Source: language,
		},
		{
			Name: "n", Unit: quantity.One, Default: 1, Sign: netlist.Positive,
			Doc: "ideality of both transport junctions", Source: language,
		},
		{
			Name: "Egap", Unit: quantity.EV, Default: 1.12, Sign: netlist.NotNegative,
			Doc: "band gap, for Isat and Irec over temperature", Source: language + ": silicon",
		},
		{
			Name: "betaDrift", Unit: quantity.PerKelvin, Default: 0,
			Doc: "relative change of betaF with temperature", Source: language,
		},
		{
			Name: "Irec", Unit: quantity.Ampere, Default: 0, Sign: netlist.NotNegative,
			Doc: "saturation current of the base's recombination", Source: language,
		},
		{
			Name: "nrec", Unit: quantity.One, Default: 2, Sign: netlist.Positive,
			Doc: "ideality of the recombination current", Source: language,
		},
		t0(),
	}, ratings(
		rating("Imax", quantity.Ampere, "largest collector current"),
		rating("VCEOmax", quantity.Volt, "largest collector-emitter voltage, base open"),
		rating("VEBOmax", quantity.Volt, "largest reverse base-emitter voltage, collector open"))...)
}

// ratings are those of any kind, then some of its own. None has a default: what is
// not stated is not known.
func ratings(own ...netlist.Param) []netlist.Param {
	return append([]netlist.Param{
		rating("Pmax", quantity.Watt, "largest dissipation at 25 degC ambient"),
		{Name: "Tjmax", Unit: quantity.Celsius, Default: none, Rating: true, Doc: "highest junction temperature"},
		rating("RthJA", quantity.KelvinPerW, "thermal resistance, junction to ambient"),
	}, own...)
}

func rating(name string, unit quantity.Unit, doc string) netlist.Param {
	return netlist.Param{Name: name, Unit: unit, Default: none, Sign: netlist.Positive, Rating: true, Doc: doc}
}
