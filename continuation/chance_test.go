package continuation_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"brinkline/continuation"
)

// A limit state g(p) = 0 as a fold: x² = g has its fold where g vanishes.
type limitState struct{ A, B, C, D float64 }

func newLimitState(t testing.TB, q limitState, g func(q limitState) float64) *continuation.Point {
	t.Helper()
	m, err := continuation.NewModel(func(s scalar, q limitState) scalar { return scalar{g(q) - s.X*s.X} }, q)
	if err != nil {
		t.Fatal(err)
	}
	return settled(t, m, scalar{math.Sqrt(g(q))})
}

var phi = distuv.UnitNormal

func chanceOf(t testing.TB, p *continuation.Point, list []*continuation.Distribution, opts ...continuation.LimitOption) *continuation.Chance {
	t.Helper()
	c, err := p.Chance(list, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// within checks a sampled probability against its own standard error.
func within(t *testing.T, c *continuation.Chance, want float64) {
	t.Helper()
	if c.Error > 0.0101*c.Sampled || math.Abs(c.Sampled-want) > 3.5*c.Error+1e-9*want {
		t.Errorf("sampled %.6g ± %.2g, want %.6g (%s; %v)", c.Sampled, c.Error, want, c.Sampling, c.Notes)
	}
}

func isNear(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: %.10g, want %.10g", what, got, want)
	}
}

// Linear limit state of normal variables: β = (μ_R - μ_S)/sqrt(σ_R² + σ_S² - 2 ρ σ_R σ_S)
// (R. E. Melchers and A. T. Beck, Structural Reliability Analysis and Prediction, 3rd
// ed. 2018, chapter 1, the fundamental case).
func TestChanceOfTheFundamentalCase(t *testing.T) {
	today := newLimitState(t, limitState{A: 10, B: 4}, func(q limitState) float64 { return q.A - q.B })
	list := continuation.Scatter(continuation.Normal("A", 10, 1.2), continuation.Normal("B", 5, 1))
	for _, rho := range []float64{0, 0.5, -0.4} {
		c := chanceOf(t, today, list, continuation.Correlated("A", "B", rho))
		beta := 5 / math.Sqrt(1.44+1-2*rho*1.2)
		isNear(t, "index", c.Index, beta, 1e-9)
		isNear(t, "first order", c.First, phi.CDF(-beta), 1e-7)
		isNear(t, "second order", c.SecondImproved, phi.CDF(-beta), 1e-5)
		// The directions are drawn as they ought to be for a plane: next to no error.
		within(t, c, phi.CDF(-beta))
		if rho == 0 {
			isNear(t, "importance of A", c.Importance[0].Share, 1.44/2.44, 1e-7)
		}
	}
}

// Lognormal resistance and load effect: β = ln(m_R/m_S sqrt((1+V_S²)/(1+V_R²))) /
// sqrt(ln((1+V_R²)(1+V_S²))), exact; correlated ones with ρ' = ln(1+ρ V_R V_S) (Melchers and
// Beck, chapter 1; Liu and Der Kiureghian 1986 for the correlation).
func TestChanceOfLognormals(t *testing.T) {
	today := newLimitState(t, limitState{A: 10, B: 5}, func(q limitState) float64 { return q.A - q.B })
	list := continuation.Scatter(continuation.Lognormal("A", 10, 1.5), continuation.Lognormal("B", 5, 1.5))
	vr, vs := 0.15, 0.3
	zr, zs := math.Log1p(vr*vr), math.Log1p(vs*vs)
	for _, rho := range []float64{0, 0.3} {
		c := chanceOf(t, today, list, continuation.Correlated("A", "B", rho))
		beta := math.Log(2*math.Sqrt((1+vs*vs)/(1+vr*vr))) / math.Sqrt(zr+zs-2*math.Log1p(rho*vr*vs))
		isNear(t, "index", c.Index, beta, 1e-6)
		within(t, c, phi.CDF(-c.Index))
	}
}

// A plastic section: Y Z - M with independent normal Y (40, 5), Z (50, 2.5), M (1000, 200).
// A. H-S. Ang and W. H. Tang, Probability Concepts in Engineering Planning and Design II,
// 1984, example 6.6, give β = 3.05 (from memory). The probability is integrated here.
func TestChanceOfAPlasticSection(t *testing.T) {
	today := newLimitState(t, limitState{A: 40, B: 50, C: 1000}, func(q limitState) float64 { return (q.A*q.B - q.C) / 100 })
	c := chanceOf(t, today, continuation.Scatter(continuation.Normal("A", 40, 5), continuation.Normal("B", 50, 2.5), continuation.Normal("C", 1000, 200)))
	if math.Abs(c.Index-3.05) > 0.005 {
		t.Errorf("index %.5g, published 3.05", c.Index)
	}
	within(t, c, integral(func(y float64) float64 {
		return integral(func(z float64) float64 { return phi.CDF(-((40+5*y)*(50+2.5*z) - 1000) / 200) })
	}))
}

// integral is the mean of f over a standard normal variable, by the trapezoidal rule.
func integral(f func(float64) float64) float64 {
	sum, h := 0.0, 0.02
	for i := -450; i <= 450; i++ {
		sum += h * phi.Prob(float64(i)*h) * f(float64(i)*h)
	}
	return sum
}

// Quadratic limit states β + 1/2 Σ κ u² - u_n: Breitung's and Hohenbichler and Rackwitz's
// values follow from the curvatures; the probability itself by integration.
func TestChanceOfQuadraticLimitStates(t *testing.T) {
	for _, q := range []struct{ beta, k1, k2 float64 }{{3, 0.2, 0.2}, {3, -0.1, 0.3}, {2, 0.5, -0.2}, {4, -0.15, -0.1}} {
		today := newLimitState(t, limitState{}, func(p limitState) float64 {
			return q.beta + (q.k1*p.A*p.A+q.k2*p.B*p.B)/2 - p.C
		})
		c := chanceOf(t, today, continuation.Scatter(continuation.Normal("A", 0, 1), continuation.Normal("B", 0, 1), continuation.Normal("C", 0, 1)))
		p1 := phi.CDF(-q.beta)
		if len(c.Curvatures) != 2 {
			t.Errorf("no curvatures: %v", c.Notes)
			continue
		}
		isNear(t, "index", c.Index, q.beta, 1e-8)
		isNear(t, "least curvature", c.Curvatures[0], math.Min(q.k1, q.k2), 1e-4)
		isNear(t, "greatest curvature", c.Curvatures[1], math.Max(q.k1, q.k2), 1e-4)
		isNear(t, "Breitung", c.Second, p1/math.Sqrt((1+q.beta*q.k1)*(1+q.beta*q.k2)), 1e-3)
		psi := phi.Prob(q.beta) / p1
		isNear(t, "Hohenbichler", c.SecondImproved, p1/math.Sqrt((1+psi*q.k1)*(1+psi*q.k2)), 1e-3)
		within(t, c, integral(func(a float64) float64 {
			return integral(func(b float64) float64 { return phi.CDF(-(q.beta + (q.k1*a*a+q.k2*b*b)/2)) })
		}))
	}
}

// Two limits on opposite sides, of which first and second order see one.
func TestChanceOfTwoLimits(t *testing.T) {
	today := newLimitState(t, limitState{}, func(q limitState) float64 { return (2.5 - q.A + 0.1*q.B) * (2.6 + q.A) })
	c := chanceOf(t, today, continuation.Scatter(continuation.Normal("A", 0, 1), continuation.Normal("B", 0, 1)))
	within(t, c, integral(func(b float64) float64 { return phi.CDF(-2.5 - 0.1*b) })+phi.CDF(-2.6))
	if len(c.Nearest.Others) != 1 {
		t.Errorf("other places: %v", c.Nearest.Others)
	}
}

// The sum of two uniform variables: P(U + V > 1.9) = 0.1²/2, far from the first order.
func TestChanceOfUniforms(t *testing.T) {
	today := newLimitState(t, limitState{A: 0.5, B: 0.5}, func(q limitState) float64 { return 1.9 - q.A - q.B })
	c := chanceOf(t, today, continuation.Scatter(continuation.Uniform("A", 0, 1), continuation.Uniform("B", 0, 1)), continuation.RelativeError(0.01, 20000))
	within(t, c, 0.005)
}

// All directions alike: outside of a ball about the medians, χ² with k degrees of freedom.
func TestChanceOutsideABall(t *testing.T) {
	var list []*continuation.Distribution
	for name := range allOf("P", 5, 1) {
		list = append(list, continuation.Normal(name, 0, 0.2))
	}
	c := chanceOf(t, newBall(t, [5]float64{}), list)
	within(t, c, distuv.ChiSquared{K: 5}.Survival(25))
}

// A sample of a normal variable behaves like it within what a sample can say.
func TestChanceOfASample(t *testing.T) {
	today := newLimitState(t, limitState{A: 10}, func(q limitState) float64 { return 12 - q.A })
	var values []float64
	for i := range 4000 {
		values = append(values, 10+phi.Quantile((float64(i)+0.5)/4000))
	}
	c := chanceOf(t, today, continuation.Scatter(continuation.Sampled("A", values)))
	// In one dimension first order is all there is.
	within(t, c, c.First)
	isNear(t, "index", c.Index, 2, 1e-3)
}

// The feeder: demand and source of the two-bus network scatter. The probability by
// integration of the closed form.
func feederScatter() []*continuation.Distribution {
	return continuation.Scatter(continuation.Normal("P", 0.6, 0.1), continuation.Lognormal("Q", 0.15, 0.05), continuation.Normal("E", 1, 0.03))
}

func feederChance() float64 {
	sigma := math.Sqrt(math.Log1p(1.0 / 9))
	mu := math.Log(0.15) - sigma*sigma/2
	return integral(func(a float64) float64 {
		return integral(func(b float64) float64 {
			q, e := math.Exp(mu+sigma*a), 1+0.03*b
			if e*e < 1.6*q {
				return 1
			}
			greatest := e * math.Sqrt(e*e-1.6*q) / 0.8
			return phi.CDF(-(greatest - 0.6) / 0.1)
		})
	})
}

func TestChanceOfTheFeeder(t *testing.T) {
	both(t, func(t *testing.T, today *continuation.Point, _ float64) {
		want := feederChance()
		c := chanceOf(t, today, feederScatter())
		within(t, c, want)
		isNear(t, "second order", c.SecondImproved, want, 0.05)
		if c.Sampling.Refined+c.Sampling.Traced > 2000 {
			t.Errorf("1 %% took %s", c.Sampling)
		}
		t.Logf("probability %.5g: first order %.4g, second %.4g and %.4g, sampled %.5g ± %.1g; %s", want, c.First, c.Second, c.SecondImproved, c.Sampled, c.Error, c.Sampling)
	})
}

// The stated error is right: over many seeds the deviations have its size.
func TestStatedErrorOfSampling(t *testing.T) {
	today := newLimitState(t, limitState{}, func(p limitState) float64 { return 3 + (0.4*p.A*p.A-0.15*p.B*p.B)/2 + 0.05*p.A*p.A*p.B - p.C })
	list := continuation.Scatter(continuation.Normal("A", 0, 1), continuation.Normal("B", 0, 1), continuation.Normal("C", 0, 1))
	want := integral(func(a float64) float64 {
		return integral(func(b float64) float64 { return phi.CDF(-(3 + (0.4*a*a-0.15*b*b)/2 + 0.05*a*a*b)) })
	})
	sum, n := 0.0, 12
	for seed := range n {
		c := chanceOf(t, today, list, continuation.Seed(seed), continuation.RelativeError(1e-9, 640))
		z := (c.Sampled - want) / c.Error
		sum += z * z
	}
	// χ² with 12 degrees of freedom: 1e-4 and 1 - 1e-4 (Student's tails add little).
	if sum < 1.9 || sum > 45 {
		t.Errorf("mean squared deviation %.3g of the stated error, want about 1", sum/float64(n))
	}
}

// The same bits on one core and on several.
func TestChanceDoesNotDependOnCores(t *testing.T) {
	today := newBus(t)
	one := chanceOf(t, today, feederScatter(), continuation.Cores(1), continuation.RelativeError(0.01, 640))
	all := chanceOf(t, today, feederScatter(), continuation.Cores(4), continuation.RelativeError(0.01, 640))
	if one.Sampled != all.Sampled || one.Error != all.Error || one.Sampling != all.Sampling {
		t.Errorf("%v %v\n%v %v", one, one.Sampling, all, all.Sampling)
	}
}

func TestBadChances(t *testing.T) {
	today := newBus(t)
	for _, c := range []struct {
		want string
		list []*continuation.Distribution
		opts []continuation.LimitOption
	}{
		{"no parameter is to vary", nil, nil},
		{"the standard deviation of P is 0", continuation.Scatter(continuation.Normal("P", 0.4, 0)), nil},
		{"must be positive", continuation.Scatter(continuation.Normal("P", 0.4, -1)), nil},
		{"the mean of a lognormal P must be positive", continuation.Scatter(continuation.Lognormal("P", -0.4, 1)), nil},
		{"is no interval", continuation.Scatter(continuation.Uniform("P", 1, 0)), nil},
		{"at least 5 are needed", continuation.Scatter(continuation.Sampled("P", []float64{1, 2})), nil},
		{"did you mean P?", continuation.Scatter(continuation.Normal("p", 0.4, 0.1)), nil},
		{"P is given twice", continuation.Scatter(continuation.Normal("P", 0.4, 0.1), continuation.Normal("P", 0.4, 0.1)), nil},
		{"must lie between -1 and 1", continuation.Scatter(continuation.Normal("P", 0.4, 0.1), continuation.Normal("Q", 0.1, 0.1)),
			[]continuation.LimitOption{continuation.Correlated("P", "Q", 1)}},
		{"not positive definite", continuation.Scatter(continuation.Normal("P", 0.4, 0.1), continuation.Normal("Q", 0.1, 0.1), continuation.Normal("X", 0.4, 0.01)),
			[]continuation.LimitOption{continuation.Correlated("P", "Q", 0.9), continuation.Correlated("P", "X", 0.9), continuation.Correlated("Q", "X", -0.9)}},
		{"X is correlated but has no distribution", continuation.Scatter(continuation.Normal("P", 0.4, 0.1)),
			[]continuation.LimitOption{continuation.Correlated("P", "X", 0.9)}},
		{"on the wrong side", continuation.Scatter(continuation.Normal("P", 1.5, 0.2)), nil},
		{"Keep, OnlyUp and OnlyDown are for NearestLimit", continuation.Scatter(continuation.Normal("P", 0.4, 0.1)), []continuation.LimitOption{continuation.OnlyUp("P")}},
		{"the greatest is", continuation.Scatter(continuation.Lognormal("P", 0.4, 4), continuation.Uniform("Q", 0, 0.1)),
			[]continuation.LimitOption{continuation.Correlated("P", "Q", 0.99)}},
	} {
		_, err := today.Chance(c.list, c.opts...)
		oneLine(t, err, c.want)
	}
}
