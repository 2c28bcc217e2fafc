// Package conform checks device models: every kind, whatever its equations, must
// pass the same suite. Its claims are
//
//   - the currents into the terminals, and each of their derivatives, sum to 0;
//   - only voltage differences matter;
//   - every derivative agrees with differences of the currents;
//   - a model absorbs power at every voltage, or passes none;
//   - everything is finite for every finite voltage up to 1 MV, and no current
//     exceeds 1e30 A;
//   - currents rise with the voltage that drives them;
//   - nothing jumps where one formula takes over from another.
package conform

import (
	"fmt"
	"math"
	"testing"

	"biaswright/devices"
	"biaswright/netlist"
)

// A Case is a model to be checked: a kind, its parameters in the order of
// Kind.Params (NaN where not stated), its relative area, its temperature in K.
type Case struct {
	Kind   *netlist.Kind
	Params []float64
	Area   float64
	Kelvin float64
}

// Stated makes a case of the kind's defaults and of what is stated in their place,
// at 25 degC and an area of 1; rivals of what is stated are not stated.
func Stated(t testing.TB, kind string, stated map[string]float64) Case {
	t.Helper()
	k, ok := devices.Catalogue().Kind(kind)
	if !ok {
		t.Fatalf("no kind %q", kind)
	}
	c := Case{Kind: k, Params: make([]float64, len(k.Params)), Area: 1, Kelvin: 298.15}
	for i, p := range k.Params {
		c.Params[i] = p.Default
	}
	for name, value := range stated {
		i := k.Index(name)
		if i < 0 {
			t.Fatalf("%s has no %q", kind, name)
		}
		c.Params[i] = value
		for _, rival := range k.Params[i].Rivals {
			c.Params[k.Index(rival)] = math.NaN()
		}
	}
	return c
}

// String names the case by its kind, temperature and area.
func (c Case) String() string {
	return fmt.Sprintf("%s at %g K, area %g", c.Kind.Name, c.Kelvin, c.Area)
}

// Check runs the suite on a case.
func Check(t *testing.T, c Case) {
	t.Helper()
	if err := devices.Check(c.Kind, c.Params, c.Kelvin); err != nil {
		t.Fatalf("%v: %v", c, err)
	}
	for _, claim := range []struct {
		name string
		hold func(testing.TB, Case)
	}{
		{"balance", balance},
		{"differences-only", differencesOnly},
		{"derivatives", derivatives},
		{"passive", passive},
		{"finite", finite},
		{"rising", rising},
		{"seams", seams},
	} {
		t.Run(claim.name, func(t *testing.T) { claim.hold(t, c) })
	}
}

// respond evaluates the case at terminal voltages.
func (c Case) respond(v []float64) *devices.Response {
	r := new(devices.Response)
	devices.Evaluate(c.Kind, c.Params, c.Area, v, c.Kelvin, r)
	return r
}

// drives are the voltages across a junction, in V, positive forward, at which a
// case is looked at. Each is a multiple of 2^-20, so that sums with terminalOffset
// are exact.
func drives() []float64 {
	out := []float64{
		-40, -12, -6, -5.625, -5.5, -3, -1, -0.25, -0.0625, -0.015625, 0,
		0.0078125, 0.03125, 0.125, 0.375, 0.5, 0.625, 0.6875, 0.75,
	}
	return append(out, -0x1p-20, 0x1p-20)
}

// terminals lists sets of terminal voltages made of the drives.
func (c Case) terminals(drives []float64) [][]float64 {
	var out [][]float64
	for _, first := range drives {
		if c.Kind.Shape == netlist.Junction {
			out = append(out, []float64{first, 0})
			continue
		}
		for _, second := range drives {
			out = append(out, c.transistor(first, second))
		}
	}
	return out
}

// transistor gives the terminal voltages that put vbe and vbc across the
// junctions, both positive forward, with the emitter at 0.
func (c Case) transistor(vbe, vbc float64) []float64 {
	s := 1.0
	if c.Kind.PNP {
		s = -1
	}
	return []float64{s * (vbe - vbc), s * vbe, 0}
}

