package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// Two real eigenvalues and a pair meet the axis within one step: x' = λ + x² folds at
// 0, and the pair of (y, z) crosses at λ = -1e-6 on the lower part.
func TestFoldAndHopfInOneStep(t *testing.T) {
	type st struct{ X, Y, Z float64 }
	model := func(s st, q lambda) st {
		g := s.X + 1e-3 // the pair's damping: crosses at x = -1e-3, λ = -1e-6
		return st{q.L + s.X*s.X, g*s.Y - 2*s.Z, 2*s.Y + g*s.Z}
	}
	m, err := continuation.NewModel(model, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, st{X: -1}), "L", continuation.Within(-1, 1))
	if len(b.Folds()) != 1 || len(b.HopfPoints()) != 1 {
		t.Fatalf("found %v; notes %q", b.Specials(), b.Notes())
	}
	if v := b.HopfPoints()[0].Value(); math.Abs(v+1e-6) > 1e-12 {
		t.Errorf("Hopf point at %v, want -1e-6", v)
	}
}

// x' = λ - x³ + 3 (g/2)^(2/3)... with folds 1e-6 apart in λ.
func TestTwoFoldsAMillionthApart(t *testing.T) {
	gap := 3 * math.Pow(1e-6/4, 2./3)
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar { return scalar{q.L - s.X*s.X*s.X + gap*s.X} }, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, scalar{-1}), "L", continuation.Within(-1, 1))
	if len(b.Folds()) != 2 {
		t.Fatalf("found %v", b.Specials())
	}
	if d := b.Folds()[0].Value() - b.Folds()[1].Value(); math.Abs(d-1e-6) > 1e-12 {
		t.Errorf("%v apart, want 1e-6", d)
	}
}

// A pitchfork broken by 1e-8: the branch turns aside smoothly and has no special
// point; what it does must not be called a bifurcation, and the run must follow the
// curve.
func TestBrokenPitchfork(t *testing.T) {
	const h = 1e-8
	m, err := continuation.NewModel(func(s struct {
		X float64 `scale:"1"`
	}, q lambda) struct {
		X float64 `scale:"1"`
	} {
		s.X = h + q.L*s.X - s.X*s.X*s.X
		return s
	}, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, []float64{1e-8}), "L", continuation.Within(-1, 1))
	if len(b.Specials()) != 0 {
		t.Errorf("found %v on a branch without special points; notes %q", b.Specials(), b.Notes())
	}
	last := b.Points()[len(b.Points())-1]
	if math.Abs(last.State[0]-1) > 1e-7 || last.Value() != 1 {
		t.Errorf("ends at x = %v, λ = %v (%s), want x = 1, λ = 1", last.State[0], last.Value(), b.Ends()[1].Text)
	}
}

func TestSteepAndFlatBranches(t *testing.T) {
	for _, steep := range []float64{1e-5, 1, 1e5} {
		// λ = tanh(s x)-like: a cubic with slopes from 1/steep to steep.
		m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
			x := s.X / steep
			return scalar{q.L - x*x*x + 0.3*x}
		}, lambda{-1})
		if err != nil {
			t.Fatal(err)
		}
		b := mustFollow(t, settled(t, m, scalar{-1.1 * steep}), "L", continuation.Within(-1, 1))
		if len(b.Folds()) != 2 {
			t.Fatalf("steep %g: found %v, ends %q %q", steep, b.Specials(), b.Ends()[0].Text, b.Ends()[1].Text)
		}
		if want := 2 * 0.1 * math.Sqrt(0.1); math.Abs(b.Folds()[0].Value()-want) > 1e-11 {
			t.Errorf("steep %g: fold at %.15g, want %.15g", steep, b.Folds()[0].Value(), want)
		}
	}
}

// n = 100 with 10 folds: a chain in which the first state goes through ten turns
// and the others follow it.
func TestHundredStatesTenFolds(t *testing.T) {
	const n = 100
	names := make([]string, n)
	for i := range names {
		names[i] = "u" + string(rune('0'+i/10)) + string(rune('0'+i%10))
	}
	model := func(u []float64, q lambda, f []float64) {
		f[0] = q.L - 0.02*u[0] - math.Sin(u[0])
		for i := 1; i < n; i++ {
			f[i] = u[i-1] - u[i]
		}
	}
	m, err := continuation.NewModel(model, lambda{0}, continuation.States(names, nil, nil))
	if err != nil {
		t.Fatal(err)
	}
	// From u = 0 the branch turns where cos u = -0.02: ten times up to u = 10 π.
	start := settled(t, m, make([]float64, n))
	b := mustFollow(t, start, "L", continuation.Within(-2, 5), continuation.Bound("u00", -1, 10*math.Pi))
	if len(b.Folds()) != 10 {
		t.Fatalf("%d folds: %v; ends %q %q", len(b.Folds()), b.Specials(), b.Ends()[0].Text, b.Ends()[1].Text)
	}
	for i, f := range b.Folds() {
		u := math.Acos(-0.02)
		want := float64(i/2)*2*math.Pi + u
		if i%2 == 1 {
			want = float64(i/2+1)*2*math.Pi - u
		}
		if math.Abs(f.Where().State[0]-want) > 1e-7 {
			t.Errorf("fold %d at u = %.12g, want %.12g", i, f.Where().State[0], want)
		}
	}
}

func TestSmallIsola(t *testing.T) {
	const r = 1e-3
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		d, e := s.X-2, q.L-3
		return scalar{d*d + e*e - r*r}
	}, lambda{3})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, scalar{2 + r}), "L", continuation.Within(0, 6))
	if !b.Closed() || len(b.Folds()) != 2 {
		t.Fatalf("closed %v, found %v, ends %q %q, %d points", b.Closed(), b.Specials(), b.Ends()[0].Text, b.Ends()[1].Text, len(b.Points()))
	}
}

// A pair that crosses and returns within a step: two Hopf points that cancel.
func TestTwoHopfPointsInOneStep(t *testing.T) {
	type st struct{ Y, Z float64 }
	model := func(s st, q lambda) st {
		g := 1e-5 - q.L*q.L // positive for |λ| < 0.00316
		return st{g*s.Y - s.Z, s.Y + g*s.Z}
	}
	m, err := continuation.NewModel(model, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, st{}), "L", continuation.Within(-1, 1))
	if len(b.HopfPoints()) != 2 {
		t.Fatalf("found %v; notes %q", b.Specials(), b.Notes())
	}
}

// Two branch points that cancel within a step, of a trivial branch.
func TestTwoBranchPointsInOneStep(t *testing.T) {
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		return scalar{(q.L*q.L-1e-5)*s.X - s.X*s.X*s.X}
	}, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, scalar{}), "L", continuation.Within(-1, 1))
	if len(b.BranchPoints()) != 2 {
		t.Fatalf("found %v; notes %q", b.Specials(), b.Notes())
	}
}

// A double zero eigenvalue by symmetry: both modes lose stability together.
func TestMultipleBifurcation(t *testing.T) {
	type st struct{ X, Y float64 }
	model := func(s st, q lambda) st {
		r := s.X*s.X + s.Y*s.Y
		return st{(q.L - r) * s.X, (q.L - r) * s.Y}
	}
	m, err := continuation.NewModel(model, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, st{}), "L", continuation.Within(-1, 1))
	if len(b.Specials()) != 1 || b.Specials()[0].Kind() != "multiple bifurcation" {
		t.Fatalf("found %v; notes %q", b.Specials(), b.Notes())
	}
}
