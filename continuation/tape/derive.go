package tape

import "math"

// A deriver adds derivatives to a graph. none stands for a derivative that is
// zero whatever the values are.
type deriver struct {
	g     *graph
	multi bool // several derivatives share the operands: divide once
}

const none = int32(-1)

func (d *deriver) neg(a int32) int32 {
	if a == none {
		return none
	}
	return d.g.unary(opNeg, a, 0)
}

func (d *deriver) add(a, b int32) int32 {
	switch {
	case a == none:
		return b
	case b == none:
		return a
	}
	return d.g.binary(opAdd, a, b)
}

func (d *deriver) sub(a, b int32) int32 {
	switch {
	case b == none:
		return a
	case a == none:
		return d.neg(b)
	}
	return d.g.binary(opSub, a, b)
}

func (d *deriver) mul(a, b int32) int32 {
	if a == none || b == none {
		return none
	}
	return d.g.binary(opMul, a, b)
}

func (d *deriver) div(a, b int32) int32 {
	if a == none {
		return none
	}
	if d.multi {
		return d.g.binary(opMul, a, d.g.binary(opDiv, d.g.constant(1), b))
	}
	return d.g.binary(opDiv, a, b)
}

func (d *deriver) constant(v float64) int32   { return d.g.constant(v) }
func (d *deriver) unary(op Op, a int32) int32 { return d.g.unary(op, a, 0) }
func (d *deriver) square(a int32) int32       { return d.g.binary(opMul, a, a) }
func (d *deriver) plus(a int32, v float64) int32 {
	return d.g.binary(opAdd, a, d.g.constant(v))
}

// select_ picks a derivative by a condition.
func (d *deriver) choose(cond, b, c int32) int32 {
	if b == none && c == none {
		return none
	}
	if b == none {
		b = d.g.constant(0)
	}
	if c == none {
		c = d.g.constant(0)
	}
	return d.g.choose(cond, b, c)
}

// tangent returns the derivative of node id, given those of its operands.
func (d *deriver) tangent(id, ta, tb, tc int32) int32 {
	n := d.g.nodes[id]
	if n.op.leaf() || kinds[n.op].flat || ta == none && tb == none && tc == none {
		return none
	}
	switch n.op {
	case opNeg:
		return d.neg(ta)
	case opAdd:
		return d.add(ta, tb)
	case opSub:
		return d.sub(ta, tb)
	case opMul:
		return d.product(n, ta, tb)
	case opDiv:
		return d.quotient(id, n, ta, tb)
	case opSelect:
		return d.choose(n.a, tb, tc)
	case opFMA:
		return d.add(d.product(n, ta, tb), tc)
	}
	if kinds[n.op].arity == 1 {
		return d.chain(id, n, ta)
	}
	return d.tangent2(id, n, ta, tb)
}

func (d *deriver) product(n node, ta, tb int32) int32 {
	if n.a == n.b {
		t := d.mul(n.a, ta)
		return d.add(t, t)
	}
	return d.add(d.mul(ta, n.b), d.mul(n.a, tb))
}

// quotient is (ta - q tb)/b with q = a/b. The removable singularities of
// x/(exp(x) - 1) and its kin have derivatives of their own.
func (d *deriver) quotient(id int32, n node, ta, tb int32) int32 {
	if x, sign, ok := d.riseOf(n.a, n.b); ok {
		return d.mul(d.mul(d.constant(sign), d.g.unary(opRise, x, 1)), ta)
	}
	if x, factor, ok := d.exprelOf(n.a, n.b); ok {
		return d.mul(d.mul(d.constant(factor), d.g.unary(opExprel, x, 1)), tb)
	}
	return d.div(d.sub(ta, d.mul(id, tb)), n.b)
}

// tangent2 is for the functions of two operands.
func (d *deriver) tangent2(id int32, n node, ta, tb int32) int32 {
	g := d.g
	switch n.op {
	case opMulSkip:
		return d.add(d.skip(ta, n.b), d.skip(n.a, tb))
	case opMax, opGreatest:
		return d.choose(g.binary(opLess, n.a, n.b), tb, ta)
	case opMin, opLeast:
		return d.choose(g.binary(opLess, n.b, n.a), tb, ta)
	case opCopysign:
		return d.mul(d.mul(d.sign(n.a), d.sign(n.b)), ta)
	case opDim:
		return d.choose(g.binary(opLess, n.b, n.a), d.sub(ta, tb), none)
	case opMod, opRemainder:
		if tb == none {
			return ta
		}
		whole := g.unary(opRoundToEven, g.binary(opDiv, g.binary(opSub, n.a, id), n.b), 0)
		return d.sub(ta, d.mul(whole, tb))
	case opHypot:
		return d.add(d.mul(g.binary(opDiv, n.a, id), ta), d.mul(g.binary(opDiv, n.b, id), tb))
	case opAtan2:
		square := g.binary(opAdd, d.square(n.a), d.square(n.b))
		return d.div(d.sub(d.mul(n.b, ta), d.mul(n.a, tb)), square)
	case opPow:
		return d.add(d.powBase(n, ta), d.powExponent(id, n, tb))
	}
	panic("tape: no derivative of " + kinds[n.op].name)
}

func (d *deriver) skip(a, b int32) int32 {
	if a == none || b == none {
		return none
	}
	return d.g.binary(opMulSkip, a, b)
}

