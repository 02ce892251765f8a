package continuation_test

import (
	"math"
	"slices"
	"testing"

	"brinkline/continuation"

	"pgregory.net/rapid"
)

// A curve λ = P(x) has its folds at the roots of P', which are drawn first: so all
// are known by construction. None may be missed and none invented, whatever the
// steepness.
func TestFoldsOfRandomCurves(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		roots := rapid.SliceOfN(rapid.Float64Range(-0.95, 0.95), 0, 7).Draw(t, "roots")
		height := math.Pow(10, rapid.Float64Range(-2, 2).Draw(t, "height"))
		slices.Sort(roots)
		for i := 1; i < len(roots); i++ {
			if roots[i]-roots[i-1] < 0.02 {
				return // nearer ones are cusps to working precision
			}
		}
		_, curve := polynomials(roots)
		size := 0.0
		for i := range 201 {
			size = math.Max(size, math.Abs(value(curve, -1+float64(i)/100)))
		}
		for i := range curve {
			curve[i] *= height / size
		}
		checkCurve(t, curve, roots)
	})
}

// polynomials returns the coefficients of Π (x - r_i) and of its integral,
// constant first.
func polynomials(roots []float64) (slope, curve []float64) {
	slope = []float64{1}
	for _, r := range roots {
		next := make([]float64, len(slope)+1)
		for i, c := range slope {
			next[i+1] += c
			next[i] -= r * c
		}
		slope = next
	}
	curve = make([]float64, len(slope)+1)
	for i, c := range slope {
		curve[i+1] = c / float64(i+1)
	}
	return slope, curve
}

func value(p []float64, x float64) float64 {
	v := 0.0
	for i := len(p) - 1; i >= 0; i-- {
		v = v*x + p[i]
	}
	return v
}

func checkCurve(t *rapid.T, curve, roots []float64) {
	model := func(s struct {
		X float64 `scale:"1"`
	}, q lambda) struct {
		X float64 `scale:"1"`
	} {
		s.X = q.L - value(curve, s.X)
		return s
	}
	m, err := continuation.NewModel(model, lambda{value(curve, -1)})
	if err != nil {
		t.Fatal(err)
	}
	start, err := m.Settle([]float64{-1})
	if err != nil {
		t.Skip("no start: the curve is flat there")
	}
	height := 0.0
	for i := range 201 {
		height = math.Max(height, math.Abs(value(curve, -1+float64(i)/100)))
	}
	b, err := start.Follow("L", continuation.Within(-10*height, 10*height), continuation.Bound("X", -1.01, 1))
	if err != nil {
		t.Fatal(err)
	}
	if len(b.Folds()) != len(roots) {
		t.Fatalf("found %d folds of %d at x = %v: %v; ends %q %q", len(b.Folds()), len(roots), roots, b, b.Ends()[0].Text, b.Ends()[1].Text)
	}
	var at []float64
	for _, f := range b.Folds() {
		at = append(at, f.Where().State[0])
	}
	slices.Sort(at)
	for i, r := range roots {
		if math.Abs(at[i]-r) > 1e-6 {
			t.Errorf("fold at x = %.12g, want %.12g", at[i], r)
		}
	}
}
