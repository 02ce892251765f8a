package continuation

import "math"

// onAny reports whether a steady state lies on one of the branches.
func (a *atlas) onAny(p *Point, branches []*Branch) bool {
	for _, b := range branches {
		if a.on(p, b) {
			return true
		}
	}
	return false
}

// on reports whether a steady state lies on a branch: whether the branch, corrected in
// the plane through the state across it, comes to that state.
func (a *atlas) on(p *Point, b *Branch) bool {
	z := a.scaled(p)
	for i := 1; i < len(b.points); i++ {
		c := a.arc(b.points[i-1], b.points[i])
		if c.length == 0 || away(z, c.za) > 1.5*c.length && away(z, c.zb) > 1.5*c.length {
			continue
		}
		u, off := c.project(z)
		if u < -0.2 || u > 1.2 || !(off < 0.3) {
			continue
		}
		if off*c.length < alike || a.comesTo(c, u, z, b.points[i]) {
			return true
		}
	}
	return len(b.points) == 1 && away(z, a.scaled(b.points[0])) < alike
}

// alike is the distance in widths of the box at which two points are one.
const alike = 1e-7

func away(x, y []float64) float64 {
	sum := 0.0
	for i := range x {
		sum += (x[i] - y[i]) * (x[i] - y[i])
	}
	return math.Sqrt(sum)
}

// scaled returns state and parameter in widths of the box.
func (a *atlas) scaled(p *Point) []float64 {
	n := len(p.State)
	z := make([]float64, n+1)
	for i, v := range p.State {
		z[i] = v / a.frame.width[i]
	}
	z[n] = p.Parameters[a.j] / a.frame.width[n]
	return z
}

// arc is the stretch between two points of a branch in widths of the box.
func (a *atlas) arc(p, q *Point) *arc {
	c := &arc{a: &node{t: a.tangent(p)}, b: &node{t: a.tangent(q)}, za: a.scaled(p), zb: a.scaled(q)}
	c.length = away(c.za, c.zb)
	return c
}

func (a *atlas) tangent(p *Point) []float64 {
	t := make([]float64, len(p.Tangent))
	for i, v := range p.Tangent {
		t[i] = v / a.frame.width[i]
	}
	if length := norm(t); length > 0 {
		for i := range t {
			t[i] /= length
		}
	}
	return t
}

// comesTo corrects the point of an arc that lies nearest to z, across the arc, and
// reports whether it is z.
func (a *atlas) comesTo(c *arc, u float64, z []float64, near *Point) bool {
	at, d := c.at(u)
	length := norm(d)
	if length == 0 {
		return false
	}
	ahead := 0.0
	for i := range d {
		d[i] /= length
		ahead += d[i] * (z[i] - at[i])
	}
	for i := range at {
		at[i] += ahead * d[i]
	}
	t := a.tracer(near)
	n := t.fresh()
	t.place(n, at)
	if t.correct(n, d) != nil {
		return false
	}
	return away(t.scaled(n), z) < alike
}

// tracer returns one that works in widths of the box, near a point.
func (a *atlas) tracer(near *Point) *tracer {
	plan := *a.plan
	t := newTracer(newSystem(a.m, near.State, near.Parameters, a.j), &plan)
	a.states.scale(t.s)
	copy(t.S, a.frame.width)
	return t
}
