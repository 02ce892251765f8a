package continuation

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"

	"brinkline/continuation/linalg"
)

// A Fit is what measured steady states say of parameters.
type Fit struct {
	Parameters []Fitted
	// Covariance of the parameters in their units, row by row in the order of Parameters.
	Covariance [][]float64
	// ChiSquared is the sum of the squared residuals over their standard deviations, Freedom
	// its degrees of freedom.
	ChiSquared float64
	Freedom    int
	// Scaled says that the errors were multiplied by sqrt(ChiSquared/Freedom), because
	// standard deviations of the data were assumed and not given.
	Scaled bool
	// Nearest are the steady states nearest to the measured points, one for each row.
	Nearest []*Point
	// Point is the steady state from which the fit began, with the parameters fitted.
	Point *Point

	index []int
}

// A Fitted parameter has its value after the fit and its standard error.
type Fitted struct {
	Parameter
	Before float64
	Error  float64
}

// Fit finds the values of parameters with which the curve of steady states through here
// comes nearest to measured points, by least squares on steady states:
//
//	min Σ_rows min over (x, λ) on the curve Σ ((value - measured)/sd)²,
//
// λ the first parameter among the columns of the data. The distance is to the curve and not
// to the state at the λ measured, so that points beside and beyond a fold count like others.
// Columns without standard deviations are taken to have 1 % of the width of their values.
// Further parameters in the data are set as measured. The outer problem is solved by the
// quasi-Newton method of Broyden, Fletcher, Goldfarb and Shanno in gonum's optimize, with
// slopes of the residuals by central differences; the covariance is (JᵀJ)⁻¹.
func (p *Point) Fit(data *Measured, parameters ...string) (*Fit, error) {
	f, err := p.newFitter(data, parameters)
	if err != nil {
		return nil, fmt.Errorf("Fit: %w", err)
	}
	out, err := f.run()
	if err != nil {
		return nil, fmt.Errorf("Fit: %w", err)
	}
	return out, nil
}

// A fitter holds the problem.
type fitter struct {
	from   *Point
	m      *Model
	data   *Measured
	index  []int // of the parameters fitted
	sizes  []float64
	free   int   // of λ
	place  []int // of each column among (x, λ); -1 for a parameter that is set
	set    []int // index of the parameter of such a column
	sd     [][]float64
	given  bool
	s      *system
	z      [][]float64 // (x, λ) nearest to each row so far
	failed error
	lu     linalg.LU
}

func (p *Point) newFitter(data *Measured, parameters []string) (*fitter, error) {
	if data == nil || len(data.Rows) == 0 {
		return nil, errors.New("there are no measured points")
	}
	if len(parameters) == 0 {
		return nil, errors.New("name at least one parameter to fit")
	}
	f := &fitter{from: p, m: p.model, data: data, free: -1, given: true}
	if err := f.columns(); err != nil {
		return nil, err
	}
	for _, name := range parameters {
		j, err := f.m.parameterIndex(name)
		if err != nil {
			return nil, err
		}
		if find(data.Columns, name) >= 0 {
			return nil, fmt.Errorf("%s is measured; fit another parameter", name)
		}
		size := math.Max(math.Abs(p.Parameters[j]), f.m.parameters[j].Scale)
		if size == 0 {
			size = 1
		}
		f.index, f.sizes = append(f.index, j), append(f.sizes, size)
	}
	f.deviations()
	if f.freedom() < 1 {
		return nil, fmt.Errorf("%d measured values are too few for %d parameters: each row needs %s and at least one state", len(data.Rows)*len(data.Columns), len(f.index), f.m.parameters[f.free].Name)
	}
	return f, f.begin()
}

// columns finds out what each column is.
func (f *fitter) columns() error {
	n := len(f.m.states)
	for _, c := range f.data.Columns {
		at, set := find(f.m.states, c.Name), -1
		if j := find(f.m.parameterVariables(), c.Name); j >= 0 {
			if set = j; f.free < 0 {
				f.free, at = j, n
			}
		} else if at < 0 {
			return fmt.Errorf("%s is a quantity; a fit takes states and parameters", c.Name)
		}
		f.place, f.set = append(f.place, at), append(f.set, set)
	}
	if f.free < 0 {
		return errors.New("no column of the data is a parameter: a fit wants the one that was changed from point to point")
	}
	return nil
}

