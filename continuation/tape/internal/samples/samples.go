// Package samples holds small models that between them use the language that can
// be recorded. They are compiled, and their source is recorded; both must give
// the same bits.
package samples

import (
	_ "embed"
	"math"
)

// Source is the text of this file.
//
//go:embed samples.go
var Source string

// Params are the parameters of all samples.
type Params struct {
	A, B  float64
	Table [4]float64
	N     int
}

// Models lists the samples by the name of their function.
var Models = map[string]func(u []float64, q Params, f []float64){
	"arrays": arrays, "structs": structs, "pointers": pointers, "appends": appends, "aliases": aliases,
	"closures": closures, "perIteration": perIteration, "methods": methods, "embedded": embedded,
	"interfaces": interfaces, "results": results, "variadic": variadic, "recursion": recursion, "mutual": mutual,
	"selects": selects, "early": early, "nestedReturns": nestedReturns, "loopReturns": loopReturns,
	"continues": continues, "switches": switches, "switchBreak": switchBreak, "logic": logic, "labels": labels,
	"guardedIndex": guardedIndex, "newton": newton, "bounded": bounded, "integers": integers, "swaps": swaps,
	"extremes": extremes, "functions": functions, "rare": rare, "ranges": ranges, "constants": constants,
	"sidesWrite": sidesWrite, "panics": panics, "strings": strings, "copies": copies, "mixedExits": mixedExits,
	"truths": truths, "expressions": expressions, "floatRecursion": floatRecursion, "conditional": conditional,
	"tableSearch": tableSearch, "structResults": structResults, "exitOrder": exitOrder,
}

func arrays(u []float64, q Params, f []float64) {
	var grid [3][4]float64
	for i := range grid {
		for j := range grid[i] {
			grid[i][j] = u[i]*float64(j+1) + q.Table[j]
		}
	}
	other := grid
	other[1][2] = 7
	sum := 0.0
	for _, row := range grid {
		row[0] = 100 // a copy
		for _, v := range row[1:] {
			sum += v
		}
	}
	f[0] = sum + grid[1][2]
	f[1] = other[1][2] * grid[0][0]
	f[2] = [...]float64{2: u[0], 0: u[1]}[2] - u[2]
}

type point struct{ x, y float64 }

type segment struct {
	from, to point
	weights  []float64
}

func (p point) norm() float64 { return math.Sqrt(p.x*p.x + p.y*p.y) }

func (p *point) shift(by float64) *point {
	p.x += by
	p.y -= by
	return p
}

func structs(u []float64, q Params, f []float64) {
	s := segment{from: point{u[0], u[1]}, to: point{y: u[2]}, weights: []float64{q.A, q.B}}
	t := s
	t.from.x = 3 * u[1]
	t.weights[0] = 2 * u[0] // shared
	list := []segment{s, {to: point{1, 2}}, t}
	list[1].from = list[0].to
	list[0].to.x = 9
	f[0] = s.from.x*s.weights[0] + t.from.x
	f[1] = list[1].from.y + list[0].to.x*u[1]
	f[2] = list[2].from.x - list[0].from.x
	if s.from == list[0].from && u[0] > 0 {
		f[2]++
	}
}

func pointers(u []float64, q Params, f []float64) {
	x := u[0]
	p := &x
	*p += u[1]
	pp := &p
	**pp *= 2
	v := point{u[0], u[1]}
	r := &v.y
	*r = 5 * u[2]
	e := &u[2]
	*e -= 1
	n := new(float64)
	*n = *e + x
	f[0], f[1], f[2] = x, v.y-v.x, *n
	set(&f[0], f[0]*q.A)
	w := &point{1, u[1]}
	w.shift(u[0]).shift(1)
	f[1] += w.x * w.y
}

func set(p *float64, v float64) { *p = v }

