package tape

import (
	"math"
	"math/big"
	"testing"
)

const digits = 500 // bits of the numbers below

func wide(v float64) *big.Float { return new(big.Float).SetPrec(digits).SetFloat64(v) }

// precisely evaluates the nodes in wide numbers; nil stands for what is not
// finite, or for a function that is no arithmetic.
func precisely(p *Program, ids []int32, leaf func(node) *big.Float) []*big.Float {
	values := make([]*big.Float, len(p.g.nodes))
	for id, need := range p.g.live(ids) {
		if need {
			values[id] = preciseNode(p.g.nodes[id], values, leaf)
		}
	}
	out := make([]*big.Float, len(ids))
	for i, id := range ids {
		out[i] = wide(0)
		if id != none {
			out[i] = values[id]
		}
	}
	return out
}

func preciseNode(n node, values []*big.Float, leaf func(node) *big.Float) *big.Float {
	if n.op == opConst {
		if bad(n.value()) {
			return nil
		}
		return wide(n.value())
	}
	if n.op.leaf() {
		return leaf(n)
	}
	ids, count := n.operands()
	var x [3]*big.Float
	for k := range count {
		x[k] = values[ids[k]]
	}
	if n.op == opSelect && x[0] != nil {
		if x[0].Sign() != 0 {
			return x[1]
		}
		return x[2]
	}
	for k := range count {
		if x[k] == nil {
			return nil
		}
	}
	return preciseOp(n.op, x)
}

func preciseOp(op Op, x [3]*big.Float) *big.Float {
	v := wide(0)
	switch op {
	case opAdd:
		return v.Add(x[0], x[1])
	case opSub:
		return v.Sub(x[0], x[1])
	case opMul:
		return v.Mul(x[0], x[1])
	case opMulSkip:
		return v.Mul(x[0], x[1])
	case opDiv:
		if x[1].Sign() == 0 {
			return nil
		}
		return v.Quo(x[0], x[1])
	case opNeg:
		return v.Neg(x[0])
	case opAbs:
		return v.Abs(x[0])
	case opMax, opGreatest:
		if x[0].Cmp(x[1]) > 0 {
			return x[0]
		}
		return x[1]
	case opMin, opLeast:
		if x[0].Cmp(x[1]) < 0 {
			return x[0]
		}
		return x[1]
	case opCopysign:
		if v.Abs(x[0]); x[1].Signbit() {
			v.Neg(v)
		}
		return v
	case opLess:
		return wide(truth(x[0].Cmp(x[1]) < 0))
	case opLessEq:
		return wide(truth(x[0].Cmp(x[1]) <= 0))
	case opEqual:
		return wide(truth(x[0].Cmp(x[1]) == 0))
	case opNot:
		return v.Sub(wide(1), x[0])
	case opAnd:
		return v.Mul(x[0], x[1])
	case opOr:
		return wide(truth(x[0].Sign() != 0 || x[1].Sign() != 0))
	}
	return nil
}

// checkDerivatives compares derivative tapes, evaluated in wide numbers, with
// differences of the tapes that they were made of. It returns how many numbers
// were compared.
func checkDerivatives(t *testing.T, p *Program, x, q []float64, text string) int {
	t.Helper()
	w, a := []float64{1, -0.5, 2}, []float64{0.75, -1.25, 0.5, 1}
	at := func(step float64) func(node) *big.Float {
		// The step is 2^-90 times step times a.
		return func(n node) *big.Float {
			v, d := 0.0, 0.0
			switch {
			case n.op == opState:
				v, d = x[n.a], a[n.a]
			case n.op == opParam:
				v = q[n.a]
				if n.a == 0 {
					d = a[3]
				}
			case n.op == opDir:
				v = a[n.a]
			case n.op == opWeight:
				v = w[n.a]
			}
			h := wide(step * d)
			return h.Add(wide(v), h.SetMantExp(h, -90))
		}
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	d := &deriver{g: p.g}
	first := p.differentiate(d, request{free: 0, along: "a"})
	second := p.differentiate(d, request{free: 0, along: "aa"})
	count := difference(t, p, "f_z[a]", p.out, first, at, text)
	count += difference(t, p, "f_zz[a,a]", first, second, at, text)
	gradient := d.gradient(skipNone(first, p.g), p.weights(), p.variables(0), 4)
	adjoint := d.gradient(p.out, p.weights(), p.variables(0), 4)
	count += difference(t, p, "w f_zz[a,.]", adjoint, gradient, at, text)
	return count
}

// difference compares the values of slopes with central differences of ids.
func difference(t *testing.T, p *Program, what string, ids, slopes []int32, at func(float64) func(node) *big.Float, text string) int {
	t.Helper()
	up, down, got := precisely(p, ids, at(1)), precisely(p, ids, at(-1)), precisely(p, slopes, at(0))
	middle := precisely(p, ids, at(0))
	count := 0
	for i := range ids {
		if up[i] == nil || down[i] == nil || middle[i] == nil || got[i] == nil {
			continue
		}
		d, right, left := slope(up[i], down[i], 1), slope(up[i], middle[i], 0.5), slope(middle[i], down[i], 0.5)
		v, _ := got[i].Float64()
		if math.Abs(right-left) > 1e-9*(1e-9+math.Abs(d)) {
			continue // a place where the model is not smooth
		}
		if gap := math.Abs(v - d); gap > 1e-13*(math.Abs(d)+1e-9) {
			t.Fatalf("%s[%d] is %v, the difference quotient %v\n%s", what, i, v, d, text)
		}
		count++
	}
	return count
}

func slope(up, down *big.Float, step float64) float64 {
	d := wide(0).Sub(up, down)
	d.SetMantExp(d, 89)
	v, _ := d.Quo(d, wide(step)).Float64()
	return v
}
