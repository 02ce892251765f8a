package display

import (
	"math"

	"brinkline/continuation"
)

// How far the fan of a Hopf point reaches: a part of the picture's width, and a
// half-amplitude that is a part of its height.
const (
	fanReach  = 0.12
	fanHeight = 0.14
	fanPieces = 16
)

// addFans draws the small oscillations that are born at Hopf points where the
// picture can show them: the followed parameter on the x axis, a state on the y
// axis.
func (f *Figure) addFans(s *scene) {
	curve := 0
	for _, it := range f.lines() {
		if it.branch != nil && !s.plane() {
			for _, h := range it.branch.HopfPoints() {
				s.addFan(it.branch, h, curve)
			}
		}
		curve++
	}
}

func (s *scene) addFan(b *continuation.Branch, h *continuation.Hopf, curve int) {
	if s.x.variable.Name != h.Parameter().Name || b.Model().Balance() {
		return
	}
	side := fanSide(h)
	one := growth(h, s.y.variable.Name)
	if !(one > 0) {
		return
	}
	middle, err := s.beside(b, h.Index(), side)
	if err != nil || len(middle) < 2 {
		return
	}
	width, height := s.extent()
	reach := min(fanReach*width, side*(middle[len(middle)-1].x-middle[0].x), math.Pow(fanHeight*height/one, 2))
	line := dashed
	if h.Soft() && min(h.UnstableBefore, h.UnstableAfter) == 0 {
		line = solid
	}
	for _, sign := range []float64{1, -1} {
		fan := hairline{ink: inks[curve%len(inks)], line: line, fan: true}
		for k := range fanPieces + 1 {
			d := reach * math.Pow(float64(k)/fanPieces, 2) // the amplitude grows with the root
			x := middle[0].x + side*d
			fan.places = append(fan.places, place{x, between(middle, x) + sign*one*math.Sqrt(d), math.NaN(), math.NaN()})
		}
		s.hair = append(s.hair, fan)
	}
}

// fanSide returns +1 where the oscillation exists for greater values of the
// parameter, -1 for smaller ones, NaN when that is not known.
func fanSide(h *continuation.Hopf) float64 {
	d := -h.CrossingSpeed / h.Lyapunov
	if d == 0 || math.IsNaN(d) {
		return math.NaN()
	}
	return math.Copysign(1, d)
}

// growth returns the half-amplitude of a state in the oscillation, per square root of
// the distance in the parameter; NaN when it is not known or the name is no state's.
func growth(h *continuation.Hopf, state string) float64 {
	distance := max(1, math.Abs(h.Value()))
	a, err := h.Amplitude(state, h.Value()+fanSide(h)*distance)
	if err != nil {
		return math.NaN()
	}
	return a / math.Sqrt(distance)
}

// beside returns the places of a branch from point i on, on the side where the
// parameter goes the way of side, as far as it keeps going so and meets no other
// special point.
func (s *scene) beside(b *continuation.Branch, i int, side float64) ([]place, error) {
	points := b.Points()
	special := map[int]bool{}
	for _, sp := range b.Specials() {
		special[sp.Index()] = true
	}
	for _, way := range []int{1, -1} {
		if k := i + way; k < 0 || k >= len(points) || !(side*(points[k].Value()-points[i].Value()) > 0) {
			continue
		}
		first, err := s.place(points[i])
		list := []place{first}
		for k := i + way; k >= 0 && k < len(points) && err == nil; k += way {
			var p place
			p, err = s.place(points[k])
			if !p.finite() || !(side*(p.x-list[len(list)-1].x) > 0) {
				break
			}
			list = append(list, p)
			if special[k] {
				break
			}
		}
		return list, err
	}
	return nil, nil
}

// between returns y at x on the curve through places whose x grows or falls: cubic
// pieces with the curve's own slopes.
func between(list []place, x float64) float64 {
	for k := 1; k < len(list); k++ {
		a, b := list[k-1], list[k]
		h := b.x - a.x
		u := (x - a.x) / h
		if u > 1 && k < len(list)-1 {
			continue
		}
		ma, mb := h*a.dy/a.dx, h*b.dy/b.dx
		if !isFinite(ma) || !isFinite(mb) || math.Abs(ma) > 9*math.Abs(b.y-a.y) || math.Abs(mb) > 9*math.Abs(b.y-a.y) {
			return a.y + u*(b.y-a.y) // at a fold the slope has no end
		}
		v := 1 - u
		return a.y*v*v*(1+2*u) + b.y*u*u*(3-2*u) + ma*u*v*v - mb*u*u*v
	}
	return list[0].y
}

// extent returns the width and height of the picture in the values of its axes.
func (s *scene) extent() (width, height float64) {
	reach := func(values []float64, a side) float64 {
		if a.shown.set {
			return a.shown.high - a.shown.low
		}
		low, high := math.Inf(1), math.Inf(-1)
		for _, v := range values {
			low, high = min(low, v), max(high, v)
		}
		low, high = a.widen(low, high)
		return high - low
	}
	xs, ys := s.values()
	return reach(xs, s.x), reach(ys, s.y)
}
