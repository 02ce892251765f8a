package continuation_test

import (
	"fmt"
	"math"
	"testing"

	"brinkline/continuation"
)

// A load behind a line, both parts of the demand on their own. With a lossless line of
// reactance X from a source of voltage E the greatest demand is where
// E⁴ - 4 X E² Q - 4 X² P² = 0 (T. Van Cutsem and C. Vournas, Voltage Stability of
// Electric Power Systems, 1998, chapter 2: the parabola of maximum deliverable power).
type busState struct {
	Angle   float64 `unit:"rad" scale:"1"`
	Voltage float64 `unit:"pu" scale:"1"`
}

type busParams struct {
	P float64 `unit:"pu"`
	Q float64 `unit:"pu"`
	E float64 `unit:"pu"`
	X float64 `unit:"pu"`
}

func bus(s busState, q busParams) busState {
	return busState{
		Angle:   -q.P - q.E*s.Voltage*math.Sin(s.Angle)/q.X,
		Voltage: -q.Q + (q.E*s.Voltage*math.Cos(s.Angle)-s.Voltage*s.Voltage)/q.X,
	}
}

// busSource is the same model for exact derivatives.
const busSource = `package model

import "math"

type busState struct {
	Angle, Voltage float64
}

type busParams struct {
	P, Q, E, X float64
}

func bus(s busState, q busParams) busState {
	return busState{
		Angle:   -q.P - q.E*s.Voltage*math.Sin(s.Angle)/q.X,
		Voltage: -q.Q + (q.E*s.Voltage*math.Cos(s.Angle)-s.Voltage*s.Voltage)/q.X,
	}
}
`

var busToday = busParams{P: 0.4, Q: 0.1, E: 1, X: 0.4}

func newBus(t testing.TB, opts ...continuation.Option) *continuation.Point {
	t.Helper()
	m, err := continuation.NewModel(bus, busToday, append(opts, continuation.Balance(), continuation.Named("bus"))...)
	if err != nil {
		t.Fatal(err)
	}
	return settled(t, m, busState{0, 1})
}

// busGap is positive where the demand can be met.
func busGap(q busParams) float64 {
	return math.Pow(q.E, 4) - 4*q.X*q.E*q.E*q.Q - 4*q.X*q.X*q.P*q.P
}

// both runs a check with finite differences and with exact derivatives.
func both(t *testing.T, check func(t *testing.T, today *continuation.Point, tolerance float64)) {
	t.Run("differences", func(t *testing.T) { check(t, newBus(t), 1e-8) })
	t.Run("exact", func(t *testing.T) { check(t, newBus(t, continuation.WithSource("bus", busSource)), 1e-11) })
}

// Along a direction in all four parameters the limit is a root of the closed form.
func TestMarginAlongADirection(t *testing.T) {
	both(t, func(t *testing.T, today *continuation.Point, tolerance float64) {
		step := busParams{P: 0.1, Q: 0.05, E: -0.01, X: 0.02}
		m, err := today.MarginAlong(map[string]float64{"P": step.P, "Q": step.Q, "E": step.E, "X": step.X}, 50)
		if err != nil {
			t.Fatal(err)
		}
		at := func(s float64, q busParams) busParams {
			return busParams{q.P + s*step.P, q.Q + s*step.Q, q.E + s*step.E, q.X + s*step.X}
		}
		steps := func(q busParams) float64 {
			low, high := 0.0, 20.0
			for range 100 {
				if mid := (low + high) / 2; busGap(at(mid, q)) > 0 {
					low = mid
				} else {
					high = mid
				}
			}
			return (low + high) / 2
		}
		want := steps(busToday)
		if math.Abs(m.Steps-want) > tolerance || m.Kind != "fold" {
			t.Errorf("%s after %.13g steps, closed form %.13g", m.Kind, m.Steps, want)
		}
		const h = 1e-4
		for i, move := range []func(*busParams, float64){
			func(q *busParams, d float64) { q.P += d }, func(q *busParams, d float64) { q.Q += d },
			func(q *busParams, d float64) { q.E += d }, func(q *busParams, d float64) { q.X += d },
		} {
			up, down := busToday, busToday
			move(&up, h)
			move(&down, -h)
			if slope := (steps(up) - steps(down)) / (2 * h); math.Abs(m.Sensitivities[i]-slope) > 1e-5*math.Abs(slope) {
				t.Errorf("parameter %d: slope %.9g, by the closed form %.9g", i, m.Sensitivities[i], slope)
			}
		}
		if c := m.Changes[3]; c.Name != "X" || math.Abs(c.AtLimit-(0.4+m.Steps*0.02)) > 1e-12 || c.By != c.AtLimit-0.4 {
			t.Errorf("change %+v", c)
		}
	})
}