// deviations takes standard deviations from the data, and 1 % of the width of a column where
// there are none.
func (f *fitter) deviations() {
	f.sd = make([][]float64, len(f.data.Rows))
	for i := range f.sd {
		f.sd[i] = make([]float64, len(f.data.Columns))
	}
	for k := range f.data.Columns {
		low, high := math.Inf(1), math.Inf(-1)
		for _, row := range f.data.Rows {
			if !math.IsNaN(row[k]) {
				low, high = math.Min(low, row[k]), math.Max(high, row[k])
			}
		}
		usual := 0.01 * (high - low)
		if !(usual > 0) {
			usual = 0.01 * math.Max(math.Abs(high), 1e-300)
		}
		for i := range f.sd {
			f.sd[i][k] = usual
			if e := f.data.Errors[i][k]; !math.IsNaN(e) {
				f.sd[i][k] = e
			} else if f.place[k] >= 0 {
				f.given = false
			}
		}
	}
}

// freedom is the number of measured values less one for the place on the curve of each row
// and one for each parameter.
func (f *fitter) freedom() int {
	n := -len(f.index)
	for _, row := range f.data.Rows {
		seen := 0
		for k, v := range row {
			if f.place[k] >= 0 && !math.IsNaN(v) {
				seen++
			}
		}
		n += max(seen-1, 0)
	}
	return n
}

// begin follows the curve over the data and takes the points nearest to the rows.
func (f *fitter) begin() error {
	name := f.m.parameters[f.free].Name
	values, err := f.data.Column(name)
	if err != nil {
		return err
	}
	now := f.from.Parameters[f.free]
	low, high := now, now
	for _, v := range values {
		low, high = math.Min(low, v), math.Max(high, v)
	}
	width := high - low
	b, err := f.from.Follow(name, Within(low-0.5*width, high+0.5*width), WithoutEigenvalues())
	if err != nil {
		return err
	}
	f.s = newSystem(f.m, f.from.State, f.from.Parameters, f.free)
	f.s.learn(b.points[0].sizes.states)
	for i, row := range f.data.Rows {
		best, least := b.points[0], math.Inf(1)
		for _, q := range b.points {
			if d := f.square(i, row, append(append([]float64(nil), q.State...), q.Value())); d < least {
				best, least = q, d
			}
		}
		f.z = append(f.z, append(append([]float64(nil), best.State...), best.Value()))
	}
	return nil
}

// square is the squared distance of a row from a point of the curve.
func (f *fitter) square(i int, row, z []float64) float64 {
	sum := 0.0
	for k, v := range row {
		if at := f.place[k]; at >= 0 && !math.IsNaN(v) {
			d := (z[at] - v) / f.sd[i][k]
			sum += d * d
		}
	}
	return sum
}

// residuals returns what is left of all measured values at parameters q (in sizes from the
// start), with the nearest points of the curve.
func (f *fitter) residuals(q []float64) ([]float64, [][]float64, error) {
	var out []float64
	places := make([][]float64, len(f.z))
	for i, row := range f.data.Rows {
		for k, j := range f.index {
			f.s.p[j] = f.from.Parameters[j] + q[k]*f.sizes[k]
		}
		for k, j := range f.set {
			if j >= 0 && f.place[k] < 0 && !math.IsNaN(row[k]) {
				f.s.p[j] = row[k]
			}
		}
		z, err := f.nearest(i, row, f.z[i])
		if err != nil {
			return nil, nil, fmt.Errorf("row %d: %w", i+1, err)
		}
		places[i] = z
		for k, v := range row {
			if at := f.place[k]; at >= 0 && !math.IsNaN(v) {
				out = append(out, (z[at]-v)/f.sd[i][k])
			}
		}
	}
	return out, places, nil
}

// nearest finds the point of the curve nearest to a row: along the tangent by the step of
// Gauss and Newton, shortened until the distance falls, and back onto the curve.
func (f *fitter) nearest(i int, row, from []float64) ([]float64, error) {
	sizes := append(append([]float64(nil), f.s.sx...), f.s.sp[f.free])
	along, err := f.tangent(from, sizes)
	if err != nil {
		return nil, err
	}
	z, along, err := f.correct(from, along, sizes)
	if err != nil {
		return nil, err
	}
	for range 100 {
		num, den := 0.0, 0.0
		for k, v := range row {
			if at := f.place[k]; at >= 0 && !math.IsNaN(v) {
				w := along[at] * sizes[at] / (f.sd[i][k] * f.sd[i][k])
				num, den = num+w*(v-z[at]), den+w*along[at]*sizes[at]
			}
		}
		if den == 0 {
			return z, nil
		}
		step := math.Max(-0.2, math.Min(0.2, num/den))
		now := f.square(i, row, z)
		moved := false
		for ; math.Abs(step) > 1e-11; step /= 4 {
			trial := append([]float64(nil), z...)
			for k := range trial {
				trial[k] += step * along[k] * sizes[k]
			}
			there, tangent, err := f.correct(trial, along, sizes)
			if errors.Is(err, ErrInterrupted) {
				return nil, err
			}
			if err == nil && f.square(i, row, there) < now {
				z, along, moved = there, tangent, true
				break
			}
		}
		if !moved {
			return z, nil
		}
	}
	return z, nil
}

