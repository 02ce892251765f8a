package continuation

import "math"

// forms evaluates the second and third derivatives of f at a point as symmetric
// forms in z = (x, λ), in the user's units, by polarisation of the directional
// ones.
type forms struct {
	s     *system
	n     int
	x, p  []float64
	free  int       // index of λ, -1 for none
	sizes []float64 // of z
}

func (t *tracer) forms(a *node) forms {
	t.s.p[t.s.free] = a.lambda
	return forms{t.s, t.n, a.x, t.s.p, t.s.free, t.S}
}

// square returns f_zz[a, a].
func (f forms) square(a []float64) ([]float64, error) {
	out := make([]float64, f.n)
	if err := f.s.diff.Second(f.x, f.p, f.free, a, out); err != nil {
		return nil, refuse(err)
	}
	return out, nil
}

// product returns f_zz[a, b] = (f_zz[a+b, a+b] - f_zz[a-b, a-b]) / 4, with a and b
// brought to one length first.
func (f forms) product(a, b []float64) ([]float64, error) {
	la, lb := f.length(a), f.length(b)
	if la == 0 || lb == 0 {
		return make([]float64, f.n), nil
	}
	plus, minus := make([]float64, len(a)), make([]float64, len(a))
	for i := range a {
		plus[i], minus[i] = a[i]/la+b[i]/lb, a[i]/la-b[i]/lb
	}
	p, err := f.square(plus)
	if err != nil {
		return nil, err
	}
	m, err := f.square(minus)
	if err != nil {
		return nil, err
	}
	for i := range p {
		p[i] = (p[i] - m[i]) / 4 * la * lb
	}
	return p, nil
}

// length is that of a direction in scaled variables.
func (f forms) length(a []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v / f.sizes[i] * v / f.sizes[i]
	}
	return math.Sqrt(sum)
}

// cube returns f_zzz[a, a, a].
func (f forms) cube(a []float64) ([]float64, error) {
	out := make([]float64, f.n)
	d, ok := f.s.diff.(ThirdOrder)
	if !ok {
		d = differences{}.For(f.s).(ThirdOrder)
	}
	if err := d.Third(f.x, f.p, f.free, a, out); err != nil {
		return nil, refuse(err)
	}
	return out, nil
}

// mixedCube returns f_zzz[a, b, b] = (T(a+b) + T(a-b) - 2 T(a)) / 6 with T(a) =
// f_zzz[a, a, a].
func (f forms) mixedCube(a, b []float64) ([]float64, error) {
	plus, minus := make([]float64, len(a)), make([]float64, len(a))
	for i := range a {
		plus[i], minus[i] = a[i]+b[i], a[i]-b[i]
	}
	var terms [3][]float64
	for i, d := range [][]float64{plus, minus, a} {
		var err error
		if terms[i], err = f.cube(d); err != nil {
			return nil, err
		}
	}
	out := make([]float64, f.n)
	for i := range out {
		out[i] = (terms[0][i] + terms[1][i] - 2*terms[2][i]) / 6
	}
	return out, nil
}

// state extends a vector of states by no change of λ.
func state(v []float64) []float64 { return append(append([]float64(nil), v...), 0) }
