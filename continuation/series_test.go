package continuation_test

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

type ignitionState struct{ X float64 }
type ignitionParams struct{ Lambda float64 }

func ignition(s ignitionState, q ignitionParams) ignitionState {
	return ignitionState{q.Lambda*math.Exp(s.X) - s.X}
}

const ignitionSource = `
type ignitionState struct{ X float64 }
type ignitionParams struct{ Lambda float64 }

func ignition(s ignitionState, q ignitionParams) ignitionState {
	return ignitionState{q.Lambda*math.Exp(s.X) - s.X}
}
`

func ignitionBranch(t *testing.T, opts ...continuation.Option) *continuation.Branch {
	t.Helper()
	m, err := continuation.NewModel(ignition, ignitionParams{0.1}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	p, err := m.Settle(ignitionState{0.1})
	if err != nil {
		t.Fatal(err)
	}
	b, err := p.Follow("Lambda", continuation.Within(0.05, 0.5))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// On the branch λ = x exp(-x), with X as local parameter the coefficients of λ
// about x0 are exp(-x0) (-1)^k (x0/k! - 1/(k-1)!).
func TestSeriesInAState(t *testing.T) {
	for _, p := range ignitionBranch(t, continuation.WithSource("ignition", ignitionSource)).Points() {
		s, err := p.Series(12, "X")
		if err != nil {
			t.Fatal(err)
		}
		x := p.State[0]
		for k := 1; k <= 12; k++ {
			want := math.Exp(-x) * math.Pow(-1, float64(k)) * (x/math.Gamma(float64(k+1)) - 1/math.Gamma(float64(k)))
			if got := s.Coefficients[k][1]; math.Abs(got-want) > 1e-13 {
				t.Errorf("at X %v: coefficient %d is %v, want %v", x, k, got, want)
			}
		}
	}
}

// In the parameter the nearest singularity is the fold at 1/e.
func TestSeriesRadius(t *testing.T) {
	p := ignitionBranch(t, continuation.WithSource("ignition", ignitionSource)).Points()[0]
	s, err := p.Series(40, "Lambda")
	if err != nil {
		t.Fatal(err)
	}
	if want := math.Exp(-1) - p.Value(); math.Abs(s.Radius-want) > 0.1*want {
		t.Errorf("radius %v at Lambda %v, want about %v", s.Radius, p.Value(), want)
	}
}

// In arclength the polynomial stays on the branch through the fold, to its
// order, and runs along it with unit speed in scaled variables.
func TestSeriesInArclength(t *testing.T) {
	const order = 4
	b := ignitionBranch(t, continuation.WithSource("ignition", ignitionSource))
	p := b.Folds()[0].Where()
	s, err := p.Series(order, "")
	if err != nil {
		t.Fatal(err)
	}
	residual := func(h float64) float64 {
		z := s.At(h)
		return math.Abs(z[1]*math.Exp(z[0]) - z[0])
	}
	far, near := residual(0.4), residual(0.2)
	if rate := math.Log2(far / near); rate < order+0.5 || far == 0 {
		t.Errorf("residuals %g and %g fall with order %.2f, want %d", far, near, rate, order+1)
	}
	if length := s.Coefficients[1][0]*p.Tangent[0] + s.Coefficients[1][1]*p.Tangent[1]; length <= 0 {
		t.Error("the series runs against the tangent")
	}
}

func TestSeriesRefusals(t *testing.T) {
	points := ignitionBranch(t).Points()
	for _, test := range []struct {
		by   string
		want string
	}{{"Lambda", "Series: it needs exact derivatives; the model has finite differences"}, {"Lamda", "did you mean Lambda?"}} {
		if _, err := points[0].Series(3, test.by); err == nil || !strings.Contains(err.Error(), test.want) {
			t.Errorf("%s: error %v, want %q", test.by, err, test.want)
		}
	}
	fold := ignitionBranch(t, continuation.WithSource("ignition", ignitionSource)).Folds()[0].Where()
	if s, err := fold.Series(3, "Lambda"); err == nil && math.Abs(s.Coefficients[1][0]) < 1e6 {
		t.Errorf("a series in the parameter at its fold: %v", s.Coefficients)
	}
}
