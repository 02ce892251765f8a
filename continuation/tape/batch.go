package tape

import "math"

// lanes is how many points a [Batch] takes at a time: enough to forget the cost
// of an instruction, few enough that the registers stay in the nearest cache.
const lanes = 64

type lane [lanes]float64

// A Batch runs a [Code] at many points, 64 at a time. It gives the bits that a
// [Machine] gives. It is used by one goroutine at a time.
type Batch struct {
	code *Code
	r    []lane
}

// NewBatch returns a batch for the code.
func (c *Code) NewBatch() *Batch {
	b := &Batch{code: c, r: make([]lane, len(c.start))}
	for i, v := range c.start {
		b.r[i].fill(v)
	}
	return b
}

func (l *lane) fill(v float64) {
	for i := range l {
		l[i] = v
	}
}

// Run evaluates the code at count points. Point i has the states x[i*n:(i+1)*n];
// its parameters are p[i*m:(i+1)*m], or p when p has m numbers for all. Its
// results go to out[i*k:(i+1)*k], where k is their number. failed lists the
// points at which a guard does not hold, whose results are of no use.
func (b *Batch) Run(count int, x, p, out []float64) (failed []int) {
	z := &b.code.zones
	shared := len(p) == z.params.n && count != 1
	for first := 0; first < count; first += lanes {
		n := min(lanes, count-first)
		b.load(z.states, x, first, n)
		if shared {
			b.share(z.params, p)
		} else {
			b.load(z.params, p, first, n)
		}
		for i := range b.code.hidden {
			b.r[z.hidden.at+i].fill(*b.code.hidden[i].at)
		}
		for i := range b.code.instrs {
			b.step(&b.code.instrs[i], n)
		}
		b.store(out, first, n)
		failed = b.check(failed, first, n)
	}
	return failed
}

func (b *Batch) load(z zone, x []float64, first, n int) {
	for k := range z.n {
		to := &b.r[z.at+k]
		for i := range n {
			to[i] = x[(first+i)*z.n+k]
		}
	}
}

func (b *Batch) share(z zone, x []float64) {
	for k := range z.n {
		b.r[z.at+k].fill(x[k])
	}
}

func (b *Batch) store(out []float64, first, n int) {
	slots := b.code.slots
	for k := range slots {
		from := &b.r[b.code.zones.out+k]
		for i := range n {
			out[(first+i)*slots+k] = from[i]
		}
	}
}

func (b *Batch) check(failed []int, first, n int) []int {
	for i := range n {
		for _, g := range b.code.guards {
			if (g.path < 0 || b.r[g.path][i] != 0) && (b.r[g.cond][i] != 0) != g.want {
				failed = append(failed, first+i)
				break
			}
		}
	}
	return failed
}

// step does one instruction in all lanes. Full blocks run over arrays of fixed
// length, which needs no checks; what is over in the last one is not looked at.
func (b *Batch) step(in *instr, n int) {
	d, x := &b.r[in.d/8], &b.r[in.a/8]
	switch in.op.reads() {
	case 1:
		step1(in, d, x, n)
	case 2:
		step2(in, d, x, &b.r[in.b/8], n)
	default:
		step3(in, d, x, &b.r[in.b/8], &b.r[in.c/8], n)
	}
}

func step1(in *instr, d, a *lane, n int) {
	switch in.op {
	case opNeg:
		for i := range d {
			d[i] = -a[i]
		}
	case opCopy:
		*d = *a
	case opSqrt:
		for i := range d {
			d[i] = math.Sqrt(a[i])
		}
	case opExp:
		expLane(d, a)
	default:
		for i := range n {
			d[i] = apply(in.op, a[i], 0, 0, int(in.c))
		}
	}
}