func appends(u []float64, q Params, f []float64) {
	var list []float64
	for i, v := range u {
		list = append(list, v*float64(i), v+q.A)
	}
	list = append(list, list...)
	copy(list[1:], list)
	f[0], f[1], f[2] = 0, list[3], list[len(list)-1]
	for i := len(list) - 1; i >= 0; i -= 2 {
		f[0] += list[i] / float64(i+1)
	}
	two := make([][]float64, 2, 5)
	for i := range two {
		two[i] = make([]float64, 3)
		two[i][i] = u[i]
	}
	two = append(two, u)
	f[1] += two[0][0] + two[1][1]*two[2][2] + two[0][2]
}

func aliases(u []float64, q Params, f []float64) {
	a := make([]float64, 2, 4)
	b := append(a, u[0])
	c := append(a, u[1]) // the same array as b
	d := append(c, 1, 2, 3)
	d[0] = u[2]
	f[0] = b[2]
	f[1] = a[0] + d[0]
	e := u[:2:2]
	e = append(e, 4)
	e[0] = 77
	f[2] = u[0] + float64(cap(u[1:]))*q.B
}

func closures(u []float64, q Params, f []float64) {
	total := 0.0
	add := func(v float64) float64 {
		total += v * q.A
		return total
	}
	scale := func(k float64) func(float64) float64 {
		return func(x float64) float64 { return k * x * u[1] }
	}
	twice := scale(2)
	f[0] = add(u[0]) + add(u[1])
	f[1] = twice(u[2]) + apply(math.Sin, u[0]) + apply(twice, 3)
	f[2] = total
	var fact func(n int) float64
	fact = func(n int) float64 {
		if n <= 1 {
			return u[0]
		}
		return float64(n) * fact(n-1)
	}
	f[2] -= fact(4)
}

func apply(g func(float64) float64, x float64) float64 { return g(x) }

func perIteration(u []float64, q Params, f []float64) {
	var gs []func() float64
	for i := 0; i < 3; i++ {
		gs = append(gs, func() float64 { return u[i] * float64(i) })
	}
	for _, v := range u {
		gs = append(gs, func() float64 { return v })
	}
	f[0], f[1], f[2] = 0, gs[2](), gs[4]()
	for _, g := range gs {
		f[0] += g()
	}
}

func methods(u []float64, q Params, f []float64) {
	p := point{u[0], u[1]}
	p.shift(u[2])
	g := p.norm
	h := p.shift
	p.x = 10
	h(1)
	k := point.norm
	m := (*point).shift
	f[0], f[1] = g(), p.x*p.y
	m(&p, 2)
	f[2] = k(p) + q.B
}

type body struct {
	point
	mass float64
	*segment
}

func embedded(u []float64, q Params, f []float64) {
	b := body{point: point{u[0], u[1]}, mass: u[2], segment: &segment{to: point{1, 2}}}
	b.x *= 2
	b.shift(b.mass)
	b.to.x = u[1]
	f[0], f[1], f[2] = b.x+b.norm(), b.point.y, b.segment.to.x+b.to.y*q.A
}

type law interface{ rate(x float64) float64 }

type linear struct{ k float64 }

type hill struct{ k, n float64 }

func (l linear) rate(x float64) float64 { return l.k * x }

func (h *hill) rate(x float64) float64 {
	p := math.Pow(math.Abs(x), h.n)
	return p / (h.k + p)
}

func interfaces(u []float64, q Params, f []float64) {
	laws := []law{linear{q.A}, &hill{1 + q.B*q.B, 2}, nil}
	for i, l := range laws {
		switch l := l.(type) {
		case linear:
			f[i] = l.k + l.rate(u[i])
		case *hill:
			f[i] = l.n * l.rate(u[i])
		default:
			f[i] = u[i]
		}
	}
	if l, ok := laws[0].(linear); ok {
		f[2] += l.k
	}
	if _, ok := laws[0].(*hill); ok {
		f[2] += 1000
	}
}

func split(x float64) (half, rest float64) {
	half = x / 2
	if x > 0 {
		rest = x
		return
	}
	return half, x - half*half
}

func results(u []float64, q Params, f []float64) {
	a, b := split(u[0])
	c, _ := split(u[1])
	f[0], f[1] = split(q.A * u[2])
	f[2] = a*b + c
	s, c := math.Sincos(u[1])
	f[2] += s * c
	whole, part := math.Modf(u[0] * 3)
	f[1] += whole*0.5 + part
}

