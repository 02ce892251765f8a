package continuation

import (
	"brinkline/continuation/linalg"
)

// How much is asked for of the eigenvalues along a branch.
type spectra int

const (
	countOnly spectra = iota // the number with positive real part, proved where that is cheaper
	allValues
	noValues
)

// A stability keeps what is known of the eigenvalues along a run: the proof of the
// count that serves at present, and a number that tells one proof from the next.
type stability struct {
	proof   linalg.Certificate
	serial  int
	eig     linalg.Eigen
	control []float64
	want    bool // eigenvalues, not the count alone, just now
}

// forget drops the proof: the scales have changed.
func (s *stability) forget() { s.proof = linalg.Certificate{} }

// spectrum sets the count of unstable eigenvalues at a node, whose Jacobian is at
// hand: proved by the certificate at hand, where eigenvalues themselves are not
// asked for; else from the eigenvalues, with a new certificate.
func (t *tracer) spectrum(a *node) error {
	a.unstable = -1
	if t.plan.spectra == noValues {
		return nil
	}
	a.fx = t.similar()
	holds := t.stable.proof.Holds(a.fx, t.n)
	if holds {
		a.unstable, a.proof = t.stable.proof.Unstable, t.stable.serial
	}
	if holds && !t.stable.want && t.plan.spectra != allValues {
		return nil
	}
	var err error
	if holds {
		a.eigenvalues, err = t.stable.eig.Values(a.fx, t.n)
	} else {
		a.eigenvalues, err = t.stable.proof.Renew(a.fx, t.n)
		t.stable.serial++
		a.proof = t.stable.serial
	}
	if err != nil {
		return &refusal{reason: err.Error()}
	}
	a.unstable = countUnstable(a.eigenvalues)
	return nil
}

// similar returns f_x in scaled states, a matrix similar to it: the same
// eigenvalues, fewer roundings.
func (t *tracer) similar() []float64 {
	fx := make([]float64, t.n*t.n)
	for i := range t.n {
		for k := range t.n {
			fx[i*t.n+k] = t.jac[i*(t.n+1)+k] * t.S[k] / t.S[i]
		}
	}
	return fx
}

// values makes sure that a node has its eigenvalues.
func (t *tracer) values(a *node) error {
	if a.eigenvalues != nil || t.plan.spectra == noValues {
		return nil
	}
	if a.fx == nil {
		if err := t.evaluate(a); err != nil {
			return err
		}
		a.fx = t.similar()
	}
	values, err := t.stable.eig.Values(a.fx, t.n)
	if err != nil {
		return &refusal{reason: err.Error()}
	}
	a.eigenvalues = values
	return nil
}

// withValues runs something that needs eigenvalues at each node that it makes, and
// at the ends of an arc.
func (t *tracer) withValues(c *arc, work func() error) error {
	for _, a := range []*node{c.a, c.b} {
		if err := t.values(a); err != nil {
			return err
		}
	}
	defer func(usual bool) { t.stable.want = usual }(t.stable.want)
	t.stable.want = true
	return work()
}

// proved reports whether the certificate at hand proves that no eigenvalue crosses
// the axis between a and b and returns: whether it holds at both ends and, since the
// matrices between two nodes do not lie on a straight line, at the middle control
// point of the parabola through these and the node z before them. What holds at
// the three control points holds on all of the parabola.
func (t *tracer) proved(z, a, b *node) bool {
	if z.fx == nil || a.fx == nil || b.fx == nil || !t.holdsAt(b) || !t.holdsAt(a) {
		return false
	}
	h1, h2 := a.arc-z.arc, b.arc-a.arc
	if len(t.stable.control) != len(a.fx) {
		t.stable.control = make([]float64, len(a.fx))
	}
	for i, v := range a.fx {
		d1, d2 := (v-z.fx[i])/h1, (b.fx[i]-v)/h2
		t.stable.control[i] = v + h2/2*(d1*h2+d2*h1)/(h1+h2)
	}
	return t.stable.proof.Holds(t.stable.control, t.n)
}

// holdsAt reports whether the certificate at hand holds at a node.
func (t *tracer) holdsAt(a *node) bool {
	if a.proof != t.stable.serial && t.stable.proof.Holds(a.fx, t.n) {
		a.proof = t.stable.serial
	}
	return a.proof == t.stable.serial
}
