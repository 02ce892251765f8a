package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

// A tally counts what was tried against the reference facts.
type tally struct {
	tried, right, missed, invented int
	claimed, held                  int // digits of the parameter, summed
}

// Every fact of one parameter, with exact derivatives of the model's own source, over
// three greatest step lengths: kinds and order, parameters to 12 digits or to the
// digits claimed where conditioning leaves fewer, coefficients to 8. TestRescaledStates
// does the same by differences for three scalings of the states.
func TestReferenceFactsExactly(t *testing.T) {
	var sum tally
	for _, c := range cases(t) {
		for _, most := range []float64{0.01, 0.05, 0.15} {
			m, err := c.Model(true, continuation.WithSource("model", c.Equations))
			if err != nil {
				t.Fatal(err)
			}
			x, err := reference.Values(c.Start.State, m)
			if err != nil {
				t.Fatal(err)
			}
			b := followFrom(t, m, x, c.Follow.Param, c, continuation.StepBetween(1e-8, most))
			sum.compare(t, c, b)
		}
	}
	if sum.missed+sum.invented > 0 || sum.right != sum.tried {
		t.Errorf("%+v", sum)
	}
	t.Logf("facts tried %d, right %d, missed %d, invented %d; digits claimed %.1f, true %.1f on average",
		sum.tried, sum.right, sum.missed, sum.invented, float64(sum.claimed)/float64(sum.tried), float64(sum.held)/float64(sum.tried))
}

func (s *tally) compare(t *testing.T, c reference.Case, b *continuation.Branch) {
	t.Helper()
	want, got := expected(c), b.Specials()
	s.tried += len(want)
	s.missed += max(0, len(want)-len(got))
	s.invented += max(0, len(got)-len(want))
	width := float64(c.Follow.To - c.Follow.From)
	for i := range min(len(want), len(got)) {
		value := float64(want[i].At[c.Follow.Param])
		size := math.Max(math.Abs(value), 1e-3*width)
		off := math.Abs(got[i].Where().Value()-value) / size
		digits := min(15, int(-math.Log10(math.Max(off, 1e-16))))
		s.claimed += got[i].Digits()
		s.held += digits
		if got[i].Kind() != kinds[want[i].Kind] || digits < min(12, max(got[i].Digits(), 8)) {
			t.Errorf("%s: %s, want %s at %.15g; %d digits true, %d claimed", c.ID, got[i].Summary(), want[i].Kind, value, digits, got[i].Digits())
			continue
		}
		if s.coefficients(t, c, got[i], want[i]) {
			s.right++
		}
	}
}

// coefficients compares to 8 digits.
func (s *tally) coefficients(t *testing.T, c reference.Case, p continuation.Special, f reference.Fact) bool {
	t.Helper()
	type pair struct {
		name      string
		got, want float64
	}
	var list []pair
	switch p := p.(type) {
	case *continuation.Fold:
		list = []pair{{"quadratic", p.Quadratic, float64(f.Quadratic)}}
	case *continuation.BranchPoint:
		list = []pair{{"mixed", p.Mixed, float64(f.Mixed)}}
		if f.Kind == "pitchfork" {
			list = append(list, pair{"cubic", p.Cubic, float64(f.Cubic)})
		} else {
			list = append(list, pair{"quadratic", p.Quadratic, float64(f.Quadratic)})
		}
	case *continuation.Hopf:
		list = []pair{{"omega", p.Omega, float64(f.Omega)}, {"Lyapunov", p.Lyapunov, float64(f.Lyapunov)}, {"crossing speed", p.CrossingSpeed, float64(f.CrossingSpeed)}}
	}
	right := true
	for _, v := range list {
		if !near(v.got, v.want, 1e-6, 1e-8) {
			t.Errorf("%s: %s: %s %.12g, want %.12g", c.ID, p.Summary(), v.name, v.got, v.want)
			right = false
		}
	}
	return right
}
