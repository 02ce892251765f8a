package display

import (
	"fmt"
	"math"

	"brinkline/continuation"
)

// foldCard shows where a fold is, what makes it one, and how sure that is.
func foldCard(f *continuation.Fold) *Grid {
	g := specialCard(f, f.Right, f.Left, f.Uncertainty)
	q := f.Parameter()
	g.say("turn", turnText(f))
	g.say("range test", fmt.Sprintf("wᵀ f_λ = %s, not 0: f_λ lies outside the range of f_x, so the branch turns in λ = %s; relative to its natural size %s",
		significant(f.RangeTest, vectorDigits), q.Name, significant(f.RangeRelative, 3)))
	g.say("quadratic coefficient", fmt.Sprintf("a = ½ wᵀ f_xx[v, v] = %s", significant(f.Quadratic, vectorDigits)))
	g.say("curvature", fmt.Sprintf("-a/(wᵀ f_λ) = %s: %s - %s ≈ %s s² where x - x* ≈ s v",
		significant(f.Curvature, vectorDigits), q.Name, valueText(f, 6), significant(f.Curvature, vectorDigits)))
	if !math.IsNaN(f.Cubic) {
		g.say("cubic coefficient", fmt.Sprintf("1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]) = %s, f_x h = -f_xx[v, v] up to a multiple of v, vᵀ h = 0: what turns the branch where a vanishes, at a cusp",
			significant(f.Cubic, vectorDigits)))
	}
	g.note(normalisation(f.WeakLeft))
	g.note(caution)
	return g
}

// specialCard is what the cards of all special points begin with.
func specialCard(s continuation.Special, right, left []float64, uncertainty float64) *Grid {
	vectors := []vector{}
	if right != nil {
		vectors = []vector{{"v", right}, {"w", left}}
	}
	return specialCardWith(s, uncertainty, vectors...)
}

// specialCardWith is a special point's card with vectors beside its states.
func specialCardWith(s continuation.Special, uncertainty float64, vectors ...vector) *Grid {
	p := s.Where()
	v := variableOf(p)
	heads := []string{"value"}
	for _, one := range vectors {
		heads = append(heads, one.name)
	}
	g := newCard(fmt.Sprintf("%s of %s in %s", capital(s.Kind()), p.Model().Name(), v.Name), heads...)
	text := "0"
	if !isZero(s) {
		text = reliable(p.Value(), s.Digits())
	}
	cells := []string{v.Label(), text}
	for _, one := range vectors {
		cells = append(cells, one.beyond(len(p.State)))
	}
	g.add(cells...)
	g.say("digits", digitsText(s.Digits(), uncertainty, v.Unit))
	g.heading("states")
	g.vectors(p, vectors)
	g.heading("kind")
	before, after := around(s)
	g.say("along the branch", alongText(p.Model(), before, after))
	return g
}

func digitsText(digits int, uncertainty float64, unit string) string {
	text := count(digits, "digit", "digits") + " can be relied on"
	if uncertainty > 0 && !math.IsInf(uncertainty, 0) {
		text += " (error about " + withUnit(significant(uncertainty, 1), unit) + ")"
	}
	return text
}

func alongText(m *continuation.Model, before, after int) string {
	if before < 0 || after < 0 {
		return "the eigenvalues were not computed"
	}
	if m.Balance() {
		return fmt.Sprintf("%s of f_x with positive real part before, %d after", count(before, "eigenvalue", "eigenvalues"), after)
	}
	say := func(n int) string {
		if n == 0 {
			return "stable"
		}
		return "unstable (" + count(n, "eigenvalue", "eigenvalues") + " with positive real part)"
	}
	return say(before) + " before, " + say(after) + " after"
}

// turnText says on which side the steady states are.
func turnText(f *continuation.Fold) string {
	q := f.Parameter()
	at := withUnit(valueText(f, 6), q.Unit)
	switch {
	case f.Curvature < 0:
		return fmt.Sprintf("the greatest %s near by: the two steady states that meet here do not exist above %s", q.Name, at)
	case f.Curvature > 0:
		return fmt.Sprintf("the least %s near by: the two steady states that meet here do not exist below %s", q.Name, at)
	default:
		return "the quadratic coefficient is not known"
	}
}

func normalisation(weak bool) string {
	if weak {
		return "v and w are the null vectors of f_x: f_x v = 0, wᵀ f_x = 0, |v| = |w| = 1 in the units shown, as wᵀ v is nearly 0 (a second eigenvalue vanishes near by)."
	}
	return "v and w are the null vectors of f_x: f_x v = 0, wᵀ f_x = 0, |v| = 1 in the units shown, its largest entry positive, and wᵀ v = 1."
}

// multipleCard shows a point with several null vectors.
func multipleCard(m *continuation.Multiple) *Grid {
	g := specialCard(m, nil, nil, m.Uncertainty)
	g.say("null space of f_x", fmt.Sprintf("%d dimensions: more than two branches may meet here", m.Dimension))
	g.note(caution)
	return g
}

// eventCard shows a point that the analyst asked for.
func eventCard(e *continuation.Event) *Grid {
	return specialCard(e, nil, nil, e.Uncertainty)
}

// marginCard shows how far it is to a limit.
func marginCard(m *continuation.Margin) *Grid {
	q := m.Parameter
	g := newCard(fmt.Sprintf("Margin of %s in %s", m.From.Model().Name(), q.Name), "value")
	value := func(v float64, digits int) string { return withUnit(significant(v, digits), q.Unit) }
	g.add("now", value(q.Value, 8))
	g.add("limit ("+m.To.Kind()+")", withUnit(valueText(m.To, 8), q.Unit))
	g.add("margin", value(m.Absolute, min(6, max(m.Digits(), 1))))
	if math.IsNaN(m.Percent) {
		g.say("in percent", "not defined, as the value now is 0")
	} else {
		g.add("in percent of the value now", significant(m.Percent, min(4, max(m.Digits(), 1)))+" %")
	}
	direction := "up"
	if m.Absolute < 0 {
		direction = "down"
	}
	g.say("direction", direction+": the other parameters stay as they are")
	g.note(caution)
	return g
}
