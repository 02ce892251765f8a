package samples

import (
	_ "embed"
	"math"
)

// MoreSource is the text of this file; it needs Source too.
//
//go:embed more.go
var MoreSource string

func init() {
	for name, f := range map[string]func(u []float64, q Params, f []float64){
		"namedTypes": namedTypes, "fields": fields, "values": values, "scopes": scopes, "untyped": untyped,
		"functionFields": functionFields, "matrices": matrices, "embeddedInterface": embeddedInterface,
		"deepBranches": deepBranches, "branchClosures": branchClosures, "smooth": smooth, "shadows": shadows,
		"emptyThings": emptyThings, "pointerGraph": pointerGraph, "loopsOfLoops": loopsOfLoops, "namedBare": namedBare,
		"truthTable": truthTable, "constantConditions": constantConditions,
	} {
		Models[name] = f
	}
}

type vector []float64

func (v vector) dot(w vector) (s float64) {
	for i, x := range v {
		s += x * w[i]
	}
	return
}

func (v *vector) push(x float64) { *v = append(*v, x) }

type kelvin float64

func (k kelvin) celsius() float64 { return float64(k) - 273.15 }

type species int

const (
	fuel species = iota
	oxygen
	ash
)

func (s species) weight() float64 { return []float64{16, 32, 44}[s] }

func namedTypes(u []float64, q Params, f []float64) {
	v := vector{1, 2}
	v.push(u[0])
	w := vector(u)
	f[0] = v.dot(w)
	t := kelvin(300 + u[1])
	f[1] = t.celsius() * float64(t)
	for s := fuel; s <= ash; s++ {
		f[2] = 0*float64(s) + s.weight()*u[s]
	}
}

type plant struct {
	list  []point
	order [2]int
	hot   bool
	inner struct{ a, b float64 }
}

func fields(u []float64, q Params, f []float64) {
	p := plant{order: [2]int{1, 0}}
	p.list = append(p.list, point{u[0], 1}, point{x: u[1]})
	p.list[1].shift(u[2])
	for i := range p.list {
		c := &p.list[p.order[i]]
		c.x *= 2
		c.shift(0.5)
	}
	p.inner.a, p.inner.b = split(u[0])
	other := p
	other.inner.a = 40
	other.list[0].y = 3
	p.hot = u[0] > u[1]
	if p.hot && !other.hot {
		p.inner.b++
	}
	f[0] = p.list[0].x + p.list[0].y*p.inner.a
	f[1] = p.list[1].norm() + p.inner.b
	f[2] = other.inner.a * u[2]
	anon := struct{ x, y float64 }{u[0], 2}
	f[2] += anon.x * anon.y
}

func doubled(a [3]float64) [3]float64 {
	for i := range a {
		a[i] *= 2
	}
	return a
}

func values(u []float64, q Params, f []float64) {
	a := [3]float64{u[0], u[1], u[2]}
	b := doubled(a)
	c := [2][3]float64{a, b}
	d := c
	d[0][1] = 9
	a, b = b, a
	f[0] = a[0] - b[0] + c[0][1]
	f[1] = d[0][1]*c[1][2] + d[1][0]
	if a == b || c == d {
		f[1] = 0
	}
	f[2] = doubled(c[0])[2]
}

func scopes(u []float64, q Params, f []float64) {
	x := u[0]
	if x := x * 2; x > 1 {
		x++
		f[0] = x
	} else if y := x - 1; y < -2 {
		f[0] = y * x
	} else {
		x := 3.0
		f[0] = x * y
	}
	switch y := x + u[1]; {
	case y > 0:
		x := y
		f[1] = x * x
	default:
		f[1] = y
	}
	for x := 0; x < 2; x++ {
		u[2] += float64(x)
	}
	f[2] = x * u[2]
}

func untyped(u []float64, q Params, f []float64) {
	f[0] = max(u[0], 1) + min(2, u[1], q.A) + math.Max(3, u[0])
	f[1] = u[1]*2 + 1<<2 - 7/2 + 7/2.0
	k := 1 << 3
	f[1] += float64(k>>1) * 'b'
	var g float64 = 3
	g /= 2
	f[2] = math.Pow(2, 3) * g * u[2] * math.Sqrt(2)
	if u[2] > 0 == (u[1] > 0) {
		f[2] -= 1
	}
}

type reaction struct {
	rate func(x float64) float64
	next *reaction
}

func functionFields(u []float64, q Params, f []float64) {
	last := &reaction{rate: func(x float64) float64 { return x * q.A }}
	chain := &reaction{math.Tanh, &reaction{rate: limited, next: last}}
	x := u[0]
	for r := chain; r != nil; r = r.next {
		x = r.rate(x) + u[1]
	}
	table := []func(a, b float64) float64{math.Atan2, math.Hypot, func(a, b float64) float64 { return a - b }}
	f[0], f[1], f[2] = x, 0, u[2]
	for i, g := range table {
		f[1] += g(u[i], 1.5) / float64(i+1)
	}
}

func matrices(u []float64, q Params, f []float64) {
	n := len(u)
	a := make([][]float64, n)
	for i := range a {
		a[i] = make([]float64, n)
		for j := range a[i] {
			a[i][j] = u[i] * u[j] / float64(1+i+j)
			if i == j {
				a[i][j] += 4 + u[i]*u[i]
			}
		}
	}
	b := append([]float64(nil), u...)
	for k := 0; k < n; k++ { // elimination with pivots known to be positive
		for i := k + 1; i < n; i++ {
			m := a[i][k] / a[k][k]
			for j := k; j < n; j++ {
				a[i][j] -= m * a[k][j]
			}
			b[i] -= m * b[k]
		}
	}
	for i := n - 1; i >= 0; i-- {
		for j := i + 1; j < n; j++ {
			b[i] -= a[i][j] * b[j]
		}
		b[i] /= a[i][i]
	}
	copy(f, b)
}

