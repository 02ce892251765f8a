package tape

import (
	"math"
	"math/big"
	"sync"
)

// The elementary functions of tapes: the same bits on every processor, as no
// fused multiply-add is used, and at most 1 ulp off. Tables and reductions follow
// P. T. P. Tang, Table-driven implementation of the exponential function in IEEE
// floating-point arithmetic, ACM TOMS 15 (1989) 144-157, and the same for the
// logarithm, ACM TOMS 16 (1990) 378-400. The polynomials of the sine and the
// cosine are those of fdlibm, quoted from memory and tested against tables.

// library makes recordings and [apply] use package math instead. Tests set it to
// compare with compiled models bit by bit.
var library = false

const shifter = 0x1.8p52 // added and taken off again, it rounds to an integer

// exp is e^x.
func exp(x float64) float64 {
	if !(x > -708 && x < 709) {
		return expFar(x)
	}
	t := float64(x*(128/math.Ln2)) + shifter
	k := int64(math.Float64bits(t)<<12) >> 12 // the low bits of t
	n := t - shifter
	r := (x - float64(n*expHigh)) - float64(n*expLow)
	e := &expTable[k&127]
	r2 := float64(r * r)
	p := r + float64(r2*(0.5+float64(r*(1./6+float64(r*(1./24+float64(r*(1./120))))))))
	v := e[0] + (e[1] + float64(e[0]*p))
	return math.Float64frombits(math.Float64bits(v) + uint64(k>>7)<<52)
}

// expFar is exp where the result is not finite or not normal.
func expFar(x float64) float64 {
	switch {
	case x != x:
		return x
	case x > 709.782712893384:
		return math.Inf(1)
	case x < -745.1332191019412:
		return 0
	}
	hi, lo, k := expParts(x, 0)
	return scaleTwice(hi, lo, k)
}

// expParts returns exp(x + y) as (hi + lo) 2^k, for |y| far below |x|.
func expParts(x, y float64) (hi, lo float64, k int) {
	n := float64(x*(128/math.Ln2)) + shifter - shifter
	r1 := x - float64(n*expHigh)
	r2 := y - float64(n*expLow)
	r := r1 + r2
	rest := r1 - r + r2
	m := int(n)
	e := &expTable[m&127]
	q := float64(r * r)
	p := float64(q*(0.5+float64(r*(1./6+float64(r*(1./24+float64(r*(1./120+float64(r*(1./720)))))))))) + rest
	// e0 (1 + r + p) with e0 r split once, as r is not small enough to lose bits.
	rh := head(r)
	eh := head(e[0])
	a := float64(e[0] * r)
	b := float64(eh*rh) - a + float64(eh*(r-rh)) + float64((e[0]-eh)*rh) + float64((e[0]-eh)*(r-rh))
	hi = e[0] + a
	lo = e[0] - hi + a + (b + e[1] + float64(e[0]*p) + float64(e[1]*r))
	return hi, lo, m >> 7
}

// head keeps the upper 26 bits of the fraction, so that products of two are exact.
func head(x float64) float64 { return math.Float64frombits(math.Float64bits(x) &^ (1<<27 - 1)) }

// scaleTwice is (hi + lo) 2^k, rounded once also where the result is subnormal.
func scaleTwice(hi, lo float64, k int) float64 {
	v := hi + lo
	switch {
	case k > 1023:
		return v * 0x1p1023 * power2(k-1023)
	case k >= -1022:
		return v * power2(k)
	}
	// Add a number at which the result's last bit is the last there is.
	s := power2(k + 1022)
	hi, lo = hi*s, lo*s
	v = 1 + hi
	v += (1 - v + hi) + lo
	return (v - 1) * 0x1p-1022
}

func power2(k int) float64 { return math.Float64frombits(uint64(k+1023) << 52) }

// reduced splits x into 2^k m with F near m, and log(m/F) = r + ..., where r is
// rh + rl and rh has so few bits that its square is exact.
func reduced(x float64) (k float64, l *[3]float64, rh, rl float64) {
	b := math.Float64bits(x)
	sub := int64(0)
	if b < 1<<52 { // subnormal
		b = math.Float64bits(x * 0x1p54)
		sub = 54
	}
	// m lies between 1/sqrt 2 and sqrt 2.
	top := int64(b-0x3fe6a09e667f3bcd) >> 52
	m := math.Float64frombits(b - uint64(top)<<52)
	i := int(m*128 + 0.5)
	l = &logTable[i-90]
	f := float64(i) / 128
	d := m - f
	rh = head(d * l[0])
	rl = (d - float64(rh*f)) * l[0]
	return float64(top - sub), l, rh, rl
}

