package devices

import (
	"math"
	"testing"

	"biaswright/devices/physics"
	"biaswright/netlist"
)

// params gives a kind's parameters as the language hands them over: defaults, what
// is stated in their place, and NaN for the rivals of what is stated.
func params(t testing.TB, kind string, stated map[string]float64) (*netlist.Kind, []float64) {
	t.Helper()
	k, ok := Catalogue().Kind(kind)
	if !ok {
		t.Fatalf("no kind %q", kind)
	}
	p := make([]float64, len(k.Params))
	for i, param := range k.Params {
		p[i] = param.Default
	}
	for name, value := range stated {
		i := k.Index(name)
		if i < 0 {
			t.Fatalf("%s has no %q", kind, name)
		}
		p[i] = value
		for _, rival := range k.Params[i].Rivals {
			p[k.Index(rival)] = math.NaN()
		}
	}
	return k, p
}

// A stated point is met to two units in the last place, whatever the temperature
// at which it is stated and whatever the other parameters.
func TestStatedPointsComeBack(t *testing.T) {
	for _, t0 := range []float64{25, -40, 27, 88.8} {
		for _, area := range []float64{1, 8, 0.3} {
			k, p := params(t, "diode", map[string]float64{"drop": 0.62, "drop.at": 1e-3, "n": 1.8, "Rbulk": 5, "T0": t0})
			d, rbulk := DiodeOf(k, p, area, kelvinOf(t0))
			i, _ := d.At(0.62 - 5*1e-3)
			within(t, "diode", i, area*1e-3, 2)
			within(t, "Rbulk", rbulk, 5/area, 1)

			k, p = params(t, "npn", map[string]float64{"Vbe": 0.65, "Vbe.at": 1e-3, "n": 1.01, "VA": 80, "Irec": 1e-13, "T0": t0})
			b := BipolarOf(k, p, area, kelvinOf(t0))
			var out BipolarPoint
			b.At(0.65, 0, &out)
			within(t, "npn", out.Ic, area*1e-3, 2)

			k, p = params(t, "zener", map[string]float64{"Vz": 5.6, "Vz.at": 5e-3, "rz": 12, "drift": 2e-3, "T0": t0})
			d, _ = DiodeOf(k, p, area, kelvinOf(t0))
			// The forward term's -Isat is not part of the stated point.
			f, df := d.breakdown(-5.6)
			within(t, "zener", d.Iz*f, area*5e-3, 2)
			// e0 is exp(-112/1.2) here, far below a rounding.
			within(t, "rz", 1/(d.Iz*d.InvNzVt*df), 12/area, 4)
		}
	}
}

func within(t *testing.T, what string, got, want, ulps float64) {
	t.Helper()
	if math.Abs(got-want) > ulps*(math.Nextafter(want, math.Inf(1))-want) {
		t.Errorf("%s: got %v, want %v within %v units in the last place", what, got, want, ulps)
	}
}

// No current without voltage, to the last digit.
func TestRest(t *testing.T) {
	for _, kind := range []string{"diode", "led", "zener"} {
		k, p := params(t, kind, nil)
		d, _ := DiodeOf(k, p, 1, 350)
		if i, g := d.At(0); i != 0 || !(g > 0) {
			t.Errorf("%s at rest: %v A, %v S", kind, i, g)
		}
	}
	for _, kind := range []string{"npn", "pnp"} {
		k, p := params(t, kind, map[string]float64{"VA": 50, "Irec": 1e-13})
		b := BipolarOf(k, p, 1, 350)
		var out BipolarPoint
		if b.At(0, 0, &out); out.Ic != 0 || out.Ib != 0 {
			t.Errorf("%s at rest: %v A, %v A", kind, out.Ic, out.Ib)
		}
	}
}

// What the trade knows of silicon (common practice), of the defaults.
func TestCommonPractice(t *testing.T) {
	const room = 298.15
	k, p := params(t, "diode", nil)
	drop := func(amps, kelvin float64) float64 {
		d, _ := DiodeOf(k, p, 1, kelvin)
		return d.NVt * math.Log1p(amps/d.Isat)
	}
	// A silicon junction stands near 0.7 V at 10 mA (10 %).
	if v := drop(10e-3, room); math.Abs(v-0.7) > 0.07 {
		t.Errorf("drop at 10 mA: %v V", v)
	}
	// It falls by about 2 mV/K.
	if slope := (drop(1e-3, room+1) - drop(1e-3, room-1)) / 2; math.Abs(slope+2e-3) > 0.3e-3 {
		t.Errorf("slope: %v V/K", slope)
	}
	// It rises by 60 mV a decade near room temperature.
	if decade := drop(10e-3, room) - drop(1e-3, room); math.Abs(decade-60e-3) > 1.2e-3 {
		t.Errorf("a decade: %v V", decade)
	}
	// A red lamp drops about 2.0 V at 10 mA (10 %).
	k, p = params(t, "led", nil)
	if v := drop(10e-3, room); math.Abs(v-2) > 0.2 {
		t.Errorf("lamp at 10 mA: %v V", v)
	}
	// A transistor's base stands near 0.65 V at 1 mA (5 %).
	k, p = params(t, "npn", nil)
	b := BipolarOf(k, p, 1, room)
	if v := math.Log1p(1e-3/b.Isat) / b.InvNVt; math.Abs(v-0.65) > 0.03 {
		t.Errorf("Vbe at 1 mA: %v V", v)
	}
}

