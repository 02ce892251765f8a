package display

import (
	"math"
	"testing"

	"brinkline/continuation"
)

// The models of the tests are invented.

type tankState struct {
	Conversion  float64
	Temperature float64 `unit:"K" scale:"300"`
}

type tankParams struct {
	Inflow  float64 `unit:"L/min"`
	Coolant float64 `unit:"K"`
	Feed    float64 `unit:"K"`
}

// tank is the mass and heat balance of a cooled stirred tank with one exothermic
// reaction of first order.
func tank(s tankState, q tankParams) tankState {
	const volume, rise, cooling = 100, 209, 209
	rate := 7.2e10 * math.Exp(-8750/s.Temperature) * (1 - s.Conversion)
	return tankState{
		Conversion:  -q.Inflow/volume*s.Conversion + rate,
		Temperature: q.Inflow/volume*(q.Feed-s.Temperature) + rise*rate + cooling/volume*(q.Coolant-s.Temperature),
	}
}

type strutState struct {
	Deflection float64 `unit:"mm" scale:"1"`
}

type strutParams struct {
	Load        float64 `unit:"kN"`
	Crookedness float64 `unit:"mm"`
}

// strut is the slow motion of a compressed strut that buckles at 12 kN.
func strut(s strutState, q strutParams) strutState {
	return strutState{(q.Load-12)*s.Deflection - 0.3*s.Deflection*s.Deflection*s.Deflection + q.Crookedness}
}

type lakeState struct {
	Phosphorus float64 `unit:"µg/L"`
}

type lakeParams struct {
	Load     float64 `unit:"µg/L/a"`
	Flushing float64 `unit:"1/a"`
}

// lake is the phosphorus of a lake whose sediment gives some back when it is rich.
func lake(s lakeState, q lakeParams) lakeState {
	p := math.Pow(s.Phosphorus/20, 8)
	return lakeState{q.Load - q.Flushing*s.Phosphorus + 20*p/(1+p)}
}

type feederState struct {
	Angle   float64 `unit:"rad"`
	Voltage float64 `unit:"p.u."`
}

type feederParams struct {
	Demand float64 `unit:"MW"`
}

// feeder is the load flow of one line to one bus: a balance without time.
func feeder(s feederState, q feederParams) feederState {
	const x = 0.2
	p, r := q.Demand/100, q.Demand/400
	return feederState{
		p + s.Voltage*math.Sin(s.Angle)/x,
		r + s.Voltage*s.Voltage/x - s.Voltage*math.Cos(s.Angle)/x,
	}
}

type wheelState struct{ X, Y float64 }

type wheelParams struct {
	Drive float64
	Spin  float64
}

// wheel is a damped oscillator that begins to turn at Drive 0.
func wheel(s wheelState, q wheelParams) wheelState {
	r := s.X*s.X + s.Y*s.Y
	return wheelState{q.Drive*s.X - q.Spin*s.Y - s.X*r, q.Spin*s.X + q.Drive*s.Y - s.Y*r}
}

func newModel(t testing.TB, f, params any, opts ...continuation.Option) *continuation.Model {
	t.Helper()
	m, err := continuation.NewModel(f, params, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func settle(t testing.TB, m *continuation.Model, guess any) *continuation.Point {
	t.Helper()
	p, err := m.Settle(guess)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func follow(t testing.TB, p *continuation.Point, name string, opts ...continuation.FollowOption) *continuation.Branch {
	t.Helper()
	b, err := p.Follow(name, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func tankStart(t testing.TB) *continuation.Point {
	m := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank"))
	return settle(t, m, tankState{0.1, 320})
}

func tankBranch(t testing.TB) *continuation.Branch {
	return follow(t, tankStart(t), "Coolant", continuation.Within(280, 320))
}

func strutBranch(t testing.TB) *continuation.Branch {
	m := newModel(t, strut, strutParams{Load: 5}, continuation.Named("strut"))
	return follow(t, settle(t, m, strutState{}), "Load", continuation.Within(0, 20))
}

func lakeBranch(t testing.TB, flushing float64) *continuation.Branch {
	m := newModel(t, lake, lakeParams{Load: 2, Flushing: flushing}, continuation.Named("lake"))
	return follow(t, settle(t, m, lakeState{2}), "Load", continuation.Within(0, 40))
}

func feederBranch(t testing.TB) *continuation.Branch {
	m := newModel(t, feeder, feederParams{Demand: 50}, continuation.Named("feeder"), continuation.Balance())
	return follow(t, settle(t, m, feederState{0, 1}), "Demand", continuation.Within(0, 400), continuation.Bound("Voltage", 0.1, 2))
}

func wheelBranch(t testing.TB) *continuation.Branch {
	m := newModel(t, wheel, wheelParams{Drive: -1, Spin: 2}, continuation.Named("wheel"))
	return follow(t, settle(t, m, wheelState{}), "Drive", continuation.Within(-2, 2))
}
