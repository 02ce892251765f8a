package tape

// An output is a number that a machine computes: node id, to be stored at slot.
type output struct {
	slot int
	id   int32
}

// A Code is a program for the register machine. It does not change and may be
// shared; each goroutine makes a [Machine] of its own.
type Code struct {
	instrs []instr
	start  []float64 // the registers before a run: constants and structural zeros
	zones  zones
	slots  int
	guards []guardRegs
	hidden []hidden
}

// zones says where things lie among the registers. Inputs that are not used have
// no room.
type zones struct {
	states, params, hidden, weights zone
	dirs                            [3]zone
	out                             int
}

type zone struct{ at, n int }

type guardRegs struct {
	path, cond int32 // registers; path may be -1
	want       bool
}

// An instr is one step of the register machine: r[d] = op(r[a], r[b], r[c]). In a
// finished code the registers stand as offsets in bytes.
type instr struct {
	op         Op
	d, a, b, c int32
}

// sizesOf are the numbers of inputs of each kind.
type sizesOf struct{ n, m, h, dir, weights int }

// A compiler turns nodes into instructions.
type compiler struct {
	g      *graph
	code   *Code
	order  []int32
	uses   []int32 // by node: how many instructions read it
	last   []int32 // by node: index in order of the last that does
	fused  []bool  // by node: done inside of the instruction of its only reader
	reader []bool  // by node: its instruction does another node too
	reg    []int32 // by node
	free   []int32
	regs   int32
}

func compile(g *graph, outputs []output, slots int, size sizesOf, guards []guard) *Code {
	c := &compiler{g: g, code: &Code{slots: slots}}
	ids := make([]int32, 0, len(outputs)+2*len(guards))
	for _, o := range outputs {
		ids = append(ids, o.id)
	}
	for _, gd := range guards {
		ids = append(ids, gd.cond)
		if gd.path >= 0 {
			ids = append(ids, gd.path)
		}
	}
	c.schedule(ids)
	c.layout(size, outputs)
	c.fuse(ids)
	c.allocate(outputs, guards)
	return c.code
}

// schedule orders the nodes depth first, output by output, so that what belongs
// to one output lies together.
func (c *compiler) schedule(ids []int32) {
	seen := make([]bool, len(c.g.nodes))
	var stack []int32
	for _, root := range ids {
		stack = append(stack, root)
		for len(stack) > 0 {
			id := stack[len(stack)-1]
			if seen[id] {
				stack = stack[:len(stack)-1]
				continue
			}
			ready := true
			in, count := c.g.nodes[id].operands()
			for k := count - 1; k >= 0; k-- {
				if !seen[in[k]] {
					stack = append(stack, in[k])
					ready = false
				}
			}
			if ready {
				seen[id] = true
				stack = stack[:len(stack)-1]
				c.order = append(c.order, id)
			}
		}
	}
}

// layout gives registers to constants, inputs and outputs.
func (c *compiler) layout(size sizesOf, outputs []output) {
	c.reg = make([]int32, len(c.g.nodes))
	for i := range c.reg {
		c.reg[i] = -1
	}
	z := &c.code.zones
	var used [opLess]bool
	var dirs [3]bool
	for _, id := range c.order {
		n := c.g.nodes[id]
		switch {
		case n.op == opConst:
			c.reg[id] = c.regs
			c.regs++
			c.code.start = append(c.code.start, n.value())
		case n.op == opDir:
			dirs[n.c] = true
		case n.op.leaf():
			used[n.op] = true
		}
	}
	c.room(&z.states, used[opState], size.n)
	c.room(&z.params, used[opParam], size.m)
	c.room(&z.hidden, used[opHidden], size.h)
	c.room(&z.weights, used[opWeight], size.weights)
	for k := range dirs {
		c.room(&z.dirs[k], dirs[k], size.dir)
	}
	z.out = int(c.regs)
	c.regs += int32(c.code.slots)
	for _, id := range c.order {
		n := c.g.nodes[id]
		switch n.op {
		case opState:
			c.reg[id] = int32(z.states.at) + n.a
		case opParam:
			c.reg[id] = int32(z.params.at) + n.a
		case opHidden:
			c.reg[id] = int32(z.hidden.at) + n.a
		case opWeight:
			c.reg[id] = int32(z.weights.at) + n.a
		case opDir:
			c.reg[id] = int32(z.dirs[n.c].at) + n.a
		}
	}
	for _, o := range outputs {
		if !c.g.nodes[o.id].op.leaf() && c.reg[o.id] < 0 {
			c.reg[o.id] = int32(z.out + o.slot)
		}
	}
}

