package continuation

import (
	"errors"
	"fmt"
	"math"
)

// SecondOrder says how a limit moves with the other parameters to second order, and how
// far the first order can be trusted.
type SecondOrder struct {
	Limit Limit
	List  []SecondSensitivity // in the order of the model's parameters
	// Hessian[i][k] is d²λ*/dp_i dp_k of the parameters in List, in the user's units.
	Hessian [][]float64
}

// A SecondSensitivity adds the second order to the sensitivity to one parameter.
type SecondSensitivity struct {
	Sensitivity
	Second float64 // d²λ*/dp²
	// Low and High are the values of the parameter between which the limit predicted by
	// the slope alone moves within 5 % of as far as it really moves, found by refining the
	// limit anew; they stop at two sizes of the parameter from its value now. Both are NaN
	// where the slope is 0.
	Low, High float64
	// LowOpen and HighOpen say that the 5 % were not reached there.
	LowOpen, HighOpen bool
}

const trusted = 0.05

// SecondOrder returns the second-order sensitivities of the fold: differences of order 4
// of the exact first-order ones, at folds refined anew beside it.
func (f *Fold) SecondOrder() (*SecondOrder, error) { return secondOrder(f, f.sensitivities) }

// SecondOrder returns the second-order sensitivities of the Hopf point, as
// [Fold.SecondOrder] does.
func (h *Hopf) SecondOrder() (*SecondOrder, error) {
	slopes, err := allSlopes(h)
	if err != nil {
		return nil, err
	}
	return secondOrder(h, slopes)
}

// A neighbourhood refines a limit at parameters beside its own.
type neighbourhood struct {
	limit  Limit
	space  *space // all parameters, u_j = (p_j - p_j*)/size_j
	free   int
	sizes  []float64
	centre *edge
	scout  *scout
	up     []float64 // the direction of λ
}

func secondOrder(limit Limit, slopes []float64) (*SecondOrder, error) {
	first, err := sensitivitiesOf(limit, slopes)
	if err != nil {
		return nil, err
	}
	b, err := newNeighbourhood(limit, slopes)
	if err != nil {
		return nil, err
	}
	s := &SecondOrder{Limit: limit}
	m := limit.Model()
	var others []int
	for j := range m.parameters {
		if j != b.free {
			others = append(others, j)
		}
	}
	for i, j := range others {
		row, err := b.row(j, others)
		if err != nil {
			return nil, fmt.Errorf("SecondOrder of the %s: the limit beside it, %s moved: %w", limit.Summary(), m.parameters[j].Name, err)
		}
		s.Hessian = append(s.Hessian, row)
		one := SecondSensitivity{Sensitivity: first.List[i], Second: row[i], Low: math.NaN(), High: math.NaN()}
		if one.Slope != 0 {
			var down, up float64
			if down, one.LowOpen, err = b.reach(j, -1, one); err != nil {
				return nil, err
			}
			if up, one.HighOpen, err = b.reach(j, +1, one); err != nil {
				return nil, err
			}
			one.Low, one.High = one.Value-down, one.Value+up
		}
		s.List = append(s.List, one)
	}
	s.symmetric()
	return s, nil
}

// symmetric takes the mean of what both orders of differentiation gave.
func (s *SecondOrder) symmetric() {
	for i := range s.Hessian {
		for k := range i {
			mean := (s.Hessian[i][k] + s.Hessian[k][i]) / 2
			s.Hessian[i][k], s.Hessian[k][i] = mean, mean
		}
	}
}

