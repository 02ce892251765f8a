package continuation

import (
	"errors"
	"fmt"
	"math"
)

// A Multiple point is one at which more than one real eigenvalue vanishes, as a
// symmetry of the model can force. More than two branches may meet there; the
// formulae for simple points do not apply.
type Multiple struct {
	found
	Dimension int // of the null space of f_x
}

// Kind returns "multiple bifurcation".
func (m *Multiple) Kind() string { return "multiple bifurcation" }

// Summary says the point in one line.
func (m *Multiple) Summary() string {
	return fmt.Sprintf("%s, %d null vectors", m.summary(m.Kind()), m.Dimension)
}

// String says the point in one line.
func (m *Multiple) String() string { return m.Summary() }

func (m *Multiple) on(p *Point, index int, reversed bool) Special {
	c := *m
	c.found = m.moved(p, index, reversed)
	return &c
}

const multipleArc = 1e-5 // scaled length below which several eigenvalues are taken to cross together

// refineMultiple finds the point on a short arc at which several real eigenvalues
// cross zero together.
func (t *tracer) refineMultiple(c *arc) (found *node, err error) {
	err = t.withValues(c, func() error {
		found, err = t.locateMultiple(c)
		return err
	})
	return found, err
}

func (t *tracer) locateMultiple(c *arc) (*node, error) {
	k := min(c.a.unstable, c.b.unstable)
	crossing := max(c.a.unstable, c.b.unstable) - k
	part := func(a *node) float64 { return real(a.eigenvalues[k]) }
	var failed error
	root, width := bracket(part(c.a), part(c.b), func(u float64) float64 {
		m, err := t.middle(c, u)
		if err != nil {
			// At the point itself no bordered matrix with one row is regular.
			failed = err
			return 0
		}
		return part(m)
	})
	if errors.Is(failed, ErrInterrupted) {
		return nil, failed
	}
	a := t.fresh()
	z, d := c.at(root)
	t.place(a, z)
	if err := t.evaluate(a); err != nil {
		return nil, err
	}
	if err := t.spectrum(a); err != nil {
		return nil, err
	}
	size := math.Max(spectralSize(c.a.eigenvalues), spectralSize(c.b.eigenvalues))
	for _, v := range a.eigenvalues[k : k+crossing] {
		if math.Hypot(real(v), imag(v)) > 1e-6*size {
			return nil, &refusal{reason: "the eigenvalues cross one after the other"}
		}
	}
	length := norm(d)
	for i := range d {
		d[i] /= length
	}
	a.t, a.scales = d, t.S
	a.arc = c.a.arc + root*(c.b.arc-c.a.arc)
	a.step = root * (c.b.arc - c.a.arc)
	if err := t.settleSpectrum(a, crossing); err != nil {
		return nil, err
	}
	m := &Multiple{Dimension: crossing}
	t.certify(c, a, &m.found, refined{})
	m.Uncertainty = (width+1e-6)*c.length*t.S[t.n] + t.roundingOf(a.lambda)
	m.digits = reliableDigits(a.lambda, m.Uncertainty)
	a.special = m
	return a, nil
}