type scaledLaw struct {
	law
	by float64
}

func (s scaledLaw) twice(x float64) float64 { return 2 * s.by * s.rate(x) }

func embeddedInterface(u []float64, q Params, f []float64) {
	var l law = scaledLaw{linear{3}, u[1]}
	f[0] = l.rate(u[0])
	f[1] = l.(scaledLaw).twice(u[1])
	var any interface{} = u[2]
	switch v := any.(type) {
	case int, string:
		f[2] = 0
	case float64:
		f[2] = v * q.A
	}
	if x, ok := any.(float64); ok {
		f[2] += x
	}
}

func deepBranches(u []float64, q Params, f []float64) {
	f[0], f[1], f[2] = u[0], u[1], u[2]
	for i, v := range u {
		if v > 0 {
			for j := range 2 {
				if u[(i+1)%3] > float64(j) {
					f[i] += v
					if f[i] > 2 {
						return
					}
					continue
				}
				switch {
				case u[(i+2)%3] > 0.5:
					f[i] *= 2
				case u[(i+2)%3] < -0.5:
					f[i] -= q.A
					if v > 1 {
						break
					}
					f[i] += 7
				}
			}
		} else if v < -1 {
			f[i] = 1 / v
		}
	}
}

func branchClosures(u []float64, q Params, f []float64) {
	count, sum := 0, 0.0
	visit := func(v float64) bool {
		count++
		if v < 0 {
			return false
		}
		sum += math.Sqrt(v)
		return v < 2
	}
	for _, v := range u {
		if visit(v) || visit(-v) {
			sum += 0.5
		}
	}
	ok := visit(q.A) && visit(u[0])
	if ok {
		sum = -sum
	}
	f[0], f[1], f[2] = sum, u[1], u[2]
}

func smooth(u []float64, q Params, f []float64) {
	step := func(x, at, width float64) float64 { return 1 / (1 + math.Exp(-(x-at)/width)) }
	f[0] = step(u[0], 0.2, 0.1) - u[0]
	f[1] = math.Pow(math.Abs(u[1])+0.1, 1+step(u[1], 0, 1)) - q.A
	f[2] = math.Log1p(math.Exp(u[2]))
}

func shadows(u []float64, q Params, f []float64) {
	len := func(x []float64) int { return 2 }
	max := func(a, b float64) float64 { return a - b }
	true := u[0] > 0
	f[0], f[1], f[2] = max(u[0], u[1]), float64(len(u))*u[1], u[2]
	if true {
		f[2] = 1
	}
}

func emptyThings(u []float64, q Params, f []float64) {
	var none []float64
	for range none {
		panic("none")
	}
	for i := range 0 {
		f[i+100] = 1
	}
	s := none[:0]
	s = append(s, u[:0]...)
	_ = struct{}{}
	{
		_, _ = split(u[0])
	}
	if none == nil && len(s) == 0 {
		f[0] = u[0]
	}
	f[1], f[2] = u[1]+float64(cap(none)), u[2]
}

type cellNode struct {
	level       float64
	left, right *cellNode
}

func (c *cellNode) total(depth int) float64 {
	if c == nil {
		return 0
	}
	c.level += float64(depth)
	return c.level + 0.5*(c.left.total(depth+1)-c.right.total(depth+1))
}

func pointerGraph(u []float64, q Params, f []float64) {
	shared := &cellNode{level: u[1]}
	root := &cellNode{u[0], &cellNode{level: u[2], left: shared}, shared}
	f[0] = root.total(0)
	f[1] = shared.level
	if root.left.left == root.right {
		f[1] *= 2
	}
	root.right = nil
	f[2] = root.total(1) * q.A
}

func loopsOfLoops(u []float64, q Params, f []float64) {
	s := 0.0
rows:
	for i := 0; i < 3; i++ {
		for j := 0; ; j++ {
			if j == 3 {
				break
			}
			v := u[i] * u[j]
			if v > 2 {
				continue rows
			}
			if v < -1 {
				s--
				continue
			}
			s += v
		}
		s *= 1.25
	}
	f[0], f[1], f[2] = s, u[1], u[2]
}

func clipped(x, low, high float64) (y float64, inside bool) {
	y, inside = x, true
	switch {
	case x < low:
		y, inside = low, false
	case x > high:
		y, inside = high, false
	}
	return
}

func namedBare(u []float64, q Params, f []float64) {
	n := 0.0
	for i, v := range u {
		y, inside := clipped(v, -0.5, 1)
		f[i] = y
		if inside {
			n += v
		}
	}
	f[0] += n
}

func truthTable(u []float64, q Params, f []float64) {
	a, b, c := u[0] > 0, u[1] > 0, u[2] > 0
	for i, t := range []bool{a && b || c, (a || b) && !c, a != (b == c)} {
		if t {
			f[i] = u[i]
		} else {
			f[i] = -2
		}
	}
	d := a
	d = d || b && c
	if d == !false {
		f[0]++
	}
}

func constantConditions(u []float64, q Params, f []float64) {
	const debug = false
	h := 0.5 / 3
	if h > 0.1 && !debug {
		f[0] = u[0]
	}
	k := int(1/h + 0.5)
	f[1] = u[1] * float64(k) * float64(int64(math.Floor(2.75)))
	f[2] = u[2]
	if debug {
		f[2] = float64(int(u[2]))
	}
}
