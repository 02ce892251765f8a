package continuation_test

import (
	"encoding/json"
	"math"
	"strconv"
	"strings"
	"testing"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

// The cases of testdata/reference-cases.json: the published source of each model
// is named there and in testdata/README.md; the values were recomputed in 70
// digits.
func cases(t testing.TB) []reference.Case {
	t.Helper()
	list, err := reference.Load("../testdata/reference-cases.json")
	if err != nil {
		t.Fatal(err)
	}
	if len(list) != 34 {
		t.Fatalf("%d cases, want 34", len(list))
	}
	return list
}

func follow(t testing.TB, c reference.Case, opts ...continuation.FollowOption) *continuation.Branch {
	t.Helper()
	m, err := c.Model(true)
	if err != nil {
		t.Fatal(err)
	}
	x, err := reference.Values(c.Start.State, m)
	if err != nil {
		t.Fatal(err)
	}
	return followFrom(t, m, x, c.Follow.Param, c, opts...)
}

func followFrom(t testing.TB, m *continuation.Model, x []float64, param string, c reference.Case, opts ...continuation.FollowOption) *continuation.Branch {
	t.Helper()
	start, err := m.Settle(x)
	if err != nil {
		t.Fatal(err)
	}
	opts = append([]continuation.FollowOption{continuation.Within(float64(c.Follow.From), float64(c.Follow.To))}, opts...)
	b, err := start.Follow(param, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// expected returns the facts that a run must find, in order. A neutral saddle
// (eigenvalues +a and -a) is none.
func expected(c reference.Case) []reference.Fact {
	var list []reference.Fact
	for _, i := range c.Branch.SpecialPoints {
		if c.Facts[i].Kind != "neutral saddle" {
			list = append(list, c.Facts[i])
		}
	}
	return list
}

// What a kind of fact is called here: transcritical and pitchfork are told apart
// by switching, which the range test does not need.
var kinds = map[string]string{
	"fold": "fold", "hopf": "Hopf point",
	"transcritical": "simple stationary bifurcation", "pitchfork": "simple stationary bifurcation",
	"branch point": "simple stationary bifurcation",
}

// near compares with a relative tolerance against the larger of the value and
// size.
func near(got, want, size, tolerance float64) bool {
	return math.Abs(got-want) <= tolerance*math.Max(math.Abs(want), size)
}

// Tolerances of derivative-dependent values: finite differences of order 4 give
// f_x to about 1e-12 of its terms and second derivatives to about 1e-8.
const (
	tolParameter   = 1e-10 // asked for: 8 digits
	tolHopf        = 1e-9
	tolState       = 1e-8
	tolCoefficient = 2e-6
	tolVector      = 1e-7
)

// Every fold, simple stationary bifurcation and Hopf point of every case is found
// at its place, none is missed and none invented, at three greatest step lengths.
func TestReferenceBranches(t *testing.T) {
	for _, c := range cases(t) {
		for _, most := range []float64{0.01, 0.05, 0.15} {
			t.Run(c.ID+"/"+strconv.FormatFloat(most, 'g', -1, 64), func(t *testing.T) {
				b := follow(t, c, continuation.StepBetween(1e-8, most))
				checkSpecials(t, c, b, nil)
				checkStretches(t, c, b)
				checkEnds(t, c, b)
				if len(b.Notes()) > 0 {
					t.Errorf("notes: %q", b.Notes())
				}
			})
		}
	}
}

func checkSpecials(t *testing.T, c reference.Case, b *continuation.Branch, factors []float64) {
	t.Helper()
	want := expected(c)
	if len(b.Specials()) != len(want) {
		t.Fatalf("found %v, want %d points", b.Specials(), len(want))
	}
	width := float64(c.Follow.To - c.Follow.From)
	for i, s := range b.Specials() {
		f := want[i]
		if s.Kind() != kinds[f.Kind] {
			t.Errorf("point %d is a %s, want %s", i, s.Kind(), f.Kind)
			continue
		}
		value, tolerance := float64(f.At[c.Follow.Param]), tolParameter
		size := 1e-3 * width
		switch f.Kind {
		case "fold":
		case "hopf":
			tolerance = tolHopf
		default:
			size = width // of first order in the error of f_x, unlike a fold
		}
		if !near(s.Where().Value(), value, size, tolerance) {
			t.Errorf("%s at %.15g, want %.15g", s.Kind(), s.Where().Value(), value)
		}
		checkClaim(t, s, value)
		checkState(t, c, s.Where(), f, factors)
		if factors == nil {
			checkCoefficients(t, c, s, f)
		}
	}
}

// checkClaim holds the digits that a point claims against those it has.
func checkClaim(t *testing.T, s continuation.Special, value float64) {
	t.Helper()
	if value == 0 {
		return
	}
	claimed := math.Pow(10, -float64(s.Digits())) * math.Abs(value)
	if off := math.Abs(s.Where().Value() - value); off > claimed {
		t.Errorf("%s claims %d digits and is off by %.2g", s.Summary(), s.Digits(), off)
	}
}

func checkState(t *testing.T, c reference.Case, p *continuation.Point, f reference.Fact, factors []float64) {
	t.Helper()
	x, err := reference.Values(f.State, p.Model())
	if err != nil {
		t.Fatal(err)
	}
	for i := range x {
		scale := float64(c.Scale[i])
		if factors != nil {
			x[i], scale = x[i]*factors[i], scale*factors[i]
		}
		if !near(p.State[i], x[i], scale, tolState) {
			t.Errorf("%s %d: state %d is %.12g, want %.12g", f.Kind, i, i, p.State[i], x[i])
		}
	}
}

func checkCoefficients(t *testing.T, c reference.Case, s continuation.Special, f reference.Fact) {
	t.Helper()
	switch s := s.(type) {
	case *continuation.Fold:
		checkVector(t, "v", s.Right, f.NullRight)
		checkVector(t, "w", s.Left, f.NullLeft)
		var test reference.Number
		if err := json.Unmarshal(f.RangeTest, &test); err != nil {
			t.Fatal(err)
		}
		if !near(s.RangeTest, float64(test), 0, tolCoefficient) || s.RangeRelative < 1e-6 {
			t.Errorf("range test %.10g (relative %.2g), want %.10g", s.RangeTest, s.RangeRelative, float64(test))
		}
		if !near(s.Quadratic, float64(f.Quadratic), 0, tolCoefficient) {
			t.Errorf("quadratic coefficient %.10g, want %.10g", s.Quadratic, float64(f.Quadratic))
		}
		checkSensitivities(t, s, f)
	case *continuation.BranchPoint:
		checkVector(t, "v", s.Right, f.NullRight)
		checkVector(t, "w", s.Left, f.NullLeft)
		if s.RangeRelative > 1e-8 {
			t.Errorf("range test %.2g relative to its size, want 0", s.RangeRelative)
		}
		checkReduced(t, s, f)
	case *continuation.Hopf:
		if !near(s.Omega, float64(f.Omega), 0, 1e-8) {
			t.Errorf("frequency %.12g, want %.12g", s.Omega, float64(f.Omega))
		}
		if !near(s.Lyapunov, float64(f.Lyapunov), 0, 1e-5) {
			t.Errorf("first Lyapunov coefficient %.12g, want %.12g", s.Lyapunov, float64(f.Lyapunov))
		}
		if !near(s.CrossingSpeed, float64(f.CrossingSpeed), 0, 1e-6) {
			t.Errorf("crossing speed %.12g, want %.12g", s.CrossingSpeed, float64(f.CrossingSpeed))
		}
	}
}

func checkReduced(t *testing.T, b *continuation.BranchPoint, f reference.Fact) {
	t.Helper()
	size := math.Max(math.Abs(float64(f.Mixed)), math.Max(math.Abs(float64(f.Quadratic)), math.Abs(float64(f.ParamQuad))))
	for _, c := range []struct {
		name string
		got  float64
		want reference.Number
	}{
		{"quadratic", b.Quadratic, f.Quadratic}, {"mixed", b.Mixed, f.Mixed}, {"parameter quadratic", b.ParameterQuadratic, f.ParamQuad},
	} {
		if !near(c.got, float64(c.want), size, tolCoefficient) {
			t.Errorf("%s coefficient %.10g, want %.10g", c.name, c.got, float64(c.want))
		}
	}
	if f.Kind == "pitchfork" && !near(b.Cubic, float64(f.Cubic), 0, 1e-4) {
		t.Errorf("cubic coefficient %.10g, want %.10g", b.Cubic, float64(f.Cubic))
	}
	if got := strings.Contains(b.Name(), "pitchfork"); got != (f.Kind == "pitchfork") {
		t.Errorf("named %s, want a %s", b.Name(), f.Kind)
	}
	for i, want := range f.Tangents {
		checkVector(t, "tangent", b.Tangents[i], want)
	}
}

func checkVector(t *testing.T, name string, got []float64, want []reference.Number) {
	t.Helper()
	size := 0.0
	for _, v := range want {
		size = math.Max(size, math.Abs(float64(v)))
	}
	for i, v := range want {
		if !near(got[i], float64(v), size, tolVector) {
			t.Errorf("%s[%d] = %.10g, want %.10g", name, i, got[i], float64(v))
		}
	}
}

func checkSensitivities(t *testing.T, fold *continuation.Fold, f reference.Fact) {
	t.Helper()
	if len(f.Sensitivities) == 0 {
		return
	}
	list, err := fold.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	for _, s := range list.List {
		if want := float64(f.Sensitivities[s.Name]); !near(s.Slope, want, 1e-9, 1e-7) {
			t.Errorf("sensitivity to %s is %.12g, want %.12g", s.Name, s.Slope, want)
		}
	}
}

func checkStretches(t *testing.T, c reference.Case, b *continuation.Branch) {
	t.Helper()
	// Neutral saddles cut the segments of the file, without a change of the count.
	var want []int
	for i, s := range c.Branch.Segments {
		if i > 0 && c.Facts[c.Branch.SpecialPoints[i-1]].Kind == "neutral saddle" {
			continue
		}
		want = append(want, s.Unstable)
	}
	var got []int
	for _, s := range b.Stretches() {
		got = append(got, s.Unstable)
	}
	if len(got) != len(want) {
		t.Fatalf("unstable eigenvalues by stretch: %v, want %v", got, want)
	}
	for i := range want {
		if got[i] != want[i] {
			t.Errorf("unstable eigenvalues by stretch: %v, want %v", got, want)
			break
		}
	}
}

func checkEnds(t *testing.T, c reference.Case, b *continuation.Branch) {
	t.Helper()
	words := map[continuation.EndReason]string{continuation.LeftRange: "range", continuation.Closed: "closed"}
	for i, e := range b.Ends() {
		if words[e.Reason] != c.Branch.Ends[i] {
			t.Errorf("end %d: %s, want %s", i, e.Text, c.Branch.Ends[i])
		}
		if v := e.Point.Value(); e.Reason == continuation.LeftRange && v != float64(c.Follow.From) && v != float64(c.Follow.To) {
			t.Errorf("end %d at %v, not on the bound", i, v)
		}
	}
}

// A model rescaled by 1e-6 and 1e6 in its states gives the same points, with the
// scales of the case and without. A state that is 0 along the whole branch shows
// no size of its own, so those cases want the scale.
func TestRescaledStates(t *testing.T) {
	for _, c := range cases(t) {
		for _, by := range []struct {
			name   string
			factor func(i int) float64
		}{
			{"1e6", func(int) float64 { return 1e6 }},
			{"1e-6", func(int) float64 { return 1e-6 }},
			{"mixed", func(i int) float64 { return []float64{1e6, 1e-6, 1}[i%3] }},
		} {
			t.Run(c.ID+"/"+by.name+"/scale", func(t *testing.T) { rescaled(t, c, by.factor, true) })
			if !trivial[c.ID] {
				t.Run(c.ID+"/"+by.name, func(t *testing.T) { rescaled(t, c, by.factor, false) })
			}
		}
	}
}

// Cases whose branch has states that are 0 throughout.
var trivial = map[string]bool{
	"column-buckling-10-points": true, "degenerate-hopf-normal-form": true, "pitchfork-subcritical": true,
	"transcritical-epidemic": true, "two-oscillators": true, "shallow-arch-two-modes": true,
	"fold-hopf-normal-form": true,
}

func rescaled(t *testing.T, c reference.Case, factor func(int) float64, scales bool) {
	factors := make([]float64, c.N)
	for i := range factors {
		factors[i] = factor(i)
	}
	m, err := c.Rescaled(factors, scales)
	if err != nil {
		t.Fatal(err)
	}
	base, err := c.Model(true)
	if err != nil {
		t.Fatal(err)
	}
	x, err := reference.Values(c.Start.State, base)
	if err != nil {
		t.Fatal(err)
	}
	param := ""
	for i, q := range base.Parameters() {
		if q.Name == c.Follow.Param {
			param = "P[" + strconv.Itoa(i) + "]"
		}
	}
	for i := range x {
		x[i] *= factors[i]
	}
	checkSpecials(t, c, followFrom(t, m, x, param, c), factors)
}
