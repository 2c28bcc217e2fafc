package reftest

import (
	"math"
	"strconv"

	"github.com/cockroachdb/apd/v3"
)

// Arithmetic in 40 decimal digits, in a shape that lets the equations be read.
// It shares nothing with the models: no code, no constant, no exponential.

type dec = *apd.Decimal

const digits = 40

var decimals = func() *apd.Context {
	c := apd.BaseContext.WithPrecision(digits)
	c.MaxExponent, c.MinExponent = 10000, -10000 // exponentials far outside what a double holds
	c.Traps = apd.InvalidOperation | apd.DivisionByZero | apd.Overflow
	return c
}()

// exactly takes a double with all its digits, of which 40 are kept.
func exactly(x float64) dec {
	d, _, err := decimals.NewFromString(strconv.FormatFloat(x, 'e', digits, 64))
	return checked(d, err)
}

func literal(s string) dec {
	d, _, err := decimals.NewFromString(s)
	return checked(d, err)
}

func checked(d dec, err error) dec {
	if err != nil {
		panic(err) // an equation met a number that it is not made for
	}
	return d
}

func binary(op func(d, x, y *apd.Decimal) (apd.Condition, error), x, y dec) dec {
	d := new(apd.Decimal)
	_, err := op(d, x, y)
	return checked(d, err)
}

func add(x, y dec) dec { return binary(decimals.Add, x, y) }
func sub(x, y dec) dec { return binary(decimals.Sub, x, y) }
func mul(x, y dec) dec { return binary(decimals.Mul, x, y) }
func div(x, y dec) dec { return binary(decimals.Quo, x, y) }
func pow(x, y dec) dec { return binary(decimals.Pow, x, y) }

func exp(x dec) dec {
	d := new(apd.Decimal)
	_, err := decimals.Exp(d, x)
	return checked(d, err)
}

func neg(x dec) dec { return new(apd.Decimal).Neg(x) }

func float(x dec) float64 {
	f, err := x.Float64()
	if err != nil && math.IsNaN(f) {
		panic(err)
	}
	return f
}

var (
	one  = literal("1")
	zero = literal("0")
	// The SI's exact constants (SI Brochure, 9th edition, table 1): J/K and C.
	boltzmann = literal("1.380649e-23")
	charge    = literal("1.602176634e-19")
	iceKelvin = literal("273.15")
)

// thermal is kT/q in V.
func thermal(kelvin dec) dec { return div(mul(boltzmann, kelvin), charge) }

// scaled is a saturation current at a temperature: Isat(T) =
// Isat (T/T0)^(3/n) exp((q Egap/(n k))(1/T0 - 1/T)).
func scaled(isat, n, egap, t, t0 dec) dec {
	if t.Cmp(t0) == 0 {
		return isat
	}
	p := pow(div(t, t0), div(literal("3"), n))
	e := mul(div(mul(charge, egap), mul(n, boltzmann)), sub(div(one, t0), div(one, t)))
	return mul(isat, mul(p, exp(e)))
}

// A junctionModel is a diode at one temperature; iz is nil without a breakdown.
type junctionModel struct {
	isat, nvt    dec
	iz, vz, nzvt dec
	rbulk        dec
}

// across is the current at a junction voltage inside Rbulk, with its slope in S.
func (m *junctionModel) across(v dec) (i, g dec) {
	e := exp(div(v, m.nvt))
	i, g = mul(m.isat, sub(e, one)), div(mul(m.isat, e), m.nvt)
	if m.iz == nil {
		return i, g
	}
	e0 := exp(neg(div(m.vz, m.nzvt)))
	b := exp(neg(div(add(v, m.vz), m.nzvt)))
	scale := div(m.iz, sub(one, e0))
	return sub(i, mul(scale, sub(b, e0))), add(g, div(mul(scale, b), m.nzvt))
}

// current is the current at the voltage of the whole part, Rbulk included, and
// the slope there: v_j + Rbulk i(v_j) = v, by Newton from the double's answer.
func (m *junctionModel) current(v dec, guess float64) (i, g dec) {
	if m.rbulk.IsZero() {
		return m.across(v)
	}
	vj := sub(v, mul(m.rbulk, exactly(guess)))
	for range 8 { // doubles the digits each time; 16 at the start
		i, g = m.across(vj)
		excess := sub(add(vj, mul(m.rbulk, i)), v)
		vj = sub(vj, div(excess, add(one, mul(m.rbulk, g))))
	}
	i, g = m.across(vj)
	return i, div(g, add(one, mul(m.rbulk, g)))
}

// A bipolarModel is a transistor at one temperature, in npn senses. An infinite
// parameter is nil.
type bipolarModel struct {
	isat, nvt, betaF, betaR, va, irec, nrecvt dec
}

// currents are I_C and I_B by the transport form, with conductances for the
// rounding of a balance: the junctions' own, and the collector's through the
// Early factor, in S.
func (m *bipolarModel) currents(vbe, vbc dec) (ic, ib dec, gbe, gbc, gce float64) {
	ef, er := exp(div(vbe, m.nvt)), exp(div(vbc, m.nvt))
	f, r := mul(m.isat, sub(ef, one)), mul(m.isat, sub(er, one))
	early := one
	if m.va != nil {
		early = sub(one, div(vbc, m.va))
		gce = math.Abs(float(div(sub(f, r), m.va)))
	}
	ic, ib = mul(sub(f, r), early), zero
	if m.betaR != nil {
		ic, ib = sub(ic, div(r, m.betaR)), add(ib, div(r, m.betaR))
	}
	if m.betaF != nil {
		ib = add(ib, div(f, m.betaF))
	}
	gf, gr := float(div(mul(m.isat, ef), m.nvt)), float(div(mul(m.isat, er), m.nvt))
	scale := math.Abs(float(early))
	gbe, gbc = gf*max(scale, 1), gr*max(scale, 1)
	if !m.irec.IsZero() {
		e := exp(div(vbe, m.nrecvt))
		ib = add(ib, mul(m.irec, sub(e, one)))
		gbe += float(div(mul(m.irec, e), m.nrecvt))
	}
	return ic, ib, gbe, gbc, gce
}
