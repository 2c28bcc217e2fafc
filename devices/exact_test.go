package devices_test

import (
	"math"
	"math/big"
	"testing"

	"github.com/cockroachdb/apd/v3"

	"biaswright/devices"
	"biaswright/devices/conform"
	"biaswright/netlist"
)

// The equations once more, in the order in which the package documentation writes
// them, at forty digits: plain and slow. Differences of them give derivatives to
// more digits than a double has.

var digits = apd.BaseContext.WithPrecision(40)

type num = *apd.Decimal

func must(_ apd.Condition, err error) {
	if err != nil {
		panic(err)
	}
}

func add(a, b num) num { r := new(apd.Decimal); must(digits.Add(r, a, b)); return r }
func sub(a, b num) num { r := new(apd.Decimal); must(digits.Sub(r, a, b)); return r }
func mul(a, b num) num { r := new(apd.Decimal); must(digits.Mul(r, a, b)); return r }
func quo(a, b num) num { r := new(apd.Decimal); must(digits.Quo(r, a, b)); return r }
func exp(a num) num    { r := new(apd.Decimal); must(digits.Exp(r, a)); return r }
func ln(a num) num     { r := new(apd.Decimal); must(digits.Ln(r, a)); return r }

func text(s string) num {
	r, _, err := apd.NewFromString(s)
	if err != nil {
		panic(err)
	}
	return r
}

// exactly is the double itself, not the shortest text that reads back as it.
func exactly(x float64) num { return text(new(big.Float).SetFloat64(x).Text('e', 60)) }

func double(a num) float64 {
	f, err := a.Float64()
	if err != nil {
		panic(err)
	}
	return f
}

var (
	one = text("1")
	// k/q by the SI's defining constants.
	perKelvin = quo(text("1.380649e-23"), text("1.602176634e-19"))
)

// A sheet is a case in decimals: parameters by name (absent where not stated or
// infinite), and what is not a parameter.
type sheet struct {
	kind         *netlist.Kind
	p            map[string]num
	area, kelvin num
	v            []num
}

func sheetOf(c conform.Case, v []float64) sheet {
	s := sheet{kind: c.Kind, p: map[string]num{}, area: exactly(c.Area), kelvin: exactly(c.Kelvin)}
	for i, x := range c.Params {
		if !math.IsNaN(x) && !math.IsInf(x, 0) {
			s.p[c.Kind.Params[i].Name] = exactly(x)
		}
	}
	for _, x := range v {
		s.v = append(s.v, exactly(x))
	}
	return s
}

// t0 is T0 in K: as a double the models add 273.15 as a double, so this does too.
func (s sheet) t0() num { return add(s.p["T0"], exactly(273.15)) }

func (s sheet) vt() num { return mul(perKelvin, s.kelvin) }

// ratio is Isat(T)/Isat(T0) for an ideality n.
func (s sheet) ratio(n num) num {
	t0 := s.t0()
	power := exp(mul(quo(text("3"), n), ln(quo(s.kelvin, t0))))
	gap := quo(s.p["Egap"], mul(n, perKelvin))
	return mul(power, exp(mul(gap, sub(quo(one, t0), quo(one, s.kelvin)))))
}

// isat is Isat(T) times the area, stated as itself or by a point.
func (s sheet) isat(point string) num {
	amps, ok := s.p["Isat"]
	if !ok {
		v := s.p[point]
		if bulk, ok := s.p["Rbulk"]; ok {
			v = sub(v, mul(bulk, s.p[point+".at"]))
		}
		x := quo(v, mul(s.p["n"], mul(perKelvin, s.t0())))
		amps = quo(s.p[point+".at"], sub(exp(x), one))
	}
	return mul(s.area, mul(amps, s.ratio(s.p["n"])))
}

// currents are those into anode and cathode, or collector, base and emitter; terms
// is the sum of the magnitudes of what they are made of.
func (s sheet) currents() (out []num, terms float64) {
	if s.kind.Shape == netlist.Junction {
		return s.junction()
	}
	return s.transistor()
}

func (s sheet) junction() ([]num, float64) {
	v := sub(s.v[0], s.v[1])
	i := mul(s.isat("drop"), sub(exp(quo(v, mul(s.p["n"], s.vt()))), one))
	terms := math.Abs(double(i))
	if vz, ok := s.p["Vz"]; ok {
		vz = add(vz, mul(s.p["drift"], sub(s.kelvin, s.t0())))
		iz := s.p["Vz.at"]
		nz, ok := s.p["nz"]
		if !ok {
			nz = quo(mul(s.p["rz"], iz), mul(perKelvin, s.t0()))
		}
		w := mul(nz, s.vt())
		e0 := exp(quo(vz, mul(text("-1"), w)))
		y := quo(add(v, vz), mul(text("-1"), w))
		b := mul(mul(s.area, iz), quo(sub(exp(y), e0), sub(one, e0)))
		i = sub(i, b)
		terms += math.Abs(double(b))
	}
	return []num{i, mul(text("-1"), i)}, terms
}

