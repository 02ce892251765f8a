package display

import (
	"fmt"
	"math"
	"math/cmplx"

	"brinkline/continuation"
)

// cornerCard shows a special point of a locus: where, its coefficients with their
// normalisation, and what it means.
func cornerCard(c *continuation.LocusSpecial) *Grid {
	first, second := pairOf(c.Where)
	g := newCard(fmt.Sprintf("%s of %s in %s and %s", capital(c.Kind), c.Where.Model().Name(), first.Name, second.Name), "value")
	for _, q := range []continuation.Parameter{first, second} {
		g.add(q.Label(), reliable(q.Value, cornerDigits))
	}
	g.heading("states")
	g.list(c.Where.Model().States(), c.Where.State, stateDigits)
	g.heading("kind")
	g.say("meaning", meaningOf(c))
	switch c.Kind {
	case cuspKind:
		g.say("cubic coefficient", "c = "+significant(c.Cubic, vectorDigits))
		g.note("c = 1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]), f_x h = -f_xx[v, v], for the null vectors with |v| = 1 in the units shown and wᵀ v = 1.")
	case takensKind:
		g.say("coefficients", fmt.Sprintf("a2 = %s, b2 = %s", significant(c.A2, vectorDigits), significant(c.B2, vectorDigits)))
		g.note("a2 = ½ p1ᵀ f_xx[q0, q0], b2 = p0ᵀ f_xx[q0, q0] + p1ᵀ f_xx[q0, q1], with f_x q0 = 0, f_x q1 = q0, f_xᵀ p1 = 0, f_xᵀ p0 = p1, |q0| = 1 in the units shown, q0ᵀ q1 = 0, p1ᵀ q1 = 1, p0ᵀ q1 = 0 (Kuznetsov 2004, section 8.4).")
	}
	frequency(g, "pair", c.Omega)
	frequency(g, "other pair", c.Omega2)
	if len(c.Where.Eigenvalues) > 0 {
		g.say("eigenvalues of f_x", eigenvalueText(settled(c.Where.Eigenvalues, zeros[c.Kind])))
	}
	g.note(caution)
	return g
}

func frequency(g *Grid, name string, omega float64) {
	if omega > 0 {
		g.say(name, fmt.Sprintf("± %s i (radians per unit of time), period %s", significant(omega, stateDigits), significant(2*math.Pi/omega, stateDigits)))
	}
}

// zeros is how many eigenvalues are 0 at a special point of a locus.
var zeros = map[string]int{cuspKind: 1, takensKind: 2, foldHopfKind: 1}

// settled puts 0 for what rounding leaves of critical eigenvalues: for the smallest
// ones, as many as are 0 there (a double zero comes out of the solver as the square
// root of rounding), and for real parts beside the largest eigenvalue.
func settled(values []complex128, zero int) []complex128 {
	size := 0.0
	for _, v := range values {
		size = max(size, math.Abs(real(v)), math.Abs(imag(v)))
	}
	clean := func(v float64) float64 {
		if math.Abs(v) < 1e-5*size {
			return 0
		}
		return v
	}
	out := make([]complex128, len(values))
	for i, v := range values {
		out[i] = complex(clean(real(v)), clean(imag(v)))
	}
	for range min(zero, len(out)) {
		least := -1
		for i, v := range out {
			if v != 0 && (least < 0 || cmplx.Abs(v) < cmplx.Abs(out[least])) {
				least = i
			}
		}
		if least >= 0 && countZeros(out) < zero {
			out[least] = 0
		}
	}
	return out
}

func countZeros(values []complex128) (n int) {
	for _, v := range values {
		if v == 0 {
			n++
		}
	}
	return n
}

// locusPointCard shows a fold or Hopf point on a locus.
func locusPointCard(p *continuation.LocusPoint) *Grid {
	g := pointCard(p.Point)
	first, second := pairOf(p)
	g.caption = fmt.Sprintf("Point of a locus of %s at %s, %s", p.Model().Name(), labelled(first.Variable, first.Value, stateDigits), labelled(second.Variable, second.Value, stateDigits))
	for i, r := range g.rows {
		if r.text && r.cells[0] == inWords {
			g.rows[i].cells[1] = fmt.Sprintf("critical: f_x has eigenvalues on the imaginary axis here, or two of opposite sign; %s besides with positive real part", count(p.Unstable, "eigenvalue", "eigenvalues"))
		}
	}
	return g
}
