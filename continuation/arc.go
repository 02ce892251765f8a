package continuation

import "math"

// An arc is the stretch of a branch between two neighbouring nodes: the cubic in
// the scaled variables that has the points and tangents of both.
type arc struct {
	a, b   *node
	za, zb []float64
	length float64
}

func (t *tracer) between(a, b *node) *arc {
	c := &arc{a: a, b: b, za: t.scaled(a), zb: t.scaled(b)}
	sum := 0.0
	for i := range c.za {
		d := c.zb[i] - c.za[i]
		sum += d * d
	}
	c.length = math.Sqrt(sum)
	return c
}

// at returns the point and the derivative dz/ds of the cubic at the fraction u.
func (c *arc) at(u float64) (z, d []float64) {
	z, d = make([]float64, len(c.za)), make([]float64, len(c.za))
	h00, h10, h01, h11 := 1+u*u*(2*u-3), u*(1-u)*(1-u), u*u*(3-2*u), u*u*(u-1)
	g00, g10, g01, g11 := 6*u*(u-1), (1-u)*(1-3*u), 6*u*(1-u), u*(3*u-2)
	for i := range z {
		ta, tb := c.length*c.a.t[i], c.length*c.b.t[i]
		z[i] = h00*c.za[i] + h10*ta + h01*c.zb[i] + h11*tb
		d[i] = (g00*c.za[i] + g10*ta + g01*c.zb[i] + g11*tb) / c.length
	}
	return z, d
}

// project returns where on the arc a point lies: the fraction, and the distance
// from the cubic in lengths of the arc.
func (c *arc) project(z []float64) (u, off float64) {
	chord, square := 0.0, 0.0
	for i := range z {
		d := c.zb[i] - c.za[i]
		chord += d * (z[i] - c.za[i])
		square += d * d
	}
	if square == 0 {
		return 0, math.Inf(1)
	}
	u = chord / square
	for range 20 { // Newton on the foot of the perpendicular; it settles in a few
		p, d := c.at(u)
		num, den := 0.0, 0.0
		for i := range z {
			num += d[i] * (z[i] - p[i])
			den += d[i] * d[i]
		}
		if den == 0 {
			break
		}
		move := num / den / c.length
		u += move
		if math.Abs(move) < 1e-14 || math.Abs(u) > 10 {
			break
		}
	}
	p, _ := c.at(u)
	for i := range p {
		p[i] -= z[i]
	}
	return u, norm(p) / c.length
}

// crossing returns the fraction at which component i of z takes a value that
// lies between those at the two ends.
func (c *arc) crossing(i int, value float64) float64 {
	low, high := 0.0, 1.0
	rising := c.zb[i] > c.za[i]
	for range 60 {
		mid := (low + high) / 2
		z, _ := c.at(mid)
		if (z[i] < value) == rising {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}

// middle returns the node of the branch at the fraction u of the arc.
func (t *tracer) middle(c *arc, u float64) (*node, error) {
	z, d := c.at(u)
	length := norm(d)
	for i := range d {
		d[i] /= length
	}
	return t.onto(c, u, z, d, d)
}

// onto corrects a node from z with border row border.
func (t *tracer) onto(c *arc, u float64, z, border, along []float64) (*node, error) {
	a := t.fresh()
	t.place(a, z)
	if err := t.correct(a, border); err != nil {
		return nil, err
	}
	if err := t.complete(a, border, along); err != nil {
		return nil, err
	}
	a.arc = c.a.arc + u*(c.b.arc-c.a.arc)
	a.step = u * (c.b.arc - c.a.arc)
	return a, nil
}

// land returns the node of the arc at which component i has a value, exactly.
func (t *tracer) land(c *arc, i int, value float64) (*node, error) {
	u := c.crossing(i, value/t.S[i])
	z, d := c.at(u)
	border := make([]float64, t.n+1)
	border[i] = 1
	z[i] = value / t.S[i]
	a, err := t.onto(c, u, z, border, d)
	if err != nil {
		return nil, err
	}
	if i == t.n {
		a.lambda = value
	} else {
		a.x[i] = value
	}
	return a, nil
}
