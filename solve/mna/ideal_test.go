package mna_test

import (
	"math"
	"testing"

	"biaswright/devices"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// A system whose junction is drawn to a fixed drop stands near it, a clone alike; it has
// no derivatives by slots; and it is itself again once nothing is idealised.
func TestIdealise(t *testing.T) {
	c := read(t, `
rail VCC = 5 V
part sig diode drop = 0.62 V at 1 mA, n = 1.8
path VCC -> R1 4.3k -> a -> D1 sig -> gnd`)
	s, x := settle(t, c)
	real := value(t, s.StateAt(x), c, "a.V")
	diode := 1 // of the elements, in file order
	ideals := make([]devices.Ideal, len(c.Elements))
	ideals[diode].Drop = devices.FixedDrop{Volts: 0.7, Amps: 1e-3, Factor: 1.0 / 64}
	s.Idealise(ideals)
	ideals[diode].Drop.Volts = 2 // a copy is in force
	for _, sys := range []*mna.System{s, s.Clone()} {
		y := append([]float64(nil), x...)
		sys.From(y)
		var w newton.Work
		if r := newton.Solve(sys, y, &w, newton.Options{}); r.Outcome != newton.Converged {
			t.Fatalf("it %s after %d steps", r.Outcome, r.Steps)
		}
		// 4.3 V on 4.3 kohm are the milliampere at 0.7 V.
		if got := value(t, sys.StateAt(y), c, "a.V"); math.Abs(got-0.7) > 1e-9 {
			t.Errorf("a.V = %.12g, want 0.7", got)
		}
		q, _ := c.ParseExpr("a.V")
		if _, _, err := sys.StateAt(y).Sensitivity(q); err == nil {
			t.Error("an idealised circuit has derivatives")
		}
	}
	s.Idealise(nil)
	var w newton.Work
	s.From(x)
	if r := newton.Solve(s, x, &w, newton.Options{}); r.Outcome != newton.Converged {
		t.Fatalf("it %s after %d steps", r.Outcome, r.Steps)
	}
	if got := value(t, s.StateAt(x), c, "a.V"); math.Abs(got-real) > 1e-12 {
		t.Errorf("a.V = %.15g, was %.15g", got, real)
	}
}
