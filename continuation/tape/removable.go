package tape

// riseOf recognises x/(exp(x) - 1) with a numerator and an exponent that are
// multiples of one thing. It returns the exponent, and the sign that 1 - exp(x)
// as a denominator brings. With N = k u, x = l u the quotient is (k/l) B(x), and
// its derivative B'(x) N'.
func (d *deriver) riseOf(a, b int32) (x int32, sign float64, ok bool) {
	x, sign, ok = d.expLessOne(b)
	if !ok {
		return 0, 0, false
	}
	u, _ := d.multiple(a)
	v, _ := d.multiple(x)
	return x, sign, u == v
}

// exprelOf recognises (exp(x) - 1)/N. With N = k u, x = l u the quotient is
// (l/k) E(x), and its derivative (l/k)² E'(x) N'.
func (d *deriver) exprelOf(a, b int32) (x int32, factor float64, ok bool) {
	x, sign, ok := d.expLessOne(a)
	if !ok {
		return 0, 0, false
	}
	u, k := d.multiple(b)
	v, l := d.multiple(x)
	return x, sign * (l / k) * (l / k), u == v
}

// expLessOne recognises expm1(x), exp(x) - 1 and 1 - exp(x).
func (d *deriver) expLessOne(id int32) (x int32, sign float64, ok bool) {
	n := d.g.nodes[id]
	switch n.op {
	case opExpm1:
		return n.a, 1, true
	case opNeg:
		x, sign, ok = d.expLessOne(n.a)
		return x, -sign, ok
	case opSub, opAdd:
		a, b := d.g.nodes[n.a], d.g.nodes[n.b]
		minus := n.op == opSub
		switch {
		case a.op == opExp && (minus && d.g.is(n.b, 1) || !minus && d.g.is(n.b, -1)):
			return a.a, 1, true
		case b.op == opExp && (minus && d.g.is(n.a, 1)):
			return b.a, -1, true
		case b.op == opExp && (!minus && d.g.is(n.a, -1)):
			return b.a, 1, true
		}
	}
	return 0, 0, false
}

// multiple writes a node as a known factor times another one.
func (d *deriver) multiple(id int32) (u int32, factor float64) {
	factor = 1
	for {
		n := d.g.nodes[id]
		switch n.op {
		case opNeg:
			id, factor = n.a, -factor
			continue
		case opMul:
			if v, ok := d.g.known(n.a); ok && v != 0 {
				id, factor = n.b, factor*v
				continue
			}
			if v, ok := d.g.known(n.b); ok && v != 0 {
				id, factor = n.a, factor*v
				continue
			}
		case opDiv:
			if v, ok := d.g.known(n.b); ok && v != 0 {
				id, factor = n.a, factor/v
				continue
			}
		case opSub:
			if n.a > n.b {
				return d.g.intern(node{op: opSub, a: n.b, b: n.a}), -factor
			}
		}
		return id, factor
	}
}
