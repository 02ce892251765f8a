package tape

import (
	"go/token"
	"math"
)

// A node is one operation of a graph; a, b and c are operands, numbers of
// earlier nodes, or immediates.
type node struct {
	op      Op
	a, b, c int32
}

// value of a constant: its bits stand in a and b.
func (n node) value() float64 {
	return math.Float64frombits(uint64(uint32(n.a)) | uint64(uint32(n.b))<<32)
}

// operands returns the numbers of the operands.
func (n *node) operands() (ids [3]int32, count int) {
	return [3]int32{n.a, n.b, n.c}, kinds[n.op].arity
}

// A graph is a set of operations in static single assignment form, each written
// once: asking for one that is there returns the old. Operands come before
// their users, so the order of nodes is an order of evaluation.
type graph struct {
	nodes []node
	table []int32 // open addressing: number of a node plus 1
	loose bool    // the sign of a zero and the place of a constant may change

	// While recording: where each node came from, its value at the sample
	// point, and how many nodes there may be.
	tracing bool
	at      token.Pos
	pos     []token.Pos
	sample  []float64
	leaf    func(node) float64 // value of a leaf at the sample point
	limit   int
	full    func()
}

func newGraph() *graph { return &graph{table: make([]int32, 256)} }

func hash(n node) uint64 {
	h := uint64(n.op)*0x9e3779b97f4a7c15 ^ uint64(uint32(n.a))*0xbf58476d1ce4e5b9 ^ uint64(uint32(n.b))*0x94d049bb133111eb ^ uint64(uint32(n.c))*0xd6e8feb86659fd93
	h ^= h >> 32
	h *= 0x9e3779b97f4a7c15
	return h ^ h>>29
}

// intern returns the number of the node, which it adds when it is new.
func (g *graph) intern(n node) int32 {
	mask := uint64(len(g.table) - 1)
	i := hash(n) & mask
	for g.table[i] != 0 {
		if id := g.table[i] - 1; g.nodes[id] == n {
			return id
		}
		i = (i + 1) & mask
	}
	id := int32(len(g.nodes))
	g.nodes = append(g.nodes, n)
	g.table[i] = id + 1
	if 2*len(g.nodes) > len(g.table) {
		g.grow()
	}
	if g.tracing {
		g.trace(n)
	}
	return id
}

func (g *graph) grow() {
	g.table = make([]int32, 2*len(g.table))
	mask := uint64(len(g.table) - 1)
	for id, n := range g.nodes {
		i := hash(n) & mask
		for g.table[i] != 0 {
			i = (i + 1) & mask
		}
		g.table[i] = int32(id) + 1
	}
}

func (g *graph) trace(n node) {
	g.pos = append(g.pos, g.at)
	var v float64
	switch {
	case n.op == opConst:
		v = n.value()
	case n.op.leaf():
		v = g.leaf(n)
	default:
		var x [3]float64
		ids, count := n.operands()
		for k, id := range ids[:count] {
			x[k] = g.sample[id]
		}
		v = apply(n.op, x[0], x[1], x[2], int(n.c))
	}
	g.sample = append(g.sample, v)
	if len(g.nodes) > g.limit {
		g.full()
	}
}

// constant returns the node of a constant. Constants are told apart by their
// bits, but all NaNs are one.
func (g *graph) constant(v float64) int32 {
	if math.IsNaN(v) {
		v = math.NaN()
	}
	bits := math.Float64bits(v)
	return g.intern(node{op: opConst, a: int32(uint32(bits)), b: int32(uint32(bits >> 32))})
}

// known returns the value of a node that is a constant.
func (g *graph) known(id int32) (float64, bool) {
	if n := g.nodes[id]; n.op == opConst {
		return n.value(), true
	}
	return 0, false
}

// is reports whether a node is that constant, to the bit.
func (g *graph) is(id int32, v float64) bool {
	n := g.nodes[id]
	return n.op == opConst && math.Float64bits(n.value()) == math.Float64bits(v)
}

// unary returns the node of an operation of one operand; k is its immediate.
func (g *graph) unary(op Op, a int32, k int) int32 {
	if v, ok := g.known(a); ok {
		return g.constant(apply(op, v, 0, 0, k))
	}
	n := g.nodes[a]
	switch {
	case op == opNeg && n.op == opNeg, op == opNot && n.op == opNot:
		return n.a
	case op == opNeg && g.loose && n.op == opSub:
		return g.binary(opSub, n.b, n.a)
	}
	return g.intern(node{op: op, a: a, c: int32(k)})
}