// balance: what flows in flows out.
func balance(t testing.TB, c Case) {
	sum := func(at []float64, what string, rows ...float64) {
		total, size := 0.0, 0.0
		for _, x := range rows {
			total += x
			size = max(size, math.Abs(x))
		}
		// Two roundings of the largest term.
		if !(math.Abs(total) <= 0x1p-52*size) {
			t.Errorf("%v, %v: %s sum to %v, the largest is %v", c, at, what, total, size)
		}
	}
	for _, v := range c.terminals(drives()) {
		r := c.respond(v)
		sum(v, "currents", r.I...)
		sum(v, "derivatives by temperature", r.DT...)
		sum(v, "derivatives by area", r.DArea...)
		column := make([]float64, len(r.I))
		for k := range v {
			for j := range column {
				column[j] = r.DV[j][k]
			}
			sum(v, fmt.Sprintf("derivatives by terminal %d", k), column...)
		}
		for p, param := range c.Kind.Params {
			for j := range column {
				column[j] = r.DP[j][p]
			}
			sum(v, "derivatives by "+param.Name, column...)
		}
	}
}

// terminalOffset is a voltage that moves all terminals; a power of two, so that
// sums with the drives are exact.
const terminalOffset = 64

// differencesOnly: a common voltage on all terminals changes nothing.
func differencesOnly(t testing.TB, c Case) {
	for _, v := range c.terminals(drives()) {
		here := c.respond(v)
		moved := append([]float64(nil), v...)
		for i := range moved {
			moved[i] += terminalOffset
		}
		there := c.respond(moved)
		for j := range here.I {
			if here.I[j] != there.I[j] {
				t.Errorf("%v, %v: terminal %d carries %v, with %v V more on all %v",
					c, v, j, here.I[j], terminalOffset, there.I[j])
			}
			total, size := 0.0, 0.0
			for k, g := range here.DV[j] {
				total += g
				size = max(size, largest(here.DV[k])) // the emitter's are sums
			}
			if math.Abs(total) > 0x1p-51*size {
				t.Errorf("%v, %v: the conductances of terminal %d sum to %v", c, v, j, total)
			}
		}
	}
}

// passive: the power that the terminals take in is not negative. A transistor
// whose v_BC exceeds its Early voltage is outside its model.
func passive(t testing.TB, c Case) {
	early := math.Inf(1)
	if i := c.Kind.Index("VA"); i >= 0 {
		early = c.Params[i]
	}
	for _, v := range c.terminals(append(drives(), -1e6, -1e3, 1e3, 1e6)) {
		if len(v) == 3 && math.Abs(v[1]-v[0]) >= early && (v[1] > v[0]) != c.Kind.PNP {
			continue
		}
		r := c.respond(v)
		power, size := 0.0, 0.0
		for j := range v {
			power += v[j] * r.I[j]
			size += math.Abs(v[j] * r.I[j])
		}
		if !(power >= -4*0x1p-53*size) {
			t.Errorf("%v, %v: it takes in %v W", c, v, power)
		}
	}
}

// finite: no voltage up to 1 MV breaks a model.
func finite(t testing.TB, c Case) {
	extreme := []float64{0, 0.7}
	for _, m := range []float64{1e6, 1e5, 1e4, 1e3, 300, 100, 30, 10, 3, 1} {
		extreme = append(extreme, m, -m)
	}
	for _, v := range c.terminals(extreme) {
		r := c.respond(v)
		all := append(append(append([]float64(nil), r.I...), r.DT...), r.DArea...)
		for j := range r.I {
			if math.Abs(r.I[j]) > 1e30 {
				t.Errorf("%v, %v: %v A", c, v, r.I[j])
			}
			all = append(append(all, r.DV[j]...), r.DP[j]...)
		}
		for _, x := range all {
			if math.IsNaN(x) || math.IsInf(x, 0) {
				t.Fatalf("%v, %v: not finite: %+v", c, v, *r)
			}
		}
	}
}

