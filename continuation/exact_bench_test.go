package continuation_test

import (
	"fmt"
	"math"
	"testing"
	"time"

	"brinkline/continuation"
)

// A chain of tanks, or a lattice of cells: n/2 places with two states each,
// coupled to their neighbours.
type chainParams struct {
	Da, B, Beta, Flow float64
}

const chainSource = `
type chainParams struct {
	Da, B, Beta, Flow float64
}

func chain(u []float64, q chainParams, f []float64) {
	for i := 0; i < len(u); i += 2 {
		x, y := u[i], u[i+1]
		r := q.Da * (1 - x) * math.Exp(y/(1+0.02*y))
		f[i] = -x + r
		f[i+1] = -(1+q.Beta)*y + q.B*r
		if i > 0 {
			f[i] += q.Flow * (u[i-2] - x)
			f[i+1] += q.Flow * (u[i-1] - y)
		}
	}
}
`

func chain(u []float64, q chainParams, f []float64) {
	for i := 0; i < len(u); i += 2 {
		x, y := u[i], u[i+1]
		r := q.Da * (1 - x) * math.Exp(y/(1+0.02*y))
		f[i] = -x + r
		f[i+1] = -(1+q.Beta)*y + q.B*r
		if i > 0 {
			f[i] += q.Flow * (u[i-2] - x)
			f[i+1] += q.Flow * (u[i-1] - y)
		}
	}
}

// byHand is the Jacobian of chain as its author would write it. What is wanted
// only at special points is taken by differences of it.
type byHand struct{ n int }

func (byHand) Describe() string { return "by hand" }

func (h byHand) For(continuation.Evaluator) continuation.Differentiator { return h }

func (h byHand) Jacobian(x, p []float64, j int, jac []float64) error {
	clear(jac)
	width := len(jac) / h.n
	da, b, beta, flow := p[0], p[1], p[2], p[3]
	for i := 0; i < h.n; i += 2 {
		d := 1 + 0.02*x[i+1]
		e := math.Exp(x[i+1] / d)
		rx, ry, ra := -da*e, da*(1-x[i])*e/(d*d), (1-x[i])*e
		top, low := jac[i*width:], jac[(i+1)*width:]
		top[i], top[i+1] = -1+rx, ry
		low[i], low[i+1] = b*rx, -(1+beta)+b*ry
		if i > 0 {
			top[i] -= flow
			low[i+1] -= flow
			top[i-2], low[i-1] = flow, flow
		}
		if j == 0 {
			top[h.n], low[h.n] = ra, b*ra
		}
	}
	return nil
}

func (h byHand) Parameter(x, p []float64, j int, col []float64) error {
	jac := make([]float64, h.n*(h.n+1))
	err := h.Jacobian(x, p, j, jac)
	for i := range col {
		col[i] = jac[i*(h.n+1)+h.n]
	}
	return err
}

// moved returns the difference quotient of the Jacobian along a.
func (h byHand) moved(x, p []float64, j int, a []float64) []float64 {
	const step = 1e-5
	var jac [2][]float64
	for k, s := range []float64{step, -step} {
		z, q := append([]float64(nil), x...), append([]float64(nil), p...)
		for i := range z {
			z[i] += s * a[i]
		}
		q[j] += s * a[h.n]
		jac[k] = make([]float64, h.n*(h.n+1))
		_ = h.Jacobian(z, q, j, jac[k])
	}
	for i := range jac[0] {
		jac[0][i] = (jac[0][i] - jac[1][i]) / (2 * step)
	}
	return jac[0]
}

func (h byHand) Second(x, p []float64, j int, a, out []float64) error {
	d := h.moved(x, p, j, a)
	for i := range out {
		out[i] = 0
		for k, v := range a {
			out[i] += d[i*(h.n+1)+k] * v
		}
	}
	return nil
}

func (h byHand) Adjoint(x, p []float64, j int, w, a, out []float64) error {
	d := h.moved(x, p, j, a)
	for k := range out {
		out[k] = 0
		for i, v := range w {
			out[k] += d[i*(h.n+1)+k] * v
		}
	}
	return nil
}

// BenchmarkExactTrace compares a whole trace, eigenvalues and folds included, by
// the tape of the source and by compiled f with a Jacobian written by hand; and
// says what finite differences take.
func BenchmarkExactTrace(b *testing.B) {
	for _, n := range []int{2, 8, 40} {
		b.Run(fmt.Sprint("n=", n), func(b *testing.B) {
			tape := chainStart(b, n, continuation.WithSource("chain", chainSource))
			hand := chainStart(b, n, continuation.WithDerivatives(byHand{n}))
			differences := chainStart(b, n)
			follow := func(p *continuation.Point) (time.Duration, int) {
				start := time.Now()
				branch, err := p.Follow("Da", continuation.Within(0.02, 0.2), continuation.MaxSteps(150), continuation.Upward())
				if err != nil {
					b.Fatal(err)
				}
				return time.Since(start), branch.Steps()
			}
			ours, theirs, plain := time.Hour, time.Hour, time.Hour
			steps := [3]int{}
			b.ReportAllocs()
			for range b.N {
				d, k := follow(tape)
				ours, steps[0] = min(ours, d), k
				b.StopTimer()
				d, k = follow(hand)
				theirs, steps[1] = min(theirs, d), k
				d, k = follow(differences)
				plain, steps[2] = min(plain, d), k
				b.StartTimer()
			}
			if steps[0] != steps[1] {
				b.Logf("steps differ: %v", steps)
			}
			b.ReportMetric(float64(ours.Nanoseconds())/float64(steps[0]), "ns/step")
			b.ReportMetric(float64(ours)/float64(theirs), "ratio-to-hand")
			b.ReportMetric(float64(plain)/float64(ours), "times-differences")
		})
	}
}

func chainStart(b *testing.B, n int, opts ...continuation.Option) *continuation.Point {
	b.Helper()
	names := make([]string, n)
	for i := range names {
		names[i] = fmt.Sprint("u", i)
	}
	opts = append(opts, continuation.States(names, nil, nil))
	m, err := continuation.NewModel(chain, chainParams{Da: 0.03, B: 8, Beta: 1, Flow: 0.3}, opts...)
	if err != nil {
		b.Fatal(err)
	}
	return settled(b, m, make([]float64, n))
}
