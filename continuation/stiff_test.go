package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

type none struct{ Unused float64 }

// A stiffProblem is one of the published test problems for stiff solvers. Its values
// are those of Hairer & Wanner, Solving Ordinary Differential Equations II (2nd ed.
// 1996), section IV.10, and of the collection of test problems for initial value
// solvers that has grown from it, written down from memory; TestStiffReferences
// confirms them by another method.
type stiffProblem struct {
	name  string
	f     func(y []float64, _ none, f []float64)
	start []float64
	at    []float64
	want  [][]float64
}

var stiffProblems = []stiffProblem{
	{
		name: "Robertson",
		f: func(y []float64, _ none, f []float64) {
			a, b, c := 0.04*y[0], 1e4*y[1]*y[2], 3e7*y[1]*y[1]
			f[0], f[1], f[2] = b-a, a-b-c, c
		},
		start: []float64{1, 0, 0},
		at:    []float64{1, 10, 100, 1e11},
		want: [][]float64{
			{0.9664597373330035, 0.3074626578578675e-4, 0.3350951640121071e-1},
			{0.8413699238414729, 0.1623390937990473e-4, 0.1586138422491472},
			{0.6172348823960878, 0.6153591274639123e-5, 0.3827589640126376},
			{0.2083340149701255e-7, 0.8333360770334713e-13, 0.9999999791665050},
		},
	},
	{
		name: "van der Pol",
		f: func(y []float64, _ none, f []float64) {
			f[0], f[1] = y[1], ((1-y[0]*y[0])*y[1]-y[0])*1e6
		},
		start: []float64{2, 0},
		at:    []float64{1, 2},
		want: [][]float64{
			{-0.1863646254808130e1, 0.7535430865435460},
			{0.1706167732170483e1, -0.8928097010247975},
		},
	},
	{
		name: "Oregonator",
		f: func(y []float64, _ none, f []float64) {
			f[0] = 77.27 * (y[1] + y[0]*(1-8.375e-6*y[0]-y[1]))
			f[1] = (y[2] - (1+y[0])*y[1]) / 77.27
			f[2] = 0.161 * (y[0] - y[2])
		},
		start: []float64{1, 2, 3},
		at:    []float64{30, 360},
		want: [][]float64{
			{0.1000661467180497e1, 0.1512778937348249e4, 0.1035854312767229e5},
			{0.1000814870318523e1, 0.1228178521549917e4, 0.1320554942846706e3},
		},
	},
	{
		name: "HIRES",
		f: func(y []float64, _ none, f []float64) {
			f[0] = -1.71*y[0] + 0.43*y[1] + 8.32*y[2] + 0.0007
			f[1] = 1.71*y[0] - 8.75*y[1]
			f[2] = -10.03*y[2] + 0.43*y[3] + 0.035*y[4]
			f[3] = 8.32*y[1] + 1.71*y[2] - 1.12*y[3]
			f[4] = -1.745*y[4] + 0.43*y[5] + 0.43*y[6]
			f[5] = -280*y[5]*y[7] + 0.69*y[3] + 1.71*y[4] - 0.43*y[5] + 0.69*y[6]
			f[6] = 280*y[5]*y[7] - 1.81*y[6]
			f[7] = -f[6]
		},
		start: []float64{1, 0, 0, 0, 0, 0, 0, 0.0057},
		at:    []float64{321.8122},
		want: [][]float64{{
			0.7371312573325668e-3, 0.1442485726316185e-3, 0.5888729740967575e-4, 0.1175651343283149e-2,
			0.2386356198831331e-2, 0.6238968252742796e-2, 0.2849998395185769e-2, 0.2850001604814231e-2,
		}},
	},
}

func (p stiffProblem) model(t testing.TB) *continuation.Model {
	t.Helper()
	names := []string{"A", "B", "C", "D", "E", "F", "G", "H"}[:len(p.start)]
	m, err := continuation.NewModel(p.f, none{1}, continuation.States(names, nil, nil), continuation.Named(p.name))
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// The error at the published times is within ten times the tolerance, in every
// component, relative to it or to the floor that the tolerance has.
func TestStiffProblems(t *testing.T) {
	for _, p := range stiffProblems {
		m := p.model(t)
		for i, time := range p.at {
			for _, tolerance := range []float64{1e-4, 1e-6, 1e-8} {
				path, err := m.Simulate(p.start, time, continuation.Accuracy(tolerance))
				if err != nil {
					t.Fatal(err)
				}
				end, x := path.End()
				if end != time {
					t.Errorf("%s to %g: %s", p.name, time, path.Ended)
					continue
				}
				worst := 0.0
				for k, want := range p.want[i] {
					size := 0.0
					for _, y := range path.States {
						size = math.Max(size, math.Abs(y[k]))
					}
					worst = math.Max(worst, math.Abs(x[k]-want)/math.Max(math.Abs(want), 1e-3*size))
				}
				t.Logf("%s to %g, tolerance %g: error %.2g, %d steps, %d rejected", p.name, time, tolerance, worst, path.Steps, path.Rejected)
				if worst > 10*tolerance {
					t.Errorf("%s to %g: error %.2g at tolerance %g", p.name, time, worst, tolerance)
				}
			}
		}
	}
}
