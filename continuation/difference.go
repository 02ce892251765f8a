package continuation

import (
	"errors"
	"math"
)

// differences takes derivatives by central finite differences of order 4 in
// scaled steps. The width of a step is not guessed but tried: see [column.tune].
type differences struct{}

func newDifferences(*Model) Derivatives { return differences{} }

func (differences) Describe() string { return "finite differences (central, order 4, tested steps)" }

func (differences) For(e Evaluator) Differentiator {
	n, m := e.Dimensions()
	d := &difference{
		e: e, n: n, columns: make([]column, n+m), col: make([]float64, n),
		x: make([]float64, n), p: make([]float64, m), at: make([]float64, n), q: make([]float64, m),
	}
	for i := range d.f {
		d.f[i] = make([]float64, n)
	}
	return d
}

type difference struct {
	e       Evaluator
	n       int
	x, p    []float64
	f       [4][]float64
	col     []float64
	columns []column // states first, then parameters
	second  column   // of second derivatives along a direction

	rows  []float64 // sizes of the equations: the largest term |f_z| times size met
	at, q []float64
}

// A column remembers which step serves for a variable.
type column struct {
	eta   float64 // step over size
	size  float64 // of the variable when eta was chosen
	used  int     // since then
	error float64 // estimated, relative to the largest component
}

// The widths that are tried for first derivatives, as fractions of a variable's
// size. 2^-10 is near the fifth root of the rounding unit, the best for a function
// that varies over its variable's size. The narrow ones serve functions that vary
// much faster, and variables that are 0 and whose size nobody has given.
var widths = []float64{0x1p-7, 0x1p-9, 0x1p-11, 0x1p-13, 0x1p-16, 0x1p-20, 0x1p-25, 0x1p-30, 0x1p-36}

// The widths for second derivatives along a direction.
var secondWidths = []float64{0x1p-6, 0x1p-8, 0x1p-10, 0x1p-12, 0x1p-15, 0x1p-19, 0x1p-24, 0x1p-30}

// The widths for third derivatives along a direction.
var thirdWidths = []float64{0x1p-3, 0x1p-4, 0x1p-5, 0x1p-6, 0x1p-7, 0x1p-8, 0x1p-10, 0x1p-12, 0x1p-15}

// The widths for differences of Jacobians.
var adjointWidths = []float64{0x1p-8, 0x1p-11, 0x1p-14, 0x1p-19, 0x1p-25, 0x1p-32}

const (
	retune = 100 // uses after which a step is chosen anew
	worse  = 10  // how much worse than the best agreement ends the search
)

// agree computes something with one width after the other, stores in out what
// agrees best with its narrower neighbour, and returns its width and how far the
// two differ: truncation makes wide steps disagree, rounding narrow ones. A width that leaves the
// model's domain is passed over. The weights make components of different units
// comparable. With all, every width is tried: a variable that is 0, whose size may
// be far from what is thought, makes wide steps agree on nonsense.
func agree(widths, out, weights []float64, all bool, compute func(eta float64, out []float64) error) (eta, differ float64, err error) {
	previous, current := make([]float64, len(out)), make([]float64, len(out))
	best, have := math.Inf(1), false
	var failed error
	for k, w := range widths {
		if err := compute(w, current); err != nil {
			if errors.Is(err, ErrInterrupted) {
				return 0, 0, err
			}
			failed, have = err, false
			continue
		}
		if have {
			gap := 0.0
			for i, weight := range weights {
				gap += weight * math.Abs(previous[i]-current[i])
			}
			// Of equals the narrower: what is exact here by chance may not be
			// elsewhere.
			if gap < best || (gap == best && (all || k <= 4)) {
				best, eta = gap, widths[k-1]
				copy(out, previous)
			}
			if k >= 4 && gap > worse*best && !all {
				break
			}
		}
		copy(previous, current)
		have = true
	}
	if eta == 0 {
		return 0, 0, failed
	}
	return eta, best, nil
}

// equationWeights returns the weights that measure changes of f against the sizes
// of its equations, times a factor.
func (d *difference) equationWeights(factor float64) []float64 {
	w := make([]float64, d.n)
	for i, r := range d.rows {
		w[i] = factor
		if r > 0 {
			w[i] = factor / r
		}
	}
	return w
}

