package continuation_test

import (
	"fmt"
	"math"
	"runtime"
	"testing"

	"brinkline/continuation"
)

// The limit of the two-bus network nearest to today's demand, in both parts of it, is
// the point of the parabola E⁴ - 4 X E² Q - 4 X² P² = 0 nearest to today's.
func nearestOnParabola(q busParams, scaleP, scaleQ float64) (distance, p, r float64) {
	off := func(p float64) float64 {
		r := (math.Pow(q.E, 4) - 4*q.X*q.X*p*p) / (4 * q.X * q.E * q.E)
		return math.Hypot((p-q.P)/scaleP, (r-q.Q)/scaleQ)
	}
	p = argmin(off, 0, 1.25)
	return off(p), p, (math.Pow(q.E, 4) - 4*q.X*q.X*p*p) / (4 * q.X * q.E * q.E)
}

// argmin scans and then narrows by golden section.
func argmin(f func(float64) float64, a, b float64) float64 {
	best, step := a, (b-a)/2000
	for x := a; x <= b; x += step {
		if f(x) < f(best) {
			best = x
		}
	}
	a, b = best-step, best+step
	const golden = 0.6180339887498949
	for range 90 {
		c, d := b-golden*(b-a), a+golden*(b-a)
		if f(c) < f(d) {
			b = d
		} else {
			a = c
		}
	}
	return (a + b) / 2
}

func TestNearestLimitOfTheTwoBusNetwork(t *testing.T) {
	both(t, func(t *testing.T, today *continuation.Point, _ float64) {
		for _, scales := range [][2]float64{{1, 1}, {0.1, 0.02}, {0.02, 0.1}} {
			n, err := today.NearestLimit(map[string]float64{"P": scales[0], "Q": scales[1]})
			if err != nil {
				t.Fatal(err)
			}
			want, p, q := nearestOnParabola(busToday, scales[0], scales[1])
			if math.Abs(n.Distance-want) > 1e-10*want || math.Abs(n.Changes[0].AtLimit-p) > 1e-6 || math.Abs(n.Changes[1].AtLimit-q) > 1e-6 {
				t.Errorf("scales %v: %.12g at P %.8g, Q %.8g; closed form %.12g at %.8g, %.8g", scales, n.Distance, n.Changes[0].AtLimit, n.Changes[1].AtLimit, want, p, q)
			}
			if n.Tried.Rays < 64 || n.Tried.Nearer > 0 {
				t.Errorf("%s", n.Tried)
			}
		}
	})
}

// testdata/reference-cases.json, harvest-two-drains: the surface is a plane.
func TestNearestLimitOfTheHarvest(t *testing.T) {
	for _, c := range cases(t) {
		if c.ID != "harvest-two-drains" {
			continue
		}
		today := follow(t, c).Points()[0]
		m := today.Model()
		today = settled(t, m, []float64{0.8464})
		n, err := today.NearestLimit(map[string]float64{"First": 1, "Second": 1})
		if err != nil {
			t.Fatal(err)
		}
		if want := 0.053665631459994953; math.Abs(n.Distance-want) > 1e-11 || math.Abs(n.At.State[0]-0.5) > 1e-7 {
			t.Errorf("distance %.14g at stock %g, want %.14g at 0.5", n.Distance, n.At.State[0], want)
		}
		if a, b := n.Changes[0].AtLimit, n.Changes[1].AtLimit; math.Abs(a-0.074) > 1e-9 || math.Abs(b-0.088) > 1e-9 {
			t.Errorf("at %.10g, %.10g, want 0.074, 0.088", a, b)
		}
		boundedHarvest(t, today)
	}
}

// Bounds on the plane First + 2 Second = 1/4, from (0.05, 0.04).
func boundedHarvest(t *testing.T, today *continuation.Point) {
	scales := map[string]float64{"First": 1, "Second": 1}
	for _, c := range []struct {
		opt           continuation.LimitOption
		first, second float64
	}{
		{continuation.Keep("Second", 0, 0.06), 0.13, 0.06},
		{continuation.OnlyDown("Second"), 0.17, 0.04},
		{continuation.OnlyDown("First"), 0.05, 0.1},
		{continuation.OnlyUp("First", "Second"), 0.074, 0.088},
	} {
		n, err := today.NearestLimit(scales, c.opt)
		if err != nil {
			t.Errorf("to %g, %g: %v", c.first, c.second, err)
			continue
		}
		if a, b := n.Changes[0].AtLimit, n.Changes[1].AtLimit; math.Abs(a-c.first) > 1e-8 || math.Abs(b-c.second) > 1e-8 {
			t.Errorf("at %.10g, %.10g, want %g, %g", a, b, c.first, c.second)
		}
	}
	_, err := today.NearestLimit(scales, continuation.OnlyDown("First", "Second"))
	oneLine(t, err, "no limit within the bounds")
	_, err = today.NearestLimit(scales, continuation.Keep("First", 0.1, 0.2))
	oneLine(t, err, "First is 0.05 now, outside its bounds 0.1 to 0.2")
	_, err = today.NearestLimit(scales, continuation.Keep("Weight", 0, 3))
	oneLine(t, err, "Weight is bounded but does not vary")
	_, err = today.NearestLimit(map[string]float64{"First": 0})
	oneLine(t, err, "the standard deviation of First is 0")
	_, err = today.NearestLimit(map[string]float64{"Fist": 1})
	oneLine(t, err, "did you mean First?")
	_, err = today.NearestLimit(map[string]float64{"First": 1e-6})
	oneLine(t, err, "look farther with Reach")
}