func (c *compiler) room(z *zone, used bool, n int) {
	if used {
		*z = zone{int(c.regs), n}
		c.regs += int32(n)
	}
}

// allocate writes the instructions; a register is free again after the last use
// of what it holds.
func (c *compiler) allocate(outputs []output, guards []guard) {
	c.last = make([]int32, len(c.g.nodes))
	var list []instr
	for _, id := range c.order {
		if c.g.nodes[id].op.leaf() || c.fused[id] {
			continue
		}
		in := c.lower(id)
		list = append(list, in)
		for k, id := range [...]int32{in.a, in.b, in.c} {
			if k < in.op.reads() {
				c.last[id] = int32(len(list))
			}
		}
	}
	for _, gd := range guards {
		c.last[gd.cond] = int32(len(list)) + 1
		if gd.path >= 0 {
			c.last[gd.path] = int32(len(list)) + 1
		}
	}
	temps := c.regs
	for i := range list {
		c.place(&list[i], int32(i)+1, temps)
	}
	start := make([]float64, c.regs)
	copy(start, c.code.start)
	c.code.start = start
	list = c.copies(list, outputs)
	for i := range list {
		list[i].scale()
	}
	c.code.instrs = list
	for _, gd := range guards {
		r := guardRegs{path: -1, cond: c.reg[gd.cond], want: gd.want}
		if gd.path >= 0 {
			r.path = c.reg[gd.path]
		}
		c.code.guards = append(c.code.guards, r)
	}
}

// place turns the operands of an instruction into registers. Registers from temps
// on are given and taken back.
func (c *compiler) place(in *instr, now, temps int32) {
	ops := [...]*int32{&in.a, &in.b, &in.c}
	count := in.op.reads()
	var freed [3]int32
	gone := 0
	for k := range count {
		id := *ops[k]
		*ops[k] = c.reg[id]
		if c.last[id] == now && c.reg[id] >= temps {
			c.last[id] = -1 // only once
			freed[gone] = c.reg[id]
			gone++
		}
	}
	c.free = append(c.free, freed[:gone]...)
	id := in.d
	if c.reg[id] < 0 {
		if k := len(c.free); k > 0 {
			c.reg[id] = c.free[k-1]
			c.free = c.free[:k-1]
		} else {
			c.reg[id] = c.regs
			c.regs++
		}
	}
	in.d = c.reg[id]
}

// copies fills the slots of outputs that do not lie there anyway: constants once
// and for all, inputs and repeated ones by an instruction.
func (c *compiler) copies(list []instr, outputs []output) []instr {
	for _, o := range outputs {
		to := int32(c.code.zones.out + o.slot)
		n := c.g.nodes[o.id]
		switch from := c.reg[o.id]; {
		case n.op == opConst:
			c.code.start[to] = n.value()
		case from != to:
			list = append(list, instr{op: opCopy, d: to, a: from})
		}
	}
	return list
}

// scale turns registers into offsets in bytes; an immediate stays.
func (in *instr) scale() {
	in.d *= 8
	for k, at := range [...]*int32{&in.a, &in.b, &in.c} {
		if k < in.op.reads() {
			*at *= 8
		}
	}
}
