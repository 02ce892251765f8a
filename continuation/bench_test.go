package continuation_test

import (
	"testing"

	"brinkline/continuation"
)

// BenchmarkTankTrace follows the stirred tank round both folds, eigenvalues
// included, through the compiled model.
func BenchmarkTankTrace(b *testing.B) {
	start := settled(b, newTank(b), tankState{0.1, 310})
	b.ReportAllocs()
	steps := 0
	for b.Loop() {
		branch, err := start.Follow("Coolant", continuation.Within(260, 330))
		if err != nil {
			b.Fatal(err)
		}
		steps += branch.Steps()
	}
	b.ReportMetric(float64(steps)/b.Elapsed().Seconds(), "steps/s")
}
