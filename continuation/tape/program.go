package tape

import (
	"fmt"
	"go/token"
	"sync"
)

// A Program is the tape of a model: f(x, p) with n states and m parameters, and
// what has been derived from it. It may be used by several goroutines.
type Program struct {
	g      *graph
	fset   *token.FileSet
	place  func(token.Pos) string
	n, m   int
	out    []int32 // the n equations
	values []float64

	hidden  []hidden
	watches []watch
	guards  []guard
	notes   []string

	base   int32       // number of nodes of f; later ones are derivatives
	pos    []token.Pos // of the nodes of f
	sample []float64

	mu    sync.Mutex
	codes map[request]*Code
}

// Dimensions returns the numbers of states and of parameters.
func (p *Program) Dimensions() (n, m int) { return p.n, p.m }

// Hidden returns the names of the variables outside of the model that it reads.
func (p *Program) Hidden() []string {
	names := make([]string, len(p.hidden))
	for i, h := range p.hidden {
		names[i] = h.name
	}
	return names
}

// Snapshots returns the names of what the tape took as it stood outside of the
// model: integers, lists.
func (p *Program) Snapshots() []string {
	var names []string
	seen := map[string]bool{}
	for _, w := range p.watches {
		if !seen[w.name] {
			seen[w.name] = true
			names = append(names, w.name)
		}
	}
	return names
}

// Current reports whether what was taken from outside of the model still stands.
func (p *Program) Current() bool {
	for i := range p.watches {
		if p.watches[i].changed() {
			return false
		}
	}
	return true
}

// Guards returns the places of the conditions of which the tape has only one
// side.
func (p *Program) Guards() []string {
	var places []string
	for _, g := range p.guards {
		places = append(places, p.place(g.pos))
	}
	return places
}

// Operations returns the number of operations of f.
func (p *Program) Operations() int {
	p.mu.Lock()
	defer p.mu.Unlock()
	count := 0
	for id, need := range p.g.live(p.out) {
		if need && !p.g.nodes[id].op.leaf() {
			count++
		}
	}
	return count
}

// A request names a code.
type request struct {
	what  what
	free  int    // index of the free parameter, -1 for none
	along string // directions: "a", "ab", "aa"
}

type what uint8

const (
	wantValue what = iota
	wantJacobian
	wantBoth
	wantParameter
	wantParameters
	wantSparse
	wantBothSparse
	wantDirectional
	wantAdjoint
)

// code returns the code of a request, made at the first asking.
func (p *Program) code(q request) *Code {
	p.mu.Lock()
	defer p.mu.Unlock()
	if c := p.codes[q]; c != nil {
		return c
	}
	outputs, slots := p.derive(q)
	size := sizesOf{n: p.n, m: p.m, h: len(p.hidden), dir: p.n + 1, weights: p.n}
	c := compile(p.g, outputs, slots, size, p.guards)
	if c.zones.hidden.n > 0 {
		c.hidden = p.hidden
	}
	if p.codes == nil {
		p.codes = map[request]*Code{}
	}
	p.codes[q] = c
	return c
}

// Value returns the code of f: n results.
func (p *Program) Value() *Code { return p.code(request{what: wantValue, free: -1}) }

// Jacobian returns the code of the derivative with respect to z = (x, p_free),
// row by row: n x (n+1) results, or n x n when free is negative.
func (p *Program) Jacobian(free int) *Code { return p.code(request{what: wantJacobian, free: free}) }

// ValueAndJacobian returns the code of f, n results, and after it of the Jacobian.
func (p *Program) ValueAndJacobian(free int) *Code {
	return p.code(request{what: wantBoth, free: free})
}

// Parameter returns the code of f_p for one parameter: n results.
func (p *Program) Parameter(j int) *Code { return p.code(request{what: wantParameter, free: j}) }

// Parameters returns the code of f_p, row by row: n x m results.
func (p *Program) Parameters() *Code { return p.code(request{what: wantParameters, free: -1}) }

// Sparse returns the code of the structural nonzeros of f_x in compressed rows,
// and [Program.Pattern] says where they stand.
func (p *Program) Sparse() *Code { return p.code(request{what: wantSparse, free: -1}) }

// ValueAndSparse returns the code of f, n results, and after it those of Sparse.
func (p *Program) ValueAndSparse() *Code { return p.code(request{what: wantBothSparse, free: -1}) }

// Directional returns the code of a directional derivative with respect to
// z = (x, p_free): n results. along has one letter for each derivative, and the
// letter names the direction: "a" is f_z[a], "aa" f_zz[a, a], "abc"
// f_zzz[a, b, c].
func (p *Program) Directional(free int, along string) *Code {
	return p.code(request{what: wantDirectional, free: free, along: along})
}

