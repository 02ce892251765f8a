package continuation

import (
	"fmt"
	"math"
	"strconv"
)

// Special is a special point of a branch: a [*Fold], a [*BranchPoint], a [*Hopf]
// or an [*Event]. Each was confirmed by a refinement.
type Special interface {
	Kind() string    // "fold", "simple stationary bifurcation", "Hopf point"
	Where() *Point   // the refined point
	Index() int      // of Where among the points of its branch
	Digits() int     // decimal digits of the parameter that can be relied on
	Summary() string // in one line: fold at Coolant 303.42 K
	// ValueText writes the value of the parameter with no more digits than can
	// be relied on, and at most so many.
	ValueText(most int) string
	around() (before, after int)
	recount(before, after int)
	// on returns a copy that belongs to a point of a branch.
	on(p *Point, index int, reversed bool) Special
}

// found is what all special points have in common.
type found struct {
	point  *Point
	index  int
	digits int

	// UnstableBefore and UnstableAfter are the numbers of eigenvalues with
	// positive real part before and after the point, in the order of the
	// branch; -1 when eigenvalues were not asked for.
	UnstableBefore, UnstableAfter int
	// Iterations is the number of Newton steps of the refinement.
	Iterations int
	// Uncertainty is the estimated error of the parameter, in its unit.
	Uncertainty float64
}

// Where returns the refined point.
func (f *found) Where() *Point { return f.point }

// Value returns the value of the followed parameter.
func (f *found) Value() float64 { return f.point.Value() }

// At returns the value of a state, a parameter or a quantity there.
func (f *found) At(name string) (float64, error) { return f.point.At(name) }

// Index returns the place of the point among the points of its branch.
func (f *found) Index() int { return f.index }

// Digits returns how many decimal digits of the parameter can be relied on.
func (f *found) Digits() int { return f.digits }

// Parameter returns the followed parameter with its value at the point.
func (f *found) Parameter() Parameter {
	return Parameter{f.point.model.parameters[f.point.free].Variable, f.point.Value()}
}

// Model returns the model.
func (f *found) Model() *Model { return f.point.model }

func (f *found) around() (before, after int) { return f.UnstableBefore, f.UnstableAfter }

func (f *found) recount(before, after int) { f.UnstableBefore, f.UnstableAfter = before, after }

// moved returns what is common, for a point of a branch that is passed in this
// or the other direction.
func (f found) moved(p *Point, index int, reversed bool) found {
	f.point, f.index = p, index
	if reversed {
		f.UnstableBefore, f.UnstableAfter = f.UnstableAfter, f.UnstableBefore
	}
	return f
}

func (f *found) summary(kind string) string {
	q := f.Parameter()
	text := fmt.Sprintf("%s at %s %s", kind, q.Name, f.ValueText(12))
	if q.Unit != "" {
		text += " " + q.Unit
	}
	return text
}

// ValueText writes the value of the parameter with no more digits than can be
// relied on, and at most so many.
func (f *found) ValueText(most int) string {
	return FormatUncertain(f.Value(), f.Uncertainty, most)
}

// FormatUncertain writes a number whose error is about uncertainty with no more
// significant digits than that allows, and at most so many. A number that cannot
// be told from 0 is 0.
func FormatUncertain(value, uncertainty float64, most int) string {
	if math.Abs(value) <= 2*uncertainty {
		return "0"
	}
	digits := min(max(reliableDigits(value, uncertainty), 1), most)
	return strconv.FormatFloat(value, 'g', digits, 64)
}