// A ball: x² = R² - |p|² has its fold where |p| = R, at R - |p| from today's p.
type ballParams struct{ P [5]float64 }

func ball(s scalar, q ballParams) scalar {
	sum := 1.0
	for _, v := range q.P {
		sum -= v * v
	}
	return scalar{sum - s.X*s.X}
}

func newBall(t testing.TB, p [5]float64) *continuation.Point {
	t.Helper()
	m, err := continuation.NewModel(ball, ballParams{p})
	if err != nil {
		t.Fatal(err)
	}
	return settled(t, m, scalar{0.9})
}

func allOf(name string, n int, scale float64) map[string]float64 {
	scales := map[string]float64{}
	for i := range n {
		scales[fmt.Sprintf("%s[%d]", name, i)] = scale
	}
	return scales
}

func TestNearestLimitInABall(t *testing.T) {
	p := [5]float64{0.3, -0.2, 0.1, 0.25, -0.15}
	size := 0.0
	for _, v := range p {
		size += v * v
	}
	size = math.Sqrt(size)
	n, err := newBall(t, p).NearestLimit(allOf("P", 5, 0.1))
	if err != nil {
		t.Fatal(err)
	}
	if want := (1 - size) / 0.1; math.Abs(n.Distance-want) > 1e-9 {
		t.Errorf("distance %.13g, want %.13g", n.Distance, want)
	}
	for i, c := range n.Changes {
		if math.Abs(c.AtLimit-p[i]/size) > 1e-6 || math.Abs(n.Normal[i]-p[i]/size) > 1e-6 {
			t.Errorf("%s: at %.9g, normal %.9g, want both %.9g", c.Name, c.AtLimit, n.Normal[i], p[i]/size)
		}
	}
}

// A surface with two hollows, against brute force on a grid of directions: the fold of
// x² = r(θ) - |p| at |p| = r(θ) = 1 + 0.3 cos 3θ + 0.1 cos(θ - 1).
func TestNearestLimitAgainstAGrid(t *testing.T) {
	type params struct{ A, B float64 }
	reach := func(theta float64) float64 { return 1 + 0.3*math.Cos(3*theta) + 0.1*math.Cos(theta-1) }
	m, err := continuation.NewModel(func(s scalar, q params) scalar {
		return scalar{reach(math.Atan2(q.B, q.A)) - math.Hypot(q.A, q.B) - s.X*s.X}
	}, params{0.05, 0.02})
	if err != nil {
		t.Fatal(err)
	}
	today := settled(t, m, scalar{1})
	n, err := today.NearestLimit(map[string]float64{"A": 1, "B": 1})
	if err != nil {
		t.Fatal(err)
	}
	off := func(theta float64) float64 {
		r := reach(theta)
		return math.Hypot(r*math.Cos(theta)-0.05, r*math.Sin(theta)-0.02)
	}
	if want := off(argmin(off, -math.Pi, math.Pi)); math.Abs(n.Distance-want) > 1e-9 {
		t.Errorf("distance %.12g, on the grid %.12g; %s; others %v", n.Distance, want, n.Tried, n.Others)
	}
	if len(n.Others) != 2 {
		t.Errorf("%d other places, want the other 2 hollows: %v", len(n.Others), n.Others)
	}
}

// The Hopf points of the Brusselator lie on B = 1 + A².
func TestNearestHopfPoint(t *testing.T) {
	type state struct{ X, Y float64 }
	type params struct{ A, B float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{q.A - (q.B+1)*s.X + s.X*s.X*s.Y, q.B*s.X - s.X*s.X*s.Y}
	}, params{A: 1.3, B: 1})
	if err != nil {
		t.Fatal(err)
	}
	n, err := settled(t, m, state{1.3, 0.7}).NearestLimit(map[string]float64{"A": 0.5, "B": 1}, continuation.Reach(5))
	if err != nil {
		t.Fatal(err)
	}
	off := func(a float64) float64 { return math.Hypot((a-1.3)/0.5, 1+a*a-1) }
	if want := off(argmin(off, 0, 2)); math.Abs(n.Distance-want) > 1e-7 || n.Kind != "Hopf point" {
		t.Errorf("%v, closed form %.9g", n, want)
	}
}