// Adjoint returns the code of the gradient with respect to z = (x, p_free) of
// wᵀ f differentiated along directions: "" is wᵀ f_z, "a" wᵀ f_zz[a, ·], "ab"
// wᵀ f_zzz[a, b, ·]. It has n+1 results, or n when free is negative.
func (p *Program) Adjoint(free int, along string) *Code {
	return p.code(request{what: wantAdjoint, free: free, along: along})
}

// derive adds what a request needs to the graph.
func (p *Program) derive(q request) (outputs []output, slots int) {
	d := &deriver{g: p.g}
	width := p.n
	if q.free >= 0 {
		width++
	}
	switch q.what {
	case wantValue:
		return list(nil, 0, p.out), p.n
	case wantJacobian:
		return dense(nil, 0, width, d.rows(p.out, p.variables(q.free))), p.n * width
	case wantBoth:
		return dense(list(nil, 0, p.out), p.n, width, d.rows(p.out, p.variables(q.free))), p.n * (width + 1)
	case wantParameter:
		return list(nil, 0, d.along(p.out, p.unit(q.free))), p.n
	case wantParameters:
		return dense(nil, 0, p.m, d.rows(p.out, parameters)), p.n * p.m
	case wantSparse:
		return p.sparse(nil, 0, d)
	case wantBothSparse:
		return p.sparse(list(nil, 0, p.out), p.n, d)
	case wantDirectional:
		return list(nil, 0, p.differentiate(d, q)), p.n
	case wantAdjoint:
		t := p.differentiate(d, q)
		return list(nil, 0, d.gradient(t, p.weights(), p.variables(q.free), width)), width
	}
	panic(fmt.Sprint("tape: unknown request ", q.what))
}

func list(out []output, at int, ids []int32) []output {
	for i, id := range ids {
		if id != none {
			out = append(out, output{at + i, id})
		}
	}
	return out
}

func dense(out []output, at, width int, rows [][]partial) []output {
	for i, row := range rows {
		for _, e := range row {
			out = append(out, output{at + i*width + int(e.variable), e.id})
		}
	}
	return out
}

func (p *Program) sparse(out []output, at int, d *deriver) ([]output, int) {
	for _, row := range d.rows(p.out, p.variables(-1)) {
		for _, e := range row {
			out = append(out, output{at, e.id})
			at++
		}
	}
	return out, at
}

// Pattern returns where the structural nonzeros of f_x stand, in compressed rows:
// those of row i are in the columns cols[start[i]:start[i+1]].
func (p *Program) Pattern() (start, cols []int) {
	p.mu.Lock()
	defer p.mu.Unlock()
	d := &deriver{g: p.g}
	start = append(start, 0)
	for _, row := range d.rows(p.out, p.variables(-1)) {
		for _, e := range row {
			cols = append(cols, int(e.variable))
		}
		start = append(start, len(cols))
	}
	return start, cols
}

// variables numbers the components of z = (x, p_free).
func (p *Program) variables(free int) func(node) int32 {
	return func(n node) int32 {
		switch {
		case n.op == opState:
			return n.a
		case n.op == opParam && int(n.a) == free:
			return int32(p.n)
		}
		return -1
	}
}

func parameters(n node) int32 {
	if n.op == opParam {
		return n.a
	}
	return -1
}

// unit is the direction of one parameter.
func (p *Program) unit(j int) func(node) int32 {
	return func(n node) int32 {
		if n.op == opParam && int(n.a) == j {
			return p.g.constant(1)
		}
		return none
	}
}

func (p *Program) weights() []int32 {
	w := make([]int32, p.n)
	for i := range w {
		w[i] = p.g.intern(kindNode(opWeight, i))
	}
	return w
}

// differentiate returns f differentiated along the directions of a request.
func (p *Program) differentiate(d *deriver, q request) []int32 {
	out := p.out
	number := p.variables(q.free)
	for _, letter := range []byte(q.along) {
		dir := int32(letter - 'a')
		out = d.along(skipNone(out, p.g), func(n node) int32 {
			if v := number(n); v >= 0 {
				return p.g.intern(node{op: opDir, a: v, c: dir})
			}
			return none
		})
	}
	return out
}

// skipNone puts a zero where a derivative is none.
func skipNone(ids []int32, g *graph) []int32 {
	out := make([]int32, len(ids))
	for i, id := range ids {
		out[i] = id
		if id == none {
			out[i] = g.constant(0)
		}
	}
	return out
}
