package continuation_test

import (
	"fmt"

	"brinkline/continuation"
)

// An ordinary Go program embeds the file that declares its model and offers it
// to NewModel; the derivatives are exact then.
func ExampleWithSource() {
	// //go:embed ignition.go
	// var ignitionSource string
	m, err := continuation.NewModel(ignition, ignitionParams{Lambda: 0.1}, continuation.WithSource("ignition", ignitionSource))
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(m.DerivativesNote())
	start, err := m.Settle(ignitionState{0.1})
	if err != nil {
		fmt.Println(err)
		return
	}
	series, err := start.Series(3, "Lambda")
	if err != nil {
		fmt.Println(err)
		return
	}
	// X = -W(-Lambda) with Lambert's function W.
	for k, c := range series.Coefficients {
		fmt.Printf("order %d: X %.6f\n", k, c[0])
	}
	// Output:
	// exact, from the source: 3 operations
	// order 0: X 0.111833
	// order 1: X 1.259138
	// order 2: X 1.685243
	// order 3: X 3.429167
}
