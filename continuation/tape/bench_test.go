package tape

import (
	"math"
	"testing"
	"time"
)

// The benchmarks compare f and J of a tape with compiled Go: f, and a Jacobian
// written by hand. Both run in turns, and the ratio of the best times is what to
// hold on to: go test -bench . -benchmem ./continuation/tape

const cascade = `
type Params struct {
	Heat, Cool, Feed, Order float64
	K [4]float64
}

func rate(k, t float64) float64 { return k * math.Exp(t/(1+0.05*t)) }

func model(u []float64, q Params, f []float64) {
	c0, t0 := 0.0, 0.0
	for i := range 4 {
		c, t := u[2*i], u[2*i+1]
		r := rate(q.K[i], t) * (1 - c)
		loss := q.Cool * math.Exp(-0.1*t) * t
		if i < 3 {
			loss += 0.01 * math.Exp(0.2*t)
		}
		f[2*i] = q.Feed*(c0-c) + r
		f[2*i+1] = q.Feed*(t0-t) + q.Heat*r - loss
		c0, t0 = c, t
	}
}
`

func cascadeF(u, p, f []float64) {
	heat, cool, feed := p[0], p[1], p[2]
	c0, t0 := 0.0, 0.0
	for i := range 4 {
		c, t := u[2*i], u[2*i+1]
		r := p[4+i] * math.Exp(t/(1+0.05*t)) * (1 - c)
		loss := cool * math.Exp(-0.1*t) * t
		if i < 3 {
			loss += 0.01 * math.Exp(0.2*t)
		}
		f[2*i] = feed*(c0-c) + r
		f[2*i+1] = feed*(t0-t) + heat*r - loss
		c0, t0 = c, t
	}
}

func cascadeJ(u, p, j []float64) {
	heat, cool, feed := p[0], p[1], p[2]
	clear(j)
	for i := range 4 {
		c, t := u[2*i], u[2*i+1]
		d := 1 + 0.05*t
		k := p[4+i] * math.Exp(t/d)
		kt := k / (d * d) * (1 - c)
		e := cool * math.Exp(-0.1*t)
		loss := e - 0.1*e*t
		if i < 3 {
			loss += 0.002 * math.Exp(0.2*t)
		}
		a, b := 16*i, 16*i+8
		j[a+2*i], j[a+2*i+1] = -feed-k, kt
		j[b+2*i], j[b+2*i+1] = -heat*k, -feed+heat*kt-loss
		if i > 0 {
			j[a+2*i-2], j[b+2*i-1] = feed, feed
		}
	}
}

func tankF(u, p, f []float64) {
	r := p[0] * (1 - u[0]) * math.Exp(u[1])
	f[0] = -u[0] + r
	f[1] = -(1+p[2])*u[1] + p[1]*r
}

func tankJ(u, p, j []float64) {
	k := p[0] * math.Exp(u[1])
	r := k * (1 - u[0])
	j[0], j[1], j[2], j[3] = -1-k, r, -p[1]*k, -(1+p[2])+p[1]*r
}

const rod = `
type Params struct{ Lambda float64 }

func model(u []float64, q Params, f []float64) {
	n := len(u)
	h := 1 / float64(n+1)
	for i := range u {
		left, right := 0.0, 0.0
		if i > 0 {
			left = u[i-1]
		}
		if i < n-1 {
			right = u[i+1]
		}
		f[i] = (left-2*u[i]+right)/(h*h) + q.Lambda*math.Exp(u[i])
	}
}
`

func rodF(u, p, f []float64) {
	n := len(u)
	h := 1 / float64(n+1)
	for i := range u {
		left, right := 0.0, 0.0
		if i > 0 {
			left = u[i-1]
		}
		if i < n-1 {
			right = u[i+1]
		}
		f[i] = (left-2*u[i]+right)/(h*h) + p[0]*math.Exp(u[i])
	}
}

func rodJ(u, p, j []float64) {
	n := len(u)
	h := 1 / float64(n+1)
	w := 1 / (h * h)
	k := 0
	for i := range u {
		if i > 0 {
			j[k] = w
			k++
		}
		j[k] = -2*w + p[0]*math.Exp(u[i])
		k++
		if i < n-1 {
			j[k] = w
			k++
		}
	}
}

const plate = `
type Params struct {
	Lambda float64
	Side int
}

func model(u []float64, q Params, f []float64) {
	m := q.Side
	h := 1 / float64(m+1)
	at := func(i, j int) float64 {
		if i < 0 || j < 0 || i >= m || j >= m {
			return 0
		}
		return u[i*m+j]
	}
	for i := range m {
		for j := range m {
			sum := at(i-1, j) + at(i+1, j) + at(i, j-1) + at(i, j+1)
			f[i*m+j] = (sum-4*at(i, j))/(h*h) + q.Lambda*math.Exp(at(i, j))
		}
	}
}
`

