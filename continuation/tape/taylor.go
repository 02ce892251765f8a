package tape

import (
	"fmt"
	"math"
)

// A Taylor computes Taylor coefficients of f along a path
//
//	x(s) = x0 + x1 s + x2 s² + ...,  p_j(s) the same for one parameter j
//
// order by order: the coefficients of f up to order k need those of the path up
// to k. Functions are expanded by the differential equation v' = g'(u) u', in
// which g'(u) is itself a node of the tape (Griewank & Walther, chapter 13). It
// is used by one goroutine.
type Taylor struct {
	p     *Program
	free  int
	order int        // the highest that there is room for
	ops   []node     // what is needed, in the order of evaluation
	slope [][3]int32 // by node: its derivative with respect to each operand
	at    []int32    // by node: where its coefficients lie, -1 for none
	c     []float64  // order+1 coefficients for each node
}

// NewTaylor prepares expansions up to the order. An error names a function
// whose expansion is not known.
func (p *Program) NewTaylor(free, order int) (*Taylor, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	t := &Taylor{p: p, free: free, order: order}
	if err := t.collect(); err != nil {
		return nil, err
	}
	t.c = make([]float64, len(t.ops)*(order+1))
	return t, nil
}

// collect finds the nodes that are needed: those of f, and the slopes of its
// functions, and what these need in turn.
func (t *Taylor) collect() error {
	g := t.p.g
	d := &deriver{g: g}
	roots := append([]int32(nil), t.p.out...)
	done := map[int32][3]int32{}
	for {
		need := g.live(roots)
		grown := false
		for id := range need {
			n := g.nodes[id]
			if !need[id] || !expands(n.op) {
				continue
			}
			if _, ok := done[int32(id)]; ok {
				continue
			}
			if n.op == opPsi || n.op == opBesselJ || n.op == opBesselY || n.op == opGamma || n.op == opLgamma || n.op == opRise || n.op == opExprel {
				return fmt.Errorf("the Taylor coefficients of %s are not known", kinds[n.op].name)
			}
			slopes, err := t.slopes(d, int32(id), n)
			if err != nil {
				return err
			}
			done[int32(id)] = slopes
			for _, s := range slopes {
				if s != none {
					roots = append(roots, s)
				}
			}
			grown = true
		}
		if !grown {
			t.settle(need, done)
			return nil
		}
	}
}

// expands reports whether an operation is expanded by its slopes.
func expands(op Op) bool { return op >= opSqrt && !kinds[op].flat && !t0(op) }

// t0 reports whether an operation chooses one operand, by its value at order 0.
func t0(op Op) bool {
	switch op {
	case opAbs, opMax, opMin, opGreatest, opLeast, opCopysign, opDim, opMod, opRemainder, opFMA:
		return true
	}
	return false
}

func (t *Taylor) slopes(d *deriver, id int32, n node) ([3]int32, error) {
	out := [3]int32{none, none, none}
	if n.op == opPow {
		return t.powSlopes(d, id, n), nil
	}
	for k := range kinds[n.op].arity {
		out[k] = d.partial(id, n, k)
	}
	return out, nil
}

// powSlopes writes the slopes of a power with the power itself: y x^y / x and
// x^y log(x). Repeated products take the place of the first near x = 0.
func (t *Taylor) powSlopes(d *deriver, id int32, n node) [3]int32 {
	out := [3]int32{none, none, none}
	if y, ok := d.g.known(n.b); ok {
		if y == 0 {
			return out
		}
		if y == math.Trunc(y) && y > 0 && y <= 16 {
			out[0] = d.mul(n.b, t.product(d, n.a, int(y)-1))
			return out
		}
		out[0] = d.mul(n.b, d.g.binary(opDiv, id, n.a))
		return out
	}
	out[0] = d.mul(n.b, d.g.binary(opDiv, id, n.a))
	out[1] = d.skip(id, d.unary(opLog, n.a))
	return out
}

func (t *Taylor) product(d *deriver, x int32, k int) int32 {
	id := d.g.constant(1)
	for range k {
		id = d.mul(id, x)
	}
	return id
}

// settle gives every node its room, in the order of evaluation.
func (t *Taylor) settle(need []bool, slopes map[int32][3]int32) {
	t.at = make([]int32, len(need))
	for id := range need {
		t.at[id] = none
		if need[id] {
			t.at[id] = int32(len(t.ops))
			t.ops = append(t.ops, t.p.g.nodes[id])
			s, ok := slopes[int32(id)]
			if !ok {
				s = [3]int32{none, none, none}
			}
			t.slope = append(t.slope, s)
		}
	}
}