func (s sheet) transistor() ([]num, float64) {
	sense, point := one, "Vbe"
	if s.kind.PNP {
		sense, point = text("-1"), "Veb"
	}
	vbe, vbc := mul(sense, sub(s.v[1], s.v[2])), mul(sense, sub(s.v[1], s.v[0]))
	isat, nvt := s.isat(point), mul(s.p["n"], s.vt())
	forward := mul(isat, sub(exp(quo(vbe, nvt)), one))
	reverse := mul(isat, sub(exp(quo(vbc, nvt)), one))
	transport := sub(forward, reverse)
	if va, ok := s.p["VA"]; ok {
		transport = mul(transport, sub(one, quo(vbc, va)))
	}
	ic, ib := transport, new(apd.Decimal)
	if beta, ok := s.p["betaR"]; ok {
		ic, ib = sub(ic, quo(reverse, beta)), add(ib, quo(reverse, beta))
	}
	if beta, ok := s.p["betaF"]; ok {
		beta = mul(beta, add(one, mul(s.p["betaDrift"], sub(s.kelvin, s.t0()))))
		ib = add(ib, quo(forward, beta))
	}
	rec := mul(s.area, mul(s.p["Irec"], s.ratio(s.p["nrec"])))
	rec = mul(rec, sub(exp(quo(vbe, mul(s.p["nrec"], s.vt()))), one))
	ib = add(ib, rec)
	ic, ib = mul(sense, ic), mul(sense, ib)
	terms := math.Abs(double(transport)) + math.Abs(double(forward)) + math.Abs(double(reverse)) + math.Abs(double(rec))
	return []num{ic, ib, mul(text("-1"), add(ic, ib))}, terms
}

// slope differentiates the currents by whatever bump moves, about a value whose
// own size is x. A step of 1e-13 leaves an error below 1e-22 from the third
// derivative and, of the forty digits, twenty-seven.
func (s sheet) slope(x float64, bump func(*sheet, num)) []float64 {
	h := mul(text("1e-13"), exactly(math.Max(math.Abs(x), 1e-3)))
	moved := func(h num) []num {
		m := s
		m.p = make(map[string]num, len(s.p))
		for k, v := range s.p {
			m.p[k] = v
		}
		m.v = append([]num(nil), s.v...)
		bump(&m, h)
		i, _ := m.currents()
		return i
	}
	up, down := moved(h), moved(mul(text("-1"), h))
	out := make([]float64, len(up))
	for j := range out {
		out[j] = double(quo(sub(up[j], down[j]), add(h, h)))
	}
	return out
}

// The points, in npn senses: active, saturated, reverse, off.
var points = map[netlist.Shape][][]float64{
	netlist.Junction:   {{0x1p-20, 0}, {0.6, 0}, {-0.04, 0}, {-5.5, 0}},
	netlist.Transistor: {{5, 0.65, 0}, {0.05, 0.7, 0}, {-0.7, 0.01, 0}, {1, -3, 0}},
}

// Every current and derivative agrees with the equations to what rounding of the
// exponents allows: their arguments, at most about 60 here, carry a few units in
// their last place, and the derivatives multiply by an argument once more.
func TestAgainstFortyDigits(t *testing.T) {
	const (
		ofCurrents    = 60 * 4 * 0x1p-53
		ofDerivatives = 8 * ofCurrents
	)
	worst, worstSlope := 0.0, 0.0
	all := cases(t)
	for i, c := range all {
		if i%2 == 0 && i%8 != 0 { // a half is slow enough; conform looks at all
			continue
		}
		for _, v := range points[c.Kind.Shape] {
			if c.Kind.PNP {
				v = []float64{-v[0], -v[1], -v[2]}
			}
			var r devices.Response
			devices.Evaluate(c.Kind, c.Params, c.Area, v, c.Kelvin, &r)
			s := sheetOf(c, v)
			want, terms := s.currents()
			for j := range want {
				off := math.Abs(r.I[j]-double(want[j])) / terms
				worst = max(worst, off)
				if !(off <= ofCurrents) {
					t.Errorf("%v, %v: I%d is %v, the equations give %v", c, v, j, r.I[j], double(want[j]))
				}
			}
			judge := func(what string, got []float64, x float64, bump func(*sheet, num)) {
				want := s.slope(x, bump)
				for j := range want {
					// A derivative is judged beside the currents over the size of
					// what moves, from which rounding comes.
					scale := math.Abs(want[j]) + terms/math.Max(math.Abs(x), 1e-3)
					off := math.Abs(got[j]-want[j]) / scale
					worstSlope = max(worstSlope, off)
					if !(off <= ofDerivatives) {
						t.Errorf("%v, %v: dI%d/d%s is %v, the equations give %v", c, v, j, what, got[j], want[j])
					}
				}
			}
			for k := range v {
				column := make([]float64, len(v))
				for j := range column {
					column[j] = r.DV[j][k]
				}
				judge("V", column, 0.025, func(m *sheet, h num) { m.v[k] = add(m.v[k], h) })
			}
			judge("T", r.DT, c.Kelvin, func(m *sheet, h num) { m.kelvin = add(m.kelvin, h) })
			judge("area", r.DArea, c.Area, func(m *sheet, h num) { m.area = add(m.area, h) })
			for k, param := range c.Kind.Params {
				if s.p[param.Name] == nil || param.Rating {
					continue
				}
				column := make([]float64, len(v))
				for j := range column {
					column[j] = r.DP[j][k]
				}
				size := c.Params[k]
				if param.Name == "Irec" && size == 0 {
					continue // conform's differences judge it
				}
				judge(param.Name, column, size, func(m *sheet, h num) { m.p[param.Name] = add(m.p[param.Name], h) })
			}
		}
	}
	t.Logf("worst: currents %.1e of their terms, derivatives %.1e", worst, worstSlope)
}
