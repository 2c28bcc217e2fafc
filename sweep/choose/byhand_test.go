package choose_test

import (
	"math"
	"testing"

	"biaswright/sweep/choose"
)

// A given value with a tolerance of its own that is derived from another: each of the eight
// corners by Ohm's law, W = 2 RX (1 ± 3 %).
func TestDerivedGivenIsDrawn(t *testing.T) {
	a := find(t, "rail W0 = 10 V\ngiven RX = 1 kohm 5%\ngiven W = RX * 2 3%\npath W0 -> R1 W -> a -> R2 ? E24 1% -> gnd\npath a -> R3 RX -> gnd\ntarget a.V = 2 V within 4%")
	for _, c := range a.Choices {
		far, at := 0.0, 0.0
		for corner := range 8 {
			side := func(bit int, tolerance float64) float64 {
				if corner>>bit&1 == 1 {
					return 1 + tolerance
				}
				return 1 - tolerance
			}
			rx := 1000 * side(0, .05)
			w, r2 := 2*rx*side(1, .03), c.Ohms[0]*side(2, .01)
			low := 1 / (1/r2 + 1/rx)
			if v := 10 * low / (w + low); math.Abs(v-2) > far {
				far, at = math.Abs(v-2), v
			}
		}
		var r choose.Requirement = c.Requirements[0]
		if !close(r.Worst.Value, at, 1e-9) || r.Worst.Met != (far < 0.08) {
			t.Errorf("R2 %g: worst %.9g V, met %v; by hand %.9g V", c.Ohms[0], r.Worst.Value, r.Worst.Met, at)
		}
		ends := map[string]float64{}
		for _, e := range r.At {
			ends[e.Name] = e.Value
		}
		if w := ends["W"] / ends["RX"] / 2; !close(w, 1.03, 1e-9) && !close(w, 0.97, 1e-9) {
			t.Errorf("R2 %g: worst at W %g with RX %g", c.Ohms[0], ends["W"], ends["RX"])
		}
	}
}

// What a negative rail delivers counts like a positive one's: by Ohm's law.
func TestDrawOfANegativeRail(t *testing.T) {
	a := find(t, "rail VEE = -12 V\npath gnd -> RA 1k -> m -> RB ? E24 -> VEE\ntarget m.V = -4 V within 20%")
	for _, c := range a.Choices {
		if want := 12 / (1000 + c.Ohms[0]); !close(c.Draw, want, 1e-9) {
			t.Errorf("RB %g draws %g A, want %g A", c.Ohms[0], c.Draw, want)
		}
	}
}
