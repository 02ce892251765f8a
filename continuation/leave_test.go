package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

func reference1(t *testing.T, id string) reference.Case {
	t.Helper()
	for _, c := range cases(t) {
		if c.ID == id {
			return c
		}
	}
	t.Fatalf("no case %s", id)
	return reference.Case{}
}

// Every branch point of the reference cases can be left; what is followed is a
// branch of steady states through the point that is another than the one it was
// found on.
func TestLeaveReferenceBranchPoints(t *testing.T) {
	for _, c := range cases(t) {
		if c.Branch.Counts["branch point"] == 0 {
			continue
		}
		t.Run(c.ID, func(t *testing.T) {
			for _, at := range follow(t, c).BranchPoints() {
				other, err := at.Leave()
				if err != nil {
					t.Fatal(err)
				}
				if n := len(other.Points()); n < 5 {
					t.Fatalf("%d points, ends %q and %q", n, other.Ends()[0].Text, other.Ends()[1].Text)
				}
				if len(other.BranchPoints()) == 0 || math.Abs(other.Points()[other.Start()].Value()-at.Value()) > 1e-12 {
					t.Errorf("the branch point is not on the branch that leaves it: %v", other)
				}
			}
		})
	}
}

// Strogatz, Nonlinear Dynamics and Chaos, 1994, section 3.4: x' = r x + x³ - x⁵
// has a subcritical pitchfork at 0; the branches that leave it turn at r = -1/4,
// x = ±1/√2.
func TestLeaveSubcriticalPitchfork(t *testing.T) {
	c := reference1(t, "pitchfork-subcritical")
	at := follow(t, c).BranchPoints()[0]
	if at.Name() != "subcritical pitchfork" {
		t.Errorf("named %s", at.Name())
	}
	other, err := at.Leave()
	if err != nil {
		t.Fatal(err)
	}
	if len(other.Folds()) != 2 {
		t.Fatalf("folds %v, want two", other.Folds())
	}
	for _, f := range other.Folds() {
		if math.Abs(f.Value()+0.25) > 1e-12 || math.Abs(math.Abs(f.Where().State[0])-math.Sqrt(0.5)) > 1e-8 {
			t.Errorf("fold at %.15g, x = %.12g", f.Value(), f.Where().State[0])
		}
	}
}

// derived: with a = y², b = (a + L)/2, c = sin(b)/3, the curves y = L and y = 2L - 1
// cross at L = 1.
func TestLeaveTwoCurves(t *testing.T) {
	c := reference1(t, "two-curves-crossing")
	found := follow(t, c)
	other, err := found.BranchPoints()[0].Leave()
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range []*continuation.Branch{found, other} {
		slope := 0.0
		for _, p := range b.Points() {
			y, l := p.State[0], p.Value()
			on1, on2 := math.Abs(y-l), math.Abs(y-(2*l-1))
			if math.Min(on1, on2) > 1e-8 {
				t.Fatalf("y = %v at L = %v lies on neither curve", y, l)
			}
			if l > 1.1 {
				slope = (y - 1) / (l - 1)
			}
		}
		t.Logf("slope %.3g", slope)
	}
	first := found.Points()[len(found.Points())-1].State[0]
	second := other.Points()[len(other.Points())-1].State[0]
	if math.Abs(first-second) < 0.5 {
		t.Errorf("both branches end at y = %v", first)
	}
}

func TestLeaveAFold(t *testing.T) {
	f := follow(t, reference1(t, "scalar-fold-ignition")).Folds()[0]
	_, err := f.Leave()
	oneLine(t, err, "one curve turns there")
}

func TestImperfection(t *testing.T) {
	at := follow(t, reference1(t, "genetic-toggle")).BranchPoints()[0]
	v, err := at.Imperfection("Tilt")
	if err != nil || math.Abs(v) < 1e-3 {
		t.Errorf("imperfection %v, %v", v, err)
	}
	_, err = at.Imperfection("Tild")
	oneLine(t, err, "did you mean Tilt?")
}
