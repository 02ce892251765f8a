package continuation

import (
	"fmt"
	"math"
)

// A FollowOption changes how a branch is followed.
type FollowOption func(*plan) error

// A plan is what a run is to do.
type plan struct {
	low, high   float64
	bounds      []bound
	until       []func(*Point) bool
	watches     []watch
	stopAtFold  bool
	stopAtAny   bool
	land        []float64
	maxSteps    int
	first       float64 // step lengths, in scaled arclength
	least, most float64
	tolerance   float64
	maxTurn     float64 // radians between tangents
	local       string  // local parameter: arclength, natural, automatic, or a state's name
	up, down    bool
	spectra     spectra
	locus       *locusPlan // set when a locus is followed
	eventful    bool       // special points of a locus are looked for
}

type bound struct {
	name      string
	low, high float64
}

const (
	arclength = ""
	natural   = "natural parameter"
	automatic = "automatic"
)

func newPlan(opts []FollowOption) (*plan, error) {
	p := &plan{
		low: math.Inf(-1), high: math.Inf(1), maxSteps: 2000,
		first: 0.01, least: 1e-8, most: 0.05, tolerance: 1e-10, maxTurn: 0.5,
		up: true, down: true, eventful: true,
	}
	for _, set := range opts {
		if err := set(p); err != nil {
			return nil, err
		}
	}
	if p.first < p.least || p.first > p.most {
		return nil, fmt.Errorf("the first step length %g lies outside the step lengths allowed, %g to %g", p.first, p.least, p.most)
	}
	return p, nil
}

// Within keeps the followed parameter between low and high; the branch ends with
// a point on the bound exactly.
func Within(low, high float64) FollowOption {
	return func(p *plan) error {
		if !(low < high) {
			return fmt.Errorf("Within(%g, %g) is no range: the first value must be the smaller", low, high)
		}
		p.low, p.high = low, high
		return nil
	}
}

// Bound ends the branch where the state of that name leaves the interval, with a
// point on the bound exactly.
func Bound(name string, low, high float64) FollowOption {
	return func(p *plan) error {
		if !(low < high) {
			return fmt.Errorf("Bound(%q, %g, %g) is no interval: the first value must be the smaller", name, low, high)
		}
		p.bounds = append(p.bounds, bound{name, low, high})
		return nil
	}
}

// Until ends the branch at the first point for which the condition holds.
func Until(condition func(*Point) bool) FollowOption {
	return func(p *plan) error {
		if condition == nil {
			return fmt.Errorf("Until wants a function")
		}
		p.until = append(p.until, condition)
		return nil
	}
}

// StopAtFold ends each direction at the first fold.
func StopAtFold() FollowOption {
	return func(p *plan) error { p.stopAtFold = true; return nil }
}

// StopAtSpecial ends each direction at the first special point of any kind.
func StopAtSpecial() FollowOption {
	return func(p *plan) error { p.stopAtAny = true; return nil }
}

// LandAt puts a point at exactly these values of the parameter, each time that
// the branch passes one.
func LandAt(values ...float64) FollowOption {
	return func(p *plan) error {
		for _, v := range values {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return fmt.Errorf("LandAt(%g): not a value to land at", v)
			}
		}
		p.land = append(p.land, values...)
		return nil
	}
}

// MaxSteps limits the number of accepted steps in each direction (default 2000).
func MaxSteps(n int) FollowOption {
	return func(p *plan) error {
		if n < 1 {
			return fmt.Errorf("MaxSteps(%d): at least one step is needed", n)
		}
		p.maxSteps = n
		return nil
	}
}

// StepLength sets the length of the first step in scaled arclength (default
// 0.01; the whole range of the parameter has length 1).
func StepLength(length float64) FollowOption {
	return func(p *plan) error {
		if !positive(length) {
			return fmt.Errorf("StepLength(%g): a step length must be positive", length)
		}
		p.first = length
		p.least, p.most = math.Min(p.least, length), math.Max(p.most, length)
		return nil
	}
}

// StepBetween sets the least and the greatest step length in scaled arclength
// (default 1e-8 and 0.05).
func StepBetween(least, most float64) FollowOption {
	return func(p *plan) error {
		if !positive(least) || !positive(most) || least > most {
			return fmt.Errorf("StepBetween(%g, %g): two positive step lengths, the smaller first", least, most)
		}
		p.least, p.most = least, most
		p.first = math.Min(math.Max(p.first, least), most)
		return nil
	}
}

// Tolerance sets the relative tolerance of the corrector (default 1e-10).
func Tolerance(t float64) FollowOption {
	return func(p *plan) error {
		if !positive(t) || t > 1e-2 {
			return fmt.Errorf("Tolerance(%g): a tolerance must be positive and at most 0.01", t)
		}
		p.tolerance = t
		return nil
	}
}

// MaxTurn sets the greatest angle in radians between the tangents at both ends
// of a step (default 0.5).
func MaxTurn(angle float64) FollowOption {
	return func(p *plan) error {
		if !positive(angle) || angle > math.Pi/2 {
			return fmt.Errorf("MaxTurn(%g): an angle between 0 and pi/2 is wanted", angle)
		}
		p.maxTurn = angle
		return nil
	}
}

func positive(x float64) bool { return x > 0 && !math.IsInf(x, 0) }

// Natural steps in the parameter itself instead of arclength. Such a run cannot
// pass a fold: it ends there and says so.
func Natural() FollowOption {
	return func(p *plan) error { p.local = natural; return nil }
}

// Local holds a state (or the parameter) as local parameter in place of
// arclength, by name.
func Local(name string) FollowOption {
	return func(p *plan) error {
		if name == "" {
			return fmt.Errorf("Local wants the name of a state")
		}
		p.local = name
		return nil
	}
}

// LocalAutomatic holds at each step the component that changes fastest as local
// parameter (Rheinboldt & Burkardt, A locally parameterized continuation process,
// ACM Transactions on Mathematical Software 9 (1983) 215-235).
func LocalAutomatic() FollowOption {
	return func(p *plan) error { p.local = automatic; return nil }
}

// Upward leaves the start towards greater values of the parameter only.
func Upward() FollowOption {
	return func(p *plan) error { p.up, p.down = true, false; return nil }
}

// Downward leaves the start towards smaller values of the parameter only.
func Downward() FollowOption {
	return func(p *plan) error { p.up, p.down = false, true; return nil }
}

// WithEigenvalues keeps the eigenvalues at every point. Without it they are there at
// the start, at special points, and where the number of unstable ones could not be
// proved more cheaply; the number itself is always known.
func WithEigenvalues() FollowOption {
	return func(p *plan) error { p.spectra = allValues; return nil }
}

// WithoutEigenvalues leaves out the eigenvalues and their count: stability is not
// known then, and Hopf points are not found.
func WithoutEigenvalues() FollowOption {
	return func(p *plan) error { p.spectra = noValues; return nil }
}