func TestCheck(t *testing.T) {
	cases := []struct {
		kind   string
		stated map[string]float64
		kelvin float64
		ok     bool
	}{
		{"diode", nil, 300, true},
		{"diode", nil, 0, false},
		{"diode", nil, 3, false}, // Isat is exp(-4300) of itself
		{"diode", map[string]float64{"T0": -280}, 300, false},
		{"diode", map[string]float64{"drop": 0.6, "drop.at": 0.1, "Rbulk": 5}, 300, true},
		{"diode", map[string]float64{"drop": 0.6, "drop.at": 0.1, "Rbulk": 6}, 300, false},
		{"diode", map[string]float64{"drop": 0.6, "drop.at": 0.1, "n": 1e-3}, 300, false},
		{"zener", map[string]float64{"Vz": 5, "drift": -0.1}, 320, true},
		{"zener", map[string]float64{"Vz": 5, "drift": -0.1}, 350, false},
		{"npn", map[string]float64{"betaDrift": 0.01}, 250, true},
		{"npn", map[string]float64{"betaDrift": 0.01}, 190, false},
		{"npn", map[string]float64{"betaF": math.Inf(1), "betaDrift": 0.01}, 250, true},
	}
	for _, c := range cases {
		k, p := params(t, c.kind, c.stated)
		if err := Check(k, p, c.kelvin); (err == nil) != c.ok {
			t.Errorf("%s %v at %v K: %v", c.kind, c.stated, c.kelvin, err)
		}
	}
}

// At no gain a transistor is two diodes; at full gain it is itself.
func TestGain(t *testing.T) {
	k, p := params(t, "npn", map[string]float64{"VA": 40, "betaF": 150, "betaR": 3, "Irec": 1e-13})
	b := BipolarOf(k, p, 2, 310)
	for _, v := range [][2]float64{{0.7, -5}, {0.7, 0.65}, {-3, 0.6}, {0.1, 0.1}, {-20, -1}} {
		var at, gain, more, less BipolarPoint
		b.At(v[0], v[1], &at)
		b.AtGain(v[0], v[1], 1, &gain)
		gain.IcGain, gain.IbGain = 0, 0
		if at != gain {
			t.Errorf("at %v: %+v, at gain 1: %+v", v, at, gain)
		}
		b.AtGain(v[0], v[1], 0, &gain)
		within(t, "collector alone", -gain.Ic, gain.Ir*(1+b.InvBetaR), 4)
		if gain.IcVbe != 0 {
			t.Errorf("at %v without gain: dIc/dVbe = %v", v, gain.IcVbe)
		}
		f, _ := physics.Junction(v[0]*b.InvNrecVt, b.KneeRec)
		alone := gain.If*(1+b.InvBetaF) + b.Irec*f
		if d := gain.Ic + gain.Ib - alone; math.Abs(d) > 1e-15*(math.Abs(gain.Ic)+math.Abs(alone)) {
			t.Errorf("at %v without gain: the emitter passes %v, its diode %v", v, gain.Ic+gain.Ib, alone)
		}

		// Both currents are of second degree in the gain: central differences
		// are exact up to rounding.
		b.AtGain(v[0], v[1], 0.5, &gain)
		b.AtGain(v[0], v[1], 0.75, &more)
		b.AtGain(v[0], v[1], 0.25, &less)
		scale := 1e-13 * (math.Abs(gain.If) + math.Abs(gain.Ir))
		if d := (more.Ic-less.Ic)/0.5 - gain.IcGain; math.Abs(d) > scale {
			t.Errorf("at %v: dIc/dgain %v is off by %v", v, gain.IcGain, d)
		}
		if d := (more.Ib-less.Ib)/0.5 - gain.IbGain; math.Abs(d) > scale {
			t.Errorf("at %v: dIb/dgain %v is off by %v", v, gain.IbGain, d)
		}
	}
}

var sinkPoint BipolarPoint

func BenchmarkDiodeAt(b *testing.B) {
	k, p := params(b, "diode", nil)
	d, _ := DiodeOf(k, p, 1, 298.15)
	b.ReportAllocs()
	for n := range b.N {
		sinkPoint.Ic, sinkPoint.Ib = d.At(0.5 + 1e-9*float64(n&0xffff))
	}
}

func BenchmarkZenerAt(b *testing.B) {
	k, p := params(b, "zener", nil)
	d, _ := DiodeOf(k, p, 1, 298.15)
	b.ReportAllocs()
	for n := range b.N {
		sinkPoint.Ic, sinkPoint.Ib = d.At(-5.5 - 1e-9*float64(n&0xffff))
	}
}

func BenchmarkBipolarAt(b *testing.B) {
	for _, irec := range []float64{0, 1e-13} {
		b.Run(map[bool]string{false: "plain", true: "recombination"}[irec > 0], func(b *testing.B) {
			k, p := params(b, "npn", map[string]float64{"VA": 80, "Irec": irec})
			q := BipolarOf(k, p, 1, 298.15)
			b.ReportAllocs()
			for n := range b.N {
				q.At(0.6+1e-9*float64(n&0xffff), -5, &sinkPoint)
			}
		})
	}
}

func BenchmarkBipolarOf(b *testing.B) {
	k, p := params(b, "npn", map[string]float64{"Vbe": 0.65, "Vbe.at": 1e-3})
	b.ReportAllocs()
	for n := range b.N {
		q := BipolarOf(k, p, 1, 298.15+float64(n&1))
		sinkPoint.Ic = q.Isat
	}
}

func BenchmarkEvaluate(b *testing.B) {
	k, p := params(b, "npn", map[string]float64{"Vbe": 0.65, "Vbe.at": 1e-3, "VA": 80, "Irec": 1e-13})
	var out Response
	v := []float64{5, 0.7, 0}
	b.ReportAllocs()
	for range b.N {
		Evaluate(k, p, 1, v, 310, &out)
	}
}
