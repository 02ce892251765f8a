package continuation

import (
	"fmt"
	"math"
)

// refineHopf finds the Hopf point on an arc on which the number of unstable
// eigenvalues changes by two: the root along the branch of the real part of the
// pair that crosses, by bracketing with the ITP method (Oliveira & Takahashi, ACM
// Transactions on Mathematical Software 47 (2021) 5). Two real eigenvalues that
// cross one after the other are not a Hopf point.
func (t *tracer) refineHopf(c *arc) (found *node, err error) {
	err = t.withValues(c, func() error {
		found, err = t.locateHopf(c)
		return err
	})
	return found, err
}

func (t *tracer) locateHopf(c *arc) (*node, error) {
	// Eigenvalues have the error of the point they are taken at.
	defer func(usual float64) { t.tolerance = usual }(t.tolerance)
	t.tolerance = math.Min(t.tolerance, 1e-12)
	k := min(c.a.unstable, c.b.unstable)
	part := func(a *node) float64 { return real(a.eigenvalues[k]) }
	var failed error
	calls := 0
	root, width := bracket(part(c.a), part(c.b), func(u float64) float64 {
		m, err := t.middle(c, u)
		if err != nil {
			failed = err
			return 0
		}
		calls++
		return part(m)
	})
	if failed != nil {
		return nil, failed
	}
	a, err := t.middle(c, root)
	if err != nil {
		return nil, err
	}
	pair := a.eigenvalues[nearestAxis(a.eigenvalues)]
	omega := math.Abs(imag(pair))
	size := spectralSize(a.eigenvalues)
	if omega < 1e-6*size {
		return nil, &refusal{reason: "two real eigenvalues cross"}
	}
	if math.Abs(real(pair)) > 1e-6*size {
		return nil, &refusal{reason: fmt.Sprintf("the real part of the pair stays at %.2g", real(pair))}
	}
	h := &Hopf{Omega: omega, Period: 2 * math.Pi / omega}
	if err := t.settleSpectrum(a, 2); err != nil {
		return nil, err
	}
	if err := t.describeOscillation(a, h); err != nil {
		return nil, err
	}
	t.certify(c, a, &h.found, refined{iterations: calls})
	// Eigenvalues carry the error of the derivatives; over the slope of the real
	// part that becomes an error along the branch.
	slope := math.Abs(part(c.b)-part(c.a)) / c.length
	along := 4*math.Max(accuracy(t.s.diff), t.tolerance)*size/slope + width*c.length
	h.Uncertainty = along*math.Abs(a.t[t.n])*t.S[t.n] + t.roundingOf(a.lambda)
	h.digits = reliableDigits(a.lambda, h.Uncertainty)
	a.special = h
	return a, nil
}

func nearestAxis(values []complex128) int {
	best := 0
	for i, v := range values {
		if imag(v) != 0 && (imag(values[best]) == 0 || math.Abs(real(v)) < math.Abs(real(values[best]))) {
			best = i
		}
	}
	return best
}

func spectralSize(values []complex128) float64 {
	size := 0.0
	for _, v := range values {
		size = math.Max(size, math.Hypot(real(v), imag(v)))
	}
	return size
}

// bracket finds a root of f between 0 and 1, where it has the values fa and fb of
// different signs, and returns it with the width of what still brackets it.
func bracket(fa, fb float64, f func(float64) float64) (root, width float64) {
	const tolerance = 1e-14
	a, b := 0.0, 1.0
	for range 100 {
		if b-a <= tolerance {
			break
		}
		middle := (a + b) / 2
		falsi := (b*fa - a*fb) / (fa - fb)
		delta := math.Min(0.1*(b-a)*(b-a), math.Abs(middle-falsi))
		u := falsi + math.Copysign(delta, middle-falsi)
		if r := (b - a) / 2 * 0.99; math.Abs(u-middle) > r {
			u = middle - math.Copysign(r, middle-falsi)
		}
		if u <= a || u >= b {
			u = middle
		}
		v := f(u)
		if v == 0 {
			return u, 0
		}
		if (v > 0) == (fa > 0) {
			a, fa = u, v
		} else {
			b, fb = u, v
		}
	}
	return (a + b) / 2, b - a
}