// row returns the coefficients of a node.
func (t *Taylor) row(id int32) []float64 {
	at := int(t.at[id]) * (t.order + 1)
	return t.c[at : at+t.order+1]
}

// Expand stores coefficient k of f in out, given the coefficients 0 to k of the
// path: path[i] has the n states and then the parameter, divided by nothing.
// Lower coefficients must have been expanded before, from the same path. q holds
// all parameters; where a parameter is free, path[0][n] is its value.
func (t *Taylor) Expand(k int, path [][]float64, q, out []float64) {
	for i, n := range t.ops {
		v := t.c[i*(t.order+1) : (i+1)*(t.order+1)]
		if n.op.leaf() {
			v[k] = t.leaf(n, k, path, q)
			continue
		}
		v[k] = t.coefficient(i, n, v, k)
	}
	for i, id := range t.p.out {
		out[i] = t.row(id)[k]
	}
}

func (t *Taylor) leaf(n node, k int, path [][]float64, q []float64) float64 {
	switch {
	case n.op == opState:
		return path[k][n.a]
	case n.op == opParam && int(n.a) == t.free:
		return path[k][t.p.n]
	case k > 0:
		return 0
	case n.op == opParam:
		return q[n.a]
	case n.op == opHidden:
		return *t.p.hidden[n.a].at
	}
	return n.value()
}

// coefficient is coefficient k of one operation; v has the lower ones.
func (t *Taylor) coefficient(i int, n node, v []float64, k int) float64 {
	ids, count := n.operands()
	if k == 0 {
		var x [3]float64
		for j := range count {
			x[j] = t.row(ids[j])[0]
		}
		return apply(n.op, x[0], x[1], x[2], int(n.c))
	}
	if kinds[n.op].flat {
		return 0
	}
	a := t.row(n.a)
	switch n.op {
	case opNeg:
		return -a[k]
	case opAdd:
		return a[k] + t.row(n.b)[k]
	case opSub:
		return a[k] - t.row(n.b)[k]
	case opMul:
		return convolve(a, t.row(n.b), k)
	case opMulSkip:
		if a[0] == 0 {
			return 0
		}
		return convolve(a, t.row(n.b), k)
	case opDiv:
		b := t.row(n.b)
		sum := a[k]
		for j := 1; j <= k; j++ {
			sum -= b[j] * v[k-j]
		}
		return sum / b[0]
	case opSelect:
		if a[0] != 0 {
			return t.row(n.b)[k]
		}
		return t.row(n.c)[k]
	case opFMA:
		return convolve(a, t.row(n.b), k) + t.row(n.c)[k]
	}
	if t0(n.op) {
		return t.chosen(n, v, k)
	}
	return t.chain(i, ids, count, k)
}

// chain uses k v_k = sum over j of j u_j g'_{k-j}.
func (t *Taylor) chain(i int, ids [3]int32, count, k int) float64 {
	sum := 0.0
	for op := range count {
		if t.slope[i][op] == none {
			continue
		}
		u, g := t.row(ids[op]), t.row(t.slope[i][op])
		for j := 1; j <= k; j++ {
			if u[j] != 0 {
				sum += float64(j) * u[j] * g[k-j]
			}
		}
	}
	return sum / float64(k)
}

// chosen is for what follows one of its operands, as the values at order 0 say.
func (t *Taylor) chosen(n node, v []float64, k int) float64 {
	a := t.row(n.a)
	if n.op == opAbs {
		return math.Copysign(1, a[0]) * a[k]
	}
	b := t.row(n.b)
	switch n.op {
	case opMax, opGreatest:
		if a[0] < b[0] {
			return b[k]
		}
		return a[k]
	case opMin, opLeast:
		if b[0] < a[0] {
			return b[k]
		}
		return a[k]
	case opCopysign:
		return math.Copysign(1, a[0]) * math.Copysign(1, b[0]) * a[k]
	case opDim:
		if b[0] < a[0] {
			return a[k] - b[k]
		}
		return 0
	}
	return a[k] - math.RoundToEven((a[0]-v[0])/b[0])*b[k] // mod, remainder
}

// convolve is coefficient k of a product.
func convolve(a, b []float64, k int) float64 {
	sum := 0.0
	for j := 0; j <= k; j++ {
		sum += a[j] * b[k-j]
	}
	return sum
}
