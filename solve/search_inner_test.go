package solve

import (
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve/mna"
)

// latch has three points, one with both sides alike (testdata/reference/operating-points.json
// lists them as latch2).
const latch = `rail VCC = 5 V
part n npn Isat = 1e-16 A, betaF = 100
path VCC -> RC1 1k -> c1 -> T1 n base=b1 -> gnd
path c1 -> RB1 10k -> b2
path VCC -> RC2 1k -> c2 -> T2 n base=b2 -> gnd
path c2 -> RB2 10k -> b1
`

func ladderOf(t *testing.T, text string) *ladder {
	t.Helper()
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{})
	if list.HasErrors() {
		t.Fatal(list)
	}
	s, err := mna.New(c)
	if err != nil {
		t.Fatal(err)
	}
	return &ladder{s: s}
}

// TestBoxSearch tries the last rung alone, which needs no start.
func TestBoxSearch(t *testing.T) {
	l := ladderOf(t, latch)
	l.try(rung{"box search", (*ladder).boxes})
	if len(l.found) != 3 {
		t.Fatalf("%d points, want 3; %+v", len(l.found), l.tried)
	}
	unstable := 0
	for _, p := range l.found {
		if p.Unstable {
			unstable++
		}
	}
	if unstable != 1 {
		t.Errorf("%d of 3 points cannot be stable, want 1", unstable)
	}
	l.try(rung{"box search", (*ladder).boxes})
	if len(l.found) != 3 || l.tried[1].Ended != "a point is known" {
		t.Errorf("tried again: %+v", l.tried[1])
	}
	none := ladderOf(t, "part d diode Isat = 1e-14 A\npath gnd -> I1 1 mA -> a -> D1 d reversed -> gnd\n")
	none.try(rung{"box search", (*ladder).boxes})
	if len(none.found) != 0 || none.tried[0].Ended != "no operating point lies in what it searched" {
		t.Errorf("a current into a diode's cathode: %+v", none.tried[0])
	}
}

// TestCertify proves what is alone, tells of what is not, and leaves linear circuits be.
func TestCertify(t *testing.T) {
	certify := func(text string) (*Result, *Search) {
		l := ladderOf(t, text)
		r, err := SolveSystem(l.s, Options{})
		if err != nil {
			t.Fatal(err)
		}
		return r, r.Certify()
	}
	if r, s := certify("rail V = 5 V\npart n npn Isat = 1e-16 A, VA = 60 V\npath V -> R1 10k -> b -> R2 2k -> gnd\npath V -> RC 1k -> c -> Q1 n base=b -> e -> RE 100 -> gnd\n"); s == nil || !s.Proven || len(r.Others) != 0 {
		t.Errorf("a divider-biased stage is not proven: %+v", s)
	}
	if r, s := certify(latch); s != nil || len(r.Others) != 2 {
		t.Errorf("a latch: %+v, %d others", s, len(r.Others))
	}
	if _, s := certify("rail V = 5 V\npath V -> R1 10k -> b -> R2 2k -> gnd\n"); s != nil {
		t.Error("a linear circuit is proven at length")
	}
}
