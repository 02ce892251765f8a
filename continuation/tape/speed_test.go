package tape

import (
	"math"
	"reflect"
	"testing"
)

func machineOf(t testing.TB, text string, n int, params any, sparse bool) *Machine {
	t.Helper()
	p := record(t, text, Settings{States: n, Params: reflect.ValueOf(params)})
	if sparse {
		return p.ValueAndSparse().NewMachine()
	}
	return p.ValueAndJacobian(-1).NewMachine()
}

// What the benchmarks compare computes the same.
func TestBenchmarksCompareLikeWithLike(t *testing.T) {
	for _, b := range benchmarks {
		m, x := machineOf(t, b.text, b.n, b.params, b.sparse), values(b.n)
		m.Run(x, b.p)
		out := make([]float64, m.code.slots)
		b.f(x, b.p, out[:b.n])
		b.j(x, b.p, out[b.n:])
		for i, v := range m.Out() {
			if math.Abs(v-out[i]) > 1e-12*(1+math.Abs(v)) {
				t.Fatalf("%s: output %d is %v, by hand %v", b.name, i, v, out[i])
			}
		}
	}
}

func TestRunsDoNotAllocate(t *testing.T) {
	for _, b := range benchmarks[:3] {
		m, x := machineOf(t, b.text, b.n, b.params, b.sparse), values(b.n)
		if k := testing.AllocsPerRun(10, func() { m.Run(x, b.p) }); k != 0 {
			t.Errorf("%s: %v allocations a run", b.name, k)
		}
	}
}
