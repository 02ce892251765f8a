package display

import (
	"testing"

	"brinkline/continuation"
)

// The models of the loci are normal forms in invented units, or the invented tank:
// where their special points lie is known by hand.

func locus(t testing.TB, s continuation.Special, second string, opts ...continuation.FollowOption) *continuation.Locus {
	t.Helper()
	var l *continuation.Locus
	var err error
	switch s := s.(type) {
	case *continuation.Fold:
		l, err = s.Follow(second, opts...)
	case *continuation.Hopf:
		l, err = s.Follow(second, opts...)
	default:
		t.Fatalf("a %T has no locus", s)
	}
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// tankLoci are the edge of ignition and the Hopf points of the tank, and a branch.
func tankLoci(t testing.TB) (path *continuation.Branch, folds, hopfs *continuation.Locus) {
	path = tankBranch(t)
	folds = locus(t, path.Folds()[0], "Inflow", continuation.Within(20, 250), continuation.Bound("Coolant", 240, 340))
	hopfs = locus(t, path.HopfPoints()[0], "Inflow", continuation.Within(20, 250), continuation.Bound("Coolant", 240, 340))
	return path, folds, hopfs
}

type pairParams struct {
	Push  float64 `unit:"N"`
	Lever float64 `unit:"m"`
}

type planar struct{ X, Y float64 }

// takens has a Bogdanov-Takens point at 0, 0; its folds lie at Push = Lever²/4 and
// its Hopf points at Push = 0, Lever < 0. sense is the sign of a2 b2.
func takens(t testing.TB, sense float64) *continuation.Branch {
	f := func(s planar, q pairParams) planar {
		return planar{s.Y, q.Push + q.Lever*s.X + s.X*s.X + sense*s.X*s.Y}
	}
	m := newModel(t, f, pairParams{Push: -2, Lever: -2}, continuation.Named("rocker"))
	return follow(t, settle(t, m, planar{-0.8, 0}), "Push", continuation.Within(-2, 2))
}

type spatial struct{ X, Y, Z float64 }

// foldHopf has folds at Push = 0, and a pair with the real part Lever there.
func foldHopf(t testing.TB) *continuation.Locus {
	f := func(s spatial, q pairParams) spatial {
		r, a := s.X*s.X+s.Y*s.Y, q.Lever+s.Z
		return spatial{a*s.X - 3*s.Y - r*s.X, 3*s.X + a*s.Y - r*s.Y, q.Push + 0.2*q.Lever*q.Lever - s.Z*s.Z - r}
	}
	m := newModel(t, f, pairParams{Push: 1, Lever: -2}, continuation.Named("top"))
	path := follow(t, settle(t, m, spatial{0, 0, 1}), "Push", continuation.Within(-2, 2))
	return locus(t, path.Folds()[0], "Lever", continuation.Within(-3, 3))
}

type four struct{ A, B, C, D float64 }

// hopfHopf has pairs with the real parts Push - Lever² and Lever + Push/3.
func hopfHopf(t testing.TB) *continuation.Locus {
	f := func(s four, q pairParams) four {
		one, two := q.Push-q.Lever*q.Lever, q.Lever+q.Push/3
		r, w := s.A*s.A+s.B*s.B, s.C*s.C+s.D*s.D
		return four{one*s.A - 2*s.B - r*s.A, 2*s.A + one*s.B - r*s.B, two*s.C - 5*s.D - w*s.C, 5*s.C + two*s.D - w*s.D}
	}
	m := newModel(t, f, pairParams{Push: -1, Lever: -0.8}, continuation.Named("coupler"))
	path := follow(t, settle(t, m, four{}), "Push", continuation.Within(-1, 2))
	return locus(t, path.HopfPoints()[0], "Lever", continuation.Within(-1, 1))
}

// degenerate has Hopf points at Push = Lever²/5 whose first Lyapunov coefficient has
// the sign of Lever.
func degenerate(t testing.TB, lever float64) *continuation.Branch {
	f := func(s planar, q pairParams) planar {
		r := s.X*s.X + s.Y*s.Y
		a := q.Push - q.Lever*q.Lever/5 + q.Lever*r - r*r
		return planar{a*s.X - 3*s.Y, 3*s.X + a*s.Y}
	}
	m := newModel(t, f, pairParams{Push: -1, Lever: lever}, continuation.Named("rotor"))
	return follow(t, settle(t, m, planar{}), "Push", continuation.Within(-2, 2))
}

func degenerateLocus(t testing.TB) *continuation.Locus {
	return locus(t, degenerate(t, -1).HopfPoints()[0], "Lever", continuation.Within(-2, 2))
}
