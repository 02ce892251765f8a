package continuation_test

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

func newWalk(t *testing.T, opts ...continuation.FollowOption) *continuation.Walk {
	t.Helper()
	start := settled(t, newTank(t), tankState{0.1, 310})
	w, err := start.Walk("Coolant", opts...)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

func steps(t *testing.T, w *continuation.Walk, n int) []*continuation.Point {
	t.Helper()
	points, err := w.Step(n)
	if err != nil {
		t.Fatal(err)
	}
	return points
}

func TestWalkStepsBackAndTurns(t *testing.T) {
	w := newWalk(t)
	steps(t, w, 5)
	here := w.Here().Value()
	length := w.StepLength
	steps(t, w, 3)
	if w.Here().Value() <= here {
		t.Errorf("the parameter does not grow: %v then %v", here, w.Here().Value())
	}
	if err := w.Back(3); err != nil {
		t.Fatal(err)
	}
	if w.Here().Value() != here || w.StepLength != length {
		t.Errorf("back at %v with step %v, want %v with %v", w.Here().Value(), w.StepLength, here, length)
	}
	w.Turn()
	steps(t, w, 2)
	if w.Here().Value() >= here {
		t.Errorf("after Turn the parameter grows: %v then %v", here, w.Here().Value())
	}
	oneLine(t, w.Back(100), "has 7 steps to take back")
}

func TestWalkRoundTheFold(t *testing.T) {
	w := newWalk(t, continuation.StopAtFold())
	for range 200 {
		if _, err := w.Step(1); err != nil || w.Ended() != "" {
			break
		}
	}
	if !strings.Contains(w.Ended(), "met the fold at Coolant 30") {
		t.Fatalf("the walk ended: %q", w.Ended())
	}
	steps(t, w, 4) // goes on behind the fold
	b := w.Branch()
	if len(b.Folds()) != 1 {
		t.Fatalf("folds on the walk: %v", b.Folds())
	}
	checkTankFold(t, b.Folds()[0])
	if last := b.Points()[len(b.Points())-1]; last.Unstable != 1 {
		t.Errorf("%d unstable eigenvalues behind the fold, want 1", last.Unstable)
	}
}

func TestWalkSteered(t *testing.T) {
	w := newWalk(t)
	if err := w.Steer("Temperature"); err != nil {
		t.Fatal(err)
	}
	w.StepLength = 0.002
	a := w.Here()
	b := steps(t, w, 1)[0]
	// A step in a state moves that state by the tangent's share exactly.
	want := a.State[1] + a.Tangent[1]*0.002
	if math.Abs(b.State[1]-want) > 0.02*math.Abs(want-a.State[1]) {
		t.Errorf("Temperature %v, want about %v", b.State[1], want)
	}
	oneLine(t, w.Steer("Temprature"), "did you mean Temperature?")
	if err := w.Steer("arclength"); err != nil {
		t.Error(err)
	}
	w.StepLength = -1
	_, err := w.Step(1)
	oneLine(t, err, "must be positive")
}

func TestWalkEndsAtTheRange(t *testing.T) {
	w := newWalk(t, continuation.Within(260, 285))
	_, err := w.Step(100)
	oneLine(t, err, "left the range at Coolant 285 K")
	if w.Here().Value() != 285 {
		t.Errorf("stands at %v", w.Here().Value())
	}
	w.Turn()
	_, err = w.Step(1000)
	oneLine(t, err, "left the range at Coolant 260 K")
}
