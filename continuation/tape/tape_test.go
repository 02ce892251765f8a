package tape

import (
	"math"
	"reflect"
	"testing"
)

// record turns text into a tape of its function model.
func record(t testing.TB, text string, set Settings) *Program {
	t.Helper()
	src, err := Parse("model", text)
	if err != nil {
		t.Fatal(err)
	}
	p, err := Record(src, set)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

type tankParams struct{ Da, B, Beta float64 }

const tank = `
type State struct{ X, Y float64 }
type Params struct{ Da, B, Beta float64 }

func model(s State, q Params) State {
	r := q.Da * (1 - s.X) * math.Exp(s.Y)
	return State{
		X: -s.X + r,
		Y: -(1+q.Beta)*s.Y + q.B*r,
	}
}
`

// The derivatives of the tank by hand.
func TestTankByHand(t *testing.T) {
	p := record(t, tank, Settings{Params: reflect.ValueOf(tankParams{0.1, 10, 2})})
	x, q := []float64{0.3, 0.7}, []float64{0.1, 10, 2}
	e := math.Exp(0.7)
	in := &Inputs{X: x, P: q, W: []float64{1, 2}}
	in.Dirs[0] = []float64{3, 5, 7}
	// f1 = -X + r, f2 = -(1+Beta) Y + B r, r = Da (1-X) e^Y; w f = ... + 21 r.
	// r_zz[a, .] with a = (3, 5, 7) for z = (X, Y, Da):
	rx := -0.1*e*5 - e*7
	ry := -0.1*e*3 + 0.1*0.7*e*5 + 0.7*e*7
	ra := -e*3 + 0.7*e*5
	tests := []struct {
		name string
		code *Code
		want []float64
	}{
		{"value", p.Value(), []float64{-0.3 + 0.07*e, -2.1 + 0.7*e}},
		{"Jacobian", p.Jacobian(0), []float64{-1 - 0.1*e, 0.07 * e, 0.7 * e, -e, -3 + 0.7*e, 7 * e}},
		{"Jacobian without parameter", p.Jacobian(-1), []float64{-1 - 0.1*e, 0.07 * e, -e, -3 + 0.7*e}},
		{"parameters", p.Parameters(), []float64{0.7 * e, 0, 0, 7 * e, 0.07 * e, -0.7}},
		{"one parameter", p.Parameter(1), []float64{0, 0.07 * e}},
		{"sparse", p.Sparse(), []float64{-1 - 0.1*e, 0.07 * e, -e, -3 + 0.7*e}},
		{"first", p.Directional(0, "a"), []float64{-3 - 0.3*e + 0.35*e + 4.9*e, -15 - 3*e + 3.5*e + 49*e}},
		{"second", p.Directional(0, "aa"), []float64{3*rx + 5*ry + 7*ra, 10 * (3*rx + 5*ry + 7*ra)}},
		{"adjoint", p.Adjoint(0, "a"), []float64{21 * rx, 21 * ry, 21 * ra}},
		{"gradient", p.Adjoint(0, ""), []float64{-1 - 2.1*e, -6 + 1.47*e, 14.7 * e}},
	}
	for _, test := range tests {
		m := test.code.NewMachine()
		m.RunWith(in)
		for i, want := range test.want {
			if got := m.Out()[i]; math.Abs(got-want) > 1e-13*math.Max(1, math.Abs(want)) {
				t.Errorf("%s: component %d is %v, want %v", test.name, i, got, want)
			}
		}
	}
}
