package quantity

import (
	"fmt"
	"math"
	"slices"
	"strconv"
)

// The preferred numbers of IEC 60063. E3 to E24 predate the rule of the others:
// ten of E24's numbers, among them those marked, are not the rounded powers, so
// they stand here as the standard lists them.
var e24 = []int{10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91}

// SeriesNames are the series, from coarse to fine.
var SeriesNames = []string{"E3", "E6", "E12", "E24", "E48", "E96", "E192"}

// A Numbers is a series of preferred numbers, 100 to 999, in rising order.
type Numbers []int

var series = func() map[string]Numbers {
	m := map[string]Numbers{}
	for _, name := range SeriesNames {
		count, _ := strconv.Atoi(name[1:])
		m[name] = generate(count)
	}
	return m
}()

func generate(count int) Numbers {
	out := make(Numbers, count)
	for i := range out {
		if count <= len(e24) {
			out[i] = 10 * e24[i*len(e24)/count]
			continue
		}
		out[i] = int(math.Round(100 * math.Pow(10, float64(i)/float64(count))))
		if out[i] == 919 {
			out[i] = 920 // the standard's one exception, in E192 alone
		}
	}
	return out
}

// Series returns a series by its name, E3 to E192. The caller must not modify it.
func Series(name string) (Numbers, bool) {
	s, ok := series[name]
	return s, ok
}

// Values returns the series as numbers from 1 up to 10, as the standard has them.
func (s Numbers) Values() []float64 {
	out := make([]float64, len(s))
	for i, n := range s {
		out[i] = float64(n) / 100 // division rounds once, so these are the nearest floats
	}
	return out
}

// Neighbours returns the largest preferred value that is not above v and the
// smallest that is not below it; both are v where v is preferred itself. v is
// positive and finite; otherwise both are NaN.
func (s Numbers) Neighbours(v float64) (below, above float64) {
	if !(v > 0) || math.IsInf(v, 1) {
		return math.NaN(), math.NaN()
	}
	decade := decimal(v, -1).exponent
	i := slices.IndexFunc(s, func(n int) bool { return s.at(n, decade) >= v })
	switch {
	case i < 0:
		return s.at(s[len(s)-1], decade), s.at(s[0], decade+1)
	case s.at(s[i], decade) == v:
		return v, v
	case i == 0:
		return s.at(s[len(s)-1], decade-1), s.at(s[0], decade)
	}
	return s.at(s[i-1], decade), s.at(s[i], decade)
}

// Nearest returns the preferred value whose ratio to v is nearest to 1, the lower
// one of equals. v is positive and finite; otherwise it is NaN.
func (s Numbers) Nearest(v float64) float64 {
	below, above := s.Neighbours(v)
	if v/below <= above/v {
		return below
	}
	return above
}

// at is a number of the series in a decade, the float nearest to it.
func (Numbers) at(n, decade int) float64 {
	v, err := strconv.ParseFloat(fmt.Sprintf("%de%d", n, decade-2), 64) // n has three digits
	if err != nil {
		return math.Inf(1) // beyond the largest float
	}
	return v
}
