package conform

import (
	"math"
	"testing"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
)

// derivatives: each agrees with the differences of the currents.
func derivatives(t testing.TB, c Case) {
	judged := 0
	for _, v := range c.terminals([]float64{-6, -5.5, -0.25, 0.0078125, 0.5, 0.6875}) {
		r := c.respond(v)
		for j := range r.I {
			judge := func(what string, analytic, x, step float64, oneSided bool, set func(*Case, []float64, float64)) {
				f := func(x float64) float64 {
					moved := c
					moved.Params = append([]float64(nil), c.Params...)
					at := append([]float64(nil), v...)
					set(&moved, at, x)
					return moved.respond(at).I[j]
				}
				got, doubt := difference(f, x, step, oneSided)
				// The currents that the derivative is made from, over the step in
				// which they change, bound what differences can see.
				scale := math.Abs(analytic) + largest(r.I)/step*1e-3
				if !(math.Abs(got-analytic) <= 1e-6*scale+20*doubt) {
					t.Errorf("%v, %v: dI%d/d%s is %v, differences give %v ± %v", c, v, j, what, analytic, got, doubt)
				}
				if doubt <= 1e-5*math.Abs(analytic) {
					judged++
				}
			}
			for k := range v {
				judge("V", r.DV[j][k], v[k], 0.02, false, func(_ *Case, at []float64, x float64) { at[k] = x })
			}
			judge("T", r.DT[j], c.Kelvin, 2, false, func(m *Case, _ []float64, x float64) { m.Kelvin = x })
			judge("area", r.DArea[j], c.Area, c.Area/8, false, func(m *Case, _ []float64, x float64) { m.Area = x })
			for p, param := range c.Kind.Params {
				x := c.Params[p]
				if math.IsNaN(x) || math.IsInf(x, 0) || param.Rating {
					if r.DP[j][p] != 0 {
						t.Errorf("%v, %v: dI%d/d%s is %v though it is not a number that counts", c, v, j, param.Name, r.DP[j][p])
					}
					continue
				}
				oneSided := x == 0 && param.Sign == netlist.NotNegative
				judge(param.Name, r.DP[j][p], x, stepOf(param, x), oneSided,
					func(m *Case, _ []float64, x float64) { m.Params[p] = x })
			}
		}
	}
	if judged == 0 {
		t.Errorf("%v: differences were too rough to judge any derivative", c)
	}
}

// stepOf is a first step for a parameter at x: small beside what changes the
// currents by a factor e, and of the unit's size where x is 0.
func stepOf(p netlist.Param, x float64) float64 {
	switch {
	case p.Unit == quantity.Celsius:
		return 2
	case p.Unit == quantity.Volt && x < 10: // a drop or a breakdown voltage
		return 0.02
	case p.Unit == quantity.EV:
		return 0.1
	case x != 0:
		return math.Abs(x) / 64
	case p.Unit == quantity.Ohm:
		return 0.1
	case p.Unit == quantity.Ampere:
		return 1e-14
	}
	return 1e-4 // drifts, per kelvin
}

// difference estimates f'(x) from differences whose step is halved until rounding
// takes over, extrapolated to a step of 0, and how far it may be off (Ridders'
// scheme: Advances in Engineering Software 4, 1982, from memory). One-sided
// differences have errors in every power of the step, central ones in even powers.
func difference(f func(float64) float64, x, step float64, oneSided bool) (best, doubt float64) {
	const rows = 9
	var table [rows][rows]float64
	doubt = math.Inf(1)
	here := f(x)
	for i := range rows {
		if oneSided {
			table[i][0] = (f(x+step) - here) / step
		} else {
			table[i][0] = (f(x+step) - f(x-step)) / (2 * step)
		}
		factor := 1.0
		for j := 1; j <= i; j++ {
			factor *= 4
			if oneSided {
				factor /= 2
			}
			table[i][j] = (factor*table[i][j-1] - table[i-1][j-1]) / (factor - 1)
			e := max(math.Abs(table[i][j]-table[i][j-1]), math.Abs(table[i][j]-table[i-1][j-1]))
			if e <= doubt {
				doubt, best = e, table[i][j]
			}
		}
		step /= 2
	}
	return best, doubt
}

func largest(s []float64) float64 {
	m := 0.0
	for _, x := range s {
		m = max(m, math.Abs(x))
	}
	return m
}
