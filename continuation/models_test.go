package continuation_test

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// An invented cooled stirred tank: mass and heat balance of a first-order
// reaction, conversion and temperature. It ignites and goes out as the coolant
// warms and cools.
type tankState struct {
	Conversion  float64
	Temperature float64 `unit:"K" scale:"300"`
}

type tankParams struct {
	Inflow  float64 `unit:"L/min"`
	Coolant float64 `unit:"K"`
	Label   string
	Stages  int
}

func tank(s tankState, q tankParams) tankState {
	rate := 7.2e10 * math.Exp(-8750/s.Temperature) * (1 - s.Conversion)
	return tankState{
		Conversion:  -q.Inflow/100*s.Conversion + rate,
		Temperature: q.Inflow/100*(350-s.Temperature) + 209.2*rate + 2.092*(q.Coolant-s.Temperature),
	}
}

func newTank(t testing.TB, opts ...continuation.Option) *continuation.Model {
	t.Helper()
	opts = append([]continuation.Option{continuation.Named("tank")}, opts...)
	m, err := continuation.NewModel(tank, tankParams{Inflow: 100, Coolant: 280, Label: "north", Stages: 1}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func settled(t testing.TB, m *continuation.Model, guess any) *continuation.Point {
	t.Helper()
	p, err := m.Settle(guess)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// A scalar fold λ = -x², least at 0... λ + x² = 0 has steady states x = ±sqrt(-λ).
type scalar struct{ X float64 }

type lambda struct{ L float64 }

func parabola(s scalar, q lambda) scalar { return scalar{q.L + s.X*s.X} }

func newParabola(t testing.TB, l float64, opts ...continuation.Option) *continuation.Model {
	t.Helper()
	m, err := continuation.NewModel(parabola, lambda{l}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return m
}
