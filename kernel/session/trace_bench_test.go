package session

import (
	"math"
	"testing"
	"time"

	"brinkline/continuation"
)

type benchState struct {
	Conversion  float64
	Temperature float64 `unit:"K" scale:"300"`
}

type benchParams struct{ Inflow, Coolant float64 }

// benchTank is the tank of tankCells, compiled.
func benchTank(s benchState, q benchParams) benchState {
	rate := 7.2e10 * math.Exp(-8750/s.Temperature) * (1 - s.Conversion)
	return benchState{
		Conversion:  -q.Inflow/100*s.Conversion + rate,
		Temperature: q.Inflow/100*(350-s.Temperature) + 209.2*rate + 2.092*(q.Coolant-s.Temperature),
	}
}

const benchTankCells = `
type State struct {
	Conversion  float64
	Temperature float64 ` + "`unit:\"K\" scale:\"300\"`" + `
}
type Params struct{ Inflow, Coolant float64 }

func tank(s State, q Params) State {
	rate := 7.2e10 * math.Exp(-8750/s.Temperature) * (1 - s.Conversion)
	return State{
		Conversion:  -q.Inflow/100*s.Conversion + rate,
		Temperature: q.Inflow/100*(350-s.Temperature) + 209.2*rate + 2.092*(q.Coolant-s.Temperature),
	}
}
opaque := func(s State, q Params) State { return tank(s, q) }
plant := continuation.NewModel(tank, Params{100, 280})
start := plant.Settle(State{0.1, 310})
plain := continuation.NewModel(opaque, Params{100, 280}).Settle(State{0.1, 310})
`

// BenchmarkTankTrace follows the stirred tank round both folds, eigenvalue counts
// and special points included: through a cell (exact derivatives from its source),
// through a cell whose model has no source (interpreted calls and finite
// differences), and compiled through the same library with finite differences. All
// in one run: the ratios are what counts.
func BenchmarkTankTrace(b *testing.B) {
	s := sessionAfter(b, benchTankCells)
	m, err := continuation.NewModel(benchTank, benchParams{100, 280})
	if err != nil {
		b.Fatal(err)
	}
	start, err := m.Settle(benchState{0.1, 310})
	if err != nil {
		b.Fatal(err)
	}
	steps := 0
	native := func() {
		branch, err := start.Follow("Coolant", continuation.Within(260, 330))
		if err != nil {
			b.Fatal(err)
		}
		steps = branch.Steps()
	}
	cell := func(source string) func() {
		return func() {
			if res := s.Run(b.Context(), Cell{Number: 2, Source: source}, &recorder{}); res.Err != nil {
				b.Fatal(res.Err)
			}
		}
	}
	rate := map[string]float64{}
	for _, run := range []struct {
		name string
		work func()
	}{
		{"cell", cell(`path := start.Follow("Coolant", continuation.Within(260, 330))`)},
		{"cell without source", cell(`path := plain.Follow("Coolant", continuation.Within(260, 330))`)},
		{"compiled", native},
	} {
		native() // for the number of steps
		best := time.Hour
		for range 5 {
			begin := time.Now()
			run.work()
			best = min(best, time.Since(begin))
		}
		rate[run.name] = float64(steps) / best.Seconds()
	}
	for b.Loop() {
		native()
	}
	b.ReportMetric(rate["cell"], "cell-steps/s")
	b.ReportMetric(rate["cell without source"], "cell-plain-steps/s")
	b.ReportMetric(rate["compiled"], "compiled-steps/s")
	b.ReportMetric(rate["cell"]/rate["compiled"], "cell/compiled")
}