// log is the natural logarithm.
func log(x float64) float64 {
	switch {
	case !(x > 0):
		if x == 0 {
			return math.Inf(-1)
		}
		return math.NaN()
	case x > math.MaxFloat64:
		return x
	}
	k, l, rh, rl := reduced(x)
	r := rh + rl
	q := float64(r*r) * (-0.5 + float64(r*(1./3+float64(r*(-0.25+float64(r*(0.2+float64(r*(-1./6+float64(r*(1./7)))))))))))
	base := float64(k*ln2High) + l[1]
	hi := base + rh
	lo := base - hi + rh
	return hi + (lo + (rl + (q + (float64(k*ln2Low) + l[2]))))
}

// logParts is log(x) as hi + lo, to about 2^-66 of it.
func logParts(x float64) (hi, lo float64) {
	k, l, rh, rl := reduced(x)
	r := rh + rl
	// -r²/2 = -rh²/2, which is exact, and the rest.
	square := float64(rh*rh) * -0.5
	rest := -float64(rl * (rh + float64(0.5*rl)))
	tail := float64(r*float64(r*r)) * (1./3 + float64(r*(-0.25+float64(r*(0.2+float64(r*(-1./6+float64(r*(1./7+float64(r*-0.125))))))))))
	base := float64(k*ln2High) + l[1]
	a := base + rh
	e := base - a + rh
	b := a + square
	e += a - b + square
	e += rl + rest + tail + float64(k*ln2Low) + l[2]
	hi = b + e
	return hi, b - hi + e
}

// pow is x^y, with the special cases of math.Pow.
func pow(x, y float64) float64 {
	if !(x > 0 && x <= math.MaxFloat64 && math.Abs(y) <= math.MaxFloat64) {
		if x < 0 && x >= -math.MaxFloat64 && math.Abs(y) < 1<<63 && y == math.Trunc(y) {
			v := pow(-x, y)
			if math.Mod(y, 2) != 0 {
				return -v
			}
			return v
		}
		return math.Pow(x, y)
	}
	switch {
	case y == 1:
		return x
	case y == 2:
		return x * x
	case y == -1:
		return 1 / x
	case y == 0.5:
		return math.Sqrt(x)
	case y == 0 || x == 1:
		return 1
	}
	h, l := logParts(x)
	switch p := h * y; {
	case p > 710:
		return math.Inf(1)
	case p < -746:
		return 0
	case math.Abs(p) < 1e-17:
		return 1 + p
	}
	hh, yh := head(h), head(y)
	p := float64(h * y)
	e := float64(hh*yh) - p + float64(hh*(y-yh)) + float64((h-hh)*yh) + float64((h-hh)*(y-yh)) + float64(l*y)
	hi, lo, k := expParts(p, e)
	if k > -1021 && k < 1023 {
		v := hi + lo
		return math.Float64frombits(math.Float64bits(v) + uint64(int64(k))<<52)
	}
	return scaleTwice(hi, lo, k)
}

// tanh is the hyperbolic tangent: a series near 0, else 1 - 2/(e^2|x| + 1) with e
// in two parts.
func tanh(x float64) float64 {
	a := math.Abs(x)
	switch {
	case a < 1e-9:
		return x
	case a < 0.0625:
		s := float64(x * x)
		return x + float64(float64(x*s)*(-1./3+float64(s*(2./15+float64(s*(-17./315+float64(s*(62./2835+float64(s*(-1382./155925+float64(s*(21844./6081075))))))))))))
	case a > 22:
		return math.Copysign(1, x)
	case a > 1.6: // the errors of the quotient weigh little
		return math.Copysign(1-2/(exp(2*a)+1), x)
	case a != a:
		return x
	}
	hi, lo, k := expParts(2*a, 0)
	s := power2(k)
	hi, lo = hi*s, lo*s
	// (e - 1)/(e + 1)
	n := hi - 1
	nl := hi - n - 1 + lo
	d := hi + 1
	dl := 1 - (d - hi) + lo
	if hi < 1 {
		dl = hi - (d - 1) + lo
	}
	q := (n + nl) / (d + dl)
	// One correction: n - q d in two parts.
	qh, dh := head(q), head(d)
	p := float64(q * d)
	pl := float64(qh*dh) - p + float64(qh*(d-dh)) + float64((q-qh)*dh) + float64((q-qh)*(d-dh))
	q += (n - p - pl + nl - float64(q*dl)) / d
	return math.Copysign(q, x)
}

