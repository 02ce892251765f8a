package tape_test

import (
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"brinkline/continuation/tape"
	"brinkline/continuation/tape/internal/samples"
)

// Every sample gives the same bits from its tape as from the compiler.
func TestSamplesGiveTheBitsOfTheCompiler(t *testing.T) {
	for name, f := range samples.Models {
		t.Run(name, func(t *testing.T) {
			src, err := tape.Parse(name, samples.Source)
			if err != nil {
				t.Fatal(err)
			}
			rng := rand.New(rand.NewPCG(1, 2))
			q := samples.Params{A: 1.25, B: -0.5, Table: [4]float64{1, -2, 0.5, 3}, N: 3}
			family := tape.NewFamily(src, tape.Settings{States: 3, Params: reflect.ValueOf(q)})
			for range 300 {
				q.A, q.B, q.Table[1] = rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
				p := []float64{q.A, q.B, q.Table[0], q.Table[1], q.Table[2], q.Table[3]}
				x := sampleState(rng)
				want := []float64{math.NaN(), math.NaN(), math.NaN()}
				f(append(make([]float64, 0, 3), x...), q, want)
				program, err := family.At(x, p)
				if err != nil {
					t.Fatal(err)
				}
				m := program.Value().NewMachine()
				if !m.Run(x, p) {
					t.Fatal("the guards do not hold")
				}
				for i, got := range m.Out() {
					if math.Float64bits(got) != math.Float64bits(want[i]) && !(math.IsNaN(got) && math.IsNaN(want[i])) {
						t.Fatalf("at %v, %v: f[%d] is %v, want %v", x, p, i, got, want[i])
					}
				}
			}
			t.Logf("%d recordings", family.Recorded())
		})
	}
}

// sampleState also meets the values at which conditions are equal.
func sampleState(rng *rand.Rand) []float64 {
	x := make([]float64, 3)
	for i := range x {
		switch rng.IntN(8) {
		case 0:
			x[i] = []float64{0, 0.5, 1, -1, math.Copysign(0, -1)}[rng.IntN(5)]
		case 1:
			x[i] = x[0]
		default:
			x[i] = 1.5 * rng.NormFloat64()
		}
	}
	return x
}
