package continuation

import (
	"fmt"
	"math"
	"sort"
)

// A Trajectory is how the states of a model change in time, from a start.
type Trajectory struct {
	// Times are those of the accepted steps, the start (0) first.
	Times []float64
	// States are the states at these times, each with n components in the order of
	// Model().States().
	States [][]float64
	// Ended says why it ends where it ends: reached its time, came to rest,
	// oscillates, left the model's domain, out of steps, interrupted.
	Ended string
	// Steps and Rejected count the steps that were taken and those that were tried
	// and not taken, Evaluations the calls of the model's function.
	Steps, Rejected, Evaluations int

	rates      [][]float64
	model      *Model
	parameters []float64
	thinned    int // every so many steps are kept, as a power of 2
	last       int
	cut        bool // the last entry is one that thinning would leave out
	stopped    bool
}

// mostKept bounds the numbers that a trajectory keeps; a longer one keeps every
// second, fourth ... step.
const mostKept = 4_000_000

// Model returns the model.
func (t *Trajectory) Model() *Model { return t.model }

// Interrupted reports whether the integration was interrupted; what was computed
// until then is there.
func (t *Trajectory) Interrupted() bool { return t.stopped }

// Point returns entry i of Times and States as a point, which is no steady state.
func (t *Trajectory) point(i int) *Point {
	return &Point{State: t.States[i], Parameters: t.parameters, Unstable: -1, model: t.model, free: -1}
}

// At returns the values of a state, a parameter or a quantity of the model at all
// Times.
func (t *Trajectory) At(name string) ([]float64, error) {
	values := make([]float64, len(t.Times))
	for i := range values {
		v, err := t.point(i).At(name)
		if err != nil {
			return nil, err
		}
		values[i] = v
	}
	return values, nil
}

// StateAt returns the states at a time between the first and the last: the cubic
// through the neighbouring ones with their rates of change, whose error is of the
// fourth order in the step.
func (t *Trajectory) StateAt(time float64) ([]float64, error) {
	end := t.Times[len(t.Times)-1]
	if !(time >= 0 && time <= end) {
		return nil, fmt.Errorf("time %g lies outside the trajectory, which goes from 0 to %g", time, end)
	}
	i := sort.SearchFloat64s(t.Times, time)
	if t.Times[i] == time {
		return append([]float64(nil), t.States[i]...), nil
	}
	c := hermite{t.Times[i-1], t.Times[i] - t.Times[i-1], t.States[i-1], t.States[i], t.rates[i-1], t.rates[i]}
	x := make([]float64, len(c.x0))
	c.at(time, x)
	return x, nil
}

// End returns the last time and the states there.
func (t *Trajectory) End() (time float64, state []float64) {
	last := len(t.Times) - 1
	return t.Times[last], t.States[last]
}

// String says the trajectory in one line.
func (t *Trajectory) String() string {
	end, _ := t.End()
	return fmt.Sprintf("trajectory of %s from time 0 to %.6g, %d steps; %s", t.model.name, end, t.Steps, t.Ended)
}

// add appends an accepted step, which was the number steps.
func (t *Trajectory) add(time float64, x, f []float64) {
	if t.cut {
		t.drop()
	}
	t.Times = append(t.Times, time)
	t.States = append(t.States, append([]float64(nil), x...))
	t.rates = append(t.rates, append([]float64(nil), f...))
	t.cut = t.thinned > 0 && t.last%(1<<t.thinned) != 0
	t.last++
	if len(t.Times)*len(x)*2 > mostKept {
		t.thin()
	}
}

func (t *Trajectory) drop() {
	last := len(t.Times) - 1
	t.Times, t.States, t.rates = t.Times[:last], t.States[:last], t.rates[:last]
}

// thin keeps every second entry, and the last.
func (t *Trajectory) thin() {
	kept := 0
	for i := range t.Times {
		if i%2 == 0 || i == len(t.Times)-1 {
			t.Times[kept], t.States[kept], t.rates[kept] = t.Times[i], t.States[i], t.rates[i]
			kept++
		}
	}
	t.cut = (len(t.Times)-1)%2 == 1
	clear(t.States[kept:])
	clear(t.rates[kept:])
	t.Times, t.States, t.rates = t.Times[:kept], t.States[:kept], t.rates[:kept]
	t.thinned++
}

// extent returns the least and the greatest value of each state from entry i on.
func (t *Trajectory) extent(from int) (least, greatest []float64) {
	least = append([]float64(nil), t.States[from]...)
	greatest = append([]float64(nil), t.States[from]...)
	for _, x := range t.States[from:] {
		for i, v := range x {
			least[i], greatest[i] = math.Min(least[i], v), math.Max(greatest[i], v)
		}
	}
	return least, greatest
}