func newNeighbourhood(limit Limit, slopes []float64) (*neighbourhood, error) {
	m, at := limit.Model(), limit.Where()
	b := &neighbourhood{limit: limit, free: at.free, sizes: make([]float64, len(m.parameters)), up: make([]float64, len(m.parameters))}
	b.up[b.free] = 1
	list := make([]*Distribution, len(b.sizes))
	for j, q := range m.parameters {
		b.sizes[j] = math.Max(math.Abs(at.Parameters[j]), q.Scale)
		if b.sizes[j] == 0 {
			b.sizes[j] = 1
		}
		list[j] = Normal(q.Name, at.Parameters[j], b.sizes[j])
	}
	var err error
	if b.space, err = newSpace(m, at.Parameters, list); err != nil {
		return nil, err
	}
	l := b.space.line(make([]float64, len(list)), b.up)
	l.at(0, make([]float64, len(list)))
	e := &edge{kind: limit.Kind(), x: at.State, p: at.Parameters, u: make([]float64, len(list)), unstable: at.Unstable}
	if m.balance {
		e.unstable = -1
	}
	if at.sizes != nil {
		e.sizes = at.sizes.states
	}
	switch s := limit.(type) {
	case *Fold:
		e.v, e.w = s.Right, s.Left
	case *Hopf:
		e.omega = s.Omega
	}
	g := negated(slopes)
	g[b.free] = 1
	b.centre, b.scout = e, newScout(m, b.space, e)
	return b, e.orient(g, l)
}

// at refines the limit with parameter j moved by d (in its unit), from a limit near by.
func (b *neighbourhood) at(j int, d float64, near *edge) (*edge, error) {
	origin := make([]float64, len(b.sizes))
	origin[j] = d / b.sizes[j]
	return b.scout.on(origin, b.up, near)
}

// slopes returns dλ*/dp of an edge for the parameters listed.
func (b *neighbourhood) slopes(e *edge, list []int) []float64 {
	out := make([]float64, len(list))
	for i, j := range list {
		out[i] = -e.normal[j] / e.normal[b.free] * b.sizes[b.free] / b.sizes[j]
	}
	return out
}

// row returns d/dp_j of the slopes: central differences of order 4, with steps that
// shrink where a limit cannot be refined beside it.
func (b *neighbourhood) row(j int, list []int) ([]float64, error) {
	var failed error
	for _, width := range []float64{1e-3, 1e-4, 1e-5} {
		h := width * b.sizes[j]
		row := make([]float64, len(list))
		failed = nil
		for _, term := range []struct{ at, weight float64 }{{1, 8}, {-1, -8}, {2, -1}, {-2, 1}} {
			var e *edge
			if e, failed = b.at(j, term.at*h, b.centre); failed != nil {
				break
			}
			addMultiple(row, term.weight/(12*h), b.slopes(e, list))
		}
		if failed == nil || errors.Is(failed, ErrInterrupted) {
			return row, failed
		}
	}
	return nil, failed
}

// reach returns how far parameter j can move in a direction until the prediction by the
// slope is off by 5 % of the true move, and whether that was not met.
func (b *neighbourhood) reach(j int, sign float64, one SecondSensitivity) (d float64, open bool, err error) {
	most := 2 * b.sizes[j]
	off := func(d float64, near *edge) (*edge, bool, error) {
		e, err := b.at(j, sign*d, near)
		if errors.Is(err, ErrInterrupted) {
			return nil, false, err
		}
		if err != nil {
			return nil, true, nil // there is no such limit any more
		}
		moved := e.t * b.sizes[b.free]
		return e, math.Abs(one.Slope*sign*d-moved) > trusted*math.Abs(moved), nil
	}
	d = most / 8
	if one.Second != 0 {
		d = math.Min(d, 2*trusted*math.Abs(one.Slope/one.Second))
	}
	good, bad, near := 0.0, math.Inf(1), b.centre
	for range 40 {
		e, wrong, err := off(d, near)
		if err != nil {
			return 0, false, err
		}
		if wrong {
			bad = d
		} else {
			good, near = d, e
		}
		switch {
		case good >= most:
			return most, true, nil
		case math.IsInf(bad, 1):
			d = math.Min(most, 1.5*d)
		case bad-good < 1e-3*bad:
			return good, false, nil
		default:
			d = (good + bad) / 2
		}
	}
	return good, false, nil
}
