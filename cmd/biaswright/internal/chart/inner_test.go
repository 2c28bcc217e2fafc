package chart

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// TestApart asserts what apart promises: order, distance, bounds, and that nothing
// moves that need not.
func TestApart(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		places := rapid.SliceOfN(rapid.Float64Range(0, 100), 1, 12).Draw(t, "places")
		slices.Sort(places)
		gap := rapid.Float64Range(0.1, 8).Draw(t, "gap")
		got := apart(places, gap, 0, 100)
		const rounding = 1e-9
		moved := false
		for i := range got {
			if got[i] < -rounding || got[i] > 100+rounding {
				t.Fatalf("%g leaves 0..100", got[i])
			}
			if i > 0 && got[i]-got[i-1] < gap-rounding {
				t.Fatalf("%g and %g are nearer than %g", got[i-1], got[i], gap)
			}
			moved = moved || math.Abs(got[i]-places[i]) > rounding
		}
		crowded := false
		for i := 1; i < len(places); i++ {
			crowded = crowded || places[i]-places[i-1] < gap
		}
		if moved && !crowded {
			t.Fatalf("moved %v to %v without need", places, got)
		}
	})
	if got := apart([]float64{5, 5, 5}, 10, 0, 8); got[0] != 0 || got[2] != 8 {
		t.Errorf("without room: %v, want evenly from 0 to 8", got)
	}
}

// TestTicks asserts that ticks lie on the axis, are few, and are written apart.
func TestTicks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		low := rapid.Float64Range(-300, 300).Draw(t, "low")
		width := math.Pow(10, rapid.Float64Range(-4, 3).Draw(t, "decades"))
		most := rapid.IntRange(2, 12).Draw(t, "most")
		a := newAxis(low, low+width, "V", false, most)
		a.from, a.to = 0, 1
		if len(a.ticks) < 1 || len(a.ticks) > most+1 {
			t.Fatalf("%d ticks, want 1 to %d", len(a.ticks), most+1)
		}
		for i, v := range a.ticks {
			if at := a.place(v); at < -1e-6 || at > 1+1e-6 {
				t.Fatalf("tick %g stands at %g", v, at)
			}
			if i > 0 && a.labels[i] == a.labels[i-1] {
				t.Fatalf("two ticks are both %s", a.labels[i])
			}
		}
	})
	a := newAxis(0, 0.016, "A", false, 4)
	if got := a.title("LAMP.I"); got != "LAMP.I [mA]" || !slices.Equal(a.labels, []string{"0", "5", "10", "15"}) {
		t.Errorf("%s: %v", got, a.labels)
	}
	if a := newAxis(1e3, 1e6, "Ω", true, 6); !slices.Equal(a.ticks, []float64{1e3, 1e4, 1e5, 1e6}) {
		t.Errorf("decades: %v", a.ticks)
	}
}
