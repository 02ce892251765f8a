package tape

import "slices"

// along returns the derivatives of the outputs in the direction that seed gives
// for each leaf, none where there is none (forward mode).
func (d *deriver) along(outputs []int32, seed func(node) int32) []int32 {
	g := d.g
	need := g.live(outputs)
	t := make([]int32, len(need))
	for id := range need {
		t[id] = none
		if !need[id] {
			continue
		}
		n := g.nodes[id]
		if n.op.leaf() {
			t[id] = seed(n)
			continue
		}
		var in [3]int32
		ids, count := n.operands()
		for k := range in {
			in[k] = none
			if k < count {
				in[k] = t[ids[k]]
			}
		}
		t[id] = d.tangent(int32(id), in[0], in[1], in[2])
	}
	out := make([]int32, len(outputs))
	for i, id := range outputs {
		out[i] = t[id]
	}
	return out
}

// A partial is one entry of a sparse row: the derivative with respect to a
// variable.
type partial struct {
	variable int32
	id       int32
}

// rows returns the derivatives of the outputs with respect to the variables that
// number gives for leaves (negative: no variable), as sparse rows in the order
// of the variables.
func (d *deriver) rows(outputs []int32, number func(node) int32) [][]partial {
	g := d.g
	need := g.live(outputs)
	rows := make([][]partial, len(need))
	one := g.constant(1)
	for id := range need {
		if !need[id] {
			continue
		}
		n := g.nodes[id]
		if n.op.leaf() {
			if v := number(n); v >= 0 {
				rows[id] = []partial{{v, one}}
			}
			continue
		}
		rows[id] = d.row(int32(id), n, rows)
	}
	out := make([][]partial, len(outputs))
	for i, id := range outputs {
		out[i] = rows[id]
	}
	return out
}

// row merges the rows of the operands.
func (d *deriver) row(id int32, n node, rows [][]partial) []partial {
	if kinds[n.op].flat {
		return nil
	}
	var in [3][]partial
	ids, count := n.operands()
	total := 0
	for k := range count {
		in[k] = rows[ids[k]]
		total = max(total, len(in[k]))
	}
	if total == 0 {
		return nil
	}
	d.multi = total > 1
	out := make([]partial, 0, total)
	for len(in[0])+len(in[1])+len(in[2]) > 0 {
		next := int32(-1)
		for _, r := range in {
			if len(r) > 0 && (next < 0 || r[0].variable < next) {
				next = r[0].variable
			}
		}
		var t [3]int32
		for k := range in {
			t[k] = none
			if len(in[k]) > 0 && in[k][0].variable == next {
				t[k] = in[k][0].id
				in[k] = in[k][1:]
			}
		}
		if v := d.tangent(id, t[0], t[1], t[2]); v != none {
			out = append(out, partial{next, v})
		}
	}
	d.multi = false
	return out
}

// gradient returns the derivatives of the sum of weights times outputs with
// respect to the variables that number gives for leaves (reverse mode). Zero
// adjoints that a selection leaves are skipped: what is infinite on a side not
// taken does no harm.
func (d *deriver) gradient(outputs, weights []int32, number func(node) int32, count int) []int32 {
	g := d.g
	need := g.live(outputs)
	bar := make([]int32, len(need))
	tainted := make([]bool, len(need))
	for id := range bar {
		bar[id] = none
	}
	for i, id := range outputs {
		if id != none && weights[i] != none {
			bar[id] = d.add(bar[id], weights[i])
		}
	}
	moves := d.moving(need, number)
	out := slices.Repeat([]int32{none}, count)
	for id := len(need) - 1; id >= 0; id-- {
		n := g.nodes[id]
		switch {
		case bar[id] == none || !moves[id]:
		case n.op.leaf():
			v := number(n)
			out[v] = d.add(out[v], bar[id])
		default:
			d.spread(int32(id), n, bar, tainted, moves)
		}
	}
	return out
}

// moving marks the nodes that depend on a variable.
func (d *deriver) moving(need []bool, number func(node) int32) []bool {
	moves := make([]bool, len(need))
	for id := range need {
		if !need[id] {
			continue
		}
		n := d.g.nodes[id]
		if n.op.leaf() {
			moves[id] = number(n) >= 0
			continue
		}
		ids, count := n.operands()
		for _, k := range ids[:count] {
			moves[id] = moves[id] || moves[k]
		}
		if kinds[n.op].flat {
			moves[id] = false
		}
	}
	return moves
}

// spread adds the part of a node to the adjoints of its operands.
func (d *deriver) spread(id int32, n node, bar []int32, tainted, moves []bool) {
	b := bar[id]
	ids, count := n.operands()
	if n.op == opSelect {
		for k, t := range [...]int32{0, d.choose(n.a, b, none), d.choose(n.a, none, b)} {
			if k > 0 && moves[ids[k]] {
				bar[ids[k]] = d.add(bar[ids[k]], t)
				tainted[ids[k]] = true
			}
		}
		return
	}
	if n.op == opMul && n.a == n.b {
		// One operand in two places.
		count = 1
	}
	for k := range count {
		to := ids[k]
		if !moves[to] {
			continue
		}
		part := d.partial(id, n, k)
		if part == none {
			continue
		}
		term := none
		if tainted[id] {
			term = d.skip(b, part)
			tainted[to] = true
		} else {
			term = d.mul(b, part)
		}
		bar[to] = d.add(bar[to], term)
	}
}

// partial is the derivative of a node with respect to operand k alone.
func (d *deriver) partial(id int32, n node, k int) int32 {
	one := d.g.constant(1)
	t := [3]int32{none, none, none}
	t[k] = one
	if n.op == opDiv && n.a == n.b {
		return none
	}
	return d.tangent(id, t[0], t[1], t[2])
}