// sign is 1 or -1.
func (d *deriver) sign(a int32) int32 { return d.g.binary(opCopysign, d.constant(1), a) }

// powBase is the part of the derivative of x^y that comes from x: y x^(y-1) x'.
// Where y is a symbol, y = 0 is looked at apart, as 0·x^(-1) has no value at 0.
func (d *deriver) powBase(n node, ta int32) int32 {
	if ta == none {
		return none
	}
	y, known := d.g.known(n.b)
	if known && y == 0 {
		return none
	}
	lower := d.power(n.a, d.g.binary(opSub, n.b, d.constant(1)))
	slope := d.mul(n.b, lower)
	if !known {
		slope = d.choose(d.g.binary(opEqual, n.b, d.constant(0)), none, slope)
	}
	return d.mul(slope, ta)
}

// power is x^y, with products for the small whole y.
func (d *deriver) power(x, y int32) int32 {
	v, known := d.g.known(y)
	switch {
	case known && v == 0:
		return d.constant(1)
	case known && v == 1:
		return x
	case known && v == 2:
		return d.square(x)
	case known && v == 3:
		return d.g.binary(opMul, d.square(x), x)
	case known && v == -1:
		return d.g.binary(opDiv, d.constant(1), x)
	case known && v == 0.5:
		return d.unary(opSqrt, x)
	}
	return d.g.binary(opPow, x, y)
}

// powExponent is the part that comes from y: x^y log(x) y', which is 0 where
// x^y is 0.
func (d *deriver) powExponent(id int32, n node, tb int32) int32 {
	if tb == none {
		return none
	}
	return d.mul(d.skip(id, d.unary(opLog, n.a)), tb)
}

// chain is the derivative of a function of one operand.
func (d *deriver) chain(id int32, n node, t int32) int32 {
	switch n.op {
	case opLog:
		return d.div(t, n.a)
	case opLog1p:
		return d.div(t, d.plus(n.a, 1))
	case opLog2:
		return d.div(t, d.mul(n.a, d.constant(math.Ln2)))
	case opLog10:
		return d.div(t, d.mul(n.a, d.constant(math.Ln10)))
	case opSqrt:
		return d.div(t, d.add(id, id))
	case opCbrt:
		return d.div(t, d.mul(d.constant(3), d.square(id)))
	case opAsin:
		return d.div(t, d.arcsine(n.a))
	case opAcos:
		return d.neg(d.div(t, d.arcsine(n.a)))
	case opAtan:
		return d.div(t, d.plus(d.square(n.a), 1))
	case opAsinh:
		return d.div(t, d.g.binary(opHypot, n.a, d.constant(1)))
	case opAcosh:
		return d.div(t, d.mul(d.unary(opSqrt, d.plus(n.a, -1)), d.unary(opSqrt, d.plus(n.a, 1))))
	case opAtanh:
		return d.div(t, d.complement(n.a))
	}
	return d.mul(d.slope(id, n), t)
}

// complement is 1 - a² with one rounding, so that it does not cancel near ±1;
// its derivatives do not cancel near 0 as those of (1-a)(1+a) would.
func (d *deriver) complement(a int32) int32 {
	return d.g.fma(d.neg(a), a, d.constant(1))
}

func (d *deriver) arcsine(a int32) int32 { return d.unary(opSqrt, d.complement(a)) }

// slope is the derivative of a function with respect to its operand.
func (d *deriver) slope(id int32, n node) int32 {
	k := int(n.c)
	switch n.op {
	case opAbs:
		return d.sign(n.a)
	case opExp:
		return id
	case opExp2:
		return d.mul(id, d.constant(math.Ln2))
	case opExpm1:
		return d.unary(opExp, n.a)
	case opSin:
		return d.unary(opCos, n.a)
	case opCos:
		return d.neg(d.unary(opSin, n.a))
	case opTan:
		return d.plus(d.square(id), 1)
	case opSinh:
		return d.unary(opCosh, n.a)
	case opCosh:
		return d.unary(opSinh, n.a)
	case opTanh:
		// 1/cosh², as 1 - tanh² cancels.
		return d.square(d.g.binary(opDiv, d.constant(1), d.unary(opCosh, n.a)))
	case opErf:
		return d.bell(n.a, 2/math.SqrtPi)
	case opErfc:
		return d.bell(n.a, -2/math.SqrtPi)
	case opErfinv:
		return d.mul(d.constant(math.SqrtPi/2), d.unary(opExp, d.square(id)))
	case opGamma:
		return d.mul(id, d.g.unary(opPsi, n.a, 0))
	case opLgamma:
		return d.g.unary(opPsi, n.a, 0)
	case opPsi, opRise, opExprel:
		return d.g.unary(n.op, n.a, k+1)
	case opBesselJ, opBesselY:
		if k == 0 {
			return d.neg(d.g.unary(n.op, n.a, 1))
		}
		return d.mul(d.constant(0.5), d.sub(d.g.unary(n.op, n.a, k-1), d.g.unary(n.op, n.a, k+1)))
	}
	panic("tape: no derivative of " + kinds[n.op].name)
}

func (d *deriver) bell(a int32, height float64) int32 {
	return d.mul(d.constant(height), d.unary(opExp, d.neg(d.square(a))))
}
