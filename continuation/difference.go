package continuation

import "math"

// differences takes derivatives by central finite differences of order 4 in
// scaled steps. The width of a step is not guessed but tried: see [column.tune].
type differences struct{}

func newDifferences(*Model) Derivatives { return differences{} }

func (differences) Describe() string { return "finite differences (central, order 4, tested steps)" }

func (differences) For(e Evaluator) Differentiator {
	n, m := e.Dimensions()
	d := &difference{e: e, n: n, x: make([]float64, n), p: make([]float64, m), columns: make([]column, n+m)}
	for i := range d.f {
		d.f[i] = make([]float64, n)
	}
	d.trial[0], d.trial[1] = make([]float64, n), make([]float64, n)
	return d
}

type difference struct {
	e       Evaluator
	n       int
	x, p    []float64
	f       [4][]float64
	trial   [2][]float64
	columns []column // states first, then parameters

	jacobians [2][]float64
}

// A column remembers which step serves for a variable.
type column struct {
	eta  float64 // step over size
	size float64 // of the variable when eta was chosen
	used int     // since then
}

// The widths that are tried, as fractions of a variable's size. 2^-10 is near
// the fifth root of the rounding unit, the best for a function that varies over
// its variable's size; the others serve functions that vary faster, or noise.
var widths = [...]float64{1. / (1 << 7), 1. / (1 << 9), 1. / (1 << 11), 1. / (1 << 13), 1. / (1 << 16)}

const retune = 100 // uses after which a step is chosen anew

func (d *difference) Jacobian(x, p []float64, j int, jac []float64) error {
	width := d.n
	if j >= 0 {
		width++
	}
	col := d.trial[0]
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

// column stores the derivative of f with respect to variable k in out.
func (d *difference) column(x, p []float64, k int, out []float64) error {
	copy(d.x, x)
	copy(d.p, p)
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

// tune differentiates with several widths and keeps the one that agrees best
// with its narrower neighbour: truncation makes wide steps disagree, rounding
// narrow ones.
func (d *difference) tune(c *column, at *float64, size float64, out []float64) error {
	best := math.Inf(1)
	var first error
	previous, current := d.trial[1], make([]float64, d.n)
	have := false
	for k, eta := range widths {
		if err := d.central(at, eta*size, current); err != nil {
			// Too wide for the model's domain, perhaps; a narrower one may do.
			if first == nil {
				first = err
			}
			have = false
			continue
		}
		if have {
			if gap := distance(previous, current); gap < best {
				best = gap
				*c = column{eta: widths[k-1], size: size}
				copy(out, previous)
			}
		}
		copy(previous, current)
		have = true
	}
	if math.IsInf(best, 1) {
		if first != nil {
			return first
		}
		*c = column{eta: widths[2], size: size}
		return d.central(at, widths[2]*size, out)
	}
	return nil
}

func distance(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += math.Abs(a[i] - b[i])
	}
	return sum
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
// (Abramowitz & Stegun, 25.3.24), with the width on which two agree best.
func (d *difference) Second(x, p []float64, j int, a, out []float64) error {
	length := d.unit(x, p, j, a)
	if length == 0 {
		clear(out)
		return nil
	}
	middle := d.trial[0]
	if err := d.e.Eval(x, p, middle); err != nil {
		return err
	}
	best, have := math.Inf(1), false
	previous, current := d.trial[1], make([]float64, d.n)
	var failed error
	for _, eta := range [...]float64{1. / (1 << 6), 1. / (1 << 8), 1. / (1 << 10), 1. / (1 << 12)} {
		if err := d.second(x, p, j, a, eta/length, middle, current); err != nil {
			failed, have = err, false
			continue
		}
		if have {
			if gap := distance(previous, current); gap < best {
				best = gap
				copy(out, previous)
			}
		}
		copy(previous, current)
		have = true
	}
	if math.IsInf(best, 1) && failed != nil {
		return failed
	}
	return nil
}

func (d *difference) second(x, p []float64, j int, a []float64, h float64, middle, out []float64) error {
	for i, step := range [...]float64{h, -h, 2 * h, -2 * h} {
		d.along(x, p, j, a, step)
		if err := d.e.Eval(d.x, d.p, d.f[i]); err != nil {
			return err
		}
	}
	for i := range out {
		near := d.f[0][i] + d.f[1][i]
		far := d.f[2][i] + d.f[3][i]
		out[i] = (16*near - far - 30*middle[i]) / (12 * h * h)
	}
	return nil
}

// Adjoint differentiates the Jacobian along a by the three-point rule; Newton's
// method on a singular point needs no more digits of it than that gives.
func (d *difference) Adjoint(x, p []float64, j int, w, a, out []float64) error {
	clear(out)
	length := d.unit(x, p, j, a)
	if length == 0 {
		return nil
	}
	width := len(out)
	for i := range d.jacobians {
		if len(d.jacobians[i]) < d.n*width {
			d.jacobians[i] = make([]float64, d.n*width)
		}
	}
	h := 1. / (1 << 12) / length
	at, q := make([]float64, d.n), make([]float64, len(p))
	for i, step := range [...]float64{h, -h} {
		d.along(x, p, j, a, step)
		copy(at, d.x)
		copy(q, d.p)
		if err := d.Jacobian(at, q, j, d.jacobians[i]); err != nil {
			return err
		}
	}
	for i := range d.n {
		for k := range out {
			out[k] += w[i] * (d.jacobians[0][i*width+k] - d.jacobians[1][i*width+k]) / (2 * h)
		}
	}
	return nil
}
