package solve_test

import (
	"testing"
	"time"

	"biaswright/solve"
)

// A source into a resistor stands at I R = 200 V (arithmetic), less what R3 takes: the scope of a
// proof must reach that far, or the proof is not about the point.
func TestScopeHoldsWhatSourcesDrive(t *testing.T) {
	c := read(t, `rail VCC = 12 V
part q npn Isat = 10 fA, betaF = 100, betaR = 1
path gnd -> I1 1 mA -> n -> R1 200k -> gnd
path VCC -> R2 1k -> c -> Q1 q base=b -> gnd
path n -> R3 1M -> b
`)
	r, err := solve.Every(c, solve.EveryOptions{Budget: 5 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range r.Point.NodeV {
		if s := r.Search.Scope; v < s.Low || v > s.High {
			t.Errorf("a node at %.4g V, the scope says %.4g V to %.4g V", v, s.Low, s.High)
		}
	}
	if !r.Search.Proven {
		t.Errorf("not proven, %d boxes open", r.Search.Open)
	}
}

// A saturated transistor that carries more than the scope's 10 A (12 V over 0.5 ohm: about
// 24 A) is no point that a proof within the scope may call the only one.
func TestNoProofOfAPointBeyondItsScope(t *testing.T) {
	c := read(t, `rail VCC = 12 V
part q npn Isat = 10 pA, betaF = 50, betaR = 1
path VCC -> R2 0.5 -> c -> Q1 q base=b -> gnd
path VCC -> R3 1 -> b
`)
	r, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s := r.Certify(); s != nil {
		t.Errorf("called the only one with currents up to %v A", s.Scope.Amps)
	}
}