// rising: a junction's current rises with its voltage; a transistor's base
// current with both of its, its collector current with v_BE (below VA).
func rising(t testing.TB, c Case) {
	grid := make([]float64, 0, 400)
	for v := -8.0; v < 4; v += 0x1p-5 {
		grid = append(grid, v)
	}
	if c.Kind.Shape == netlist.Junction {
		climb(t, c, grid, func(v float64) float64 { return c.respond([]float64{v, 0}).I[0] })
		return
	}
	s := 1.0
	if c.Kind.PNP {
		s = -1
	}
	for _, other := range []float64{-5, 0, 0.5, 0.6875} { // sums with the grid are exact
		climb(t, c, grid, func(v float64) float64 { return s * c.respond(c.transistor(v, other)).I[0] })
		climb(t, c, grid, func(v float64) float64 { return s * c.respond(c.transistor(v, other)).I[1] })
		climb(t, c, grid, func(v float64) float64 { return s * c.respond(c.transistor(other, v)).I[1] })
	}
}

func climb(t testing.TB, c Case, grid []float64, f func(float64) float64) {
	last := math.Inf(-1)
	for _, v := range grid {
		now := f(v)
		if now < last-4*0x1p-52*math.Abs(last) { // less by more than rounding
			t.Errorf("%v: the current falls from %v to %v A at %v V", c, last, now, v)
		}
		last = now
	}
}

// seams: where one formula takes over from another, currents and conductances of
// the two agree. The seams are those that the models tell of.
func seams(t testing.TB, c Case) {
	if c.Kind.Shape == netlist.Junction {
		d, _ := devices.DiodeOf(c.Kind, c.Params, c.Area, c.Kelvin)
		at := []float64{d.Knee * d.NVt}
		if d.Zener {
			at = append(at, -d.Vz-d.KneeZ*d.NzVt, d.NzVt, -d.NzVt)
		}
		for _, v := range at {
			join(t, c, v, func(v float64) []float64 { return []float64{v, 0} })
		}
		return
	}
	b := devices.BipolarOf(c.Kind, c.Params, c.Area, c.Kelvin)
	knee := b.Knee / b.InvNVt
	for _, other := range []float64{-2, 0.5} {
		join(t, c, knee, func(v float64) []float64 { return c.transistor(v, other) })
		join(t, c, knee, func(v float64) []float64 { return c.transistor(other, v) })
	}
	if b.Irec > 0 {
		join(t, c, b.KneeRec/b.InvNrecVt, func(v float64) []float64 { return c.transistor(v, -2) })
	}
	// The transport current changes its form where the junctions come close.
	for k := -8; k <= 8; k++ {
		join(t, c, 0.65+float64(k)/(16*b.InvNVt), func(v float64) []float64 { return c.transistor(v, 0.65) })
	}
}

// join compares the two sides of a seam, a few units in the last place apart.
func join(t testing.TB, c Case, seam float64, at func(float64) []float64) {
	// Wide enough to be on either side though the seam itself is rounded.
	width := 16 * 0x1p-52 * math.Abs(seam)
	left, right := c.respond(at(seam-width)), c.respond(at(seam+width))
	for j := range left.I {
		steep, size := 0.0, 0.0
		for k := range left.DV[j] {
			steep += math.Abs(left.DV[j][k])
			size = max(size, math.Abs(left.DV[j][k]))
		}
		// The current may move by its slope and by rounding.
		if d := math.Abs(left.I[j] - right.I[j]); !(d <= 4*width*steep+16*0x1p-52*math.Abs(left.I[j])) {
			t.Errorf("%v: at %v V terminal %d jumps from %v to %v A", c, seam, j, left.I[j], right.I[j])
		}
		for k := range left.DV[j] {
			// The slope may move by the curvature: an exponential's argument of
			// at most 1e4 times 32 roundings.
			if d := math.Abs(left.DV[j][k] - right.DV[j][k]); !(d <= 1e-10*size) {
				t.Errorf("%v: at %v V the conductance %d,%d jumps from %v to %v S",
					c, seam, j, k, left.DV[j][k], right.DV[j][k])
			}
		}
	}
}
