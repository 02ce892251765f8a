package tape

import "math"

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
	if z.states.n > 0 {
		copy(m.r[z.states.at:z.states.at+z.states.n], x)
	}
	if z.params.n > 0 {
		copy(m.r[z.params.at:z.params.at+z.params.n], p)
	}
	return m.run()
}

// RunWith is Run for codes with weights and directions.
func (m *Machine) RunWith(in *Inputs) bool {
	z := &m.code.zones
	if z.weights.n > 0 {
		copy(m.r[z.weights.at:z.weights.at+z.weights.n], in.W)
	}
	for k, d := range z.dirs {
		if d.n > 0 {
			copy(m.r[d.at:d.at+d.n], in.Dirs[k])
		}
	}
	return m.Run(in.X, in.P)
}

func (m *Machine) run() bool {
	c := m.code
	for i := range c.hidden {
		m.r[c.zones.hidden.at+i] = *c.hidden[i].at
	}
	execute(c.instrs, m.r)
	for _, g := range c.guards {
		if (g.path < 0 || m.r[g.path] != 0) && (m.r[g.cond] != 0) != g.want {
			return false
		}
	}
	return true
}

// execute does the instructions. Products are rounded before they are added, so
// that no processor fuses them.
func execute(code []instr, r []float64) {
	for i := range code {
		in := &code[i]
		switch in.op {
		case opAdd:
			r[in.d] = r[in.a] + r[in.b]
		case opSub:
			r[in.d] = r[in.a] - r[in.b]
		case opMul:
			r[in.d] = r[in.a] * r[in.b]
		case opMulAdd:
			r[in.d] = float64(r[in.a]*r[in.b]) + r[in.c]
		case opMulSub:
			r[in.d] = float64(r[in.a]*r[in.b]) - r[in.c]
		case opSubMul:
			r[in.d] = r[in.c] - float64(r[in.a]*r[in.b])
		case opDiv:
			r[in.d] = r[in.a] / r[in.b]
		case opNeg:
			r[in.d] = -r[in.a]
		case opCopy:
			r[in.d] = r[in.a]
		case opExp:
			r[in.d] = math.Exp(r[in.a])
		case opSqrt:
			r[in.d] = math.Sqrt(r[in.a])
		case opSelect:
			if r[in.a] != 0 {
				r[in.d] = r[in.b]
			} else {
				r[in.d] = r[in.c]
			}
		case opLess:
			r[in.d] = truth(r[in.a] < r[in.b])
		default:
			r[in.d] = general(in, r)
		}
	}
}

func general(in *instr, r []float64) float64 {
	var x [3]float64
	switch kinds[in.op].arity {
	case 3:
		x[2] = r[in.c]
		fallthrough
	case 2:
		x[1] = r[in.b]
		fallthrough
	default:
		x[0] = r[in.a]
	}
	return apply(in.op, x[0], x[1], x[2], int(in.c))
}
