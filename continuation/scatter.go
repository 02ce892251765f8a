package continuation

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
)

// A MarginScatter is the distribution of a margin when parameters scatter, by sampling.
type MarginScatter struct {
	Limit     Limit
	Parameter Parameter // of the margin, with its value now
	Margins   []float64 // λ* - λ of each sample for which the limit was found, ascending
	Missing   int       // samples for which it was not
	// Upward says that the limit lies above today's value: a margin below 0 is a limit
	// passed. Otherwise one above 0 is.
	Upward bool
}

// MarginScatter returns how the margin from here to a limit scatters: for n samples of the
// parameters the limit is refined anew, beginning from where the tangent plane of the limits
// predicts it. Where the followed parameter scatters itself the margin is from its sampled
// value. That the limit found is still the first one on the way is not checked.
func (p *Point) MarginScatter(limit Limit, scatter []*Distribution, n int, opts ...LimitOption) (*MarginScatter, error) {
	s, err := p.marginScatter(limit, scatter, n, opts)
	if err != nil {
		return nil, fmt.Errorf("MarginScatter: %w", err)
	}
	return s, nil
}

func (p *Point) marginScatter(limit Limit, scatter []*Distribution, n int, opts []LimitOption) (*MarginScatter, error) {
	plan, err := newLimitPlan(opts)
	if err != nil {
		return nil, err
	}
	if n < 1 {
		return nil, fmt.Errorf("%d samples: at least one is needed", n)
	}
	margin, err := p.MarginTo(limit)
	if err != nil {
		return nil, err
	}
	slopes, err := allSlopes(limit)
	if err != nil {
		return nil, err
	}
	sp, err := newSpace(p.model, p.Parameters, scatter)
	if err != nil {
		return nil, err
	}
	if err := sp.dependence(plan.pairs); err != nil {
		return nil, err
	}
	s := &MarginScatter{Limit: limit, Parameter: margin.Parameter, Upward: margin.Absolute > 0}
	if err := s.draw(sp, slopes, n, plan); err != nil {
		return nil, err
	}
	slices.Sort(s.Margins)
	if len(s.Margins) == 0 {
		return nil, fmt.Errorf("the limit could not be found for any of %d samples", n)
	}
	return s, nil
}

// allSlopes returns dλ*/dp for all parameters, -1 for λ itself.
func allSlopes(limit Limit) ([]float64, error) {
	if f, ok := limit.(*Fold); ok {
		return f.sensitivities, nil
	}
	s, err := limit.Sensitivities()
	if err != nil {
		return nil, err
	}
	slopes, free := []float64{}, limit.Where().free
	for _, one := range s.List {
		slopes = append(slopes, one.Slope)
	}
	return slices.Insert(slopes, free, -1), nil
}

const scatterBatch = 64

// draw takes n samples in batches.
func (s *MarginScatter) draw(sp *space, slopes []float64, n int, plan *limitPlan) error {
	type batch struct {
		margins []float64
		missing int
		err     error
	}
	var failed error
	next := func(i int) func() batch {
		if failed != nil || i*scatterBatch >= n {
			return nil
		}
		return func() (b batch) {
			at, err := newNeighbourhood(s.Limit, slopes)
			if err != nil {
				return batch{err: err}
			}
			r := rand.New(rand.NewPCG(plan.seed, 0xa0761d6478bd642f+uint64(i)))
			for range min(scatterBatch, n-i*scatterBatch) {
				m, err := at.sample(sp, r)
				switch {
				case errors.Is(err, ErrInterrupted):
					return batch{err: err}
				case err != nil:
					b.missing++
				default:
					b.margins = append(b.margins, m)
				}
			}
			return b
		}
	}
	inOrder(sp.m.workers(plan.workers), lag, next, func(b batch) {
		if b.err != nil && failed == nil {
			failed = b.err
		}
		s.Margins = append(s.Margins, b.margins...)
		s.Missing += b.missing
	})
	return failed
}

// sample draws parameters and returns the margin there.
func (b *neighbourhood) sample(sp *space, r *rand.Rand) (float64, error) {
	u, slopes, p := make([]float64, sp.dim()), make([]float64, sp.dim()), make([]float64, len(b.sizes))
	for i := range u {
		u[i] = r.NormFloat64()
	}
	sp.at(u, p, slopes)
	origin := make([]float64, len(p))
	for j, v := range p {
		if j != b.free {
			origin[j] = (v - b.centre.p[j]) / b.sizes[j]
		}
	}
	e, err := b.scout.on(origin, b.up, b.centre)
	if err != nil {
		return 0, err
	}
	return e.p[b.free] - p[b.free], nil
}

// Mean returns the mean of the margins and SD their standard deviation.
func (s *MarginScatter) Mean() float64 {
	mean, _ := meanAndError(s.Margins)
	return mean
}

// SD returns the standard deviation of the margins.
func (s *MarginScatter) SD() float64 {
	_, e := meanAndError(s.Margins)
	return e * math.Sqrt(float64(len(s.Margins)))
}

// Quantile returns the margin below which a share q of the samples lies.
func (s *MarginScatter) Quantile(q float64) float64 {
	at := math.Min(math.Max(q*float64(len(s.Margins))-0.5, 0), float64(len(s.Margins)-1))
	i := min(int(at), max(len(s.Margins)-2, 0))
	if len(s.Margins) == 1 {
		return s.Margins[0]
	}
	return s.Margins[i] + (at-float64(i))*(s.Margins[i+1]-s.Margins[i])
}

// Passed returns the share of the samples for which the limit is passed, and its standard
// error.
func (s *MarginScatter) Passed() (share, error float64) {
	n := 0
	for _, m := range s.Margins {
		if (m < 0) == s.Upward && m != 0 {
			n++
		}
	}
	total := float64(len(s.Margins))
	share = float64(n) / total
	return share, math.Sqrt(share * (1 - share) / total)
}

// Histogram counts the margins in bins of one width: len(counts)+1 edges.
func (s *MarginScatter) Histogram(bins int) (edges []float64, counts []int) {
	bins = max(bins, 1)
	low, high := s.Margins[0], s.Margins[len(s.Margins)-1]
	if low == high {
		low, high = low-0.5, high+0.5
	}
	edges, counts = make([]float64, bins+1), make([]int, bins)
	for i := range edges {
		edges[i] = low + (high-low)*float64(i)/float64(bins)
	}
	for _, m := range s.Margins {
		counts[min(int((m-low)/(high-low)*float64(bins)), bins-1)]++
	}
	return edges, counts
}

// String says the scatter in one line.
func (s *MarginScatter) String() string {
	share, e := s.Passed()
	return fmt.Sprintf("margin in %s to the %s over %d samples: mean %s, standard deviation %.3g, 5 %% to 95 %% from %.4g to %.4g; passed in %.3g ± %.1g of them",
		s.Parameter.Name, s.Limit.Kind(), len(s.Margins), withUnit(s.Mean(), s.Parameter.Unit), s.SD(), s.Quantile(0.05), s.Quantile(0.95), share, e)
}