func sum(first float64, rest ...float64) float64 {
	for _, v := range rest {
		first += v
	}
	return first / float64(1+len(rest))
}

func variadic(u []float64, q Params, f []float64) {
	f[0] = sum(u[0]) + sum(u[0], u[1], q.A)
	f[1] = sum(1, u...)
	f[2] = sum(split(u[2]))
}

func recursion(u []float64, q Params, f []float64) {
	f[0] = power(u[0], 5)
	f[1] = power(u[1], q.N)
	f[2] = tree(u, 0)
}

func power(x float64, n int) float64 {
	switch {
	case n == 0:
		return 1
	case n%2 == 1:
		return x * power(x, n-1)
	}
	return power(x*x, n/2)
}

func tree(u []float64, at int) float64 {
	if at >= 7 {
		return u[at%len(u)]
	}
	return tree(u, 2*at+1) - 0.5*tree(u, 2*at+2)
}

func mutual(u []float64, q Params, f []float64) {
	f[0], f[1], f[2] = even(6, u[0]), odd(6, u[1]), u[2]*q.B
}

func even(n int, x float64) float64 {
	if n == 0 {
		return x
	}
	return x + odd(n-1, x*1.5)
}

func odd(n int, x float64) float64 {
	if n == 0 {
		return -x
	}
	return 1 - even(n-1, x*0.5)
}

func selects(u []float64, q Params, f []float64) {
	x := u[0]
	y := 0.0
	if x > 0.5 {
		y = math.Sqrt(x - 0.5)
		x = 2 * x
	} else if x > -0.5 {
		y = x * x
	} else {
		x = -x
	}
	if u[1] < u[2] {
		f[0] = y
	} else {
		f[0] = x / (u[1] - u[2])
	}
	f[1] = y + x
	if !(u[1] >= 0) {
		f[1] = math.Log(-u[1])
	}
	f[2] = u[2]
	if u[2] != u[2] || u[0] == u[1] {
		f[2] = q.A
	}
}

func early(u []float64, q Params, f []float64) {
	f[0] = limited(u[0])
	f[1] = limited(u[1]) * limited(u[2]*3)
	f[2] = u[2]
	if u[2] > 1 {
		return
	}
	f[2] = u[2]*u[2] + q.A
	if u[1] > 1 {
		f[0] = 5
		return
	}
	f[0]++
}

func limited(x float64) float64 {
	if x > 1 {
		return 1 + 0.1*math.Log(x)
	}
	if x < -1 {
		return -1
	}
	y := x * x
	return x * (1.5 - 0.5*y)
}

func nestedReturns(u []float64, q Params, f []float64) {
	for i := range f {
		f[i] = nested(u[i], u[(i+1)%3], q.A)
	}
}

func nested(a, b, c float64) float64 {
	d := a * b
	if a > 0 {
		if b > 0 {
			return a + b
		}
		d++
		if c > b {
			d *= 2
			if a > 1 {
				return d
			}
		} else {
			return c
		}
		d += 3
	} else if b > 0.5 {
		return -b
	}
	return d - c
}

func loopReturns(u []float64, q Params, f []float64) {
	for i, v := range u {
		f[i] = interpolate([]float64{-2, -1, 0.25, 1, 2}, []float64{3, 1, q.A, 2, -1}, v)
	}
}

func interpolate(xs, ys []float64, x float64) float64 {
	if x <= xs[0] {
		return ys[0]
	}
	for i := 1; i < len(xs); i++ {
		if x <= xs[i] {
			t := (x - xs[i-1]) / (xs[i] - xs[i-1])
			return ys[i-1] + t*(ys[i]-ys[i-1])
		}
	}
	return ys[len(ys)-1]
}

func tableSearch(u []float64, q Params, f []float64) {
	xs := []float64{-2, -1, 0.25, 1, 2}
	for i, v := range u {
		k := 0
		for k < len(xs)-2 && xs[k+1] < v {
			k++
		}
		f[i] = q.Table[k%4] + (v-xs[k])*float64(k+1)
	}
}

