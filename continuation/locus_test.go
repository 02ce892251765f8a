package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

var locusKinds = map[string]string{
	"cusp": "cusp", "bogdanov-takens": "Bogdanov-Takens point", "fold-hopf": "fold-Hopf point",
	"hopf-hopf": "Hopf-Hopf point", "degenerate-hopf": "degenerate Hopf point",
}

// lociThrough follows the fold or Hopf points of a case in the second parameter of a
// fact, as far as half a range beyond it.
func lociThrough(t *testing.T, c reference.Case, f reference.Fact) ([]*continuation.Locus, string) {
	t.Helper()
	second := ""
	for name := range f.At {
		if name != c.Follow.Param {
			second = name
		}
	}
	b := follow(t, c)
	want, base := float64(f.At[second]), float64(c.Params[second])
	low, high := math.Min(want, base), math.Max(want, base)
	width := math.Max(math.Max(high-low, 0.5*math.Abs(want)), 1e-2)
	var loci []*continuation.Locus
	for _, s := range b.Specials() {
		var l *continuation.Locus
		var err error
		within := continuation.Within(low-0.5*width, high+0.5*width)
		switch s := s.(type) {
		case *continuation.Fold:
			l, err = s.Follow(second, within)
		case *continuation.Hopf:
			l, err = s.Follow(second, within)
		default:
			continue
		}
		if err != nil {
			t.Errorf("%s: %v", s.Summary(), err)
			continue
		}
		loci = append(loci, l)
	}
	return loci, second
}

// Every point of the reference cases at which the kind of limit changes in two
// parameters is found on a locus, with its coefficients. The pitchfork of
// genetic-toggle is no fold: Tilt breaks it, so no locus leads through its cusp from
// the branch that the case follows.
func TestReferenceLoci(t *testing.T) {
	tried := 0
	for _, c := range cases(t) {
		for _, f := range c.Facts {
			if locusKinds[f.Kind] == "" || c.ID == "genetic-toggle" {
				continue
			}
			tried++
			t.Run(c.ID+"/"+f.Kind, func(t *testing.T) {
				loci, second := lociThrough(t, c, f)
				for _, l := range loci {
					for _, s := range l.Specials() {
						if s.Kind == locusKinds[f.Kind] && near(s.Where.Second, float64(f.At[second]), 1, 1e-9) &&
							near(s.Where.First, float64(f.At[c.Follow.Param]), 1, 1e-9) {
							checkLocusSpecial(t, c, s, f)
							return
						}
					}
				}
				t.Errorf("not found; the loci are %v", loci)
			})
		}
	}
	if tried != 11 {
		t.Errorf("%d facts tried, want 11", tried)
	}
}

func checkLocusSpecial(t *testing.T, c reference.Case, s *continuation.LocusSpecial, f reference.Fact) {
	t.Helper()
	x, err := reference.Values(f.State, s.Where.Model())
	if err != nil {
		t.Fatal(err)
	}
	for i := range x {
		if !near(s.Where.State[i], x[i], float64(c.Scale[i]), 1e-7) {
			t.Errorf("state %d is %.10g, want %.10g", i, s.Where.State[i], x[i])
		}
	}
	for _, v := range []struct {
		name string
		got  float64
		want reference.Number
	}{{"cubic", s.Cubic, f.Cubic}, {"a2", s.A2, f.A2}, {"b2", s.B2, f.B2}, {"omega", s.Omega, f.Omega}} {
		if v.want != 0 && !near(v.got, float64(v.want), 0, 1e-6) {
			t.Errorf("%s = %.10g, want %.10g", v.name, v.got, float64(v.want))
		}
	}
}

// No special point is invented on the loci of the cooled tank and the budworm: the
// reference has one cusp each, and one Bogdanov-Takens point for the tank.
func TestLociInventNothing(t *testing.T) {
	for id, want := range map[string]map[string]int{
		"cooled-tank":      {"cusp": 1, "Bogdanov-Takens point": 1},
		"budworm-outbreak": {"cusp": 1},
		"lake-phosphorus":  {"cusp": 1},
	} {
		c := reference1(t, id)
		var fact reference.Fact
		for _, f := range c.Facts {
			if f.Kind == "cusp" {
				fact = f
			}
		}
		loci, _ := lociThrough(t, c, fact)
		for _, l := range loci {
			if l.Kind() != "fold" {
				continue
			}
			count := map[string]int{}
			for _, s := range l.Specials() {
				count[s.Kind]++
			}
			for kind, n := range want {
				if count[kind] != n {
					t.Errorf("%s: %d times %s, want %d: %v", id, count[kind], kind, n, l)
				}
			}
			if len(count) != len(want) {
				t.Errorf("%s: %v", id, l)
			}
		}
	}
}

// The fold locus of the budworm in closed form (Ludwig, Jones & Holling 1978): r = 2
// x³/(1+x²)², k = 2 x³/(x²-1).
func TestFoldLocusInClosedForm(t *testing.T) {
	c := reference1(t, "budworm-outbreak")
	fold := follow(t, c).Folds()[0]
	l, err := fold.Follow("K", continuation.Within(5, 15))
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range l.Points() {
		x := p.State[0]
		r, k := 2*x*x*x/math.Pow(1+x*x, 2), 2*x*x*x/(x*x-1)
		if !near(p.First, r, 0, 1e-8) || !near(p.Second, k, 0, 1e-7) {
			t.Fatalf("at x = %g: R %.10g, K %.10g, want %.10g, %.10g", x, p.First, p.Second, r, k)
		}
	}
	if len(l.Points()) < 20 {
		t.Errorf("%d points", len(l.Points()))
	}
	// f_xx vanishes at the cusp only, x = sqrt(3).
	for i := 1; i < len(l.Points()); i++ {
		a, b := l.Points()[i-1], l.Points()[i]
		if (a.Quadratic > 0) != (b.Quadratic > 0) && (a.State[0]-math.Sqrt(3))*(b.State[0]-math.Sqrt(3)) > 1e-9 {
			t.Errorf("the quadratic coefficient changes sign between x = %g and %g", a.State[0], b.State[0])
		}
	}
}

// The slope of the locus at a fold is its sensitivity.
func TestLocusSlopeIsTheSensitivity(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	fold := mustFollow(t, start, "Coolant", continuation.Within(260, 330)).Folds()[0]
	l, err := fold.Follow("Inflow", continuation.Within(80, 120), continuation.LandAt(99.9, 100.1))
	if err != nil {
		t.Fatal(err)
	}
	var at [2]float64
	for _, p := range l.Points() {
		switch p.Second {
		case 99.9:
			at[0] = p.First
		case 100.1:
			at[1] = p.First
		}
	}
	s, err := fold.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	if slope := (at[1] - at[0]) / 0.2; !near(slope, s.List[0].Slope, 0, 1e-5) {
		t.Errorf("slope of the locus %.8g, sensitivity %.8g", slope, s.List[0].Slope)
	}
}

func TestBadLoci(t *testing.T) {
	type params struct{ L, Idle float64 }
	m, err := continuation.NewModel(func(s scalar, q params) scalar { return scalar{q.L + s.X*s.X} }, params{-1, 2})
	if err != nil {
		t.Fatal(err)
	}
	fold := mustFollow(t, settled(t, m, scalar{1}), "L", continuation.Within(-2, 1)).Folds()[0]
	_, err = fold.Follow("Idle")
	oneLine(t, err, "Idle does not enter the equations")
	_, err = fold.Follow("L")
	oneLine(t, err, "a locus wants a second parameter")
	_, err = fold.Follow("Idel")
	oneLine(t, err, "did you mean Idle?")
}
