package continuation

import (
	"fmt"
	"math"
)

// A LimitOption changes how [Point.NearestLimit], [Point.Chance] and
// [Point.MarginScatter] work.
type LimitOption func(*limitPlan) error

type limitPlan struct {
	bounds     []bound
	pairs      []correlation
	starts     int
	rays       int
	reach      float64
	seed       uint64
	error      float64
	directions int
	workers    int
	noSampling bool
}

func newLimitPlan(opts []LimitOption) (*limitPlan, error) {
	p := &limitPlan{rays: 64, reach: 20, error: 0.01, directions: 4000}
	for _, set := range opts {
		if err := set(p); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// Keep lets a parameter move between low and high only, in its unit, in the search for
// the nearest limit.
func Keep(parameter string, low, high float64) LimitOption {
	return func(p *limitPlan) error {
		if !(low < high) {
			return fmt.Errorf("Keep(%q, %g, %g) is no interval: the first value must be the smaller", parameter, low, high)
		}
		p.bounds = append(p.bounds, bound{parameter, low, high})
		return nil
	}
}

// OnlyUp lets parameters only grow from today's values in the search for the nearest
// limit.
func OnlyUp(parameters ...string) LimitOption { return oneSided(parameters, 0, math.Inf(1)) }

// OnlyDown lets parameters only fall from today's values in the search for the nearest
// limit.
func OnlyDown(parameters ...string) LimitOption { return oneSided(parameters, math.Inf(-1), 0) }

// oneSided bounds changes; NaN in the place of today's value.
func oneSided(parameters []string, low, high float64) LimitOption {
	return func(p *limitPlan) error {
		for _, name := range parameters {
			b := bound{name, math.Inf(-1), math.Inf(1)}
			if low == 0 {
				b.low = math.NaN()
			} else {
				b.high = math.NaN()
			}
			p.bounds = append(p.bounds, b)
		}
		return nil
	}
}

// Correlated sets the correlation coefficient of two parameters that scatter (0 without
// it).
func Correlated(a, b string, rho float64) LimitOption {
	return func(p *limitPlan) error {
		p.pairs = append(p.pairs, correlation{a, b, rho})
		return nil
	}
}

// Starts sets from how many directions the nearest limit is looked for (default two
// for each parameter and eight more).
func Starts(n int) LimitOption {
	return func(p *limitPlan) error {
		if n < 1 {
			return fmt.Errorf("Starts(%d): at least one is needed", n)
		}
		p.starts = n
		return nil
	}
}

// CheckRays sets along how many rays the nearest limit is checked against the full
// boundary (default 64).
func CheckRays(n int) LimitOption {
	return func(p *limitPlan) error {
		if n < 0 {
			return fmt.Errorf("CheckRays(%d): a number of rays is wanted", n)
		}
		p.rays = n
		return nil
	}
}

// Reach sets how far limits are looked for, in scales or standard deviations (default
// 20).
func Reach(distance float64) LimitOption {
	return func(p *limitPlan) error {
		if !positive(distance) {
			return fmt.Errorf("Reach(%g): a distance must be positive", distance)
		}
		p.reach = distance
		return nil
	}
}

// Seed sets the number from which random directions are made (default 0). The same
// number gives the same result on any number of cores.
func Seed(n int) LimitOption {
	return func(p *limitPlan) error { p.seed = uint64(n); return nil }
}

// RelativeError sets the standard error, relative to the probability, at which sampling
// ends (default 0.01), and the most directions that it may take for it.
func RelativeError(e float64, mostDirections int) LimitOption {
	return func(p *limitPlan) error {
		if !positive(e) || mostDirections < 1 {
			return fmt.Errorf("RelativeError(%g, %d): a positive error and a number of directions are wanted", e, mostDirections)
		}
		p.error, p.directions = e, mostDirections
		return nil
	}
}

// WithoutSampling leaves a chance at its first- and second-order values.
func WithoutSampling() LimitOption {
	return func(p *limitPlan) error { p.noSampling = true; return nil }
}

// Cores sets how many goroutines work (default one for each core). The result does not
// depend on it.
func Cores(n int) LimitOption {
	return func(p *limitPlan) error {
		if n < 1 {
			return fmt.Errorf("Cores(%d): at least one is needed", n)
		}
		p.workers = n
		return nil
	}
}

// box returns the bounds in the coordinates of a space whose variables are scaled
// shifts.
func (p *limitPlan) box(s *space, now []float64) (low, high []float64, err error) {
	low, high = make([]float64, s.dim()), make([]float64, s.dim())
	for i := range low {
		low[i], high[i] = math.Inf(-1), math.Inf(1)
	}
	if len(p.bounds) > 0 && s.lower != nil {
		return nil, nil, fmt.Errorf("bounds do not go with correlated parameters")
	}
	for _, b := range p.bounds {
		at := -1
		for i, d := range s.marg {
			if d.Parameter == b.name {
				at = i
			}
		}
		if at < 0 {
			return nil, nil, fmt.Errorf("%s is bounded but does not vary: give it a scale", b.name)
		}
		j := s.index[at]
		if math.IsNaN(b.low) {
			b.low = now[j]
		}
		if math.IsNaN(b.high) {
			b.high = now[j]
		}
		if now[j] < b.low || now[j] > b.high {
			return nil, nil, fmt.Errorf("%s is %s now, outside its bounds %g to %g: today's point must lie inside", b.name, withUnit(now[j], s.m.parameters[j].Unit), b.low, b.high)
		}
		low[at] = math.Max(low[at], (b.low-now[j])/s.marg[at].SD)
		high[at] = math.Min(high[at], (b.high-now[j])/s.marg[at].SD)
		if low[at] == 0 && high[at] == 0 {
			return nil, nil, fmt.Errorf("%s is bounded to its value now: leave it out", b.name)
		}
	}
	return low, high, nil
}
