package continuation

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/stat/distuv"
)

const (
	batchSize     = 32 // directions
	batchUniform  = 4  // of them spread evenly
	fewestBatches = 20
	comparedOne   = 16 // one refined limit in so many is compared with a traced ray
	noticedChange = 1e-6
	leftOut       = 1e-6 // share of the probability behind limits too far to be looked for
)

// A sampler draws directions and weighs them.
type sampler struct {
	s        *limitSearch
	cones    []*cone
	radius   distuv.ChiSquared
	far      float64 // beyond this a limit does not matter
	traceAll bool
}

// A batch is what some directions gave.
type batch struct {
	mean                      float64
	control                   float64 // mean of the part of the density that comes from the cones, over all of it
	traced, refined           int
	compared, differ, uniform int
	err                       error
}

// sample adds the directional sampling to a chance.
func (s *limitSearch) sample(c *Chance, cones []*cone) {
	d := &sampler{s: s, cones: cones, radius: distuv.ChiSquared{K: float64(s.space.dim())}}
	d.prepare()
	err := d.run(c)
	if err == nil && c.Sampling.Differ > 0 {
		d.traceAll = true
		err = d.run(c)
	}
	switch {
	case errors.Is(err, ErrInterrupted):
		c.Notes = append(c.Notes, "interrupted: the sampling was not brought to its end")
	case err != nil:
		c.Notes = append(c.Notes, "the sampling failed: "+err.Error())
	case c.Error > s.plan.error*c.Sampled:
		c.Notes = append(c.Notes, fmt.Sprintf("the sampling ended after %d directions with a relative error of %.2g, wanted %.2g: allow more with RelativeError", c.Sampling.Directions, c.Error/c.Sampled, s.plan.error))
	}
}

// prepare shares the directions out to the cones by their second-order probabilities.
func (d *sampler) prepare() {
	sum, least := 0.0, standard.CDF(-d.cones[0].beta)
	for i, c := range d.cones {
		first := standard.CDF(-c.beta)
		c.share = c.second(standard.Prob(c.beta) / first)
		if !(c.share < 10*first) {
			c.share = 10 * first // flat or hollow: the formula says nothing
		}
		sum += c.share
		if i == 0 {
			least = math.Min(least, c.share)
		}
	}
	for _, c := range d.cones {
		c.share /= sum
	}
	// Beyond far the tails of all directions together are a small share of the
	// probability.
	d.far = d.cones[0].beta
	for d.radius.Survival(d.far*d.far) > leftOut*least {
		d.far += 0.1
	}
}

// run takes batches until the error is small enough.
func (d *sampler) run(c *Chance) error {
	var failed error
	var means, controls []float64
	c.Sampling = SamplingTried{}
	enough := func() bool {
		n := len(means)
		if n == 0 || c.Sampling.Differ > 0 && !d.traceAll {
			return c.Sampling.Differ > 0 && !d.traceAll
		}
		return n*batchSize >= d.s.plan.directions || n >= fewestBatches && c.Error <= d.s.plan.error*c.Sampled
	}
	next := func(i int) func() batch {
		if failed != nil || enough() {
			return nil
		}
		return func() batch { return d.batch(uint64(i)) }
	}
	inOrder(d.s.m.workers(d.s.plan.workers), lag, next, func(b batch) {
		if b.err != nil {
			if failed == nil {
				failed = b.err
			}
			return
		}
		t := &c.Sampling
		t.Directions += batchSize
		t.Uniform += b.uniform
		t.Traced += b.traced
		t.Refined += b.refined
		t.Compared += b.compared
		t.Differ += b.differ
		means, controls = append(means, b.mean), append(controls, b.control)
		c.Sampled, c.Error = controlled(means, controls)
		c.Error = math.Hypot(c.Error, leftOut*c.Sampled)
		d.s.m.tellSurvey("Chance", t.Directions, math.Min(0.99, float64(t.Directions)/float64(d.s.plan.directions)), false)
	})
	d.s.m.tellSurvey("Chance", c.Sampling.Directions, 1, true)
	return failed
}

