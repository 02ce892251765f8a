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
			tape.UseLibrary(t)
			src, err := tape.Parse(name, samples.Source, samples.MoreSource)
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
				got, ok := program.Plainly(x, p)
				if !ok {
					t.Fatal("the guards do not hold")
				}
				for i, got := range got {
					if math.Float64bits(got) != math.Float64bits(want[i]) && !(math.IsNaN(got) && math.IsNaN(want[i])) {
						t.Fatalf("at %v, %v: f[%d] is %v, want %v", x, p, i, got, want[i])
					}
				}
			}
			t.Logf("%d recordings", family.Recorded())
		})
	}
}

// A machine gives the bits of the operations done one by one.
func TestMachinesGiveTheBitsOfTheirOperations(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	q := samples.Params{A: 1.25, B: -0.5, Table: [4]float64{1, -2, 0.5, 3}, N: 3}
	p := []float64{1.25, -0.5, 1, -2, 0.5, 3}
	for name := range samples.Models {
		src, err := tape.Parse(name, samples.Source, samples.MoreSource)
		if err != nil {
			t.Fatal(err)
		}
		family := tape.NewFamily(src, tape.Settings{States: 3, Params: reflect.ValueOf(q)})
		for range 100 {
			x := sampleState(rng)
			program, err := family.At(x, p)
			if err != nil {
				t.Fatal(err)
			}
			m := program.Value().NewMachine()
			want, ok := program.Plainly(x, p)
			if !m.Run(x, p) || !ok {
				t.Fatal("the guards do not hold")
			}
			for i, v := range m.Out() {
				if math.Float64bits(v) != math.Float64bits(want[i]) && !(math.IsNaN(v) && math.IsNaN(want[i])) {
					t.Fatalf("%s at %v: f[%d] is %v, want %v", name, x, i, v, want[i])
				}
			}
		}
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

// A batch gives the bits of a machine, point by point.
func TestBatchesGiveTheBitsOfMachines(t *testing.T) {
	const count = 150
	rng := rand.New(rand.NewPCG(5, 6))
	q := samples.Params{A: 1.25, B: -0.5, Table: [4]float64{1, -2, 0.5, 3}, N: 3}
	own := []float64{1.25, -0.5, 1, -2, 0.5, 3}
	var x, p []float64
	for range count {
		x = append(x, sampleState(rng)...)
		p = append(p, own...)
	}
	for name := range samples.Models {
		src, err := tape.Parse(name, samples.Source, samples.MoreSource)
		if err != nil {
			t.Fatal(err)
		}
		program, err := tape.Record(src, tape.Settings{States: 3, Params: reflect.ValueOf(q)})
		if err != nil {
			t.Fatal(err)
		}
		code := program.ValueAndJacobian(0)
		m, b := code.NewMachine(), code.NewBatch()
		k := len(m.Out())
		out, shared := make([]float64, count*k), make([]float64, count*k)
		failed := map[int]bool{}
		for _, i := range b.Run(count, x, p, out) {
			failed[i] = true
		}
		b.Run(count, x, own, shared)
		for i := range count {
			if m.Run(x[3*i:3*i+3], own) == failed[i] {
				t.Fatalf("%s: point %d: the guards hold in the machine %v", name, i, failed[i])
			}
			for e, v := range m.Out() {
				for _, w := range []float64{out[i*k+e], shared[i*k+e]} {
					if math.Float64bits(v) != math.Float64bits(w) && !(math.IsNaN(v) && math.IsNaN(w)) {
						t.Fatalf("%s: point %d: output %d is %v in the batch, %v in the machine", name, i, e, w, v)
					}
				}
			}
		}
	}
}