// tangent returns the unit tangent of the curve at a point near it.
func (f *fitter) tangent(z, sizes []float64) ([]float64, error) {
	n := f.s.n
	g := mat.NewDense(n, n+1, nil)
	if err := f.s.Fz(z[:n], z[n], g.RawMatrix().Data); err != nil {
		return nil, err
	}
	for i := range n {
		row := g.RawRowView(i)
		most := 0.0
		for k := range row {
			row[k] *= sizes[k]
			most = math.Max(most, math.Abs(row[k]))
		}
		for k := range row {
			row[k] /= math.Max(most, math.SmallestNonzeroFloat64)
		}
	}
	_, right, err := extremes(g, 1)
	if err != nil {
		return nil, err
	}
	return right[0], nil
}

// correct takes a point near the curve onto it, orthogonal to along, and returns the unit
// tangent there.
func (f *fitter) correct(from, along, sizes []float64) (z, tangent []float64, err error) {
	n := f.s.n
	z = append([]float64(nil), from...)
	res, jac := make([]float64, n), make([]float64, n*(n+1))
	previous := math.Inf(1)
	for range 20 {
		if err := f.s.F(z[:n], z[n], res); err != nil {
			return nil, nil, err
		}
		if err := f.s.Fz(z[:n], z[n], jac); err != nil {
			return nil, nil, err
		}
		onto, way, err := ontoCurve(&f.lu, jac, res, along, sizes)
		if err != nil {
			return nil, nil, err
		}
		for k := range z {
			z[k] += onto[k] * sizes[k]
		}
		size := norm(onto)
		if size < 1e-13 || size < 1e-9 && size > previous/2 {
			way, _ = sized(way)
			return z, way, nil
		}
		if math.IsNaN(size) || size > 10 {
			break
		}
		previous = size
	}
	return nil, nil, errors.New("the curve of steady states was not found near the measured point")
}

// ontoCurve returns Newton's step onto the curve orthogonal to along, and the tangent, both
// in scaled variables.
func ontoCurve(lu *linalg.LU, jac, res, along, sizes []float64) (onto, tangent []float64, err error) {
	m := len(along)
	n := m - 1
	a := lu.Matrix(m)
	onto, tangent = make([]float64, m), make([]float64, m)
	for i := range n {
		most := 0.0
		for k := range m {
			a[i*m+k] = jac[i*m+k] * sizes[k]
			most = math.Max(most, math.Abs(a[i*m+k]))
		}
		if most == 0 {
			most = 1
		}
		for k := range m {
			a[i*m+k] /= most
		}
		onto[i] = -res[i] / most
	}
	copy(a[n*m:], along)
	tangent[n] = 1
	if err := lu.Factor(); err != nil {
		return nil, nil, errors.New("the curve has no tangent near the measured point")
	}
	lu.Solve(onto)
	lu.Solve(tangent)
	return onto, tangent, nil
}

// slopes returns the derivative of the residuals, column by column.
func (f *fitter) slopes(q []float64) ([][]float64, error) {
	const h = 1e-5
	var columns [][]float64
	for k := range q {
		at := append([]float64(nil), q...)
		at[k] = q[k] + h
		up, _, err := f.residuals(at)
		if err != nil {
			return nil, err
		}
		at[k] = q[k] - h
		down, _, err := f.residuals(at)
		if err != nil {
			return nil, err
		}
		for i := range up {
			up[i] = (up[i] - down[i]) / (2 * h)
		}
		columns = append(columns, up)
	}
	return columns, nil
}

