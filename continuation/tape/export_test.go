package tape

import "testing"

// UseLibrary makes recordings of this test use the functions of package math.
func UseLibrary(t *testing.T) {
	library = true
	t.Cleanup(func() { library = false })
}

// Plainly evaluates f by its operations one after the other, and reports whether
// the guards hold.
func (p *Program) Plainly(x, q []float64) (f []float64, ok bool) {
	p.mu.Lock()
	defer p.mu.Unlock()
	ids := append([]int32(nil), p.out...)
	for _, g := range p.guards {
		ids = append(ids, g.cond, max(g.path, 0))
	}
	values := make([]float64, len(p.g.nodes))
	for id, need := range p.g.live(ids) {
		if need {
			values[id] = p.evaluate(p.g.nodes[id], values, x, q)
		}
	}
	for _, id := range p.out {
		f = append(f, values[id])
	}
	for _, g := range p.guards {
		if (g.path < 0 || values[g.path] != 0) && (values[g.cond] != 0) != g.want {
			return f, false
		}
	}
	return f, true
}