func plateF(u, p, f []float64) {
	m := int(math.Sqrt(float64(len(u))))
	h := 1 / float64(m+1)
	for i := range m {
		for j := range m {
			sum := 0.0
			if i > 0 {
				sum += u[(i-1)*m+j]
			}
			if i < m-1 {
				sum += u[(i+1)*m+j]
			}
			if j > 0 {
				sum += u[i*m+j-1]
			}
			if j < m-1 {
				sum += u[i*m+j+1]
			}
			f[i*m+j] = (sum-4*u[i*m+j])/(h*h) + p[0]*math.Exp(u[i*m+j])
		}
	}
}

func plateJ(u, p, jac []float64) {
	m := int(math.Sqrt(float64(len(u))))
	h := 1 / float64(m+1)
	w := 1 / (h * h)
	k := 0
	put := func(v float64) { jac[k] = v; k++ }
	for i := range m {
		for j := range m {
			if i > 0 {
				put(w)
			}
			if j > 0 {
				put(w)
			}
			put(-4*w + p[0]*math.Exp(u[i*m+j]))
			if j < m-1 {
				put(w)
			}
			if i < m-1 {
				put(w)
			}
		}
	}
}

// ratio runs ours and theirs in turns and reports how the best times compare.
func ratio(b *testing.B, ours, theirs func()) {
	measure := func(f func(), n int) float64 {
		start := time.Now()
		for range n {
			f()
		}
		return float64(time.Since(start)) / float64(n)
	}
	n := max(1, int(2e5/(measure(ours, 3)+1)))
	best, other := math.Inf(1), math.Inf(1)
	b.ReportAllocs()
	b.ResetTimer()
	for range b.N {
		best = min(best, measure(ours, n))
		b.StopTimer()
		other = min(other, measure(theirs, n))
		b.StartTimer()
	}
	b.ReportMetric(best, "ns/f+J")
	b.ReportMetric(other, "ns/compiled")
	b.ReportMetric(best/other, "ratio")
	b.ReportMetric(0, "ns/op")
}

func values(n int) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = 0.3 + 0.1*math.Sin(float64(i))
	}
	return x
}

type plateParams struct {
	Lambda float64
	Side   int
}

var benchmarks = []struct {
	name   string
	text   string
	n      int
	p      []float64
	params any
	sparse bool
	f, j   func(u, p, out []float64)
}{
	{"2 states", tank, 2, []float64{0.1, 10, 2}, nil, false, tankF, tankJ},
	{"8 states", cascade, 8, []float64{8, 1.5, 1, 2, 0.1, 0.12, 0.09, 0.11}, nil, false, cascadeF, cascadeJ},
	{"rod 1000", rod, 1000, []float64{2}, nil, true, rodF, rodJ},
	{"plate 100x100", plate, 10000, []float64{2}, plateParams{2, 100}, true, plateF, plateJ},
}

func BenchmarkValueAndJacobian(b *testing.B) {
	for _, bench := range benchmarks {
		b.Run(bench.name, func(b *testing.B) {
			m, x := machineOf(b, bench.text, bench.n, bench.params, bench.sparse), values(bench.n)
			f, j := make([]float64, bench.n), make([]float64, m.code.slots-bench.n)
			ratio(b, func() { m.Run(x, bench.p) }, func() { bench.f(x, bench.p, f); bench.j(x, bench.p, j) })
		})
	}
}

// First use of a model: parse and check its text, record it, derive f and J. What
// the checker needs to know of package math is read once, before.
func BenchmarkFirstUse(b *testing.B) {
	for _, bench := range benchmarks {
		b.Run(bench.name, func(b *testing.B) {
			b.ReportAllocs()
			for range b.N {
				machineOf(b, bench.text, bench.n, bench.params, bench.sparse)
			}
		})
	}
}

// Batches of 512 points, the time of a point against that of compiled Go.
func BenchmarkBatch(b *testing.B) {
	const count = 512
	for _, bench := range benchmarks[:2] {
		b.Run(bench.name, func(b *testing.B) {
			m := machineOf(b, bench.text, bench.n, bench.params, bench.sparse).code.NewBatch()
			x := values(count * bench.n)
			out, f, j := make([]float64, count*m.code.slots), make([]float64, bench.n), make([]float64, bench.n*bench.n)
			ratio(b, func() { m.Run(count, x, bench.p, out) }, func() {
				for i := range count {
					u := x[i*bench.n : (i+1)*bench.n]
					bench.f(u, bench.p, f)
					bench.j(u, bench.p, j)
				}
			})
		})
	}
}