// The same on one core and on all.
func TestNearestLimitDoesNotDependOnCores(t *testing.T) {
	old := runtime.GOMAXPROCS(4)
	defer runtime.GOMAXPROCS(old)
	today := newBall(t, [5]float64{0.3, -0.2, 0.1, 0.25, -0.15})
	one, err := today.NearestLimit(allOf("P", 5, 0.1), continuation.Cores(1))
	if err != nil {
		t.Fatal(err)
	}
	all, err := today.NearestLimit(allOf("P", 5, 0.1))
	if err != nil {
		t.Fatal(err)
	}
	if one.Distance != all.Distance || one.Tried != all.Tried || one.String() != all.String() {
		t.Errorf("%v %v\n%v %v", one, one.Tried, all, all.Tried)
	}
}

// The nearest limit of the IEEE 14-bus system in all loads, each measured by itself: no
// direction tried by brute force meets a nearer one, and the way to it is normal to the
// surface.
func TestFourteenBusNearestLimit(t *testing.T) {
	if testing.Short() {
		t.Skip("takes seconds")
	}
	today := newFourteenFlow(readFourteenBus(t)).today(t)
	scales := map[string]float64{}
	for _, k := range []int{1, 2, 3, 4, 5, 8, 9, 10, 11, 12, 13} {
		scales[fmt.Sprintf("Load[%d]", k)] = 1
	}
	n, err := today.NearestLimit(scales, continuation.Starts(6), continuation.CheckRays(12))
	if err != nil {
		t.Fatal(err)
	}
	for i, c := range n.Changes {
		if way := c.By / n.Distance; math.Abs(way-n.Normal[i]) > 1e-6 {
			t.Errorf("%s: way %.8f, normal %.8f", c.Name, way, n.Normal[i])
		}
	}
	along := map[string]float64{}
	for _, c := range n.Changes {
		along[c.Name] = c.By
	}
	m, err := today.MarginAlong(along, 3)
	if err != nil || math.Abs(m.Steps-1) > 1e-8 {
		t.Errorf("along the way to it the first limit is met after %v, %v", m, err)
	}
	t.Logf("%v; %s; others %d", n, n.Tried, len(n.Others))
}

// Second-order sensitivities against the closed form of the two-bus network.
func TestSecondOrderSensitivities(t *testing.T) {
	both(t, func(t *testing.T, today *continuation.Point, tolerance float64) {
		b := mustFollow(t, today, "P", continuation.Within(0.4, 2), continuation.StopAtFold(), continuation.Upward())
		s, err := b.Folds()[0].SecondOrder()
		if err != nil {
			t.Fatal(err)
		}
		// P = E sqrt(E² - 4 X Q) / (2 X)
		greatest := func(q busParams) float64 { return q.E * math.Sqrt(q.E*q.E-4*q.X*q.Q) / (2 * q.X) }
		root := math.Sqrt(1 - 4*0.4*0.1)
		for name, want := range map[[2]int]float64{
			{0, 0}: -2 * 0.4 / (root * root * root),                // QQ: -2 X E / (E² - 4XQ)^(3/2)
			{0, 1}: -(1/root - 1/(root*root*root)),                 // QE: d/dE (-E/root)
			{1, 1}: (3/root - 1/(root*root*root)) / (2 * 0.4) * 1., // EE
		} {
			if got := s.Hessian[name[0]][name[1]]; math.Abs(got-want) > 1e-6*math.Abs(want) {
				t.Errorf("%v: %.10g, closed form %.10g", name, got, want)
			}
		}
		off := func(q busParams, slope, by float64) float64 {
			moved := greatest(q) - greatest(busToday)
			return math.Abs(slope*by-moved) / math.Abs(moved)
		}
		for i, one := range s.List {
			for _, end := range []struct {
				at   float64
				open bool
			}{{one.Low, one.LowOpen}, {one.High, one.HighOpen}} {
				q := busToday
				*[]*float64{&q.Q, &q.E, &q.X}[i] = end.at
				e := off(q, one.Slope, end.at-one.Value)
				if e > 0.0501 || !end.open && e < 0.049 && !math.IsNaN(e) {
					t.Errorf("%s at %.6g: off by %.4g, want 0.05 (open %v)", one.Name, end.at, e, end.open)
				}
			}
		}
	})
}
