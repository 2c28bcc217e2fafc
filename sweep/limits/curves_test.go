package limits_test

import (
	"math"
	"runtime"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/sweep/limits"
)

// A cell with two states is drawn in the one that was asked for: the curve passes
// through the nominal point's own value and stays of its size around it.
func TestCurveKeepsTheBranch(t *testing.T) {
	c, list := netlist.Read("bootstrap.bias", []byte(shipped(t, "bootstrap.bias")), devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
	if list.HasErrors() {
		t.Fatal(list[0].Message)
	}
	drive := netlist.NodeID(slices.IndexFunc(c.Nodes, func(n netlist.Node) bool { return n.Name == "drive" }))
	for _, state := range []struct {
		near     float64 // V at drive
		low, top float64 // A, what the sensor's current may be at nominal
	}{{0, 0, 1e-12}, {0.6, 50e-6, 200e-6}} {
		a, err := limits.Find(c, limits.Options{Near: map[netlist.NodeID]float64{drive: state.near}})
		if err != nil {
			t.Fatal(err)
		}
		if v := a.Hold.Nominal; v < state.low || v > state.top {
			t.Fatalf("near %g V the current is %g A", state.near, v)
		}
		const points = 61
		for i := range a.Limits {
			l := &a.Limits[i]
			curve, err := a.Curve(i, points)
			if err != nil {
				t.Fatal(err)
			}
			if !slices.IsSorted(curve.X) || curve.X[0] != l.From || curve.X[len(curve.X)-1] != l.To {
				t.Errorf("%s: drawn over %g .. %g, want %g .. %g", l.Axis, curve.X[0], curve.X[len(curve.X)-1], l.From, l.To)
			}
			at, found := slices.BinarySearch(curve.X, l.Nominal)
			if !found || math.Abs(curve.Q[at]/a.Hold.Nominal-1) > 1e-5 { // femtoamperes are solved less finely
				t.Errorf("%s: drawn with %g A at nominal, want %g A", l.Axis, curve.Q[at], a.Hold.Nominal)
			}
			const apart = 1e3 // the two states are eight orders apart
			for _, k := range []int{max(at-1, 0), min(at+1, len(curve.X)-1)} {
				if q := curve.Q[k]; !(q > a.Hold.Nominal/apart && q < a.Hold.Nominal*apart) {
					t.Errorf("%s: %g A at %g, next to %g A at nominal", l.Axis, q, curve.X[k], a.Hold.Nominal)
				}
			}
		}
	}
}

// The answer is the same however many work on it.
func TestWorkersDoNotMatter(t *testing.T) {
	c := read(t, shipped(t, "mast-lamp.bias"))
	find := func(workers int) *limits.Answer {
		a, err := limits.Find(c, limits.Options{Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		return a
	}
	one, many := find(1), find(max(4, runtime.NumCPU()))
	if d := cmp.Diff(one.Load.Counts, many.Load.Counts); d != "" {
		t.Error(d)
	}
	for i := range one.Limits {
		for side, both := range map[string][2]limits.Side{"low": {one.Limits[i].Low, many.Limits[i].Low}, "high": {one.Limits[i].High, many.Limits[i].High}} {
			if a, b := both[0].At, both[1].At; a != b && !(math.IsNaN(a) && math.IsNaN(b)) {
				t.Errorf("%s, %s: %g by one, %g by many", one.Limits[i].Axis, side, a, b)
			}
		}
	}
}