// The Hopf point of the Brusselator is at B = 1 + A² (Prigogine and Lefever 1968):
// dB/dA = 2 A, elasticity 2 A²/(1 + A²). It comes before anything else.
func TestHopfSensitivities(t *testing.T) {
	type state struct{ X, Y float64 }
	type params struct{ A, B float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{q.A - (q.B+1)*s.X + s.X*s.X*s.Y, q.B*s.X - s.X*s.X*s.Y}
	}, params{A: 1.3, B: 1})
	if err != nil {
		t.Fatal(err)
	}
	start := settled(t, m, state{1.3, 0.7})
	both, err := start.Margins("B", continuation.Within(0.1, 6))
	if err != nil {
		t.Fatal(err)
	}
	want := 1 + 1.3*1.3
	if both.Below != nil || both.Above == nil || both.Above.To.Kind() != "Hopf point" || math.Abs(both.Above.Absolute-(want-1)) > 1e-8 {
		t.Fatalf("%v, want a Hopf point at %g", both, want)
	}
	s, err := both.Above.To.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	if len(s.List) != 1 || math.Abs(s.List[0].Slope-2.6) > 1e-7 || math.Abs(s.List[0].Elasticity-2*1.69/2.69) > 1e-7 {
		t.Errorf("%+v", s.List)
	}
	along, err := start.MarginAlong(map[string]float64{"A": 0.1, "B": 1}, 20)
	if err != nil {
		t.Fatal(err)
	}
	// 1 + s = 1 + (1.3 + s/10)²
	if root := (0.74 - math.Sqrt(0.74*0.74-4*0.01*1.69)) / 0.02; math.Abs(along.Steps-root) > 1e-7 || along.Kind != "Hopf point" {
		t.Errorf("%v, closed form %.12g", along, root)
	}
	_, err = settledAt(t, start, "B", 4).MarginAlong(map[string]float64{"B": 1}, 3)
	oneLine(t, err, "is unstable already (2 eigenvalues")
	_, err = settledAt(t, start, "B", 4).Margins("B")
	oneLine(t, err, "is unstable already")
}

func settledAt(t testing.TB, p *continuation.Point, name string, value float64) *continuation.Point {
	t.Helper()
	q, err := p.With(name, value)
	if err != nil {
		t.Fatal(err)
	}
	return q
}

// Hopf limits of other published models against Hopf points found anew at p ± h.
func TestHopfSensitivitiesAgainstMovedPoints(t *testing.T) {
	for _, c := range cases(t) {
		if c.Setting == "balance" || c.Branch.Counts["hopf"] == 0 {
			continue
		}
		t.Run(c.ID, func(t *testing.T) {
			b := follow(t, c)
			if len(b.HopfPoints()) != c.Branch.Counts["hopf"] {
				t.Fatalf("found %v", b.Specials())
			}
			for k, h := range b.HopfPoints() {
				compareMoved(t, h, k)
			}
		})
	}
}

// compareMoved finds the Hopf point again after a small step of each parameter, from
// the steady state beside it.
func compareMoved(t *testing.T, h *continuation.Hopf, k int) {
	t.Helper()
	s, err := h.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	for _, one := range s.List {
		step := 1e-4 * math.Max(math.Abs(one.Value), 0.1)
		at := func(d float64) (float64, bool) {
			q, err := h.Where().With(one.Name, one.Value+d)
			if err != nil {
				return 0, false
			}
			size := 0.02 * math.Max(math.Abs(h.Value()), 1)
			b, err := q.Follow(h.Parameter().Name, continuation.Within(h.Value()-size, h.Value()+size))
			if err != nil || len(b.HopfPoints()) != 1 {
				return 0, false
			}
			return b.HopfPoints()[0].Value(), true
		}
		up, ok1 := at(step)
		down, ok2 := at(-step)
		if !ok1 || !ok2 {
			continue
		}
		want := (up - down) / (2 * step)
		if math.Abs(one.Slope-want) > 1e-5*math.Max(math.Abs(want), 1e-3*math.Abs(h.Value()/math.Max(math.Abs(one.Value), 0.1))) {
			t.Errorf("%v, %s: slope %.9g, from moved points %.9g", h, one.Name, one.Slope, want)
		}
	}
}

// Loads by bus: a factor for the load of each bus, one for the generation.
type byBus struct {
	Generation float64
	Load       [14]float64
}

func (n *fourteenFlow) byBus(u []float64, q byBus, f []float64) {
	v, a := n.spread(u)
	for i, row := 1, 0; i < 14; i++ {
		bus := n.net.Buses[i]
		p, r := n.injected(i, &v, &a)
		f[i-1] = (q.Generation**bus.Generation-q.Load[i]*bus.LoadMW)/100 - p
		if bus.Kind == "PQ" {
			f[13+row] = -q.Load[i]*bus.LoadMVAr/100 - r
			row++
		}
	}
}

