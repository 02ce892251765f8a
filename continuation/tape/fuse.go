package tape

// Operations of the machine that do two nodes in one instruction, with the
// rounding of each. x is the inner result: Add of a and b in opAddMul, which is
// (a+b)*c. An R stands before what is done from the other side: opRSubAdd is
// c - (a+b).
const (
	opCopy = opCount + iota
	opAddAdd
	opAddSub
	opRSubAdd
	opAddMul
	opAddDiv
	opRDivAdd
	opSubAdd
	opSubSub
	opRSubSub
	opSubMul
	opSubDiv
	opRDivSub
	opMulAdd
	opMulSub
	opRSubMul
	opMulMul
	opMulDiv
	opRDivMul
	opNegMul
	opExpMul // exp(a)*b
)

// reads returns how many registers an instruction reads.
func (op Op) reads() int {
	switch {
	case op < opCount:
		return kinds[op].arity
	case op == opCopy:
		return 1
	case op == opNegMul, op == opExpMul:
		return 2
	}
	return 3
}

// fuse finds nodes that only one other reads and that can be done in the same
// instruction.
func (c *compiler) fuse(ids []int32) {
	n := len(c.g.nodes)
	c.uses, c.fused, c.reader = make([]int32, n), make([]bool, n), make([]bool, n)
	for _, id := range c.order {
		in, count := c.g.nodes[id].operands()
		for _, k := range in[:count] {
			c.uses[k]++
		}
	}
	for _, id := range ids {
		c.uses[id] += 2 // an output is needed as such
	}
	for _, id := range c.order {
		n := c.g.nodes[id]
		for k, inner := range [...]int32{n.a, n.b} {
			if k < kinds[n.op].arity && c.uses[inner] == 1 && !c.reader[inner] && c.pair(n, k) != 0 {
				c.fused[inner], c.reader[id] = true, true
				break
			}
		}
	}
}

// pair returns the operation that does node n and its operand k at once, 0 when
// there is none.
func (c *compiler) pair(n node, k int) Op {
	inner := n.a
	if k == 1 {
		inner = n.b
	}
	x := c.g.nodes[inner].op
	if x == opExp && n.op == opMul {
		return opExpMul
	}
	if x == opMul && n.op == opNeg {
		return opNegMul
	}
	var first Op
	switch x {
	case opAdd:
		first = opAddAdd
	case opSub:
		first = opSubAdd
	case opMul:
		first = opMulAdd
	default:
		return 0
	}
	switch {
	case n.op == opAdd:
		return first
	case n.op == opSub:
		return first + 1 + Op(k)
	case n.op == opMul:
		return first + 3
	case n.op == opDiv:
		return first + 4 + Op(k)
	}
	return 0
}

// lower returns the instruction of a node, with operands as nodes.
func (c *compiler) lower(id int32) instr {
	n := c.g.nodes[id]
	if !c.reader[id] {
		return instr{n.op, id, n.a, n.b, n.c}
	}
	k, inner, other := 0, n.a, n.b
	if !c.fused[n.a] {
		k, inner, other = 1, n.b, n.a
	}
	x := c.g.nodes[inner]
	op := c.pair(n, k)
	switch op {
	case opExpMul:
		return instr{op, id, x.a, other, 0}
	case opNegMul:
		return instr{op, id, x.a, x.b, 0}
	}
	return instr{op, id, x.a, x.b, other}
}
