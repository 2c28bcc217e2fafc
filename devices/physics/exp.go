package physics

import "math"

// The reduction x = k ln2/128 + r. The step is split in two so that k·high is
// exact for every |k| below 2^17: high has 35 leading bits of ln2/128, low the
// double of what is left.
const (
	stepsPerUnit = 0x1.71547652b82fep+7  // 128/ln2
	stepHigh     = 0x1.62e42fef8p-8      // ln2/128, 35 bits
	stepLow      = 0x1.1cf79abc9e3b4p-43 // the rest
	// Adding and taking away 1.5·2^52 rounds to the nearest whole number, and
	// leaves that number in the low bits of the sum.
	rounder = 0x1.8p52
	// Below this magnitude neither exp(x) nor its power of two leaves the normal
	// doubles (which end at exp(-708.4) and exp(709.8)).
	tableLimit = 708
)

// Exp is e^x, within 0.51 units in the last place for |x| < 708; beyond that as
// math.Exp.
//
// It writes e^x as 2^(k/128) e^r with |r| below 0.0028, takes the power from a
// table and e^r from five terms of its series: the sixth, r^6/720, is below 2^-60.
// (Method: Tang, ACM Transactions on Mathematical Software 15, 1989, from memory.)
func Exp(x float64) float64 {
	if !(math.Abs(x) < tableLimit) {
		return math.Exp(x)
	}
	shifted := x*stepsPerUnit + rounder
	k := shifted - rounder
	r := (x - k*stepHigh) - k*stepLow
	p := r + r*r*(1.0/2+r*(1.0/6+r*(1.0/24+r*(1.0/120))))
	bits := math.Float64bits(shifted)
	t := &powers[bits&127]
	// The low bits of shifted hold k in two's complement; its part above 7 bits
	// is the power of two, moved into the exponent of the table's entry.
	s := math.Float64frombits(math.Float64bits(t.high) + bits>>7<<52)
	return s + s*(p+t.rest)
}

// ExpExpm1 is e^x, and e^x - 1 without cancellation near 0, within 0.51 and about
// 1.5 units in the last place; one costs hardly more than both.
func ExpExpm1(x float64) (e, em1 float64) {
	if !(math.Abs(x) < tableLimit) {
		if x < 0 {
			return math.Exp(x), -1
		}
		return math.Exp(x), math.Expm1(x)
	}
	// As in Exp, which stands apart only because a shared part would not inline.
	shifted := x*stepsPerUnit + rounder
	k := shifted - rounder
	r := (x - k*stepHigh) - k*stepLow
	p := r + r*r*(1.0/2+r*(1.0/6+r*(1.0/24+r*(1.0/120))))
	bits := math.Float64bits(shifted)
	t := &powers[bits&127]
	s := math.Float64frombits(math.Float64bits(t.high) + bits>>7<<52)
	tail := s * (p + t.rest)
	// s - 1 is exact for s between 1/2 and 2, where cancellation would hurt; for
	// k = 0 it vanishes and tail is the series itself.
	return s + tail, (s - 1) + tail
}

// MaxCurrent is the current in A at which the exponential of a junction gives way
// to its tangent. No conductor carries it, so no solution of a built circuit lies
// there. With it a junction of n = 1 at 1 MV and 230 K has 5e24 A on its tangent,
// and a transistor with an Early voltage of 20 V, whose product adds a factor of
// 5e4, stays below 1e30 A.
const MaxCurrent = 1e17

// Knee is the argument at which isat·e^x reaches MaxCurrent, for a current isat in
// A; never beyond the range of the doubles.
func Knee(isat float64) float64 {
	return math.Min(math.Log(MaxCurrent/isat), tableLimit)
}

// Junction is the guarded exponential of a junction, e^x - 1 up to the knee and
// its tangent there beyond, with its derivative: finite for every finite x, once
// continuously differentiable, increasing. Far in reverse the derivative e^x stays
// as long as a double can hold it, so that junctions in series share a reverse
// voltage in a regular system.
func Junction(x, knee float64) (f, df float64) {
	if x <= knee {
		df, f = ExpExpm1(x)
		return f, df
	}
	df, f = ExpExpm1(knee)
	return f + df*(x-knee), df
}