func (n *fourteenFlow) today(t testing.TB) *continuation.Point {
	t.Helper()
	var names []string
	for i := 2; i <= 14; i++ {
		names = append(names, fmt.Sprintf("Angle %d", i))
	}
	for _, i := range n.pq {
		names = append(names, fmt.Sprintf("Voltage %d", i+1))
	}
	q := byBus{Generation: 1}
	for i := range q.Load {
		q.Load[i] = 1
	}
	m, err := continuation.NewModel(n.byBus, q, continuation.States(names, nil, nil), continuation.Balance())
	if err != nil {
		t.Fatal(err)
	}
	return settled(t, m, n.flat())
}

// The margin of the IEEE 14-bus system along all loads and the generation together is
// the published data's nose (by bisection, testdata/fourteen-bus.json) less today, and
// its sensitivities by bus are those of the nose found anew.
func TestFourteenBusMarginByBus(t *testing.T) {
	net := readFourteenBus(t)
	start := newFourteenFlow(net).today(t)
	growth := map[string]float64{"Generation": 1}
	for i := range 14 {
		growth[fmt.Sprintf("Load[%d]", i)] = 1
	}
	m, err := start.MarginAlong(growth, 6)
	if err != nil {
		t.Fatal(err)
	}
	nose, _ := net.Recomputed.Nose.LoadFactor.Float64()
	if math.Abs(m.Steps-(nose-1)) > 1e-8 {
		t.Errorf("margin %.11f steps, by bisection %.8f", m.Steps, nose-1)
	}
	// A slack bus takes what it must: its load moves nothing.
	if m.Sensitivities[1] != 0 {
		t.Errorf("load of the slack bus: %g, want 0", m.Sensitivities[1])
	}
	for _, k := range []int{3, 8, 13} {
		name := fmt.Sprintf("Load[%d]", k)
		steps := func(d float64) float64 {
			at, err := settledAt(t, start, name, 1+d).MarginAlong(growth, 6)
			if err != nil {
				t.Fatal(err)
			}
			return at.Steps
		}
		const h = 0.01
		want := (8*(steps(h)-steps(-h)) - (steps(2*h) - steps(-2*h))) / (12 * h)
		if got := m.Sensitivities[1+k]; math.Abs(got-want) > 1e-6*math.Abs(want) {
			t.Errorf("%s: slope %.10g, by differences of the nose %.10g", name, got, want)
		}
	}
}

func TestBadMargins(t *testing.T) {
	start := newBus(t)
	_, err := start.MarginAlong(map[string]float64{"p": 1}, 5)
	oneLine(t, err, "did you mean P?")
	_, err = start.MarginAlong(nil, 5)
	oneLine(t, err, "no parameter is to vary")
	_, err = start.MarginAlong(map[string]float64{"P": math.NaN()}, 5)
	oneLine(t, err, "the step of P is NaN")
	_, err = start.MarginAlong(map[string]float64{"P": 1}, 0)
	oneLine(t, err, "give a positive number")
	_, err = start.MarginAlong(map[string]float64{"P": -0.001}, 5)
	oneLine(t, err, "no limit within 5 steps of P -0.001")
	_, err = start.Margins("Demand")
	oneLine(t, err, `no parameter "Demand"; the model has P, Q, E, X`)
}

// A fold that the steady state lies beyond is none of its limits.
func TestMarginOnTheWrongSide(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330))
	hot := b.Points()[len(b.Points())-1]
	if hot.Value() != 330 {
		hot = b.Points()[0]
	}
	ignition, err := b.LimitAbove(start)
	if err != nil {
		t.Fatal(err)
	}
	_, err = hot.MarginTo(ignition)
	oneLine(t, err, "beyond it")
	above, err := b.NearestLimitAbove(start)
	if err != nil || above.(*continuation.Fold) != ignition {
		t.Errorf("%v, %v", above, err)
	}
	_, err = b.NearestLimitBelow(start)
	oneLine(t, err, "no limit below 280 K on this branch")
}

// The shallow arch buckles sideways before it snaps (Fung and Kaplan 1952): the limit
// is the pitchfork at h + 3 sqrt(h² - 4), not the fold behind it.
func TestArchBucklesBeforeItSnaps(t *testing.T) {
	for _, c := range cases(t) {
		if c.ID != "shallow-arch-two-modes" {
			continue
		}
		b := follow(t, c)
		limit, err := b.NearestLimitAbove(b.Points()[b.Start()])
		if err != nil {
			t.Fatal(err)
		}
		if want := 4 + 3*math.Sqrt(12); math.Abs(limit.Value()-want) > 1e-9 || limit.Kind() != "simple stationary bifurcation" {
			t.Errorf("%v, want the pitchfork at %.10g", limit, want)
		}
		_, err = limit.Sensitivities()
		oneLine(t, err, "see Imperfection")
	}
}
