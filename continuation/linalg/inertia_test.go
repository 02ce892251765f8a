package linalg

import (
	"math"
	"math/rand/v2"
	"testing"
)

func random(r *rand.Rand, n int) []float64 {
	a := make([]float64, n*n)
	for i := range a {
		a[i] = r.NormFloat64()
	}
	return a
}

func unstable(values []complex128) int {
	count := 0
	for _, v := range values {
		if real(v) > 0 {
			count++
		}
	}
	return count
}

// What a certificate proves of a matrix near the one it was taken from is what the
// eigenvalues say; and it holds for small changes, else it would be of no use.
func TestCertificateNeverLies(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for _, n := range []int{1, 2, 3, 8, 30} {
		held, tried := 0, 0
		for range 200 {
			a := random(r, n)
			var c Certificate
			if _, err := c.Renew(a, n); err != nil {
				t.Fatal(err)
			}
			if !c.Holds(a, n) {
				continue // an eigenvalue at the axis, to working precision
			}
			size := math.Pow(10, -4*r.Float64())
			for i := range a {
				a[i] += size * r.NormFloat64()
			}
			tried++
			if !c.Holds(a, n) {
				continue
			}
			held++
			var e Eigen
			values, err := e.Values(a, n)
			if err != nil {
				t.Fatal(err)
			}
			if got := unstable(values); got != c.Unstable {
				t.Fatalf("n = %d: certified %d, eigenvalues %v", n, c.Unstable, values)
			}
		}
		if tried < 150 || held < tried/10 {
			t.Errorf("n = %d: held for %d of %d", n, held, tried)
		}
	}
}

func TestCertificateAgreesWithEigenvalues(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for range 100 {
		n := 1 + r.IntN(9)
		a := random(r, n)
		var c Certificate
		var e Eigen
		got, err := c.Renew(a, n)
		if err != nil {
			t.Fatal(err)
		}
		want, err := e.Values(a, n)
		if err != nil {
			t.Fatal(err)
		}
		for i := range want {
			if d := got[i] - want[i]; math.Hypot(real(d), imag(d)) > 1e-10 {
				t.Fatalf("eigenvalue %d: %v, want %v", i, got[i], want[i])
			}
		}
	}
}

func benchmarkMatrix(n int) []float64 {
	r := rand.New(rand.NewPCG(5, 6))
	a := random(r, n)
	for i := range n {
		a[i*n+i] -= 2 * math.Sqrt(float64(n))
	}
	return a
}

func BenchmarkCertificate(b *testing.B) {
	for _, n := range []int{2, 8, 40, 100} {
		a := benchmarkMatrix(n)
		var c Certificate
		if _, err := c.Renew(a, n); err != nil {
			b.Fatal(err)
		}
		var e Eigen
		b.Run("holds/"+string(rune('0'+n/10))+string(rune('0'+n%10)), func(b *testing.B) {
			for b.Loop() {
				if !c.Holds(a, n) {
					b.Fatal("does not hold")
				}
			}
		})
		b.Run("eigenvalues/"+string(rune('0'+n/10))+string(rune('0'+n%10)), func(b *testing.B) {
			for b.Loop() {
				if _, err := e.Values(a, n); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