// binary returns the node of an operation of two operands.
func (g *graph) binary(op Op, a, b int32) int32 {
	va, ka := g.known(a)
	vb, kb := g.known(b)
	if ka && kb {
		return g.constant(apply(op, va, vb, 0, 0))
	}
	if id, ok := g.simplify(op, a, b); ok {
		return id
	}
	if kinds[op].commutative && a > b {
		a, b = b, a
	}
	return g.intern(node{op: op, a: a, b: b})
}

// simplify folds what has the same bits: 1*x, x/1, -1*x, x-0, x+(-0). Where
// signs of zeros do not matter also x+0, 0-x and sums with negatives; 0*x never.
func (g *graph) simplify(op Op, a, b int32) (int32, bool) {
	switch op {
	case opMul:
		return g.simplifyProduct(a, b)
	case opMulSkip:
		if g.is(a, 0) {
			return a, true
		}
		if g.is(a, 1) || g.is(b, 1) || g.is(a, -1) || g.is(b, -1) {
			return g.simplifyProduct(a, b)
		}
	case opDiv:
		if g.is(b, 1) {
			return a, true
		}
		if g.is(b, -1) {
			return g.unary(opNeg, a, 0), true
		}
	case opSub:
		if g.is(b, 0) {
			return a, true
		}
		if g.loose {
			return g.simplifyDifference(a, b)
		}
	case opAdd:
		if g.is(a, math.Copysign(0, -1)) {
			return b, true
		}
		if g.is(b, math.Copysign(0, -1)) {
			return a, true
		}
		if g.loose {
			return g.simplifySum(a, b)
		}
	case opAnd, opOr:
		return g.simplifyTruth(op, a, b)
	}
	return 0, false
}

func (g *graph) simplifyProduct(a, b int32) (int32, bool) {
	switch {
	case g.is(a, 1):
		return b, true
	case g.is(b, 1):
		return a, true
	case g.is(a, -1):
		return g.unary(opNeg, b, 0), true
	case g.is(b, -1):
		return g.unary(opNeg, a, 0), true
	}
	if g.loose {
		na, nb := g.nodes[a], g.nodes[b]
		switch {
		case na.op == opNeg && nb.op == opNeg:
			return g.binary(opMul, na.a, nb.a), true
		case na.op == opNeg:
			return g.unary(opNeg, g.binary(opMul, na.a, b), 0), true
		case nb.op == opNeg:
			return g.unary(opNeg, g.binary(opMul, a, nb.a), 0), true
		}
	}
	return 0, false
}

func (g *graph) simplifyDifference(a, b int32) (int32, bool) {
	if g.is(a, 0) {
		return g.unary(opNeg, b, 0), true
	}
	if n := g.nodes[b]; n.op == opNeg {
		return g.binary(opAdd, a, n.a), true
	}
	return 0, false
}

func (g *graph) simplifySum(a, b int32) (int32, bool) {
	na, nb := g.nodes[a], g.nodes[b]
	switch {
	case g.is(a, 0):
		return b, true
	case g.is(b, 0):
		return a, true
	case nb.op == opNeg:
		return g.binary(opSub, a, nb.a), true
	case na.op == opNeg:
		return g.binary(opSub, b, na.a), true
	}
	return 0, false
}

func (g *graph) simplifyTruth(op Op, a, b int32) (int32, bool) {
	if a == b {
		return a, true
	}
	decided, neutral := 0.0, 1.0
	if op == opOr {
		decided, neutral = 1, 0
	}
	switch {
	case g.is(a, decided), g.is(b, neutral):
		return a, true
	case g.is(b, decided), g.is(a, neutral):
		return b, true
	}
	return 0, false
}

// choose returns b where cond holds and c elsewhere.
func (g *graph) choose(cond, b, c int32) int32 {
	if v, ok := g.known(cond); ok {
		if v != 0 {
			return b
		}
		return c
	}
	if b == c {
		return b
	}
	if n := g.nodes[cond]; n.op == opNot {
		cond, b, c = n.a, c, b
	}
	return g.intern(node{op: opSelect, a: cond, b: b, c: c})
}

// fma returns the node of a fused multiply-add.
func (g *graph) fma(a, b, c int32) int32 {
	va, ka := g.known(a)
	vb, kb := g.known(b)
	vc, kc := g.known(c)
	if ka && kb && kc {
		return g.constant(math.FMA(va, vb, vc))
	}
	return g.intern(node{op: opFMA, a: a, b: b, c: c})
}

// live marks the nodes that the given ones need.
func (g *graph) live(outputs []int32) []bool {
	need := make([]bool, len(g.nodes))
	last := int32(-1)
	for _, id := range outputs {
		if id >= 0 {
			need[id] = true
			last = max(last, id)
		}
	}
	for id := last; id >= 0; id-- {
		if !need[id] {
			continue
		}
		ids, count := g.nodes[id].operands()
		for _, k := range ids[:count] {
			need[k] = true
		}
	}
	return need
}
