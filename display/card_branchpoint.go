package display

import (
	"fmt"
	"math"
	"strings"

	"brinkline/continuation"
)

// branchPointCard shows a simple stationary bifurcation: the null vectors, the
// tangents of both branches and the equation that they come from.
func branchPointCard(b *continuation.BranchPoint) *Grid {
	vectors := []vector{{"v", b.Right}, {"w", b.Left}}
	known := b.Tangents[0] != nil && b.Tangents[1] != nil
	if known {
		vectors = append(vectors, vector{"tangent 1", b.Tangents[0]}, vector{"tangent 2", b.Tangents[1]})
	}
	g := specialCardWith(b, b.Uncertainty, vectors...)
	if name := b.Name(); name != "" {
		g.say("name", name)
	}
	g.say("meaning", b.Meaning())
	g.say("range test", fmt.Sprintf("wᵀ f_λ = %s, 0 up to rounding: f_λ lies in the range of f_x, so two branches cross here; relative to its natural size %s",
		significant(b.RangeTest, 2), significant(b.RangeRelative, 2)))
	if known {
		reducedRows(g, b)
	}
	g.note(normalisation(false))
	if known {
		g.note("The tangents are unit vectors in the units shown, that of the parameter in the first row; the reduced equation holds to leading order, with f_x φ = -f_λ, vᵀ φ = 0, f_x h = -f_xx[v, v], vᵀ h = 0.")
	}
	g.note(caution)
	return g
}

// reducedRows shows the equation of both branches, whole and coefficient by
// coefficient.
func reducedRows(g *Grid, b *continuation.BranchPoint) {
	g.say("reduced equation", reducedText(b))
	for _, one := range []struct {
		name, formula string
		value         float64
	}{
		{"of s²", "½ wᵀ f_xx[v, v]", b.Quadratic},
		{"of s m", "wᵀ (f_xx[v, φ] + f_xλ v)", b.Mixed},
		{"of m²", "½ wᵀ (f_xx[φ, φ] + 2 f_xλ φ + f_λλ)", b.ParameterQuadratic},
		{"of s³", "1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h])", b.Cubic},
	} {
		g.say(one.name, one.formula+" = "+significant(one.value, vectorDigits))
	}
}

// reducedText writes the equation of both branches to leading order. What is 0 up to
// rounding, beside the others, stays out.
func reducedText(b *continuation.BranchPoint) string {
	var out strings.Builder
	largest := max(math.Abs(b.Quadratic), math.Abs(b.Mixed), math.Abs(b.ParameterQuadratic), math.Abs(b.Cubic))
	for _, term := range []struct {
		factor float64
		power  string
	}{{b.Quadratic, "s²"}, {b.Mixed, "s m"}, {b.ParameterQuadratic, "m²"}, {b.Cubic, "s³"}} {
		switch {
		case math.Abs(term.factor) <= 1e-12*largest || math.IsNaN(term.factor):
			continue
		case out.Len() > 0:
			out.WriteString(" " + sign(term.factor) + " ")
		case term.factor < 0:
			out.WriteString("-")
		}
		out.WriteString(significant(math.Abs(term.factor), vectorDigits) + " " + term.power)
	}
	return fmt.Sprintf("%s = 0 for m = %s - %s, x - x* ≈ s v + m φ", &out, b.Parameter().Name, valueText(b, 6))
}
