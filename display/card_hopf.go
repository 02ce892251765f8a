package display

import (
	"fmt"
	"math"
	"math/cmplx"

	"brinkline/continuation"
)

// hopfCard shows a Hopf point: the pair, what it means and how the small oscillation
// grows.
func hopfCard(h *continuation.Hopf) *Grid {
	g := specialCardWith(h, h.Uncertainty, modeColumns(h)...)
	g.say("meaning", h.Meaning())
	g.say("pair", fmt.Sprintf("± %s i, the eigenvalues that cross the imaginary axis (radians per unit of time)", significant(h.Omega, stateDigits)))
	g.say("period", significant(h.Period, stateDigits)+" units of time, of small oscillations")
	q := h.Parameter()
	if h.Mode != nil {
		g.say("crossing speed", fmt.Sprintf("d Re μ/dλ = %s along the branch, λ = %s", withUnit(significant(h.CrossingSpeed, vectorDigits), perUnit(q.Unit)), q.Name))
	}
	if !math.IsNaN(h.Lyapunov) {
		g.say("first Lyapunov coefficient", fmt.Sprintf("l1 = %s: %s", significant(h.Lyapunov, vectorDigits), lyapunovText(h)))
	}
	if text := growthText(h); text != "" {
		g.say("oscillation", text)
		g.note("Half-amplitude: 2 |q_i| sqrt(-μ_λ (λ - λ*)/(ω l1)), a local estimate to leading order; no oscillation was followed.")
	}
	if h.Mode != nil {
		g.note("q is the eigenvector of iω: f_x q = iω q, f_xᵀ p = -iω p, |q| = 1 in the units shown, its largest entry real and positive, <p, q> = 1; l1 is Kuznetsov's (2004, eq. 3.20).")
	}
	g.note(caution)
	return g
}

// modeColumns are the sizes and phases of the eigenvector, and what they make of the
// oscillation.
func modeColumns(h *continuation.Hopf) []vector {
	if h.Mode == nil {
		return nil
	}
	size, phase := vector{name: "|q|"}, vector{name: "phase of q (°)"}
	grow := vector{name: "half-amplitude per √" + unitOr(h.Parameter().Unit, "unit")}
	for i, v := range h.Model().States() {
		degrees := cmplx.Phase(h.Mode[i]) * 180 / math.Pi
		if math.Abs(degrees) < 1e-6 {
			degrees = 0
		}
		size.entries, phase.entries = append(size.entries, cmplx.Abs(h.Mode[i])), append(phase.entries, degrees)
		grow.entries = append(grow.entries, growth(h, v.Name))
	}
	if growthText(h) == "" {
		return []vector{size, phase}
	}
	return []vector{size, phase, grow}
}

func lyapunovText(h *continuation.Hopf) string {
	switch {
	case h.Lyapunov < 0:
		return "negative, the oscillation attracts within its two dimensions"
	case h.Lyapunov > 0:
		return "positive, the oscillation repels"
	default:
		return "0, the next coefficient decides"
	}
}

// growthText says on which side the oscillation exists.
func growthText(h *continuation.Hopf) string {
	q := h.Parameter()
	at := withUnit(valueText(h, 6), q.Unit)
	switch side := fanSide(h); {
	case side > 0:
		return fmt.Sprintf("exists above %s %s near by, its amplitude grows with the square root of %s - %s", q.Name, at, q.Name, at)
	case side < 0:
		return fmt.Sprintf("exists below %s %s near by, its amplitude grows with the square root of %s - %s", q.Name, at, at, q.Name)
	default:
		return ""
	}
}

func perUnit(unit string) string {
	if unit == "" {
		return ""
	}
	return "per " + unit
}

func unitOr(unit, instead string) string {
	if unit == "" {
		return instead
	}
	return unit
}
