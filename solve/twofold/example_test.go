package twofold_test

import (
	"fmt"

	"biaswright/solve/twofold"
)

// A leakage beside an ohm, seventeen decades apart: doubles lose it.
func Example() {
	ohm, leak := 1.0, 1e-17
	fmt.Println(ohm + leak - ohm)
	sum := twofold.Sum(ohm, leak)
	fmt.Println(sum.Sub(twofold.Of(ohm)).Value())
	// Output:
	// 0
	// 1e-17
}
