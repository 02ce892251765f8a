package tape

import "math"

// besselJ is J_n(x), for negative n too: J_{-n} = (-1)^n J_n.
func besselJ(n int, x float64) float64 { return math.Jn(n, x) }

// besselY is Y_n(x), for negative n too: Y_{-n} = (-1)^n Y_n.
func besselY(n int, x float64) float64 { return math.Yn(n, x) }

// evenBernoulli holds B_2j/(2j)! = (-1)^(j+1) 2 ζ(2j)/(2π)^(2j), j from 1
// (Abramowitz & Stegun, Handbook of Mathematical Functions, 23.2.16).
var evenBernoulli = func() (c [28]float64) {
	power, sign := 1.0, 1.0
	for j := 1; j < len(c); j++ {
		power *= 4 * math.Pi * math.Pi
		c[j] = sign * 2 * zetaEven(j) / power
		sign = -sign
	}
	return c
}()

// zetaEven is ζ(2j).
func zetaEven(j int) float64 {
	switch j {
	case 1:
		return math.Pi * math.Pi / 6
	case 2:
		return math.Pow(math.Pi, 4) / 90
	case 3:
		return math.Pow(math.Pi, 6) / 945
	}
	sum := 0.0
	for k := 200; k >= 1; k-- {
		sum += math.Pow(float64(k), float64(-2*j))
	}
	return sum
}

// polygamma is the m-th derivative of the digamma function: upwards by
// recurrence, then the asymptotic series (Abramowitz & Stegun 6.4.6, 6.4.11;
// 6.3.5, 6.3.18 for m = 0). Poles give NaN.
func polygamma(m int, x float64) float64 {
	if x <= 0 && x == math.Floor(x) || math.IsNaN(x) || math.IsInf(x, -1) {
		return math.NaN()
	}
	factorial := math.Gamma(float64(m + 1))
	sign := -1.0 // (-1)^(m+1)
	if m%2 == 1 {
		sign = 1
	}
	shift := 0.0
	for ; x < 20; x++ {
		shift += math.Pow(x, -float64(m+1))
	}
	return sign * (factorial*shift + polygammaTail(m, x))
}

// polygammaTail is (-1)^(m+1) times the polygamma function, for x of 20 or more.
func polygammaTail(m int, x float64) float64 {
	sum := 0.0
	for j := 12; j >= 1; j-- {
		// B_2j (2j+m-1)!/(2j)! x^-(2j+m)
		sum += evenBernoulli[j] * math.Gamma(float64(2*j+m)) * math.Pow(x, -float64(2*j+m))
	}
	if m == 0 {
		return -(math.Log(x) - 1/(2*x) - sum)
	}
	f := math.Gamma(float64(m)) // (m-1)!
	return f*math.Pow(x, -float64(m)) + f*float64(m)/2*math.Pow(x, -float64(m+1)) + sum
}

// rise is the k-th derivative of x/(exp(x) - 1), whose value at 0 is 1. Near 0
// the series with Bernoulli numbers is summed; elsewhere
//
//	k s⁽ᵏ⁻¹⁾ + x s⁽ᵏ⁾  with  s = 1/(exp(x) - 1),  s' = -s (1 + s)
func rise(k int, x float64) float64 {
	if math.Abs(x) < 2.5 {
		return riseSeries(k, x)
	}
	s, t := 1/math.Expm1(x), -1/math.Expm1(-x) // t = 1 + s
	if k == 0 {
		return x * s
	}
	if math.IsInf(x, 0) {
		return [2]float64{0, truth(k == 1) * -1}[int(truth(x < 0))]
	}
	before, at := s, -s*t
	q := []float64{1} // s⁽ᵏ⁾ = -s t q(s)
	for i := 1; i < k; i++ {
		q = nextRise(q)
		before, at = at, -s*t*horner(q, s)
	}
	return float64(k)*before + x*at
}

// nextRise returns the coefficients of -((1+2s) q + (s+s²) q').
func nextRise(q []float64) []float64 {
	next := make([]float64, len(q)+1)
	for i, v := range q {
		next[i] -= v * float64(1+i)
		next[i+1] -= v * float64(2+i)
	}
	return next
}

func horner(q []float64, s float64) float64 {
	sum := 0.0
	for i := len(q) - 1; i >= 0; i-- {
		sum = float64(sum*s) + q[i]
	}
	return sum
}

func riseSeries(k int, x float64) float64 {
	sum := 0.0
	for j := len(evenBernoulli) - 1; j >= 1; j-- {
		if n := 2 * j; n >= k {
			sum += evenBernoulli[j] * falling(n, k) * math.Pow(x, float64(n-k))
		}
	}
	switch k {
	case 0:
		sum += 1 - x/2
	case 1:
		sum -= 0.5
	}
	return sum
}

// falling is n (n-1) ... (n-k+1).
func falling(n, k int) float64 {
	v := 1.0
	for i := range k {
		v *= float64(n - i)
	}
	return v
}

// exprel is the k-th derivative of (exp(x) - 1)/x, the integral of tᵏ exp(xt)
// over 0 < t < 1, by a Kummer series of positive terms (Abramowitz & Stegun
// 13.1.2, 13.1.27), and by its recurrence for large |x|.
func exprel(k int, x float64) float64 {
	if math.Abs(x) > 40 {
		if k == 0 {
			return math.Expm1(x) / x
		}
		return (math.Exp(x) - float64(k)*exprel(k-1, x)) / x
	}
	sum, term := 0.0, 1.0
	if x >= 0 {
		for n := 0; term > 1e-18*sum || n < 2; n++ {
			sum += term / float64(n+k+1)
			term *= x / float64(n+1)
		}
		return sum
	}
	for n := 0; term > 1e-18*sum || n < 2; n++ {
		sum += term
		term *= -x / float64(n+k+2)
	}
	return math.Exp(x) * sum / float64(k+1)
}
