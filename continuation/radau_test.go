package continuation_test

import (
	"math"
	"testing"
)

// radau integrates with the method Radau IIA of order 5 (Ehle 1969; Hairer & Wanner,
// Solving Ordinary Differential Equations II, table IV.5.6), whose stages are solved
// together by Newton's method, with steps from comparing one with two halves. It shares
// nothing with what it is to confirm, and is slow.
type radau struct {
	f         func(y, f []float64)
	n         int
	tolerance float64
}

var root6 = math.Sqrt(6)

var radauA = [3][3]float64{
	{(88 - 7*root6) / 360, (296 - 169*root6) / 1800, (-2 + 3*root6) / 225},
	{(296 + 169*root6) / 1800, (88 + 7*root6) / 360, (-2 - 3*root6) / 225},
	{(16 - root6) / 36, (16 + root6) / 36, 1.0 / 9},
}

func (r *radau) run(y []float64, end float64) []float64 {
	y = append([]float64(nil), y...)
	t, h := 0.0, 1e-8
	for t < end {
		h = math.Min(h, end-t)
		whole, ok := r.step(y, h)
		half, ok1 := r.step(y, h/2)
		if !ok || !ok1 {
			h /= 4
			continue
		}
		two, ok2 := r.step(half, h/2)
		if !ok2 {
			h /= 4
			continue
		}
		worst := 0.0
		for i := range y {
			size := math.Max(math.Abs(y[i]), math.Abs(two[i])) + 1e-12
			worst = math.Max(worst, math.Abs(two[i]-whole[i])/31/(r.tolerance*size))
		}
		factor := math.Min(4, 0.8*math.Pow(math.Max(worst, 1e-10), -1.0/6))
		if worst > 1 {
			h *= math.Max(0.1, factor)
			continue
		}
		t += h
		copy(y, two)
		h *= factor
	}
	return y
}

// step solves z_i = h Σ a_ij f(y + z_j) for the three stages; the last gives the new
// state.
func (r *radau) step(y []float64, h float64) ([]float64, bool) {
	n := r.n
	z := make([]float64, 3*n)
	f, at := make([]float64, n), make([]float64, n)
	jac := r.jacobian(y)
	for range 12 {
		rows := make([][]float64, 3*n)
		for i := range rows {
			rows[i] = make([]float64, 3*n+1)
			rows[i][i] = 1
			rows[i][3*n] = -z[i]
		}
		for j := range 3 {
			for k := range at {
				at[k] = y[k] + z[j*n+k]
			}
			r.f(at, f)
			for i := range 3 {
				for k := range n {
					rows[i*n+k][3*n] += h * radauA[i][j] * f[k]
					for l := range n {
						rows[i*n+k][j*n+l] -= h * radauA[i][j] * jac[k*n+l]
					}
				}
			}
		}
		size, ok := eliminate(rows, y)
		if !ok {
			return nil, false
		}
		for i := range z {
			z[i] += rows[i][3*n]
		}
		if size < 1e-15 {
			break
		}
	}
	out := make([]float64, n)
	for k := range out {
		out[k] = y[k] + z[2*n+k]
		if math.IsNaN(out[k]) {
			return nil, false
		}
	}
	return out, true
}

// jacobian differentiates by central differences; Newton's method on the stages needs
// few digits of it.
func (r *radau) jacobian(y []float64) []float64 {
	jac, at := make([]float64, r.n*r.n), append([]float64(nil), y...)
	plus, minus := make([]float64, r.n), make([]float64, r.n)
	for k := range y {
		d := 1e-5 * (math.Abs(y[k]) + 1e-9)
		at[k] = y[k] + d
		r.f(at, plus)
		at[k] = y[k] - d
		r.f(at, minus)
		at[k] = y[k]
		for i := range plus {
			jac[i*r.n+k] = (plus[i] - minus[i]) / (2 * d)
		}
	}
	return jac
}

// eliminate solves in place, leaving the solution in the last column, and returns its
// size relative to that of the states.
func eliminate(rows [][]float64, y []float64) (size float64, ok bool) {
	m := len(rows)
	for k := range m {
		pivot := k
		for i := k; i < m; i++ {
			if math.Abs(rows[i][k]) > math.Abs(rows[pivot][k]) {
				pivot = i
			}
		}
		rows[k], rows[pivot] = rows[pivot], rows[k]
		if rows[k][k] == 0 {
			return 0, false
		}
		for i := range m {
			if i == k || rows[i][k] == 0 {
				continue
			}
			factor := rows[i][k] / rows[k][k]
			for j := k; j <= m; j++ {
				rows[i][j] -= factor * rows[k][j]
			}
		}
	}
	for i := range rows {
		rows[i][m] /= rows[i][i]
		size = math.Max(size, math.Abs(rows[i][m])/(math.Abs(y[i%len(y)])+1e-12))
	}
	return size, true
}

// The published values are those of another method with a much tighter tolerance.
func TestStiffReferences(t *testing.T) {
	for _, p := range stiffProblems {
		r := &radau{f: func(y, f []float64) { p.f(y, none{}, f) }, n: len(p.start), tolerance: 1e-11}
		for i, time := range p.at {
			if time > 100 && p.name == "Oregonator" {
				r.tolerance = 1e-10
			}
			y := r.run(p.start, time)
			worst := 0.0
			for k, want := range p.want[i] {
				worst = math.Max(worst, math.Abs(y[k]-want)/math.Abs(want))
			}
			t.Logf("%s to %g: %.2g", p.name, time, worst)
			if worst > 1e-8 {
				t.Errorf("%s to %g: the published value is off by %.2g: %v, want %v", p.name, time, worst, y, p.want[i])
			}
		}
	}
}
