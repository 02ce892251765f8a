package continuation_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"testing"

	"brinkline/continuation"
)

// A polynomialSystem has all of its real roots known by construction.
type polynomialSystem struct {
	kind  string
	f     func(x, out []float64)
	roots [][]float64
	n     int
}

// randomSystem draws a system of one of four kinds, with up to 30 roots in the box
// from -1 to 1, at least 0.02 apart. Its equations are mixed by a random matrix, so
// that none of them shows the structure.
func randomSystem(r *rand.Rand) *polynomialSystem {
	for {
		var s *polynomialSystem
		switch r.IntN(4) {
		case 0:
			s = crossingPlanes(r)
		case 1:
			s = separate(r)
		case 2:
			s = alongCurve(r)
		default:
			s = withComplexRoots(r, crossingPlanes(r))
		}
		s.roots = slices.DeleteFunc(s.roots, func(x []float64) bool { return largestOf(x) > 1 })
		if len(s.roots) > 0 && len(s.roots) <= 30 && apart(s.roots, 0.02) && clearOfEdge(s.roots) {
			return s.mixed(r)
		}
	}
}

func largestOf(x []float64) float64 {
	worst := 0.0
	for _, v := range x {
		worst = math.Max(worst, math.Abs(v))
	}
	return worst
}

func apart(roots [][]float64, least float64) bool {
	for i, x := range roots {
		for _, y := range roots[:i] {
			if math.Sqrt(distance2(x, y)) < least {
				return false
			}
		}
	}
	return true
}

func clearOfEdge(roots [][]float64) bool {
	return !slices.ContainsFunc(roots, func(x []float64) bool { return math.Abs(largestOf(x)-1) < 1e-3 })
}

func distance2(x, y []float64) float64 {
	sum := 0.0
	for i := range x {
		sum += (x[i] - y[i]) * (x[i] - y[i])
	}
	return sum
}

func uniform(r *rand.Rand) float64 { return 2*r.Float64() - 1 }

// crossingPlanes has products of linear forms for equations: the roots are the points
// in which one plane of each product meets the others.
func crossingPlanes(r *rand.Rand) *polynomialSystem {
	n := 1 + r.IntN(3)
	planes := make([][][]float64, n) // of each equation: normals, with the offset last
	for i := range planes {
		for range 1 + r.IntN(map[int]int{1: 9, 2: 5, 3: 3}[n]) {
			normal, through := make([]float64, n+1), make([]float64, n)
			for k := range n {
				normal[k], through[k] = r.NormFloat64(), 0.9*uniform(r)
			}
			length := math.Sqrt(distance2(normal, make([]float64, n+1)))
			for k := range n {
				normal[k] /= length
				normal[n] -= normal[k] * through[k]
			}
			planes[i] = append(planes[i], normal)
		}
	}
	s := &polynomialSystem{kind: "planes", n: n}
	s.f = func(x, out []float64) {
		for i, list := range planes {
			out[i] = 1
			for _, p := range list {
				v := p[n]
				for k := range n {
					v += p[k] * x[k]
				}
				out[i] *= v
			}
		}
	}
	s.meet(planes, nil)
	return s
}

// meet adds the points in which the chosen planes and one of each further equation
// meet.
func (s *polynomialSystem) meet(planes [][][]float64, chosen [][]float64) {
	if len(chosen) == s.n {
		if x := solved(chosen); x != nil {
			s.roots = append(s.roots, x)
		}
		return
	}
	for _, p := range planes[len(chosen)] {
		s.meet(planes, append(chosen[:len(chosen):len(chosen)], p))
	}
}

// solved returns the point in which n planes meet, by elimination.
func solved(rows [][]float64) []float64 {
	n := len(rows)
	a := make([][]float64, n)
	for i := range a {
		a[i] = slices.Clone(rows[i])
		a[i][n] = -a[i][n]
	}
	for k := range n {
		pivot := k
		for i := k; i < n; i++ {
			if math.Abs(a[i][k]) > math.Abs(a[pivot][k]) {
				pivot = i
			}
		}
		a[k], a[pivot] = a[pivot], a[k]
		if math.Abs(a[k][k]) < 1e-3 {
			return []float64{math.Inf(1)} // nearly parallel: far out of the box or ill-conditioned
		}
		for i := range n {
			if i == k {
				continue
			}
			factor := a[i][k] / a[k][k]
			for j := k; j <= n; j++ {
				a[i][j] -= factor * a[k][j]
			}
		}
	}
	x := make([]float64, n)
	for i := range x {
		x[i] = a[i][n] / a[i][i]
	}
	return x
}

// separate has an equation for each of the turned coordinates.
func separate(r *rand.Rand) *polynomialSystem {
	n := 1 + r.IntN(4)
	s := &polynomialSystem{kind: "separate", n: n}
	list := make([][]float64, n)
	for i := range list {
		for range 1 + r.IntN(map[int]int{1: 9, 2: 5, 3: 3, 4: 2}[n]) {
			list[i] = append(list[i], 0.9*uniform(r))
		}
	}
	s.f = func(x, out []float64) {
		for i, roots := range list {
			out[i] = 1
			for _, v := range roots {
				out[i] *= x[i] - v
			}
		}
	}
	s.roots = [][]float64{{}}
	for _, choices := range list {
		var next [][]float64
		for _, x := range s.roots {
			for _, v := range choices {
				next = append(next, append(slices.Clone(x), v))
			}
		}
		s.roots = next
	}
	return s
}

