package continuation

import (
	"math"
	"testing"
)

// The order of convergence, measured with fixed steps on a predator and its prey (Lotka
// and Volterra): 4, and 4 in one step for the error estimate of the embedded method of
// order 3.
func TestOrderOfConvergence(t *testing.T) {
	type plane struct{ X, Y float64 }
	m, err := NewModel(func(s plane, q struct{ A float64 }) plane {
		return plane{s.X * (q.A - s.Y), s.Y * (s.X - 1)}
	}, struct{ A float64 }{1.5})
	if err != nil {
		t.Fatal(err)
	}
	end := func(steps int) (x []float64, estimate float64) {
		s := newSystem(m, []float64{2, 0.5}, m.values(), -1)
		r := newRosenbrock(s)
		x = []float64{2, 0.5}
		f, next, off := make([]float64, 2), make([]float64, 2), make([]float64, 2)
		for k := range steps {
			if err := s.Eval(x, s.p, f); err != nil {
				t.Fatal(err)
			}
			if err := r.begin(x); err != nil {
				t.Fatal(err)
			}
			if err := r.step(x, f, 4/float64(steps), next, off); err != nil {
				t.Fatal(err)
			}
			if k == 0 {
				estimate = norm(off)
			}
			copy(x, next)
		}
		return x, estimate
	}
	exact, _ := end(4000)
	var errors, estimates []float64
	for _, steps := range []int{100, 200, 400, 800} {
		x, estimate := end(steps)
		errors = append(errors, math.Hypot(x[0]-exact[0], x[1]-exact[1]))
		estimates = append(estimates, estimate)
	}
	for i := 1; i < len(errors); i++ {
		order, embedded := math.Log2(errors[i-1]/errors[i]), math.Log2(estimates[i-1]/estimates[i])
		t.Logf("steps %d: error %.3g, order %.2f; error estimate of a step %.3g, order %.2f", 100<<i, errors[i], order, estimates[i], embedded)
		if math.Abs(order-4) > 0.2 || math.Abs(embedded-4) > 0.2 {
			t.Errorf("orders %.2f and %.2f, want 4 and 4", order, embedded)
		}
	}
}

// The method is L-stable and stiffly accurate: one long step on x' = -k x brings it to
// 0, whatever k h.
func TestLStable(t *testing.T) {
	m, err := NewModel(func(s struct{ X float64 }, q struct{ K float64 }) struct{ X float64 } {
		return struct{ X float64 }{-q.K * s.X}
	}, struct{ K float64 }{1})
	if err != nil {
		t.Fatal(err)
	}
	s := newSystem(m, []float64{1}, m.values(), -1)
	r := newRosenbrock(s)
	next, off := make([]float64, 1), make([]float64, 1)
	worst := 0.0
	for h := 1e-3; h < 1e12; h *= 1.3 {
		if err := r.begin([]float64{1}); err != nil {
			t.Fatal(err)
		}
		if err := r.step([]float64{1}, []float64{-1}, h, next, off); err != nil {
			t.Fatal(err)
		}
		worst = math.Max(worst, math.Abs(next[0]))
		if h > 1e6 && math.Abs(next[0]) > 20/h {
			t.Errorf("a step of %g leaves %g", h, next[0])
		}
	}
	if worst > 1 {
		t.Errorf("the stability function reaches %g on the negative axis", worst)
	}
}
