package chart

import "math"

// apart moves places, which are in rising order, so that each is at least gap from
// the one before it and all lie within low and high where there is room, and moves
// them no further than they must be (least squares; pool adjacent violators). Where
// there is no room, they are spaced evenly over what there is.
func apart(places []float64, gap, low, high float64) []float64 {
	n := len(places)
	if n == 0 {
		return nil
	}
	if room := high - low; float64(n-1)*gap > room {
		gap = room / float64(n-1)
	}
	// With the gaps taken out, the places must only rise.
	type pool struct {
		sum   float64
		count int
	}
	var pools []pool
	for i, p := range places {
		next := pool{p - float64(i)*gap, 1}
		for k := len(pools) - 1; k >= 0 && pools[k].sum/float64(pools[k].count) >= next.sum/float64(next.count); k-- {
			next.sum += pools[k].sum
			next.count += pools[k].count
			pools = pools[:k]
		}
		pools = append(pools, next)
	}
	out := make([]float64, 0, n)
	for _, p := range pools {
		at := p.sum / float64(p.count)
		at = math.Max(low, math.Min(at, high-float64(n-1)*gap))
		for range p.count {
			out = append(out, at+float64(len(out))*gap)
		}
	}
	return out
}