// quarter reduces x to y0 + y1 between -pi/4 and pi/4, and the number of quarter
// turns that were taken off, modulo 4.
func quarter(x float64) (y0, y1 float64, turns int) {
	a := math.Abs(x)
	if a <= math.Pi/4 {
		return x, 0, 0
	}
	if a > 0x1p19*math.Pi/2 {
		return quarterFar(x)
	}
	n := float64(x*(2/math.Pi)) + shifter - shifter
	turns = int(n) & 3
	// As many parts of pi/2 as the cancellation asks for.
	r, w := x-float64(n*halfPi1), float64(n*halfPi1Rest)
	y0 = r - w
	if exponent(x)-exponent(y0) > 16 {
		t := r
		w = float64(n * halfPi2)
		r = t - w
		w = float64(n*halfPi2Rest) - (t - r - w)
		y0 = r - w
		if exponent(x)-exponent(y0) > 49 {
			t = r
			w = float64(n * halfPi3)
			r = t - w
			w = float64(n*halfPi3Rest) - (t - r - w)
			y0 = r - w
		}
	}
	return y0, r - y0 - w, turns
}

func exponent(x float64) int { return int(math.Float64bits(x)>>52) & 0x7ff }

// quarterFar is quarter for arguments beyond half a million turns, where speed
// does not matter.
func quarterFar(x float64) (y0, y1 float64, turns int) {
	if x-x != 0 {
		return math.NaN(), math.NaN(), 0
	}
	half := halfPi()
	wide := new(big.Float).SetPrec(widePi)
	t := wide.Quo(new(big.Float).SetPrec(widePi).SetFloat64(x), half)
	n, _ := new(big.Float).SetPrec(widePi).Add(t, new(big.Float).SetFloat64(math.Copysign(0.5, x))).Int(nil)
	t.Sub(t, new(big.Float).SetPrec(widePi).SetInt(n))
	t.Mul(t, half)
	y0, _ = t.Float64()
	y1, _ = t.Sub(t, new(big.Float).SetFloat64(y0)).Float64()
	return y0, y1, int(new(big.Int).And(n, big.NewInt(3)).Int64())
}

// widePi is enough for the largest float64, and 150 bits of the rest.
const widePi = 1300

// halfPi is pi/2 by Machin's formula, pi = 16 atan(1/5) - 4 atan(1/239).
var halfPi = sync.OnceValue(func() *big.Float {
	wide := func(v int64) *big.Float { return new(big.Float).SetPrec(widePi).SetInt64(v) }
	arctangent := func(n int64) *big.Float {
		sum, power := wide(0), new(big.Float).Quo(wide(1), wide(n))
		for k := int64(1); power.MantExp(nil) > -widePi; k += 2 {
			term := new(big.Float).Quo(power, wide(k))
			if k%4 == 3 {
				term.Neg(term)
			}
			sum.Add(sum, term)
			power.Quo(power, wide(n*n))
		}
		return sum
	}
	a, b := arctangent(5), arctangent(239)
	return a.Sub(a.Mul(a, wide(8)), b.Mul(b, wide(2)))
})

// sin is the sine of x radians.
func sin(x float64) float64 {
	y0, y1, turns := quarter(x)
	return turned(y0, y1, turns)
}

// cos is the cosine of x radians.
func cos(x float64) float64 {
	y0, y1, turns := quarter(x)
	return turned(y0, y1, turns+1)
}

func turned(y0, y1 float64, turns int) float64 {
	switch turns & 3 {
	case 0:
		return sinNear(y0, y1)
	case 1:
		return cosNear(y0, y1)
	case 2:
		return -sinNear(y0, y1)
	}
	return -cosNear(y0, y1)
}

// sinNear is the sine of x + y for |x| up to pi/4.
func sinNear(x, y float64) float64 {
	z := float64(x * x)
	v := float64(z * x)
	r := 8.33333333332248946124e-03 + float64(z*(-1.98412698298579493134e-04+float64(z*(2.75573137070700676789e-06+float64(z*(-2.50507602534068634195e-08+float64(z*1.58969099521155010221e-10)))))))
	return x - (float64(z*(float64(0.5*y)-float64(v*r))) - y - float64(v*-1.66666666666666324348e-01))
}

// cosNear is the cosine of x + y for |x| up to pi/4.
func cosNear(x, y float64) float64 {
	z := float64(x * x)
	r := float64(z * (4.16666666666666019037e-02 + float64(z*(-1.38888888888741095749e-03+float64(z*(2.48015872894767294178e-05+float64(z*(-2.75573143513906633035e-07+float64(z*(2.08757232129817482790e-09+float64(z*-1.13596475577881948265e-11)))))))))))
	h := float64(0.5 * z)
	w := 1 - h
	return w + ((1 - w - h) + (float64(z*r) - float64(x*y)))
}