// run minimises the sum of squares.
func (f *fitter) run() (*Fit, error) {
	problem := optimize.Problem{
		Func: func(q []float64) float64 {
			r, places, err := f.residuals(q)
			if err != nil {
				f.failed = err
				return math.Inf(1)
			}
			f.z = places
			return dot(r, r) / 2
		},
		Grad: func(grad, q []float64) {
			r, _, err := f.residuals(q)
			columns, err2 := f.slopes(q)
			if err = errors.Join(err, err2); err != nil {
				f.failed = err
				clear(grad)
				return
			}
			for k, c := range columns {
				grad[k] = dot(c, r)
			}
		},
		Status: func() (optimize.Status, error) {
			if errors.Is(f.failed, ErrInterrupted) {
				return optimize.Failure, ErrInterrupted
			}
			return optimize.NotTerminated, nil
		},
	}
	q := make([]float64, len(f.index))
	if _, _, err := f.residuals(q); err != nil {
		return nil, err
	}
	result, err := optimize.Minimize(problem, q, &optimize.Settings{GradientThreshold: 1e-9}, &optimize.BFGS{})
	if errors.Is(err, ErrInterrupted) {
		return nil, err
	}
	if result == nil {
		return nil, errors.Join(err, f.failed)
	}
	// A line search that can gain no more stops with an error where rounding begins.
	return f.result(result.X)
}

// result makes the fit at its minimum.
func (f *fitter) result(q []float64) (*Fit, error) {
	r, places, err := f.residuals(q)
	if err != nil {
		return nil, err
	}
	columns, err := f.slopes(q)
	if err != nil {
		return nil, err
	}
	k := len(q)
	normal := mat.NewSymDense(k, nil)
	for i := range k {
		for j := range i + 1 {
			normal.SetSym(i, j, dot(columns[i], columns[j]))
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(normal) || chol.Cond() > 1e14 {
		return nil, errors.New("the data do not tell the parameters apart (the normal equations are singular): fit fewer of them, or measure more")
	}
	var inverse mat.SymDense
	if err := chol.InverseTo(&inverse); err != nil {
		return nil, err
	}
	out := &Fit{ChiSquared: dot(r, r), Freedom: f.freedom(), Scaled: !f.given, index: f.index}
	scale := 1.0
	if out.Scaled {
		scale = out.ChiSquared / float64(out.Freedom)
	}
	params := append([]float64(nil), f.from.Parameters...)
	for i, j := range f.index {
		row := make([]float64, k)
		for l := range row {
			row[l] = scale * inverse.At(i, l) * f.sizes[i] * f.sizes[l]
		}
		out.Covariance = append(out.Covariance, row)
		params[j] += q[i] * f.sizes[i]
		out.Parameters = append(out.Parameters, Fitted{Parameter{f.m.parameters[j].Variable, params[j]}, f.from.Parameters[j], math.Sqrt(row[i])})
	}
	for i, z := range places {
		out.Nearest = append(out.Nearest, f.at(i, z, params))
	}
	if out.Point, err = f.m.settle(f.from.State, params); err != nil {
		return nil, fmt.Errorf("the fit is done, but the steady state that it began from does not exist with its parameters: %w", err)
	}
	return out, nil
}

func (f *fitter) at(i int, z, params []float64) *Point {
	n := len(z) - 1
	p := &Point{State: z[:n:n], Parameters: append([]float64(nil), params...), Unstable: -1, model: f.m, free: -1}
	p.Parameters[f.free] = z[n]
	for k, j := range f.set {
		if j >= 0 && f.place[k] < 0 && !math.IsNaN(f.data.Rows[i][k]) {
			p.Parameters[j] = f.data.Rows[i][k]
		}
	}
	return p
}

// Uncertainty returns the standard error of a limit that comes from that of the fitted
// parameters, to first order: sqrt(sᵀ C s) with the sensitivities s of the limit. The limit
// must be one of the fitted model.
func (f *Fit) Uncertainty(limit Limit) (float64, error) {
	if isNilLimit(limit) {
		return 0, errors.New("there is no limit (nil)")
	}
	slopes, err := allSlopes(limit)
	if err != nil {
		return 0, err
	}
	if limit.Model() != f.Point.model {
		return 0, errors.New("the limit belongs to another model than the fit")
	}
	sum := 0.0
	for i, j := range f.index {
		for k, l := range f.index {
			sum += slopes[j] * f.Covariance[i][k] * slopes[l]
		}
	}
	return math.Sqrt(sum), nil
}

// String says the fit in one line.
func (f *Fit) String() string {
	text := "fit:"
	for _, q := range f.Parameters {
		text += fmt.Sprintf(" %s %s ± %.2g;", q.Name, withUnit(q.Value, q.Unit), q.Error)
	}
	return text + fmt.Sprintf(" χ² = %.4g with %d degrees of freedom", f.ChiSquared, f.Freedom)
}