func continues(u []float64, q Params, f []float64) {
	s, n := 0.0, 0
	for i := 0; i < 6; i++ {
		n++
		v := u[i%3] * float64(i-2)
		if v > 1 {
			s += 0.25
			continue
		}
		if v < -1 {
			if q.A > 0 {
				continue
			}
			s -= v
		}
		s += v * v
	}
	f[0], f[1], f[2] = s, s*u[1], float64(n)*u[2]
}

func switches(u []float64, q Params, f []float64) {
	for i, v := range u {
		f[i] = 0
		switch {
		case v > 1:
			f[i] = v * v
		case v > 0, v < -1:
			f[i] = -v
			fallthrough
		case v == 0:
			f[i] += q.B
		default:
			f[i] = math.Exp(v)
		}
		switch i {
		case 0, 2:
			f[i] += 1
		case 1:
			f[i] += 2
			fallthrough
		case 7:
			f[i] *= 3
		}
		switch v {
		case 0.5:
			f[i] = 8
		}
	}
}

func switchBreak(u []float64, q Params, f []float64) {
	for i, v := range u {
		f[i] = v
		switch {
		case i < 2:
			if v > 0 {
				f[i] = 2 * v
				break
			}
			f[i] -= q.A
		default:
			f[i] = 1 / (1 + v*v)
		}
		f[i]++
	}
}

func logic(u []float64, q Params, f []float64) {
	a, b := u[0] > 0, u[1] > 0
	c := a && !b || u[2] < q.A && b
	d := a == b
	f[0], f[1], f[2] = 1, u[1], u[2]
	if c {
		f[0] = u[0]
	}
	if d || (c && positive(u[2])) {
		f[1] = -u[1]
	}
	if a != b && len(u) == 3 {
		f[2] *= 2
	}
	if len(u) > 5 && u[7] > 0 {
		f[2] = 0
	}
}

func positive(x float64) bool {
	if x > 0 {
		return true
	}
	return x > -0.1 && !math.Signbit(x)
}

func labels(u []float64, q Params, f []float64) {
	s := 0.0
outer:
	for i := range 4 {
		for j := range 4 {
			if j > i {
				continue outer
			}
			if i*j == 6 {
				break outer
			}
			s += u[(i+j)%3] * float64(i+1)
		}
	}
	f[0] = s
	f[1] = u[1]
choice:
	switch {
	case q.N > 1:
		for i := range 3 {
			if u[1] > 0 && i == 0 {
				break choice
			}
		}
		f[1] = u[1] * u[1]
	}
	f[2] = q.A * u[2]
}

func guardedIndex(u []float64, q Params, f []float64) {
	k := 0
	if u[0] > 0 {
		k = 1
	}
	if u[1] > 0 {
		k += 2
	}
	f[0] = q.Table[k] * u[0]
	f[1] = float64(k) + u[1]
	g := math.Sin
	if u[2] > 0 {
		g = math.Cos
	}
	f[2] = g(u[2])
}

func newton(u []float64, q Params, f []float64) {
	for i, v := range u {
		x := 1 + math.Abs(v)
		for k := 0; k < 50; k++ {
			step := (x*x - 1 - v*v) / (2 * x)
			x -= step
			if math.Abs(step) < 1e-12 {
				break
			}
		}
		f[i] = x * q.A
	}
}

func bounded(u []float64, q Params, f []float64) {
	x, k := u[0], 0
	for ; k < 20 && math.Abs(x) > 0.01; k++ {
		x /= 2
	}
	f[0], f[1], f[2] = x+float64(k)*q.A, u[1], u[2]
}

func integers(u []float64, q Params, f []float64) {
	var small uint8 = 250
	for range 10 {
		small++
	}
	var signed int16 = -32768
	signed--
	n := 7
	n <<= 3
	n ^= 5
	n &^= 1
	m := -7 / 2 * (-7 % 3)
	b := uint32(1)<<31 | 3
	b *= 2
	f[0] = u[0] * float64(small)
	f[1] = u[1] + float64(signed) + float64(n)/float64(m)
	f[2] = u[2] * float64(b>>1) * float64(int8(200+q.N)) * float64(len("abc")) * float64('a')
}

