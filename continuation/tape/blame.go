package tape

import "math"

// Blame says which line of the model makes a NaN or an infinity at x and p, and
// by which operation ("line 7: math.Log is NaN"). It is empty where f is finite.
func (p *Program) Blame(x, q []float64) string {
	p.mu.Lock()
	defer p.mu.Unlock()
	need := p.g.live(p.out)
	values := make([]float64, len(need))
	for id := range need {
		if !need[id] {
			continue
		}
		n := p.g.nodes[id]
		values[id] = p.evaluate(n, values, x, q)
	}
	for id := range need {
		n := p.g.nodes[id]
		if !need[id] || n.op.leaf() || !bad(values[id]) {
			continue
		}
		if place := p.spreads(int32(id), n, values); place != "" {
			return place
		}
	}
	return ""
}

func bad(v float64) bool { return math.IsNaN(v) || math.IsInf(v, 0) }

// spreads describes a node that is bad although its operands are not, and that
// makes an equation bad.
func (p *Program) spreads(id int32, n node, values []float64) string {
	in, count := n.operands()
	for _, k := range in[:count] {
		if bad(values[k]) {
			return ""
		}
	}
	if !p.reaches(id, values) {
		return ""
	}
	what := kinds[n.op].name
	if n.op == opDiv && values[n.b] == 0 {
		what = "division by zero"
	}
	text := "infinite"
	if math.IsNaN(values[id]) {
		text = "NaN"
	}
	place := ""
	if int(id) < len(p.pos) {
		place = p.place(p.pos[id])
	}
	if place != "" {
		place += ": "
	}
	return place + what + " is " + text
}

// reaches reports whether a bad node makes an equation bad: it may stand on a
// side that is not taken.
func (p *Program) reaches(id int32, values []float64) bool {
	need := make([]bool, len(values))
	for _, o := range p.out {
		need[o] = bad(values[o])
	}
	for k := int32(len(need)) - 1; k > id; k-- {
		if !need[k] {
			continue
		}
		n := p.g.nodes[k]
		in, count := n.operands()
		if n.op == opSelect {
			taken := n.c
			if values[n.a] != 0 {
				taken = n.b
			}
			need[taken] = true
			continue
		}
		for _, i := range in[:count] {
			need[i] = true
		}
	}
	return need[id]
}

func (p *Program) evaluate(n node, values, x, q []float64) float64 {
	switch n.op {
	case opConst:
		return n.value()
	case opState:
		return x[n.a]
	case opParam:
		return q[n.a]
	case opHidden:
		return *p.hidden[n.a].at
	case opDir, opWeight:
		return 0
	}
	var in [3]float64
	ids, count := n.operands()
	for k, id := range ids[:count] {
		in[k] = values[id]
	}
	return apply(n.op, in[0], in[1], in[2], int(n.c))
}
