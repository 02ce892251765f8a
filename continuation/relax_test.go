package continuation_test

import (
	"context"
	"math"
	"strings"
	"sync/atomic"
	"testing"

	"brinkline/continuation"
)

func relaxed(t testing.TB, m *continuation.Model, from any, opts ...continuation.TimeOption) *continuation.Relaxation {
	t.Helper()
	r, err := m.Relax(from, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// The tank comes to the steady state that Newton's method finds nearby.
func TestRelaxToASteadyState(t *testing.T) {
	m := newTank(t)
	r := relaxed(t, m, tankState{0.2, 320})
	p, err := r.Steady()
	if err != nil {
		t.Fatal(err)
	}
	want := settled(t, m, tankState{0.1, 310})
	for i := range p.State {
		if math.Abs(p.State[i]-want.State[i]) > 1e-9*math.Abs(want.State[i]) {
			t.Errorf("state %v, want %v", p.State, want.State)
		}
	}
	if !p.Stable() || r.Oscillation() != nil || !strings.Contains(r.String(), "tank relaxes by time") {
		t.Errorf("%v", r)
	}
	hot, err := r.Trajectory().At("Temperature")
	if err != nil || hot[0] != 320 || math.Abs(hot[len(hot)-1]-want.State[1]) > 0.01 {
		t.Errorf("trajectory %v, %v", hot, err)
	}
	if _, err := r.Trajectory().At("Tempreture"); err == nil {
		t.Error("an unknown name is taken")
	}
	if _, err := p.Follow("Coolant", continuation.Within(270, 290)); err != nil {
		t.Error(err)
	}
}

type plane struct{ X, Y float64 }

func vanDerPol(mu float64) func(s plane, q none) plane {
	return func(s plane, q none) plane {
		return plane{s.Y, mu*(1-s.X*s.X)*s.Y - s.X}
	}
}

func timeModel(t testing.TB, f any, opts ...continuation.Option) *continuation.Model {
	t.Helper()
	m, err := continuation.NewModel(f, none{1}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// The van der Pol oscillator has the period 6.66328686 for mu = 1 (Andersen & Geer,
// Power series expansions for the frequency and period of the limit cycle of the van
// der Pol equation, SIAM Journal on Applied Mathematics 42 (1982) 678-693: 6.6633) and
// 162.837 for mu = 100 (asymptotic series of Dorodnitsyn, to 1e-3); the digits beyond
// are those of a run with a hundredth of the tolerance.
func TestRelaxToAnOscillation(t *testing.T) {
	for _, c := range []struct{ mu, period, within float64 }{{1, 6.66328686, 1e-5}, {100, 162.837, 1e-2}} {
		m := timeModel(t, vanDerPol(c.mu))
		r := relaxed(t, m, plane{0.1, 0})
		o := r.Oscillation()
		if o == nil {
			t.Fatalf("mu = %g: %v", c.mu, r)
		}
		fine := relaxed(t, m, plane{0.1, 0}, continuation.Accuracy(1e-8)).Oscillation()
		if fine == nil || math.Abs(o.Period-fine.Period) > 3*o.Uncertainty {
			t.Errorf("mu = %g: period %.9g, claimed to %.1g, with a finer tolerance %.9g", c.mu, o.Period, o.Uncertainty, fine.Period)
		}
		if math.Abs(o.Period-c.period) > c.within || math.Abs(o.Greatest[0]-2) > 0.02 || math.Abs(o.Mean[0]) > 0.02 {
			t.Errorf("mu = %g: period %.9g, want %g; X from %g to %g, mean %g", c.mu, o.Period, c.period, o.Least[0], o.Greatest[0], o.Mean[0])
		}
		t.Logf("mu = %g: period %.10g, +- %.1g, %d steps; finer %.10g", c.mu, o.Period, o.Uncertainty, r.Trajectory().Steps, fine.Period)
		if _, err := r.Steady(); err == nil || !strings.Contains(err.Error(), "it oscillates with period") {
			t.Errorf("steady: %v", err)
		}
	}
}

// The Oregonator's published cycle repeats after about 302.9 (Hairer & Wanner, figure
// IV.10.3 shows it).
func TestRelaxOfTheOregonator(t *testing.T) {
	m := stiffProblems[2].model(t)
	r := relaxed(t, m, []float64{1, 2, 3})
	if o := r.Oscillation(); o == nil || math.Abs(o.Period-302.9) > 0.2 {
		t.Fatalf("%v", r)
	}
}

// A cycle that has doubled its period repeats after two turns (Rössler, An equation for
// continuous chaos, Physics Letters A 57 (1976) 397-398: a = b = 0.2, c = 3.5, of about
// 2 x 5.9); with c = 5.7 it never does.
func TestRelaxOfADoubledCycle(t *testing.T) {
	type space struct{ X, Y, Z float64 }
	with := func(c float64) *continuation.Model {
		return timeModel(t, func(s space, q none) space {
			return space{-s.Y - s.Z, s.X + 0.2*s.Y, 0.2 + s.Z*(s.X-c)}
		})
	}
	r := relaxed(t, with(3.5), space{1, 1, 0})
	if o := r.Oscillation(); o == nil || o.Period < 11.4 || o.Period > 12.2 {
		t.Errorf("%v", r)
	}
	r = relaxed(t, with(5.7), space{1, 1, 0}, continuation.TimeLimit(1000))
	if _, err := r.Steady(); r.Oscillation() != nil || err == nil || !strings.Contains(err.Error(), "still moving at the time limit 1000") {
		t.Errorf("%v", r)
	}
}

// A spiral that closes slowly is no oscillation, however slowly; a centre's orbit is
// one.
func TestRelaxOfASlowSpiral(t *testing.T) {
	for _, damping := range []float64{0.1, 1e-2} {
		m := timeModel(t, func(s plane, q none) plane { return plane{s.Y, -s.X - damping*s.Y} })
		r := relaxed(t, m, plane{1, 0})
		if p, err := r.Steady(); err != nil || largestOf(p.State) > 1e-9 {
			t.Errorf("damping %g: %v", damping, r)
		}
	}
	for _, damping := range []float64{1e-3, 1e-4, 1e-5} {
		m := timeModel(t, func(s plane, q none) plane { return plane{s.Y, -s.X - damping*s.Y} })
		r := relaxed(t, m, plane{1, 0}, continuation.MaxTimeSteps(5000), continuation.Accuracy(1e-8))
		if r.Oscillation() != nil {
			t.Errorf("damping %g: %v", damping, r)
		}
	}
}

// What cannot be confirmed is said.
func TestRelaxSaysWhatItCannot(t *testing.T) {
	unstable := timeModel(t, func(s plane, q none) plane { return plane{s.X, -s.Y} })
	_, err := relaxed(t, unstable, plane{0, 0}).Steady()
	oneLine(t, err, "stands still in an unstable steady state (1 eigenvalues with positive real part)")
	closed := timeModel(t, func(s plane, q none) plane { return plane{s.Y - 2*s.X, 2*s.X - s.Y} })
	r := relaxed(t, closed, plane{1, 0})
	_, err = r.Steady()
	oneLine(t, err, "a total may be conserved")
	if _, x := r.Trajectory().End(); math.Abs(x[0]-1.0/3) > 1e-6 {
		t.Errorf("came to %v", x)
	}
	explodes := timeModel(t, func(s plane, q none) plane { return plane{s.X * s.X, -s.Y} })
	_, err = relaxed(t, explodes, plane{1, 1}).Steady()
	oneLine(t, err, "stopped at time 1")
	leaves := timeModel(t, func(s plane, q none) plane { return plane{-1, math.Sqrt(s.X)} })
	_, err = relaxed(t, leaves, plane{1, 1}).Steady()
	oneLine(t, err, "the equation of Y is NaN")
}

func TestBadTimes(t *testing.T) {
	m := timeModel(t, vanDerPol(1))
	balance := timeModel(t, vanDerPol(1), continuation.Balance(), continuation.Named("bridge"))
	relax := func(m *continuation.Model, from any, opts ...continuation.TimeOption) error {
		_, err := m.Relax(from, opts...)
		return err
	}
	simulate := func(time float64) error {
		_, err := m.Simulate(plane{1, 1}, time)
		return err
	}
	for _, c := range []struct {
		err  error
		want string
	}{
		{relax(balance, plane{1, 1}), "Relax of bridge: the model is a balance without time behind it, so nothing moves; find its states with Settle or Survey"},
		{relax(m, 3), "the guess is a int"},
		{relax(m, plane{math.NaN(), 1}), "the guess for X is NaN"},
		{relax(m, plane{1, 1}, continuation.Accuracy(0)), "must be positive"},
		{relax(m, plane{1, 1}, continuation.AccuracyFloor(2)), "a part between 0 and 1"},
		{relax(m, plane{1, 1}, continuation.MaxTimeSteps(0)), "at least one step"},
		{relax(m, plane{1, 1}, continuation.TimeLimit(-1)), "must be positive"},
		{simulate(0), "a time must be positive"},
		{simulate(math.Inf(1)), "a time must be positive"},
	} {
		oneLine(t, c.err, c.want)
	}
	nan := timeModel(t, func(s plane, q none) plane { return plane{math.Log(-s.X), 0} })
	oneLine(t, relax(nan, plane{1, 1}), "no start: the equation of X is NaN")
}

func TestInterruptedRelax(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	var calls atomic.Int64
	m := timeModel(t, func(s plane, q none) plane {
		if calls.Add(1) == 800 {
			cancel()
		}
		return vanDerPol(5)(s, q)
	}, continuation.WithContext(func() context.Context { return ctx }))
	r := relaxed(t, m, plane{1, 1})
	if !r.Interrupted() || len(r.Trajectory().Times) < 5 || calls.Load() > 800 {
		t.Errorf("%v after %d calls", r, calls.Load())
	}
	if _, err := r.Steady(); err == nil || !strings.Contains(err.Error(), "it was interrupted at time") {
		t.Errorf("%v", err)
	}
}

// A trajectory gives its states at any time, and keeps a bounded number of them.
func TestTrajectory(t *testing.T) {
	m := timeModel(t, func(s plane, q none) plane { return plane{s.Y, -s.X} })
	path, err := m.Simulate(plane{0, 1}, 10)
	if err != nil {
		t.Fatal(err)
	}
	for i := range 101 {
		at := float64(i) / 10
		x, err := path.StateAt(at)
		if err != nil || math.Abs(x[0]-math.Sin(at)) > 1e-4 || math.Abs(x[1]-math.Cos(at)) > 1e-4 {
			t.Errorf("at %g: %v, want %g %g (%v)", at, x, math.Sin(at), math.Cos(at), err)
		}
	}
	_, err = path.StateAt(11)
	oneLine(t, err, "time 11 lies outside the trajectory, which goes from 0 to 10")
	if !strings.Contains(path.String(), "from time 0 to 10") {
		t.Errorf("%v", path)
	}
}
