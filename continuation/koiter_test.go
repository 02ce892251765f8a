package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// Koiter's power laws: a small imperfection lowers the limit by a power of its size. W. T.
// Koiter, On the Stability of Elastic Equilibrium, 1945 (NASA TT F-10833); B. Budiansky,
// Theory of buckling and post-buckling behavior of elastic structures, Advances in Applied
// Mechanics 14 (1974) 1-65: 2/3 for a symmetric unstable crossing, 1/2 for an asymmetric
// one.

// exponent fits the drop of the limit between two imperfections.
func exponent(t *testing.T, perfect float64, limit func(size float64) float64) float64 {
	t.Helper()
	a, b := 1e-7, 1e-6
	return math.Log((perfect-limit(b))/(perfect-limit(a))) / math.Log(b/a)
}

// firstFold returns the first limit above the start.
func firstFold(t *testing.T, start *continuation.Point, load string, from, to float64) float64 {
	t.Helper()
	b := mustFollow(t, start, load, continuation.Within(from, to), continuation.Upward(), continuation.StopAtFold(), continuation.StepBetween(1e-9, 0.02))
	limit, err := b.NearestLimitAbove(b.Points()[b.Start()])
	if err != nil {
		t.Fatal(err)
	}
	if limit.Kind() != "fold" {
		t.Fatalf("%v, want a fold", limit)
	}
	return limit.Value()
}

// The shallow arch of two modes (Fung and Kaplan 1952) with a small sideways load: 2/3.
func TestKoiterSymmetricArch(t *testing.T) {
	type state struct {
		Symmetric float64 `scale:"4"`
		Sideways  float64 `scale:"1"`
	}
	type params struct{ Load, Rise, Side float64 }
	arch := func(s state, q params) state {
		n := s.Symmetric*s.Symmetric + 4*s.Sideways*s.Sideways - q.Rise*q.Rise
		return state{-(s.Symmetric - q.Rise) - s.Symmetric*n - q.Load, -16*s.Sideways - 4*s.Sideways*n + q.Side}
	}
	perfect := 4 + 3*math.Sqrt(12)
	got := exponent(t, perfect, func(size float64) float64 {
		m, err := continuation.NewModel(arch, params{Rise: 4, Side: size}, continuation.Balance())
		if err != nil {
			t.Fatal(err)
		}
		return firstFold(t, settled(t, m, state{4, 0}), "Load", 0, 40)
	})
	if math.Abs(got-2.0/3) > 0.01*2/3 {
		t.Errorf("exponent %.5f, want 2/3", got)
	}
	t.Logf("exponent %.5f", got)
}

// A rigid column held upright by an inclined spring, whose crossing is asymmetric
// (J. M. T. Thompson and G. W. Hunt, A General Theory of Elastic Stability, 1973, the
// rigid link with an inclined spring): with the spring at 45 degrees the equilibrium of
// moments at the rotation θ with imperfection ε is
//
//	P sin(θ + ε) = (sqrt(1 + sin θ) - 1)/sqrt(1 + sin θ) · cos θ · 2,
//
// in the scale in which the perfect column buckles at P = 1: exponent 1/2 on the side on
// which it falls.
func TestKoiterAsymmetricColumn(t *testing.T) {
	type state struct {
		Rotation float64 `scale:"1"`
	}
	type params struct{ Load, Lean float64 }
	column := func(s state, q params) state {
		root := math.Sqrt(1 + math.Sin(s.Rotation))
		return state{2*(1-1/root)*math.Cos(s.Rotation) - q.Load*math.Sin(s.Rotation+q.Lean)}
	}
	got := exponent(t, 1, func(size float64) float64 {
		m, err := continuation.NewModel(column, params{Load: 0, Lean: size}, continuation.Balance())
		if err != nil {
			t.Fatal(err)
		}
		return firstFold(t, settled(t, m, state{0}), "Load", 0, 2)
	})
	if math.Abs(got-0.5) > 0.005 {
		t.Errorf("exponent %.5f, want 1/2", got)
	}
	t.Logf("exponent %.5f", got)
}

// The elastic column (supercritical): with an imperfection there is no limit, and that is
// said.
func TestKoiterSupercriticalColumn(t *testing.T) {
	type state struct {
		Rotation float64 `scale:"1"`
	}
	type params struct{ Load, Lean float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{s.Rotation - q.Load*math.Sin(s.Rotation+q.Lean)}
	}, params{0, 1e-3}, continuation.Balance())
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, state{0}), "Load", continuation.Within(0, 3))
	_, err = b.NearestLimitAbove(b.Points()[b.Start()])
	oneLine(t, err, "no limit above 0 on this branch: it left the range at Load 3")
}

// The scatter of a margin: of the two-bus network in a linear regime of known moments, and
// the share passed against the probability.
func TestMarginScatter(t *testing.T) {
	today := settledAt(t, newBus(t), "P", 0.6)
	b := mustFollow(t, today, "P", continuation.Within(0.6, 2), continuation.StopAtFold(), continuation.Upward())
	s, err := today.MarginScatter(b.Folds()[0], feederScatter(), 4000)
	if err != nil {
		t.Fatal(err)
	}
	share, e := s.Passed()
	if want := feederChance(); math.Abs(share-want) > 4*math.Max(e, math.Sqrt(want/4000)) || s.Missing > 0 {
		t.Errorf("passed in %g ± %g, want %g; %d missing", share, e, want, s.Missing)
	}
	edges, counts := s.Histogram(20)
	sum := 0
	for _, n := range counts {
		sum += n
	}
	if sum != 4000 || len(edges) != 21 || edges[0] != s.Margins[0] || s.Quantile(0.5) < s.Quantile(0.05) {
		t.Errorf("%d in the histogram, %v", sum, s)
	}
	t.Log(s)
}
