package quantity

import (
	"errors"
	"fmt"
	"math"
)

// Add returns a + b. Both have one unit, or one is a Celsius temperature and the
// other a difference in kelvin.
func Add(a, b Quantity) (Quantity, error) {
	switch {
	case a.Unit == Celsius && b.Unit == Celsius:
		return Quantity{}, errors.New("cannot add degrees Celsius to degrees Celsius")
	case a.Unit == Celsius && b.Unit == Kelvin, a.Unit == Kelvin && b.Unit == Celsius:
		return Quantity{a.Value + b.Value, Celsius}, nil
	case a.Unit != b.Unit:
		return Quantity{}, fmt.Errorf("cannot add %s to %s", b.Unit.Words(), a.Unit.Words())
	}
	return Quantity{a.Value + b.Value, a.Unit}, nil
}

// Sub returns a - b. The difference of two Celsius temperatures is in kelvin.
func Sub(a, b Quantity) (Quantity, error) {
	switch {
	case a.Unit == Celsius && b.Unit == Celsius:
		return Quantity{a.Value - b.Value, Kelvin}, nil
	case a.Unit == Celsius && b.Unit == Kelvin:
		return Quantity{a.Value - b.Value, Celsius}, nil
	case a.Unit != b.Unit:
		return Quantity{}, fmt.Errorf("cannot subtract %s from %s", b.Unit.Words(), a.Unit.Words())
	}
	return Quantity{a.Value - b.Value, a.Unit}, nil
}

// Mul returns a × b. Celsius temperatures have no product.
func Mul(a, b Quantity) (Quantity, error) {
	if a.Unit.Absolute || b.Unit.Absolute {
		return Quantity{}, errors.New("cannot multiply degrees Celsius")
	}
	u, err := combine(a.Unit, b.Unit, 1)
	return Quantity{a.Value * b.Value, u}, err
}

// Div returns a / b. Celsius temperatures have no quotient.
func Div(a, b Quantity) (Quantity, error) {
	if a.Unit.Absolute || b.Unit.Absolute {
		return Quantity{}, errors.New("cannot divide degrees Celsius")
	}
	u, err := combine(a.Unit, b.Unit, -1)
	return Quantity{a.Value / b.Value, u}, err
}

// Pow returns a^b. b is a plain number; the powers of a's unit times b must be
// whole.
func Pow(a, b Quantity) (Quantity, error) {
	switch {
	case b.Unit != One:
		return Quantity{}, fmt.Errorf("cannot raise to a power in %s", b.Unit.Words())
	case a.Unit.Absolute:
		return Quantity{}, errors.New("cannot raise degrees Celsius to a power")
	}
	var powers [4]float64
	for i, d := range []int8{a.Unit.Volt, a.Unit.Ampere, a.Unit.Kelvin, a.Unit.ElectronVolt} {
		powers[i] = float64(d) * b.Value
		if a.Unit != One && (powers[i] != math.Trunc(powers[i]) || math.Abs(powers[i]) > math.MaxInt8) {
			return Quantity{}, fmt.Errorf("cannot raise %s to the power %g", a.Unit.Words(), b.Value)
		}
	}
	if a.Unit == One {
		return Quantity{math.Pow(a.Value, b.Value), One}, nil
	}
	u := Unit{Volt: int8(powers[0]), Ampere: int8(powers[1]), Kelvin: int8(powers[2]), ElectronVolt: int8(powers[3])}
	return Quantity{math.Pow(a.Value, b.Value), u}, nil
}

// Parallel returns 1/(1/a + 1/b), for two of one unit. Where one is 0, so is it.
func Parallel(a, b Quantity) (Quantity, error) {
	switch {
	case a.Unit != b.Unit:
		return Quantity{}, fmt.Errorf("cannot put %s in parallel with %s", b.Unit.Words(), a.Unit.Words())
	case a.Unit.Absolute:
		return Quantity{}, errors.New("cannot put degrees Celsius in parallel")
	}
	return Quantity{1 / (1/a.Value + 1/b.Value), a.Unit}, nil
}

// Sqrt returns the square root of a, whose unit must be a square.
func Sqrt(a Quantity) (Quantity, error) {
	q, err := Pow(a, Quantity{Value: 0.5}) // the root is the power one half
	if err != nil {
		return Quantity{}, fmt.Errorf("cannot take the square root of %s", a.Unit.Words())
	}
	q.Value = math.Sqrt(a.Value) // rounds correctly, which Pow need not
	return q, nil
}

// Ln returns the natural logarithm of a plain number.
func Ln(a Quantity) (Quantity, error) {
	if a.Unit != One {
		return Quantity{}, fmt.Errorf("cannot take the logarithm of %s", a.Unit.Words())
	}
	return Quantity{math.Log(a.Value), One}, nil
}

// Exp returns e to the power of a plain number.
func Exp(a Quantity) (Quantity, error) {
	if a.Unit != One {
		return Quantity{}, fmt.Errorf("cannot take the exponential of %s", a.Unit.Words())
	}
	return Quantity{math.Exp(a.Value), One}, nil
}

func combine(a, b Unit, sign int) (Unit, error) {
	var powers [4]int
	for i, p := range [][2]int8{{a.Volt, b.Volt}, {a.Ampere, b.Ampere}, {a.Kelvin, b.Kelvin}, {a.ElectronVolt, b.ElectronVolt}} {
		powers[i] = int(p[0]) + sign*int(p[1])
		if powers[i] != int(int8(powers[i])) {
			return Unit{}, errors.New("the unit's powers are too high")
		}
	}
	return Unit{Volt: int8(powers[0]), Ampere: int8(powers[1]), Kelvin: int8(powers[2]), ElectronVolt: int8(powers[3])}, nil
}
