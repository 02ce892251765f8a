package continuation

import (
	"fmt"
	"math"
)

// Leave follows the other branch that crosses at this point, both ways, in the
// range and with the options of the run that found the point, which further
// options change. The branch point is a point of what it returns.
func (b *BranchPoint) Leave(opts ...FollowOption) (*Branch, error) {
	plan := *b.plan
	plan.up, plan.down = true, true
	for _, set := range opts {
		if err := set(&plan); err != nil {
			return nil, fmt.Errorf("Leave: %w", err)
		}
	}
	other, err := b.otherTangent()
	if err != nil {
		return nil, fmt.Errorf("Leave: %w", err)
	}
	p := b.point
	if err := plan.check(p, p.free); err != nil {
		return nil, fmt.Errorf("Leave: %w", err)
	}
	t := newTracer(newSystem(p.model, p.State, p.Parameters, p.free), &plan)
	t.learn(p.sizes)
	copy(t.S, b.scales)
	copy(t.s.sx, p.sizes.states)
	a := t.fresh()
	copy(a.x, p.State)
	a.lambda, a.scales, a.special = p.Value(), t.S, b
	a.eigenvalues, a.unstable = p.Eigenvalues, p.Unstable
	a.t = make([]float64, t.n+1)
	for i, v := range other {
		a.t[i] = v / t.S[i]
	}
	length := norm(a.t)
	for i := range a.t {
		a.t[i] /= length
	}
	t.nodes = []*node{a}
	// The branches lie near each other at first: a long step might land on the
	// wrong one.
	t.ds = math.Min(t.ds, 1e-3)
	t.plan.least = math.Min(t.plan.least, 1e-8)
	r := &run{plan: &plan, task: "Leave at " + b.Summary(), up: t}
	return r.both(), nil
}

// otherTangent returns the tangent that is not that of the branch on which the
// point was found.
func (b *BranchPoint) otherTangent() ([]float64, error) {
	if b.Tangents[0] == nil {
		return nil, fmt.Errorf("the tangents at %s are not known", b.Summary())
	}
	angle := func(t []float64) float64 {
		var ab, aa, bb float64
		for i, s := range b.scales {
			u, v := t[i]/s, b.point.Tangent[i]/s
			ab, aa, bb = ab+u*v, aa+u*u, bb+v*v
		}
		return math.Abs(ab) / math.Sqrt(aa*bb)
	}
	if angle(b.Tangents[0]) > angle(b.Tangents[1]) {
		return b.Tangents[1], nil
	}
	return b.Tangents[0], nil
}

// Imperfection returns wᵀ f_p for another parameter p: where it is not 0, a change
// of p breaks the crossing into two branches that pass each other, by a distance
// that grows with its square root (at a pitchfork, with its cube root).
func (b *BranchPoint) Imperfection(parameter string) (float64, error) {
	m := b.point.model
	j, err := m.parameterIndex(parameter)
	if err != nil {
		return 0, fmt.Errorf("Imperfection: %w", err)
	}
	col := make([]float64, len(m.states))
	s := newSystem(m, b.point.State, b.point.Parameters, b.point.free)
	if err := s.diff.Parameter(b.point.State, b.point.Parameters, j, col); err != nil {
		return 0, fmt.Errorf("Imperfection: %w", err)
	}
	return dot(b.Left, col), nil
}

// Leave says why there is nothing to leave to: at a fold one branch turns.
func (f *Fold) Leave(...FollowOption) (*Branch, error) {
	return nil, fmt.Errorf("Leave: the %s has no second branch: f_λ is outside the range of f_x, so one curve turns there", f.Summary())
}