// alongCurve has its roots on a polynomial curve.
func alongCurve(r *rand.Rand) *polynomialSystem {
	n := 2 + r.IntN(3)
	var at []float64
	for range 2 + r.IntN(7) {
		at = append(at, 0.95*uniform(r))
	}
	bends := make([][3]float64, n)
	for i := range bends {
		bends[i] = [3]float64{0.3 * uniform(r), 0.4 * uniform(r), 0.3 * uniform(r)}
	}
	curve := func(i int, v float64) float64 { return bends[i][0]*v + bends[i][1]*v*v + bends[i][2]*v*v*v*v }
	s := &polynomialSystem{kind: "curve", n: n}
	s.f = func(x, out []float64) {
		out[0] = 1
		for _, v := range at {
			out[0] *= x[0] - v
		}
		for i := 1; i < n; i++ {
			out[i] = x[i] - curve(i, x[0])
		}
	}
	for _, v := range at {
		x := []float64{v}
		for i := 1; i < n; i++ {
			x = append(x, curve(i, v))
		}
		s.roots = append(s.roots, x)
	}
	return s
}

// withComplexRoots multiplies the first equation by a factor without real zeros,
// near which Newton's method is led astray.
func withComplexRoots(r *rand.Rand, s *polynomialSystem) *polynomialSystem {
	centre := make([]float64, s.n)
	for i := range centre {
		centre[i] = uniform(r)
	}
	width := 0.05 + 0.3*r.Float64()
	f := s.f
	s.kind += ", complex"
	s.f = func(x, out []float64) {
		f(x, out)
		out[0] *= width + distance2(x, centre)
	}
	return s
}

// mixed mixes the equations by a random matrix that is far from singular.
func (s *polynomialSystem) mixed(r *rand.Rand) *polynomialSystem {
	n := s.n
	mix := make([]float64, n*n)
	for i := range n {
		for k := range n {
			mix[i*n+k] = 0.7 * uniform(r) / math.Sqrt(float64(n))
		}
		mix[i*n+i] += 1
	}
	f, plain := s.f, make([]float64, n)
	s.f = func(x, out []float64) {
		plain := slices.Clone(plain)
		f(x, plain)
		for i := range out {
			out[i] = 0
			for k, v := range plain {
				out[i] += mix[i*n+k] * v
			}
		}
	}
	return s
}

// model states the system in units in which state i is by factor[i] larger.
func (s *polynomialSystem) model(t testing.TB, factor []float64, opts ...continuation.Option) (*continuation.Model, continuation.Box) {
	names, box := make([]string, s.n), continuation.Box{}
	for i := range names {
		names[i] = fmt.Sprintf("X%d", i)
		box[names[i]] = [2]float64{-factor[i], factor[i]}
	}
	f := func(u []float64, q lambda, out []float64) {
		x := make([]float64, len(u))
		for i := range x {
			x[i] = u[i] / factor[i]
		}
		s.f(x, out)
	}
	opts = append(opts, continuation.States(names, nil, nil))
	m, err := continuation.NewModel(f, lambda{1}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return m, box
}

// missed returns how many roots are not among the points, and how many points are
// no roots.
func (s *polynomialSystem) missed(points []*continuation.Point, factor []float64) (missed, invented int) {
	found := make([]bool, len(s.roots))
	for _, p := range points {
		is := false
		for k, x := range s.roots {
			off := 0.0
			for i := range x {
				off = math.Max(off, math.Abs(p.State[i]/factor[i]-x[i]))
			}
			if off < 1e-6 && !found[k] {
				found[k], is = true, true
			}
		}
		if !is {
			invented++
		}
	}
	for _, ok := range found {
		if !ok {
			missed++
		}
	}
	return missed, invented
}

// All real roots of random polynomial systems are found at the default effort in 99 %
// of them, and nothing is invented, in whatever units the states are.
func TestSurveyOfPolynomials(t *testing.T) {
	systems := 60
	if os.Getenv("BRINKLINE_LONG") != "" {
		systems = 1000
	}
	whole, runs, starts, evaluations, roots := 0, 0, 0, 0, 0
	bad := map[string]int{}
	for k := range systems {
		r := rand.New(rand.NewPCG(uint64(k), 5))
		s := randomSystem(r)
		factor := make([]float64, s.n)
		for i := range factor {
			factor[i] = math.Pow(10, float64(r.IntN(13)-6))
		}
		m, box := s.model(t, factor)
		found, err := m.Survey(box)
		if err != nil {
			t.Fatalf("system %d (%s): %v", k, s.kind, err)
		}
		missed, invented := s.missed(found.Points(), factor)
		if invented > 0 {
			t.Errorf("system %d (%s): %d states that are no roots, %v", k, s.kind, invented, found)
		}
		if missed == 0 {
			whole++
		} else {
			bad[s.kind]++
			t.Logf("system %d (%s, n = %d): missed %d of %d roots; %s", k, s.kind, s.n, missed, len(s.roots), found.Statement())
		}
		tried := found.Tried()
		runs, starts, evaluations, roots = runs+tried.Runs, starts+tried.Starts, evaluations+tried.Evaluations, roots+len(s.roots)
	}
	t.Logf("all roots found in %d of %d systems; %d roots, %.0f starts, %.0f runs, %.0f evaluations a system; %v", whole, systems, roots,
		float64(starts)/float64(systems), float64(runs)/float64(systems), float64(evaluations)/float64(systems), bad)
	if float64(whole) < 0.99*float64(systems) {
		t.Errorf("all roots found in %d of %d systems, want 99 %%", whole, systems)
	}
}