// A Fold (limit point) is a point where the branch turns in the parameter:
// f_x v = 0 with f_λ outside the range of f_x. For λ beyond it the two steady
// states that meet there no longer exist.
type Fold struct {
	found
	Right []float64 // v, |v| = 1 in the user's units, largest component positive
	Left  []float64 // w, wᵀ v = 1 unless WeakLeft
	// RangeTest is wᵀ f_λ. It is not 0: f_λ lies outside the range of f_x.
	RangeTest float64
	// RangeRelative is |RangeTest| over its natural size: |w| times the largest
	// scaled |f_λ| or |f_x| met on the branch, all in scaled variables.
	RangeRelative float64
	// Quadratic is a = 1/2 wᵀ f_xx[v, v].
	Quadratic float64
	// Curvature is -a / wᵀf_λ: the branch is λ - λ* ≈ Curvature s², x - x* ≈ s v.
	Curvature float64
	// Cubic is 1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]) with f_x h = -f_xx[v, v] up to
	// a multiple of v, vᵀ h = 0: what is left to turn the branch where Quadratic
	// vanishes, at a cusp. NaN where the third derivatives could not be had.
	Cubic float64
	// WeakLeft says that wᵀ v = 1 is out of reach (a second eigenvalue vanishes
	// near by): Left has length 1 instead, and Quadratic and RangeTest scale
	// with it.
	WeakLeft bool

	sensitivities []float64 // d λ*/d p_j, NaN for λ itself
}

// Kind returns "fold".
func (f *Fold) Kind() string { return "fold" }

// Summary says the fold in one line.
func (f *Fold) Summary() string { return f.summary("fold") }

// String says the fold in one line.
func (f *Fold) String() string { return f.Summary() }

// Greatest reports whether the fold is where the parameter is greatest on the
// branch near by (the steady states end for growing values), and not least.
func (f *Fold) Greatest() bool { return f.Curvature < 0 }

// A BranchPoint is a singular point with f_λ in the range of f_x (wᵀ f_λ = 0), a
// simple stationary bifurcation: two branches cross there.
type BranchPoint struct {
	found
	Right []float64 // v
	Left  []float64 // w
	// RangeTest is wᵀ f_λ as computed, 0 up to rounding.
	RangeTest     float64
	RangeRelative float64
	// Reduced is the equation of both branches; its zero value, with nil
	// Tangents, says that it could not be computed.
	Reduced
	// Tangents are the unit tangents of both branches in the user's units: states,
	// then the parameter, whose component is not negative.
	Tangents [2][]float64

	pitchfork bool
	scales    []float64 // of the run that found the point
	plan      *plan
}

// Kind returns "simple stationary bifurcation".
func (b *BranchPoint) Kind() string { return "simple stationary bifurcation" }

// Summary says the point in one line.
func (b *BranchPoint) Summary() string {
	kind := b.Kind()
	if name := b.Name(); name != "" {
		kind += " (" + name + ")"
	}
	return b.summary(kind)
}

// String says the point in one line.
func (b *BranchPoint) String() string { return b.Summary() }

// A Hopf point is one where a complex pair of eigenvalues crosses the imaginary
// axis: the steady state gives way to an oscillation or an oscillation to it.
type Hopf struct {
	found
	Omega  float64 // imaginary part of the pair, radians per unit of time
	Period float64 // 2π / Omega
	// Mode is the eigenvector q of iω: |q| = 1 in the user's units, its largest
	// component real and positive.
	Mode []complex128
	// CrossingSpeed is d Re μ/dλ of the pair along the branch.
	CrossingSpeed float64
	// Lyapunov is the first Lyapunov coefficient for |q| = 1, <p, q> = 1: negative
	// for a small stable oscillation, positive for a hard loss of stability; NaN
	// where it could not be computed.
	Lyapunov float64
}

// Kind returns "Hopf point".
func (h *Hopf) Kind() string { return "Hopf point" }

// Summary says the point in one line.
func (h *Hopf) Summary() string {
	return fmt.Sprintf("%s, period %.4g", h.summary("Hopf point"), h.Period)
}

// String says the point in one line.
func (h *Hopf) String() string { return h.Summary() }

func (f *Fold) on(p *Point, index int, reversed bool) Special {
	c := *f
	c.found = f.moved(p, index, reversed)
	return &c
}

func (b *BranchPoint) on(p *Point, index int, reversed bool) Special {
	c := *b
	c.found = b.moved(p, index, reversed)
	return &c
}

func (h *Hopf) on(p *Point, index int, reversed bool) Special {
	c := *h
	c.found = h.moved(p, index, reversed)
	return &c
}