func swaps(u []float64, q Params, f []float64) {
	a, b := u[0], u[1]
	a, b = b, a+b
	p, r := point{a, b}, point{b, q.A}
	p, r = r, p
	u[0], u[1], u[2] = u[2], u[0], u[1]
	i := 0
	i, f[i] = 2, a
	f[1], f[i] = p.x-r.y, u[0]*u[1]
}

func extremes(u []float64, q Params, f []float64) {
	f[0] = max(u[0], u[1], 0.25) - min(u[2], q.A)
	f[1] = math.Max(u[0], u[1]) * math.Min(u[1], u[2]) * float64(max(q.N, 2))
	f[2] = math.Abs(u[2]-1) + math.Dim(u[0], u[1]) + math.Copysign(u[1], u[2])
}

func functions(u []float64, q Params, f []float64) {
	x, y := u[0], u[1]
	f[0] = math.Exp(x) + math.Log(2+x*x) + math.Sin(x)*math.Cos(y) + math.Tan(x/3) + math.Sqrt(y*y+1) + math.Pow(1+x*x, y)
	f[1] = math.Sinh(x) + math.Cosh(y) + math.Tanh(x*y) + math.Asin(math.Tanh(x)) + math.Acos(math.Sin(y)) + math.Atan(x) + math.Atan2(x, y)
	f[2] = math.Expm1(x) + math.Log1p(y*y) + math.Log2(1+x*x) + math.Log10(2+y*y) + math.Exp2(x) + math.Hypot(x, y) + math.Cbrt(x)*q.A
}

func rare(u []float64, q Params, f []float64) {
	x, y := u[0], 1.5+math.Abs(u[1])
	f[0] = math.Asinh(x) + math.Acosh(y) + math.Atanh(x/(1+math.Abs(x))) + math.Erf(x) + math.Erfc(x) + math.Erfinv(math.Tanh(x)) + math.FMA(x, y, q.A)
	f[1] = math.Gamma(y) + math.J0(x) + math.J1(y) + math.Jn(3, x) + math.Y0(y) + math.Y1(y) + math.Yn(2, y) + math.Ldexp(x, 3)
	lg, _ := math.Lgamma(y)
	f[2] = lg + math.Floor(x) + math.Ceil(y) + math.Trunc(x) + math.Round(y) + math.RoundToEven(x) + math.Mod(x, y) + math.Remainder(y, 0.7) + math.Inf(1)*0
	if math.IsNaN(f[2]) || math.IsInf(x, 0) {
		f[2] = lg - math.Pow10(2)
	}
}

func ranges(u []float64, q Params, f []float64) {
	s := 0.0
	for i := range 3 {
		s += u[i]
	}
	for i, v := range q.Table {
		s += v * float64(i)
	}
	for i := range &q.Table {
		q.Table[i] = s // a copy of the parameters
	}
	for _, c := range []int{2, 0, 1} {
		s = s*0.5 + u[c]
	}
	for range len(u) {
		s++
	}
	var k int
	for k = range u {
	}
	f[0], f[1], f[2] = s, q.Table[1]+float64(k), u[1]
}

const (
	first = iota + 1
	second
	third
)

const gas = 8.314462618

func constants(u []float64, q Params, f []float64) {
	const h = 1.0 / third
	type temperature float64
	t := temperature(300) + temperature(u[0])
	f[0] = float64(t) * gas * h
	f[1] = u[1]*second + math.Pi/4 + first/2
	f[2] = u[2] * (1 << 3) * 1e-3 * math.MaxInt8
}

func sidesWrite(u []float64, q Params, f []float64) {
	list := []float64{0, 0, 0}
	p := &point{}
	count := func(v float64) { list[0] += v }
	if u[0] > 0 {
		count(u[0])
		p.shift(u[1])
		f[1] = 1
	} else {
		list[2] = u[0]
		p = p.shift(2)
		count(1)
	}
	f[0] = list[0] + p.x*p.y
	f[1] = list[1] + u[1]*q.A
	f[2] = list[2]
}

