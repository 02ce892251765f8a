package continuation

import (
	"math"
	"math/cmplx"
	"slices"
)

// returns watches for a trajectory to come back to a section across it: the plane
// through a state of it, normal to its rate of change, in scaled states.
type returns struct {
	clock  *clock
	x0, f0 []float64 // where the last step began
	t0     float64

	origin, normal []float64
	size           []float64 // of the states, when the section was laid
	laid           int       // steps taken then
	times          []float64
	states         [][]float64

	found *Oscillation
}

const (
	firstSection = 32   // steps before a section is laid first; another after twice as many
	mostReturns  = 8    // passages of the section within a period
	sameReturn   = 1e-3 // of the swing
	kept         = 4 * mostReturns
)

// remember keeps where the next step begins.
func (r *returns) remember() {
	r.x0, r.f0, r.t0 = append(r.x0[:0], r.clock.x...), append(r.f0[:0], r.clock.f...), r.clock.t
}

// passed looks at the step that was just taken.
func (r *returns) passed() {
	c := r.clock
	if steps := c.path.Steps; steps >= firstSection && steps >= 2*r.laid {
		r.lay()
		return
	}
	if r.origin == nil || !(r.side(r.x0) < 0 && r.side(c.x) >= 0) {
		return
	}
	t, x, err := r.crossing()
	if err != nil {
		c.fail(err)
		return
	}
	r.times, r.states = append(r.times, t), append(r.states, x)
	if len(r.times) > kept {
		r.times, r.states = r.times[1:], r.states[1:]
	}
	r.compare()
}

// lay lays the section through the present state.
func (r *returns) lay() {
	c := r.clock
	r.laid = c.path.Steps
	r.origin, r.size = slices.Clone(c.x), slices.Clone(c.s.sx)
	r.normal = make([]float64, len(c.x))
	for i, v := range c.f {
		r.normal[i] = v / r.size[i]
	}
	r.times, r.states = nil, nil
	if length := norm(r.normal); length > 0 {
		for i := range r.normal {
			r.normal[i] /= length
		}
	}
}

// side is the distance from the section, positive ahead of it.
func (r *returns) side(x []float64) float64 {
	sum := 0.0
	for i, v := range r.normal {
		sum += v * (x[i] - r.origin[i]) / r.size[i]
	}
	return sum
}

// crossing finds where in the last step the section was passed, with the integrator's
// own accuracy: steps of other lengths from the same beginning, by the secant rule
// within brackets.
func (r *returns) crossing() (time float64, x []float64, err error) {
	c := r.clock
	low, high := 0.0, c.t-r.t0
	sideLow, sideHigh := r.side(r.x0), r.side(c.x)
	x = slices.Clone(c.x)
	h := high
	off := make([]float64, len(x))
	for range 20 {
		if sideHigh == 0 || high-low < 1e-12*high {
			break
		}
		h = low - sideLow*(high-low)/(sideHigh-sideLow)
		if err := c.r.step(r.x0, r.f0, h, x, off); err != nil {
			return 0, nil, err
		}
		s := r.side(x)
		if math.Abs(s) < 1e-13 {
			break
		}
		if s < 0 {
			low, sideLow, sideHigh = h, s, sideHigh/2 // Illinois: no end stays for ever
		} else {
			high, sideHigh, sideLow = h, s, sideLow/2
		}
	}
	return r.t0 + h, x, nil
}

// compare looks for the shortest number of passages after which the states repeat.
func (r *returns) compare() {
	last := len(r.times) - 1
	for j := 1; j <= mostReturns && 3*j <= last; j++ {
		swing, from := r.swing(last, j)
		if swing == nil {
			continue
		}
		d0 := r.differ(last, last-j, swing)
		d1 := r.differ(last-j, last-2*j, swing)
		d2 := r.differ(last-2*j, last-3*j, swing)
		if d0 > sameReturn || !r.settled(d0, d1, d2, swing) {
			continue
		}
		o := r.oscillation(last, j, from, d0)
		if o.Uncertainty < sameReturn*o.Period && !r.spiral(o, d0) {
			r.found = o
			return
		}
	}
}