func step2(in *instr, d, a, b *lane, n int) {
	switch in.op {
	case opAdd:
		for i := range d {
			d[i] = a[i] + b[i]
		}
	case opSub:
		for i := range d {
			d[i] = a[i] - b[i]
		}
	case opMul:
		for i := range d {
			d[i] = a[i] * b[i]
		}
	case opDiv:
		for i := range d {
			d[i] = a[i] / b[i]
		}
	case opNegMul:
		for i := range d {
			d[i] = -float64(a[i] * b[i])
		}
	case opExpMul:
		var x lane // d may be b
		expLane(&x, a)
		for i := range d {
			d[i] = x[i] * b[i]
		}
	case opLess:
		for i := range d {
			d[i] = truth(a[i] < b[i])
		}
	default:
		for i := range n {
			d[i] = apply(in.op, a[i], b[i], 0, 0)
		}
	}
}

func step3(in *instr, d, a, b, c *lane, n int) {
	switch in.op {
	case opSelect:
		for i := range d {
			v := c[i]
			if a[i] != 0 {
				v = b[i]
			}
			d[i] = v
		}
	case opFMA:
		for i := range n {
			d[i] = math.FMA(a[i], b[i], c[i])
		}
	case opAddAdd, opAddSub, opRSubAdd, opAddMul, opAddDiv, opRDivAdd:
		var x lane // d may be c
		for i := range x {
			x[i] = a[i] + b[i]
		}
		outer(in.op-opAddAdd, d, &x, c)
	case opSubAdd, opSubSub, opRSubSub, opSubMul, opSubDiv, opRDivSub:
		var x lane
		for i := range x {
			x[i] = a[i] - b[i]
		}
		outer(in.op-opSubAdd, d, &x, c)
	default:
		product(in.op, d, a, b, c)
	}
}

// outer does the second half of a double operation.
func outer(op Op, d, x, c *lane) {
	switch op + opAddAdd {
	case opAddAdd:
		for i := range d {
			d[i] = x[i] + c[i]
		}
	case opAddSub:
		for i := range d {
			d[i] = x[i] - c[i]
		}
	case opRSubAdd:
		for i := range d {
			d[i] = c[i] - x[i]
		}
	case opAddMul:
		for i := range d {
			d[i] = x[i] * c[i]
		}
	case opAddDiv:
		for i := range d {
			d[i] = x[i] / c[i]
		}
	case opRDivAdd:
		for i := range d {
			d[i] = c[i] / x[i]
		}
	}
}

func product(op Op, d, a, b, c *lane) {
	switch op {
	case opMulAdd:
		for i := range d {
			d[i] = float64(a[i]*b[i]) + c[i]
		}
	case opMulSub:
		for i := range d {
			d[i] = float64(a[i]*b[i]) - c[i]
		}
	case opRSubMul:
		for i := range d {
			d[i] = c[i] - float64(a[i]*b[i])
		}
	case opMulMul:
		for i := range d {
			d[i] = float64(a[i]*b[i]) * c[i]
		}
	case opMulDiv:
		for i := range d {
			d[i] = float64(a[i]*b[i]) / c[i]
		}
	case opRDivMul:
		for i := range d {
			d[i] = c[i] / float64(a[i]*b[i])
		}
	}
}

// expLane is exp in all lanes; without calls and branches the processor works on
// several at once.
func expLane(d, a *lane) {
	for i := range a {
		if !(a[i] > -708 && a[i] < 709) {
			for k := range d {
				d[k] = exp(a[k])
			}
			return
		}
	}
	for i := range d {
		x := a[i]
		t := float64(x*(128/math.Ln2)) + shifter
		k := int64(math.Float64bits(t)<<12) >> 12
		n := t - shifter
		r := (x - float64(n*expHigh)) - float64(n*expLow)
		e := &expTable[k&127]
		r2 := float64(r * r)
		p := r + float64(r2*(0.5+float64(r*(1./6+float64(r*(1./24+float64(r*(1./120))))))))
		v := e[0] + (e[1] + float64(e[0]*p))
		d[i] = math.Float64frombits(math.Float64bits(v) + uint64(k>>7)<<52)
	}
}
