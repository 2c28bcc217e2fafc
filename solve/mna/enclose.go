package mna

import (
	"math"

	"biaswright/solve/interval"
)

// An Enclosure is intervals in which the exact solution of the stated equations lies.
type Enclosure struct {
	// V is each local node's voltage in V; I[d][j] the current into terminal j of
	// device d in A.
	V    []interval.I
	I    [][3]interval.I
	Rail []interval.I // what each rail delivers, in A
}

// Slack is the share by which a coefficient of the balances, as a double, may differ from
// the one that the stated equations have: the roundings of a saturation current, computed
// through exponents of some dozens, are about a hundred units in the last place; this is
// ten times as many.
const Slack = 1e-13

// Enclose bounds all voltages and currents over a box of the unknowns in which the solution
// lies; the numbers in force and no ramp.
func (s *System) Enclose(x []interval.I) *Enclosure {
	e := &Enclosure{V: make([]interval.I, s.nodes), I: make([][3]interval.I, len(s.devices)), Rail: make([]interval.I, len(s.behind))}
	for node, row := range s.row {
		e.V[node] = sure(s.full[node])
		if int(row) < s.n {
			e.V[node] = e.V[node].Add(x[row])
		}
	}
	for _, b := range s.between {
		e.V[b.node] = e.V[b.from].Scale(1 - b.share).Add(e.V[b.to].Scale(b.share))
	}
	for i := range s.devices {
		e.I[i] = s.encloseDevice(&s.devices[i], e.V)
	}
	for rail, terminals := range s.behind {
		for _, t := range terminals {
			e.Rail[rail] = e.Rail[rail].Add(e.I[t.device][t.at])
		}
	}
	return e
}

// sure holds a sum of a few decimals, each rounded to a double.
func sure(volts float64) interval.I {
	const roundings = 4 * 1.2e-16 // of 2^-53 each
	w := interval.Up(roundings * math.Abs(volts))
	return interval.I{Lo: interval.Down(volts - w), Hi: interval.Up(volts + w)}
}

// loose widens by the slack.
func loose(a interval.I) interval.I {
	w := interval.Up(Slack * a.Mag())
	return interval.I{Lo: interval.Down(a.Lo - w), Hi: interval.Up(a.Hi + w)}
}

func (s *System) encloseDevice(d *device, v []interval.I) [3]interval.I {
	through := func(i interval.I) [3]interval.I { return [3]interval.I{i, i.Neg()} }
	a, b := v[d.node[0]], v[d.node[1]]
	switch d.kind {
	case resistorDevice, bulkDevice:
		return through(loose(a.Sub(b).Scale(s.resistors[d.at].g)))
	case sourceDevice:
		return through(interval.Of(s.sources[d.at].amps))
	case junctionDevice:
		j := &s.junctions[d.at]
		u := a.Sub(b).Scale(j.share)
		i := loose(u.Over(j.d.NVt).Expm1().Scale(j.d.Isat))
		if j.d.Zener {
			// (exp(y) - e0)/(1 - e0), y = -(u + Vz)/(nz V_T)
			rise := u.Add(interval.Of(j.d.Vz)).Over(-j.d.NzVt).Exp().Sub(interval.Of(j.d.Vz).Over(-j.d.NzVt).Exp())
			i = i.Sub(loose(rise.Scale(j.d.Iz * j.d.Inv1mE0)))
		}
		return through(i)
	}
	q := &s.bipolars[d.at]
	k := &q.k
	be, bc := b.Sub(v[d.node[2]]).Scale(q.sign), b.Sub(a).Scale(q.sign)
	f, r := loose(be.Scale(k.InvNVt).Expm1().Scale(k.Isat)), loose(bc.Scale(k.InvNVt).Expm1().Scale(k.Isat))
	ic := f.Sub(r).Mul(interval.Of(1).Sub(loose(bc.Scale(k.InvVA)))).Sub(loose(r.Scale(k.InvBetaR)))
	ib := loose(f.Scale(k.InvBetaF)).Add(loose(r.Scale(k.InvBetaR)))
	if k.Irec > 0 {
		ib = ib.Add(loose(be.Scale(k.InvNrecVt).Expm1().Scale(k.Irec)))
	}
	return [3]interval.I{ic.Scale(q.sign), ib.Scale(q.sign), ic.Add(ib).Scale(-q.sign)}
}

// ElementCurrent is the enclosure of a current of an element by its symbol, "I", "Ic",
// "Ib" or "Ie", along its arrow or positive in normal use; false where it is not a
// device's.
func (s *System) ElementCurrent(e *Enclosure, element int, symbol string) (interval.I, bool) {
	if s.first[element] == s.first[element+1] {
		return interval.I{}, false // an ideal voltage: its current follows from others
	}
	el := &s.circuit.Elements[element]
	dev := s.carrier(element, 0)
	sign := 1.0
	switch symbol {
	case "I":
		if el.Reversed {
			sign = -1
		}
		return e.I[dev][0].Scale(sign), s.devices[dev].kind != bipolarDevice
	case "Ic", "Ib", "Ie":
		if s.devices[dev].kind != bipolarDevice {
			return interval.I{}, false
		}
		at := map[string]int{"Ic": 0, "Ib": 1, "Ie": 2}[symbol]
		sign = s.bipolars[s.devices[dev].at].sign
		if at == 2 {
			sign = -sign
		}
		return e.I[dev][at].Scale(sign), true
	}
	return interval.I{Lo: math.NaN(), Hi: math.NaN()}, false
}
