package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// Models of the literature whose special points are known in closed form, from
// memory of the sources named; the closed forms were rederived for these tests.
// Each must show just these points in this order.
func TestLiterature(t *testing.T) {
	type xy struct{ X, Y float64 }
	type xyz struct{ X, Y, Z float64 }
	type ab struct{ A, B float64 }
	type point struct {
		kind, name string
		at, omega  float64
	}
	root := math.Sqrt(1 - 8*0.08)
	for _, c := range []struct {
		name, source string
		model        any
		params       any
		start        any
		follow       string
		low, high    float64
		want         []point
	}{
		{
			"glycolysis", "E. E. Sel'kov, European Journal of Biochemistry 4 (1968) 79-86; S. H. Strogatz, Nonlinear Dynamics and Chaos, 1994, example 7.3.3: Hopf points at b² = (1 - 2a ± sqrt(1 - 8a))/2, omega² = a + b²",
			func(s xy, q ab) xy {
				return xy{-s.X + q.A*s.Y + s.X*s.X*s.Y, q.B - q.A*s.Y - s.X*s.X*s.Y}
			}, ab{0.08, 0.2}, xy{0.2, 1.5}, "B", 0.2, 1.2,
			[]point{
				{"Hopf point", "", math.Sqrt((1 - 0.16 - root) / 2), math.Sqrt(0.08 + (1-0.16-root)/2)},
				{"Hopf point", "", math.Sqrt((1 - 0.16 + root) / 2), math.Sqrt(0.08 + (1-0.16+root)/2)},
			},
		},
		{
			"chlorine dioxide, iodine, malonic acid", "I. Lengyel, G. Rabai and I. R. Epstein, Journal of the American Chemical Society 112 (1990) 9104-9110; Strogatz 1994, example 8.3.1: Hopf point at b = 3a/5 - 25/a, x = a/5, omega² = det = 5 b x/(1+x²)",
			func(s xy, q ab) xy {
				r := s.X * s.Y / (1 + s.X*s.X)
				return xy{q.A - s.X - 4*r, q.B * (s.X - r)}
			}, ab{10, 5}, xy{2, 5}, "B", 1, 6,
			[]point{{"Hopf point", "", 3.5, math.Sqrt(5 * 3.5 * 2 / 5)}},
		},
		{
			"three-mode spiral", "O. E. Rössler, Physics Letters A 57 (1976) 397-398: steady states x = (c ± sqrt(c² - 4ab))/2, which meet in a fold at c = 2 sqrt(ab)",
			func(s xyz, q struct{ A, B, C float64 }) xyz {
				return xyz{-s.Y - s.Z, s.X + q.A*s.Y, q.B + s.Z*(s.X-q.C)}
			}, struct{ A, B, C float64 }{0.2, 0.2, 2}, xyz{0.02, -0.1, 0.1}, "C", 0.2, 2.5,
			[]point{{"fold", "", 0.4, 0}},
		},
		{
			"chemostat", "J. Monod, Annales de l'Institut Pasteur 79 (1950) 390-410: washout at D = M S0/(K + S0)",
			func(s struct{ Cells, Food float64 }, q struct{ Dilution, Feed float64 }) struct{ Cells, Food float64 } {
				growth := 0.8 * s.Food / (0.5 + s.Food) * s.Cells
				return struct{ Cells, Food float64 }{growth - q.Dilution*s.Cells, q.Dilution*(q.Feed-s.Food) - growth/0.4}
			}, struct{ Dilution, Feed float64 }{0.3, 2}, struct{ Cells, Food float64 }{0.7, 0.3}, "Dilution", 0.1, 0.75,
			[]point{{"simple stationary bifurcation", "transcritical bifurcation", 0.8 * 2 / 2.5, 0}},
		},
		{
			"bead on a rotating hoop", "Strogatz 1994, section 3.5 (overdamped): pitchfork at g = r omega²/g = 1",
			func(s scalar, q lambda) scalar { return scalar{math.Sin(s.X) * (q.L*math.Cos(s.X) - 1)} },
			lambda{0.5}, scalar{0}, "L", 0.5, 2,
			[]point{{"simple stationary bifurcation", "supercritical pitchfork", 1, 0}},
		},
		{
			"laser", "H. Haken, Synergetics, 3rd ed. 1983; Strogatz 1994, section 3.3: threshold at N0 = k/G",
			func(s struct{ Photons float64 }, q struct{ Pump, Gain, Loss float64 }) struct{ Photons float64 } {
				return struct{ Photons float64 }{(q.Gain*q.Pump-q.Loss)*s.Photons - q.Gain*0.3*s.Photons*s.Photons}
			}, struct{ Pump, Gain, Loss float64 }{0.2, 2, 1.5}, struct{ Photons float64 }{0}, "Pump", 0.1, 2,
			[]point{{"simple stationary bifurcation", "transcritical bifurcation", 0.75, 0}},
		},
	} {
		t.Run(c.name, func(t *testing.T) {
			m, err := continuation.NewModel(c.model, c.params)
			if err != nil {
				t.Fatal(err)
			}
			b := mustFollow(t, settled(t, m, c.start), c.follow, continuation.Within(c.low, c.high))
			if len(b.Specials()) != len(c.want) {
				t.Fatalf("found %v, want %v (%s)", b.Specials(), c.want, c.source)
			}
			for i, s := range b.Specials() {
				w := c.want[i]
				if s.Kind() != w.kind || math.Abs(s.Where().Value()-w.at) > 1e-9*w.at {
					t.Errorf("%s at %.14g, want %s at %.14g (%s)", s.Kind(), s.Where().Value(), w.kind, w.at, c.source)
				}
				if h, ok := s.(*continuation.Hopf); ok && math.Abs(h.Omega-w.omega) > 1e-9*w.omega {
					t.Errorf("frequency %.14g, want %.14g", h.Omega, w.omega)
				}
				if p, ok := s.(*continuation.BranchPoint); ok && p.Name() != w.name {
					t.Errorf("named %s, want %s", p.Name(), w.name)
				}
			}
		})
	}
}

// At the cusp of the reference cases the quadratic coefficient vanishes and the
// cubic one is published; folds near it must come near both.
func TestCubicNearACusp(t *testing.T) {
	// x' = β1 + β2 x - x³ (Kuznetsov 2004, section 8.2): folds at x = ±sqrt(β2/3),
	// quadratic coefficient -3x, cubic -1.
	m, err := continuation.NewModel(func(s scalar, q struct{ Beta1, Beta2 float64 }) scalar {
		return scalar{q.Beta1 + q.Beta2*s.X - s.X*s.X*s.X}
	}, struct{ Beta1, Beta2 float64 }{-1, 0.003})
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range mustFollow(t, settled(t, m, scalar{-1}), "Beta1", continuation.Within(-1, 1)).Folds() {
		if x := f.Where().State[0]; math.Abs(f.Quadratic+3*x) > 1e-7 || math.Abs(f.Cubic+1) > 1e-6 {
			t.Errorf("at x = %g: quadratic %g, cubic %g", x, f.Quadratic, f.Cubic)
		}
	}
}