func panics(u []float64, q Params, f []float64) {
	if u[0] > 1e6 {
		panic("too hot")
	}
	f[0], f[1], f[2] = u[0], checked(u[1]), u[2]*q.B
}

func checked(x float64) float64 {
	if x < -1e9 {
		panic(x)
	}
	return math.Sqrt(1 + x*x)
}

func strings(u []float64, q Params, f []float64) {
	kind := "quad"
	if q.N == 3 {
		kind += "ratic"
	}
	switch kind[:5] {
	case "quadr":
		f[0] = u[0] * u[0]
	default:
		f[0] = u[0]
	}
	f[1] = u[1] * float64(len(kind))
	f[2] = u[2] + float64(kind[1])
}

func copies(u []float64, q Params, f []float64) {
	a := []point{{1, u[0]}, {u[1], 2}}
	b := make([]point, 3)
	n := copy(b[1:], a)
	a[0].y = 50
	b[2].x *= q.A
	clear(a)
	f[0], f[1], f[2] = b[1].y*float64(n), b[2].x, a[1].x+u[2]
}

func mixedExits(u []float64, q Params, f []float64) {
	for i := range f {
		f[i] = search(u[i], u[(i+1)%3], q.A)
	}
}

func search(x, y, a float64) float64 {
	s := 0.0
	for i := 0; i < 4; i++ {
		v := x*float64(i) - y
		if v > 2 {
			continue
		}
		if v < -2 {
			return s - a
		}
		if v > 1 {
			if y > 0 {
				return s
			}
			s++
			continue
		}
		s += v
	}
	return s * a
}

func truths(u []float64, q Params, f []float64) {
	hot := false
	if u[0] > 0.3 {
		hot = u[1] > 0
	}
	all := true
	for _, v := range u {
		all = all && v > -1
	}
	f[0], f[1], f[2] = u[0], u[1], u[2]
	if hot {
		f[0] = -1
	}
	if !all {
		f[1] = q.A
	}
	flags := [2]bool{hot, all}
	if flags[0] != flags[1] {
		f[2] += 10
	}
}

func expressions(u []float64, q Params, f []float64) {
	f[0] = 0 * u[0]
	f[1] = u[1] + 0 - (0 - u[0]) + -(-u[1]) - 0*u[2]
	f[2] = +u[2]*1/(u[0]-u[0]) + (q.A - q.A)
	f[0] += float64(u[1]*u[2]) + u[0]
	f[0] -= u[2]
	f[0] /= u[1]
	f[0]++
	f[1]--
}

func floatRecursion(u []float64, q Params, f []float64) {
	for i, v := range u {
		f[i] = halve(v) * q.A
	}
}

func halve(x float64) float64 {
	if x < 0.5 {
		return x * x
	}
	return 1 + halve(x/2)
}

func conditional(u []float64, q Params, f []float64) {
	var parts []float64
	if u[0] > 0 {
		parts = append(parts, u[0])
	}
	parts = append(parts, u[1])
	f[0] = parts[0] * q.A
	f[1] = float64(len(parts))
	f[2] = parts[len(parts)-1] + u[2]
}

func swing(x float64) (p point, ok bool) {
	if x > 1 {
		return point{x, 1}, true
	}
	p.y = x
	if x > 0 {
		p.x = 3
		return
	}
	return point{}, x < -1
}

func structResults(u []float64, q Params, f []float64) {
	for i, v := range u {
		p, ok := swing(v)
		f[i] = p.x + 2*p.y
		if ok {
			f[i] *= q.A
		}
	}
}

func exitOrder(u []float64, q Params, f []float64) {
	f[0], f[1], f[2] = 0, u[1], u[2]
	for i := range 3 {
		if u[i] > 1 {
			return
		}
		f[0] += u[i]
		if u[i] < -1 {
			f[1] = float64(i)
			continue
		}
		if f[0] > 1.5 {
			f[2] = f[0]
			return
		}
		f[0] *= 1.1
	}
	f[1] += q.A
}
