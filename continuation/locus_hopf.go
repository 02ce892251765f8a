package continuation

import (
	"math"

	"brinkline/continuation/linalg"
)

// hopfDefining says that A = f_x has a pair of eigenvalues whose sum is zero and whose
// product is κ: A² + κ has two null vectors, so all four entries of G vanish in
//
//	[A²+κ B; Cᵀ 0] [V; G] = [0; I],   B, C: n x 2,
//
// of which two suffice (Govaerts 2000, section 4.4; Beyn et al., Numerical continuation
// and computation of normal forms, Handbook of Dynamical Systems 2, 2002). κ = ω² > 0
// is a Hopf point; the locus runs on through κ = 0, a Bogdanov-Takens point, into
// neutral saddles.
type hopfDefining struct {
	b, c   [2][]float64
	v, w   [2][]float64
	g      [2][2]float64
	chosen [2][2]int // the entries of G that are used
	unit   float64   // by which A²+κ is multiplied
	a      []float64 // A in scaled states
	lu     linalg.LU
}

func (d *hopfDefining) unknowns() int { return 2 }

// similar stores A with scaled states.
func (d *hopfDefining) similar(c *core) {
	if d.a == nil {
		d.a = make([]float64, c.n*c.n)
	}
	for i := range c.n {
		for k := range c.n {
			d.a[i*c.n+k] = c.fx[i*c.n+k] * c.s.sx[k] / c.s.sx[i]
		}
	}
}

func (d *hopfDefining) solve(c *core, y []float64) error {
	n, m := c.n, c.n+2
	d.similar(c)
	a := d.lu.Matrix(m)
	clear(a)
	for i := range n {
		for k := range n {
			sum := 0.0
			for l := range n {
				sum += d.a[i*n+l] * d.a[l*n+k]
			}
			a[i*m+k] = d.unit * sum
		}
		a[i*m+i] += d.unit * y[n+1]
		a[i*m+n], a[i*m+n+1] = d.b[0][i], d.b[1][i]
	}
	copy(a[n*m:], d.c[0])
	copy(a[(n+1)*m:], d.c[1])
	if d.lu.Factor() != nil {
		return &refusal{reason: "more than two eigenvalues meet the axis"}
	}
	for k := range 2 {
		v, w := make([]float64, m), make([]float64, m)
		v[n+k], w[n+k] = 1, 1
		d.lu.Solve(v)
		d.lu.SolveTransposed(w)
		d.v[k], d.w[k] = v[:n], w[:n]
		d.g[0][k], d.g[1][k] = v[n], v[n+1]
	}
	return nil
}

func (d *hopfDefining) extra(c *core, y, out []float64) error {
	if err := d.solve(c, y); err != nil {
		return err
	}
	for r, e := range d.chosen {
		out[r] = d.g[e[0]][e[1]]
	}
	return nil
}

func (d *hopfDefining) gradients(c *core, y []float64, j int, rows [][]float64) error {
	if err := d.solve(c, y); err != nil {
		return err
	}
	for r, e := range d.chosen {
		if err := d.gradient(c, y, j, e, rows[r]); err != nil {
			return err
		}
	}
	return nil
}

// gradient stores the derivative of entry e of G: dG = -Wᵀ (A dA + dA A + dκ) V.
func (d *hopfDefining) gradient(c *core, y []float64, j int, e [2]int, row []float64) error {
	n := c.n
	w, v := d.w[e[0]], d.v[e[1]]
	wa, av := make([]float64, n), make([]float64, n)
	for i := range n {
		for k := range n {
			wa[k] += w[i] * d.a[i*n+k]
			av[i] += d.a[i*n+k] * v[k]
		}
	}
	clear(row)
	for _, pair := range [][2][]float64{{wa, v}, {w, av}} {
		left, along, out := make([]float64, n), make([]float64, n+1), make([]float64, n+1)
		for i := range n {
			left[i], along[i] = pair[0][i]/c.s.sx[i], pair[1][i]*c.s.sx[i]
		}
		if err := c.s.diff.Adjoint(y[:n], c.p, j, left, along, out); err != nil {
			return err
		}
		for k, x := range out {
			row[k] -= d.unit * x
		}
	}
	row[n+1] = -d.unit * dot(w, v)
	return nil
}

// begin takes the first borders from the eigenvectors of the pair.
func (d *hopfDefining) begin(c *core, y []float64, pair *criticalPair) error {
	n := c.n
	d.similar(c)
	size := 0.0
	for _, x := range d.a {
		size = math.Max(size, math.Abs(x))
	}
	d.unit = 1 / (size * size)
	for k := range 2 {
		d.b[k], d.c[k] = make([]float64, n), make([]float64, n)
	}
	for i := range n {
		d.c[0][i], d.c[1][i] = real(pair.q[i])/c.s.sx[i], imag(pair.q[i])/c.s.sx[i]
		d.b[0][i], d.b[1][i] = real(pair.p[i])*c.s.sx[i], imag(pair.p[i])*c.s.sx[i]
	}
	orthonormal(&d.b)
	orthonormal(&d.c)
	return d.choose(c, y)
}

// renew takes the borders from the vectors at hand; they turn with these, so that
// G stays smooth along the locus.
func (d *hopfDefining) renew(c *core, y []float64) error {
	if err := d.solve(c, y); err != nil {
		return err
	}
	d.b, d.c = [2][]float64{d.w[0], d.w[1]}, [2][]float64{d.v[0], d.v[1]}
	orthonormal(&d.b)
	orthonormal(&d.c)
	return d.choose(c, y)
}

// choose takes the two entries of G whose gradients are the least alike.
func (d *hopfDefining) choose(c *core, y []float64) error {
	if err := d.solve(c, y); err != nil {
		return err
	}
	var rows [4][]float64
	for e := range rows {
		rows[e] = make([]float64, c.n+2)
		if err := d.gradient(c, y, c.first, [2]int{e / 2, e % 2}, rows[e]); err != nil {
			return err
		}
		for k := range c.n {
			rows[e][k] *= c.s.sx[k]
		}
		rows[e][c.n] *= c.s.sp[c.first]
		rows[e][c.n+1] /= d.unit
	}
	best := -1.0
	for i := range rows {
		for k := i + 1; k < 4; k++ {
			gram := dot(rows[i], rows[i])*dot(rows[k], rows[k]) - math.Pow(dot(rows[i], rows[k]), 2)
			if gram > best {
				best, d.chosen = gram, [2][2]int{{i / 2, i % 2}, {k / 2, k % 2}}
			}
		}
	}
	return nil
}

func orthonormal(pair *[2][]float64) {
	u := unit(pair[0])
	v := append([]float64(nil), pair[1]...)
	along := dot(u, v)
	for i := range v {
		v[i] -= along * u[i]
	}
	pair[0], pair[1] = u, unit(v)
}