// meanAndError returns the mean of independent values and its standard error.
func meanAndError(list []float64) (mean, error float64) {
	n := float64(len(list))
	for _, v := range list {
		mean += v / n
	}
	if n < 2 {
		return mean, math.Inf(1)
	}
	for _, v := range list {
		error += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(error / (n - 1) / n)
}

// controlled returns the mean of values and its standard error with the help of controls
// whose expectation is 1: the density of the cones over the whole density (Owen & Zhou,
// Safe and effective importance sampling, Journal of the American Statistical Association
// 95 (2000) 135-143). The regression on them takes out the noise of how many directions
// happened to fall where.
func controlled(values, controls []float64) (mean, error float64) {
	mean, error = meanAndError(values)
	n := float64(len(values))
	if n < 8 {
		return mean, error
	}
	middle, _ := meanAndError(controls)
	both, square := 0.0, 0.0
	for i, v := range values {
		both += (v - mean) * (controls[i] - middle)
		square += (controls[i] - middle) * (controls[i] - middle)
	}
	if square == 0 {
		return mean, error
	}
	slope, left := both/square, 0.0
	for i, v := range values {
		d := v - mean - slope*(controls[i]-middle)
		left += d * d
	}
	spread := 1 + n*(middle-1)*(middle-1)/square // of the value at 1, not at the middle
	return mean - slope*(middle-1), math.Sqrt(left / (n - 2) / n * spread)
}

// batch takes the directions of one batch: some spread evenly, the others drawn in
// opposite pairs about the places where the surface is near.
func (d *sampler) batch(i uint64) batch {
	r := rand.New(rand.NewPCG(d.s.plan.seed, 0xd1342543de82ef95+i))
	scouts := make([]*scout, len(d.cones))
	b := batch{uniform: batchUniform}
	for range batchUniform {
		e := make([]float64, d.s.space.dim())
		for k := range e {
			e[k] = r.NormFloat64()
		}
		e, _ = sized(e)
		d.weigh(&b, e, nil, nil)
	}
	for k := 0; k < batchSize-batchUniform; k += 2 {
		at := d.choose(r.Float64())
		c := d.cones[at]
		if scouts[at] == nil && c.edge.normal != nil {
			scouts[at] = newScout(d.s.m, d.s.space, c.edge)
		}
		e, opposite := c.draw(r)
		compare := (int(i)*(batchSize-batchUniform)+k)%comparedOne == 0
		d.pair(&b, e, opposite, c, scouts[at], compare)
	}
	for _, sc := range scouts {
		if sc != nil {
			b.refined, sc.solved = b.refined+sc.solved, 0
		}
	}
	return b
}

func (d *sampler) pair(b *batch, e, opposite []float64, c *cone, sc *scout, compare bool) {
	if sc == nil || d.traceAll {
		d.weigh(b, e, nil, nil)
		d.weigh(b, opposite, nil, nil)
		return
	}
	near := d.weigh(b, e, c, sc)
	d.weigh(b, opposite, c, sc)
	if near == nil || !compare || b.err != nil {
		return
	}
	b.traced++
	b.compared++
	first, err := d.s.trace(e, near.t*1.001+1e-9)
	if errors.Is(err, ErrInterrupted) {
		b.err = err
	}
	if err != nil || math.Abs(first.t-near.t) > noticedChange*near.t {
		b.differ++
	}
}

// choose returns the cone at a place between 0 and 1.
func (d *sampler) choose(u float64) int {
	for i, c := range d.cones {
		if u -= c.share; u < 0 {
			return i
		}
	}
	return len(d.cones) - 1
}

// weigh adds the weight of a direction to a batch, and returns its limit where it was
// refined.
func (d *sampler) weigh(b *batch, e []float64, c *cone, sc *scout) *edge {
	if b.err != nil {
		return nil
	}
	cones, density := d.density(e)
	b.control += cones / density / batchSize
	var at *edge
	if sc != nil {
		found, err := sc.on(d.s.origin(), e, c.edge)
		if errors.Is(err, ErrInterrupted) {
			b.err = err
			return nil
		}
		if err == nil && found.t > 0 {
			at = found
		}
	}
	refined := at
	if at == nil {
		b.traced++
		found, err := d.s.trace(e, d.far)
		if errors.Is(err, ErrInterrupted) {
			b.err = err
			return nil
		}
		if err != nil {
			return nil // no limit that matters
		}
		at = found
	}
	b.mean += d.radius.Survival(at.t*at.t) / density / batchSize
	return refined
}

// density is that of the directions drawn from the cones and of all, over that of evenly
// spread ones.
func (d *sampler) density(e []float64) (cones, all float64) {
	const even = float64(batchUniform) / batchSize
	sum := 0.0
	for _, c := range d.cones {
		sum += c.share * c.density(e, d.radius)
	}
	return sum, even + (1-even)*sum
}

// draw returns a direction and its opposite about the way of the cone. With a plane as
// surface it is that of a standard normal vector beyond the plane; a curved one stretches
// the tangent plane.
func (c *cone) draw(r *rand.Rand) (e, opposite []float64) {
	height := -standard.Quantile(math.Max(r.Float64(), 1e-15) * standard.CDF(-c.beta))
	e, opposite = make([]float64, len(c.way)), make([]float64, len(c.way))
	addMultiple(e, c.beta, c.way)
	addMultiple(opposite, c.beta, c.way)
	for i, a := range c.axes {
		y := c.stretch[i] * c.beta * r.NormFloat64() / height
		addMultiple(e, y, a)
		addMultiple(opposite, -y, a)
	}
	e, _ = sized(e)
	opposite, _ = sized(opposite)
	return e, opposite
}

// density is that of draw over that of evenly spread directions:
//
//	Q_k(β² + |y/s|²) / Φ(-β) · ((β² + |y|²) / (β² + |y/s|²))^(k/2) / Π s
//
// at the point y of the tangent plane that the direction meets.
func (c *cone) density(e []float64, radius distuv.ChiSquared) float64 {
	up := dot(e, c.way)
	if !(up > 1e-12) {
		return 0
	}
	plain, drawn, stretched := c.beta*c.beta, c.beta*c.beta, 1.0
	for i, a := range c.axes {
		y := c.beta * dot(e, a) / up
		plain += y * y
		drawn += y * y / (c.stretch[i] * c.stretch[i])
		stretched *= c.stretch[i]
	}
	return radius.Survival(drawn) / standard.CDF(-c.beta) * math.Pow(plain/drawn, radius.K/2) / stretched
}
