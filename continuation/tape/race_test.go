package tape

import (
	"math"
	"math/rand/v2"
	"reflect"
	"sync"
	"testing"
)

// Goroutines share a family; each has machines of its own. They meet guards the
// other way, derive, and expand at the same time.
func TestFamilyIsShared(t *testing.T) {
	src, err := Parse("model", `
type State struct{ X, Y float64 }
type Params struct{ Table [3]float64; N int }

func model(s State, q Params) State {
	k := 0
	if s.X > 0 {
		k++
	}
	if s.Y > s.X {
		k++
	}
	return State{q.Table[k]*math.Sin(s.X) - s.Y, s.X*s.Y - float64(k)}
}`)
	if err != nil {
		t.Fatal(err)
	}
	type params struct {
		Table [3]float64
		N     int
	}
	f := NewFamily(src, Settings{Params: reflect.ValueOf(params{})})
	p := []float64{2, 3, 5}
	var all sync.WaitGroup
	for g := range 8 {
		all.Go(func() {
			rng := rand.New(rand.NewPCG(1, uint64(g)))
			for range 40 {
				x := []float64{rng.NormFloat64(), rng.NormFloat64()}
				q, err := f.At(x, p)
				if err != nil {
					t.Error(err)
					return
				}
				k := 0
				if x[0] > 0 {
					k++
				}
				if x[1] > x[0] {
					k++
				}
				m := q.ValueAndJacobian(k).NewMachine()
				if !m.Run(x, p) {
					t.Error("the guards do not hold")
				}
				want := []float64{p[k]*math.Sin(x[0]) - x[1], x[0]*x[1] - float64(k), p[k] * math.Cos(x[0]), -1, math.Sin(x[0]), x[1], x[0], 0}
				for i, v := range m.Out() {
					if math.Abs(v-want[i]) > 1e-14 {
						t.Errorf("output %d is %v, want %v", i, v, want[i])
					}
				}
				e, err := q.NewTaylor(-1, 3)
				if err != nil {
					t.Error(err)
					return
				}
				out := make([]float64, 2)
				if e.Expand(0, [][]float64{x}, p, out); math.Abs(out[0]-want[0]) > 1e-14 {
					t.Errorf("order 0 is %v, want %v", out[0], want[0])
				}
				q.Blame(x, p)
				q.Operations()
			}
		})
	}
	all.Wait()
	if f.Recorded() != 4 && f.Recorded() != 3 {
		t.Errorf("%d recordings", f.Recorded())
	}
}
