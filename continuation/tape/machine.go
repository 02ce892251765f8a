package tape

import (
	"math"
	"unsafe"
)

// A Machine runs a [Code]. It has registers of its own and is used by one
// goroutine at a time.
type Machine struct {
	code *Code
	r    []float64
	out  []float64
}

// NewMachine returns a machine for the code.
func (c *Code) NewMachine() *Machine {
	m := &Machine{code: c, r: append([]float64(nil), c.start...)}
	m.out = m.r[c.zones.out : c.zones.out+c.slots]
	return m
}

// Out holds the results of the last run. What is structurally zero is 0.
func (m *Machine) Out() []float64 { return m.out }

// Operations returns the number of instructions.
func (c *Code) Operations() int { return len(c.instrs) }

// Inputs are what a tape is evaluated at. What a code does not use may be nil.
type Inputs struct {
	X, P []float64
	W    []float64    // weights of the n equations
	Dirs [3][]float64 // directions a, b, c, of n+1 components: states, then the free parameter
}

// Run evaluates at x and p; it reports whether all guards hold. Where it reports
// false the results are those of another branch of the model, and of no use.
func (m *Machine) Run(x, p []float64) bool {
	z := &m.code.zones
	m.fill(z.states, x)
	m.fill(z.params, p)
	return m.run()
}

// RunWith is Run for codes with weights and directions.
func (m *Machine) RunWith(in *Inputs) bool {
	z := &m.code.zones
	m.fill(z.weights, in.W)
	for k, d := range z.dirs {
		m.fill(d, in.Dirs[k])
	}
	return m.Run(in.X, in.P)
}

// fill copies inputs; short lists by hand, which is faster.
func (m *Machine) fill(z zone, x []float64) {
	to := m.r[z.at : z.at+z.n]
	if z.n > 8 {
		copy(to, x)
		return
	}
	for i := range to {
		to[i] = x[i]
	}
}

func (m *Machine) run() bool {
	c := m.code
	for i := range c.hidden {
		m.r[c.zones.hidden.at+i] = *c.hidden[i].at
	}
	if len(c.instrs) > 0 {
		execute(c.instrs, unsafe.Pointer(unsafe.SliceData(m.r)))
	}
	for _, g := range c.guards {
		if (g.path < 0 || m.r[g.path] != 0) && (m.r[g.cond] != 0) != g.want {
			return false
		}
	}
	return true
}

// execute does the instructions on the registers from base on. Products are
// rounded before they are added, so that no processor fuses them. The offsets
// come from the compiler, which knows how many registers there are.
func execute(code []instr, base unsafe.Pointer) {
	for i := range code {
		in := &code[i]
		d := at(base, in.d)
		switch in.op {
		case opAdd:
			*d = *at(base, in.a) + *at(base, in.b)
		case opSub:
			*d = *at(base, in.a) - *at(base, in.b)
		case opMul:
			*d = *at(base, in.a) * *at(base, in.b)
		case opDiv:
			*d = *at(base, in.a) / *at(base, in.b)
		case opNeg:
			*d = -*at(base, in.a)
		case opCopy:
			*d = *at(base, in.a)
		case opAddAdd:
			*d = *at(base, in.a) + *at(base, in.b) + *at(base, in.c)
		case opAddSub:
			*d = *at(base, in.a) + *at(base, in.b) - *at(base, in.c)
		case opRSubAdd:
			*d = *at(base, in.c) - (*at(base, in.a) + *at(base, in.b))
		case opAddMul:
			*d = (*at(base, in.a) + *at(base, in.b)) * *at(base, in.c)
		case opAddDiv:
			*d = (*at(base, in.a) + *at(base, in.b)) / *at(base, in.c)
		case opRDivAdd:
			*d = *at(base, in.c) / (*at(base, in.a) + *at(base, in.b))
		case opSubAdd:
			*d = *at(base, in.a) - *at(base, in.b) + *at(base, in.c)
		case opSubSub:
			*d = *at(base, in.a) - *at(base, in.b) - *at(base, in.c)
		case opRSubSub:
			*d = *at(base, in.c) - (*at(base, in.a) - *at(base, in.b))
		case opSubMul:
			*d = (*at(base, in.a) - *at(base, in.b)) * *at(base, in.c)
		case opSubDiv:
			*d = (*at(base, in.a) - *at(base, in.b)) / *at(base, in.c)
		case opRDivSub:
			*d = *at(base, in.c) / (*at(base, in.a) - *at(base, in.b))
		case opMulAdd:
			*d = float64(*at(base, in.a)**at(base, in.b)) + *at(base, in.c)
		case opMulSub:
			*d = float64(*at(base, in.a)**at(base, in.b)) - *at(base, in.c)
		case opRSubMul:
			*d = *at(base, in.c) - float64(*at(base, in.a)**at(base, in.b))
		case opMulMul:
			*d = float64(*at(base, in.a)**at(base, in.b)) * *at(base, in.c)
		case opMulDiv:
			*d = float64(*at(base, in.a)**at(base, in.b)) / *at(base, in.c)
		case opRDivMul:
			*d = *at(base, in.c) / float64(*at(base, in.a)**at(base, in.b))
		case opNegMul:
			*d = -float64(*at(base, in.a) * *at(base, in.b))
		case opExpMul:
			*d = exp(*at(base, in.a)) * *at(base, in.b)
		case opExp:
			*d = exp(*at(base, in.a))
		case opSqrt:
			*d = math.Sqrt(*at(base, in.a))
		case opSelect:
			v := at(base, in.c)
			if *at(base, in.a) != 0 {
				v = at(base, in.b)
			}
			*d = *v
		case opLess:
			*d = truth(*at(base, in.a) < *at(base, in.b))
		default:
			*d = general(in, base)
		}
	}
}

// at is the register at an offset in bytes.
func at(base unsafe.Pointer, offset int32) *float64 {
	return (*float64)(unsafe.Add(base, uintptr(uint32(offset))))
}

func general(in *instr, base unsafe.Pointer) float64 {
	x := *at(base, in.a)
	switch kinds[in.op].arity {
	case 1:
		return apply(in.op, x, 0, 0, int(in.c))
	case 2:
		return apply(in.op, x, *at(base, in.b), 0, 0)
	}
	return apply(in.op, x, *at(base, in.b), *at(base, in.c), 0)
}