// survey finds the sizes of the equations: it must be done before steps are
// chosen by them.
func (d *difference) survey(x, p []float64) error {
	d.rows = make([]float64, d.n)
	copy(d.x, x)
	copy(d.p, p)
	for k := range d.columns {
		at, size := d.variable(k)
		if err := d.central(at, size*widths[2], d.col); err != nil {
			if errors.Is(err, ErrInterrupted) {
				return err
			}
			continue // too wide for the domain here; the other variables tell
		}
		d.measure(d.col, size)
	}
	return nil
}

// measure notes the terms of a column.
func (d *difference) measure(col []float64, size float64) {
	for i, v := range col {
		d.rows[i] = math.Max(d.rows[i], math.Abs(v)*size)
	}
}

func (d *difference) Jacobian(x, p []float64, j int, jac []float64) error {
	width := d.n
	if j >= 0 {
		width++
	}
	col := d.col
	for k := range width {
		variable := k
		if k == d.n {
			variable = d.n + j
		}
		if err := d.column(x, p, variable, col); err != nil {
			return err
		}
		for i, v := range col {
			jac[i*width+k] = v
		}
	}
	return nil
}

func (d *difference) Parameter(x, p []float64, j int, col []float64) error {
	return d.column(x, p, d.n+j, col)
}

// Accuracy returns the estimated relative error of the first derivatives.
func (d *difference) Accuracy() float64 {
	worst := epsilon
	for _, c := range d.columns {
		worst = math.Max(worst, c.error)
	}
	return worst
}

// column stores the derivative of f with respect to variable k in out.
func (d *difference) column(x, p []float64, k int, out []float64) error {
	copy(d.x, x)
	copy(d.p, p)
	if d.rows == nil {
		if err := d.survey(x, p); err != nil {
			return err
		}
	}
	at, size := d.variable(k)
	c := &d.columns[k]
	if c.eta == 0 || c.used >= retune || size > 2*c.size || size < c.size/2 {
		return d.tune(c, at, size, out)
	}
	c.used++
	return d.central(at, c.eta*size, out)
}

// variable returns where variable k stands in the working copy, and its size.
func (d *difference) variable(k int) (at *float64, size float64) {
	sx, sp := d.e.Scales()
	if k < d.n {
		return &d.x[k], math.Max(math.Abs(d.x[k]), sx[k])
	}
	k -= d.n
	return &d.p[k], math.Max(math.Abs(d.p[k]), sp[k])
}

// tune differentiates with several widths and keeps the one that serves best.
func (d *difference) tune(c *column, at *float64, size float64, out []float64) error {
	eta, differ, err := agree(widths, out, d.equationWeights(size), *at == 0, func(eta float64, out []float64) error {
		return d.central(at, eta*size, out)
	})
	if err == nil {
		*c = column{eta: eta, size: size, error: differ}
		d.measure(out, size)
	}
	return err
}

// central stores the derivative with respect to *at by the five-point rule
//
//	f' ≈ (8 (f(+h) - f(-h)) - (f(+2h) - f(-2h))) / 12 h,  error h⁴ f⁽⁵⁾ / 30
//
// (Abramowitz & Stegun, Handbook of Mathematical Functions, 25.3.6).
func (d *difference) central(at *float64, h float64, out []float64) error {
	middle := *at
	defer func() { *at = middle }()
	h = (middle + h) - middle // a step that the variable can really make
	for i, step := range [...]float64{h, -h, 2 * h, -2 * h} {
		*at = middle + step
		if err := d.e.Eval(d.x, d.p, d.f[i]); err != nil {
			return err
		}
	}
	for i := range out {
		out[i] = (8*(d.f[0][i]-d.f[1][i]) - (d.f[2][i] - d.f[3][i])) / (12 * h)
	}
	return nil
}

// along moves the working copy to z + step a, where z = (x, p_j).
func (d *difference) along(x, p []float64, j int, a []float64, step float64) {
	for i := range d.x {
		d.x[i] = x[i] + step*a[i]
	}
	copy(d.p, p)
	if j >= 0 {
		d.p[j] = p[j] + step*a[d.n]
	}
}

// stencil evaluates f at z + h a, z - h a, z + 2h a and z - 2h a.
func (d *difference) stencil(x, p []float64, j int, a []float64, h float64) error {
	for i, step := range [...]float64{h, -h, 2 * h, -2 * h} {
		d.along(x, p, j, a, step)
		if err := d.e.Eval(d.x, d.p, d.f[i]); err != nil {
			return err
		}
	}
	return nil
}

