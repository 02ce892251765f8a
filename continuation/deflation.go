package continuation

import (
	"errors"
	"math"
	"slices"
)

const (
	deflatedSteps = 80
	longestStep   = 1.0  // in root mean square widths of the box
	leastDeflated = 0.01 // damping
	mostLeaps     = 6
	farOut        = 2.0 // widths outside of the box at which a hunt is given up
)

// The radii of deflation, in widths of the box, that the starts take in turn. A wide
// one drives the iteration away from all that is known, and over steady states that
// lie between; a narrow one leaves it the ways of Newton's method nearly everywhere.
var deflationRadii = [...]float64{0.1, 0.03, 0.01}

// A hunt looks for steady states from a start with those deflated that are known
// already: Newton's method on
//
//	M(x) f(x) = 0,  M(x) = Π_r (ρ²/|x - r|² + 1),
//
// with distances in widths of the box (Farrell, Birkisson & Funke, Deflation
// techniques for finding distinct solutions of nonlinear partial differential
// equations, SIAM Journal on Scientific Computing 37 (2015) A2026-A2045): M is
// infinite at the known r, so that the iteration cannot go there again, and near 1
// farther from them than the radius ρ, where the iteration is Newton's own.
type hunt struct {
	newton
	frame *frame
	known [][]float64

	radius float64 // ρ
	leaps  int
	most   []float64 // the largest sizes of the equations met
	slope  []float64 // of ln M
	step   []float64
	simple []float64
	trial  []float64
}

// errHunt ends a hunt that leads nowhere; nobody reads more of it.
var errHunt = errors.New("the hunt leads nowhere")

func newHunt(s *system, f *frame, start []float64) *hunt {
	n := s.n
	h := &hunt{frame: f, newton: newton{s: s, x: append([]float64(nil), start...)}}
	h.f, h.jac = make([]float64, n), make([]float64, n*n)
	h.most = make([]float64, n)
	h.slope, h.step, h.simple, h.trial = make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	return h
}

// run goes on until plain Newton steps are small, where deflation changes them no
// more.
func (h *hunt) run() error {
	if err := h.s.Eval(h.x, h.s.p, h.f); err != nil {
		return err
	}
	damping := 1.0
	for h.steps = 1; h.steps <= deflatedSteps; h.steps++ {
		if err := h.direction(h.step); err != nil {
			return err
		}
		for i := range h.most {
			h.most[i] = math.Max(h.most[i], h.rowSize(i))
		}
		if h.arriving() {
			return nil
		}
		stretch := h.deflate()
		next, err := h.damp(stretch, damping)
		if err != nil {
			return err
		}
		damping = next
		if h.frame.beyond(h.x) > farOut {
			return errHunt
		}
	}
	return errHunt
}

// arriving reports whether the plain Newton step is small, also against the distance
// from what is known.
func (h *hunt) arriving() bool {
	if h.size(h.step) > 1e-5 {
		return false
	}
	length := h.length() / h.radius
	return !slices.ContainsFunc(h.known, func(r []float64) bool { return h.distance2(h.x, r) < 100*length*length })
}

// deflate returns by what the Newton step d must be multiplied to be that of the
// deflated equations. With m = grad ln M their matrix is M (f_x + f mᵀ), of rank one
// from the plain one, so the step has the same direction (Sherman-Morrison):
//
//	δ = d / (1 - mᵀ d).
func (h *hunt) deflate() (stretch float64) {
	clear(h.slope)
	for _, r := range h.known {
		square := h.distance2(h.x, r)
		if square == 0 {
			return 1 // at a known one itself; the step leaves it or fails
		}
		// d ln(1/q + 1) = -dq / (q (1 + q)) for q = |x - r|² / ρ²
		factor := -2 / (square * (1 + square) * h.radius * h.radius)
		for i, w := range h.frame.width {
			h.slope[i] += factor * (h.x[i] - r[i]) / (w * w)
		}
	}
	away := 1 - dot(h.slope, h.step)
	if away == 0 {
		return math.Inf(1)
	}
	return 1 / away
}

// distance2 is the squared distance in widths of the box over that of ρ.
func (h *hunt) distance2(x, y []float64) float64 {
	sum := 0.0
	for i, w := range h.frame.width {
		d := (x[i] - y[i]) / w
		sum += d * d
	}
	return sum / (h.radius * h.radius)
}

// logM returns ln M(x).
func (h *hunt) logM(x []float64) float64 {
	sum := 0.0
	for _, r := range h.known {
		sum += math.Log1p(1 / h.distance2(x, r))
	}
	return sum
}

// damp goes along the deflated step as far as the natural monotonicity test allows:
// the simplified step at the new point must be shorter. Where no step passes, it takes
// the whole one all the same, a few times: it may leave a valley that holds no steady
// state. It returns the damping to begin the next step with.
func (h *hunt) damp(stretch, damping float64) (float64, error) {
	whole := longestStep / (h.length() * math.Abs(stretch))
	if math.IsInf(stretch, 0) {
		stretch, whole = longestStep/h.length(), 1
	}
	before, size := h.logM(h.x), h.size(h.step)*math.Abs(stretch)
	for damping = math.Min(damping, whole); damping >= leastDeflated; damping /= 2 {
		err := h.try(damping * stretch)
		if errors.Is(err, ErrInterrupted) {
			return 0, err
		}
		if err == nil && h.simplified(stretch, before) <= (1-damping/4)*size {
			copy(h.x, h.trial)
			return math.Min(1, 4*damping), nil
		}
	}
	if h.leaps++; h.leaps > mostLeaps {
		return 0, errHunt
	}
	if err := h.try(math.Min(1, whole) * stretch); err != nil {
		return 0, err
	}
	copy(h.x, h.trial)
	return 1, nil
}

// try evaluates f so many plain Newton steps ahead.
func (h *hunt) try(steps float64) error {
	for i, d := range h.step {
		h.trial[i] = h.x[i] + steps*d
	}
	return h.s.Eval(h.trial, h.s.p, h.f)
}

// length is that of the plain step, in root mean square widths of the box.
func (h *hunt) length() float64 {
	sum := 0.0
	for i, w := range h.frame.width {
		d := h.step[i] / w
		sum += d * d
	}
	return math.Sqrt(sum / float64(h.s.n))
}

// simplified returns the size of the simplified Newton step at the trial point: that
// of the deflated equations there, with their matrix at x. With e that of the plain
// equations it is (e + δ mᵀ e) M(trial) / M(x).
func (h *hunt) simplified(stretch, before float64) float64 {
	for i, v := range h.f {
		h.simple[i] = -v / h.rowSize(i)
	}
	h.lu.Solve(h.simple)
	for i := range h.simple {
		h.simple[i] *= h.columnSize(i)
	}
	turn := dot(h.slope, h.simple) * stretch
	for i, d := range h.step {
		h.simple[i] += turn * d
	}
	return h.size(h.simple) * math.Exp(h.logM(h.trial)-before)
}