// swing is the extent of each state over the last period, nil where nothing swings by
// more than the tolerance can tell. from is the entry of the trajectory at which the
// period begins.
func (r *returns) swing(last, j int) (swing []float64, from int) {
	path := r.clock.path
	from, _ = slices.BinarySearch(path.Times, r.times[last-j])
	from = max(from-1, 0)
	least, greatest := path.extent(from)
	most := 0.0
	for i, size := range r.clock.s.sx {
		greatest[i] -= least[i]
		most = math.Max(most, greatest[i]/size)
	}
	if most < 1000*r.clock.plan.tolerance {
		return nil, 0
	}
	for i, size := range r.clock.s.sx { // what hardly swings shows the error of the steps
		greatest[i] = math.Max(greatest[i], 0.1*most*size)
	}
	return greatest, from
}

func (r *returns) differ(a, b int, swing []float64) float64 {
	worst := 0.0
	for i, s := range swing {
		worst = math.Max(worst, math.Abs(r.states[a][i]-r.states[b][i])/s)
	}
	return worst
}

// settled reports whether what the returns still change is going to sum up to little:
// the changes fall geometrically, or are those of the tolerance.
func (r *returns) settled(d0, d1, d2 float64, swing []float64) bool {
	noise := 0.0
	for i, s := range swing {
		noise = math.Max(noise, 20*r.clock.plan.tolerance*r.clock.s.sx[i]/s)
	}
	if math.Max(d0, math.Max(d1, d2)) < math.Min(noise, sameReturn) {
		return true
	}
	// Both: near an unstable cycle the first are small and grow again.
	rate := math.Max(d0/d1, d1/d2)
	return rate < 0.9 && d0*rate/(1-rate) < sameReturn
}

// oscillation measures the last period.
func (r *returns) oscillation(last, j, from int, d0 float64) *Oscillation {
	o := &Oscillation{Period: r.times[last] - r.times[last-j], Repeats: d0}
	before := r.times[last-j] - r.times[last-2*j]
	o.Uncertainty = math.Abs(o.Period-before) + 10*r.clock.plan.tolerance*o.Period
	r.overPeriod(o, from)
	return o
}

// overPeriod sets extent and mean of the states, by the cubics between the steps.
func (r *returns) overPeriod(o *Oscillation, from int) {
	path := r.clock.path
	o.Least, o.Greatest = path.extent(from)
	o.Mean = make([]float64, len(o.Least))
	total := 0.0
	x := make([]float64, len(o.Mean))
	const parts = 8
	for i := from; i+1 < len(path.Times); i++ {
		c := hermite{path.Times[i], path.Times[i+1] - path.Times[i], path.States[i], path.States[i+1], path.rates[i], path.rates[i+1]}
		for k := range parts {
			c.at(c.t+c.h*(float64(k)+0.5)/parts, x)
			for i, v := range x {
				o.Mean[i] += v * c.h / parts
				o.Least[i], o.Greatest[i] = math.Min(o.Least[i], v), math.Max(o.Greatest[i], v)
			}
		}
		total += c.h
	}
	for i := range o.Mean {
		o.Mean[i] /= total
	}
}

// spiral reports whether the motion is that of a stable steady state within it, which
// is come to slowly: the returns change no less than its eigenvalues say.
func (r *returns) spiral(o *Oscillation, d0 float64) bool {
	c := r.clock
	n := newton{s: c.s, x: slices.Clone(o.Mean)}
	if n.run() != nil {
		return false
	}
	p := &Point{}
	if p.judge(c.s, n.jac) != nil || p.Unstable > 0 || imag(p.Eigenvalues[0]) == 0 {
		return false
	}
	for i, v := range n.x {
		if v < o.Least[i] || v > o.Greatest[i] {
			return false
		}
	}
	pair := p.Eigenvalues[0]
	turn := 2 * math.Pi / math.Abs(imag(pair))
	decay := 1 - cmplx.Abs(cmplx.Exp(complex(real(pair)*o.Period, 0)))
	return math.Abs(turn/o.Period-1) < 0.2 && d0 > decay/10
}