// unit returns the length of a in scaled variables.
func (d *difference) unit(x, p []float64, j int, a []float64) float64 {
	sx, sp := d.e.Scales()
	longest := 0.0
	for i := range x {
		longest = math.Max(longest, math.Abs(a[i])/math.Max(sx[i], math.Abs(x[i])))
	}
	if j >= 0 {
		longest = math.Max(longest, math.Abs(a[d.n])/math.Max(sp[j], math.Abs(p[j])))
	}
	return longest
}

// Second uses the five-point rule for the second derivative,
//
//	f'' ≈ (16 (f(+h) + f(-h)) - (f(+2h) + f(-2h)) - 30 f) / 12 h²,  error h⁴ f⁽⁶⁾ / 90
//
// (Abramowitz & Stegun, 25.3.24), with the width on which two agree best, chosen anew
// now and then.
func (d *difference) Second(x, p []float64, j int, a, out []float64) error {
	length := d.unit(x, p, j, a)
	if length == 0 {
		clear(out)
		return nil
	}
	if d.rows == nil {
		if err := d.survey(x, p); err != nil {
			return err
		}
	}
	if err := d.e.Eval(x, p, d.col); err != nil {
		return err
	}
	middle := append([]float64(nil), d.col...)
	c := &d.second
	if c.eta != 0 && c.used < retune {
		c.used++
		return d.bend(x, p, j, a, c.eta/length, middle, out)
	}
	eta, _, err := agree(secondWidths, out, d.equationWeights(1), false, func(eta float64, out []float64) error {
		return d.bend(x, p, j, a, eta/length, middle, out)
	})
	if err == nil {
		*c = column{eta: eta}
	}
	return err
}

func (d *difference) bend(x, p []float64, j int, a []float64, h float64, middle, out []float64) error {
	if err := d.stencil(x, p, j, a, h); err != nil {
		return err
	}
	for i := range out {
		near := d.f[0][i] + d.f[1][i]
		far := d.f[2][i] + d.f[3][i]
		out[i] = (16*near - far - 30*middle[i]) / (12 * h * h)
	}
	return nil
}

// sizes returns the sizes of the variables z.
func (d *difference) sizes(j, width int) []float64 {
	sx, sp := d.e.Scales()
	w := make([]float64, width)
	copy(w, sx)
	if j >= 0 {
		w[d.n] = sp[j]
	}
	return w
}

// Third uses the five-point rule for the third derivative,
//
//	f''' ≈ (f(+2h) - f(-2h) - 2 (f(+h) - f(-h))) / 2 h³,  error h² f⁽⁵⁾ / 4,
//
// and Richardson's extrapolation from h and h/2, with the width on which two
// agree best.
func (d *difference) Third(x, p []float64, j int, a, out []float64) error {
	length := d.unit(x, p, j, a)
	if length == 0 {
		clear(out)
		return nil
	}
	if d.rows == nil {
		if err := d.survey(x, p); err != nil {
			return err
		}
	}
	half := make([]float64, d.n)
	_, _, err := agree(thirdWidths, out, d.equationWeights(1), false, func(eta float64, out []float64) error {
		if err := d.third(x, p, j, a, eta/length, out); err != nil {
			return err
		}
		if err := d.third(x, p, j, a, eta/length/2, half); err != nil {
			return err
		}
		for i := range out {
			out[i] = (4*half[i] - out[i]) / 3
		}
		return nil
	})
	return err
}

func (d *difference) third(x, p []float64, j int, a []float64, h float64, out []float64) error {
	if err := d.stencil(x, p, j, a, h); err != nil {
		return err
	}
	for i := range out {
		out[i] = (d.f[2][i] - d.f[3][i] - 2*(d.f[0][i]-d.f[1][i])) / (2 * h * h * h)
	}
	return nil
}

// Adjoint differentiates the Jacobian along a by the three-point rule; Newton's
// method on a singular point needs no more digits of it than that gives.
func (d *difference) Adjoint(x, p []float64, j int, w, a, out []float64) error {
	length := d.unit(x, p, j, a)
	if length == 0 {
		clear(out)
		return nil
	}
	jac := make([]float64, d.n*len(out))
	_, _, err := agree(adjointWidths, out, d.sizes(j, len(out)), true, func(eta float64, out []float64) error {
		clear(out)
		h := eta / length
		for _, step := range [...]float64{h, -h} {
			d.along(x, p, j, a, step)
			copy(d.at, d.x)
			copy(d.q, d.p)
			if err := d.Jacobian(d.at, d.q, j, jac); err != nil {
				return err
			}
			for i := range d.n {
				for k := range out {
					out[k] += w[i] * jac[i*len(out)+k] / (2 * step)
				}
			}
		}
		return nil
	})
	return err
}
