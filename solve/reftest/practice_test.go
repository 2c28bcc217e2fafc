package reftest

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"biaswright/netlist"
	"biaswright/solve"
)

// Facts of the trade that any engineer would expect of a model. The source of
// each is common practice.

func solved1(t *testing.T, name string, lines ...string) *solve.Point {
	t.Helper()
	return point(t, read(t, name, []byte(strings.Join(lines, "\n")+"\n")))
}

// junctionAt feeds a small-signal silicon diode of typical values, 0.6 V at
// 0.5 mA with n = 1 (common practice), with a current.
func junctionAt(t *testing.T, amps string) *solve.Point {
	t.Helper()
	return solved1(t, "junction.bias",
		"part si diode drop = 0.6 V at 0.5 mA, n = 1",
		"path gnd -> I1 "+amps+" -> a -> D1 si -> gnd")
}

func TestSiliconJunctionDropsAboutSevenTenths(t *testing.T) {
	if got := value(t, junctionAt(t, "10 mA"), "a.V"); !within(got, 0.7, 0.10, 0) {
		t.Errorf("%g V at 10 mA, common practice says 0.7 V within 10 %%", got)
	}
}

func TestTransistorOfDefaultValuesDropsAboutSevenTenths(t *testing.T) {
	p := solved1(t, "vbe.bias",
		"rail VC = 5 V",
		"part q npn Vbe = 0.65 V at 1 mA",
		"path gnd -> I1 100 uA -> b",
		"path VC -> Q1 q base=b -> gnd")
	if got := value(t, p, "Q1.Vbe"); !within(got, 0.7, 0.10, 0) {
		t.Errorf("V_BE = %g V at 10 mA, common practice says 0.7 V within 10 %%", got)
	}
}

func TestSiliconJunctionFallsTwoMillivoltsAKelvin(t *testing.T) {
	p := junctionAt(t, "1 mA")
	got := slope(t, p, "a.V", "ambient")
	// Common practice says about -2 mV/K; handbooks range from -1.6 to -2.3.
	if got < -2.3e-3 || got > -1.6e-3 {
		t.Errorf("%.3g mV/K at 1 mA, common practice says about -2", 1e3*got)
	}
	// The derivative is what a kelvin does.
	warm, list := p.Circuit.With(netlist.Setting{Name: "ambient", Value: "25.01 degC"})
	if list.HasErrors() {
		t.Fatal(list)
	}
	cold, list := p.Circuit.With(netlist.Setting{Name: "ambient", Value: "24.99 degC"})
	if list.HasErrors() {
		t.Fatal(list)
	}
	difference := (value(t, point(t, warm), "a.V") - value(t, point(t, cold), "a.V")) / 0.02
	if !within(difference, got, 1e-6, 0) { // the central difference's own error
		t.Errorf("%.9g V/K by the adjoint, %.9g V/K by difference", got, difference)
	}
}

func TestSiliconJunctionRisesSixtyMillivoltsADecade(t *testing.T) {
	got := value(t, junctionAt(t, "1 mA"), "a.V") - value(t, junctionAt(t, "0.1 mA"), "a.V")
	if !within(got, 60e-3, 0.03, 0) { // 59.2 mV at 25 degC, 60 mV near 29 degC
		t.Errorf("%g mV a decade, common practice says 60 near room temperature", 1e3*got)
	}
}

func TestLampsBehindAResistor(t *testing.T) {
	// A lamp of 2.0 V at 10 mA behind 670 ohm on 9.05 V: (9.05 - 2.0)/670 is
	// 10.5 mA; two in series, (9.05 - 4.0)/670, are 7.5 mA less what their
	// drop changes. Common practice, within 4 %.
	for _, want := range []struct {
		lamps int
		amps  float64
	}{{1, 10.4e-3}, {2, 7.4e-3}} {
		p := solved1(t, "lamps.bias",
			"rail VCC = 9.05 V",
			"part red led drop = 2.0 V at 10 mA",
			fmt.Sprintf("path VCC -> R1 670 -> a -> LAMP red row=%d -> gnd", want.lamps))
		if got := value(t, p, "LAMP.I"); !within(got, want.amps, 0.04, 0) {
			t.Errorf("%d lamps pass %g mA, common practice says %g within 4 %%", want.lamps, 1e3*got, 1e3*want.amps)
		}
	}
}

func TestStiffDividerHoldsItsSinkOverBeta(t *testing.T) {
	// A divider whose lower resistor is at most ten times the emitter resistor:
	// the collector current moves by no more than 7 % over beta 100 to 300
	// (common practice).
	for _, lower := range []float64{3.3, 10} { // times RE
		const re, top = 1000.0, 12.0 // ohm, V
		base := 1.7                  // V: 1 mA through RE and one drop
		rd := lower * re
		amps := func(beta float64) float64 {
			p := solved1(t, "divider.bias",
				fmt.Sprintf("rail VCC = %g V", top),
				fmt.Sprintf("part q npn Vbe = 0.65 V at 1 mA, betaF = %g", beta),
				fmt.Sprintf("path VCC -> RU %s -> b -> RD %g -> gnd", number(rd*(top-base)/base), rd),
				fmt.Sprintf("path VCC -> RC 4.7k -> c -> Q1 q base=b -> e -> RE %g -> gnd", re))
			return value(t, p, "Q1.Ic")
		}
		low, high := amps(100), amps(300)
		if moved := math.Abs(high/low - 1); moved > 0.07 || moved == 0 {
			t.Errorf("lower resistor %g times RE: moves by %.2f %%, at most 7 expected", lower, 100*moved)
		}
	}
}
