package follow

import "math"

// zero finds a sign change of f between a and b, where its values fa and fb have
// opposite signs or one is 0, to within tol. It returns both sides of it: x, the
// better one, and across, within 2 tol of x unless f(x) is exactly 0. It is not
// ok if f is not.
//
// Method: R. P. Brent, Algorithms for Minimization without Derivatives, 1973,
// chapter 4: interpolation by an inverse parabola or a secant, and bisection
// where they would not shrink the bracket fast enough.
func zero(f func(float64) (float64, bool), a, b, fa, fb, tol float64) (x, across float64, ok bool) {
	// b is the best point, c the other side, a the point before b.
	c, fc := a, fa
	width := b - a
	before := width // the move before the last one
	for {
		if (fb < 0) == (fc < 0) {
			c, fc = a, fa
			width, before = b-a, b-a
		}
		if math.Abs(fc) < math.Abs(fb) {
			a, b, c = b, c, b
			fa, fb, fc = fb, fc, fb
		}
		// No bracket of doubles is narrower than the spacing at b.
		least := tol + 2*epsilon*math.Abs(b)
		half := (c - b) / 2
		if math.Abs(half) <= least || fb == 0 {
			return b, c, true
		}
		move := half
		if math.Abs(before) >= least && math.Abs(fa) > math.Abs(fb) {
			if m := interpolate(a, b, c, fa, fb, fc); m*half > 0 &&
				math.Abs(m) < math.Min(1.5*math.Abs(half)-least/2, math.Abs(before)/2) {
				move = m
			}
		}
		if move == half {
			width = half
		}
		before, width = width, move
		a, fa = b, fb
		if math.Abs(move) < least {
			move = math.Copysign(least, half)
		}
		b += move
		if fb, ok = f(b); !ok {
			return b, c, false
		}
	}
}

// epsilon is the spacing of doubles at 1.
const epsilon = 0x1p-52

// interpolate is the move from b to the zero of the inverse parabola through
// three points, or of the secant if a is c.
func interpolate(a, b, c, fa, fb, fc float64) float64 {
	if a == c || fa == fc {
		return -fb * (b - c) / (fb - fc)
	}
	r, s, t := fb/fc, fb/fa, fa/fc
	p := s * (t*(r-t)*(c-b) - (1-r)*(b-a))
	q := (t - 1) * (r - 1) * (s - 1)
	if a == b || q == 0 {
		return math.NaN()
	}
	return p / q
}
