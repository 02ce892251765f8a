package continuation_test

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

func TestEventIsLocated(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	limit := func(p *continuation.Point) float64 { return p.State[1] - 340 }
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330), continuation.Mark("temperature limit", limit))
	if len(b.Events()) != 1 {
		t.Fatalf("events %v, want one", b.Events())
	}
	e := b.Events()[0]
	if v := e.Where().State[1]; math.Abs(v-340) > 1e-9 {
		t.Errorf("Temperature %v, want 340", v)
	}
	if !strings.HasPrefix(e.Summary(), "temperature limit at Coolant ") {
		t.Errorf("summary %q", e.Summary())
	}
	if len(b.Folds()) != 2 || len(b.Stretches()) != 3+len(b.HopfPoints()) {
		t.Errorf("the event changes the stretches: %v", b.Stretches())
	}
}

func TestStopAtEvent(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	limit := func(p *continuation.Point) float64 { return p.State[1] - 340 }
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330), continuation.StopAt("temperature limit", limit), continuation.Upward())
	end := b.Ends()[1]
	if end.Reason != continuation.AtSpecial || !strings.Contains(end.Text, "met the temperature limit at Coolant") {
		t.Errorf("ended by %q: %s", end.Reason, end.Text)
	}
	if v := end.Point.State[1]; math.Abs(v-340) > 1e-9 {
		t.Errorf("stopped at Temperature %v", v)
	}
}

func TestEventThatIsNaN(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330), continuation.Mark("odd", func(*continuation.Point) float64 { return math.NaN() }))
	if len(b.Events()) != 0 || len(b.Folds()) != 2 {
		t.Errorf("found %v", b.Specials())
	}
	if len(b.Notes()) == 0 || !strings.Contains(b.Notes()[0], `the event "odd" is NaN near Coolant`) {
		t.Errorf("notes %q", b.Notes())
	}
	_, err := start.Follow("Coolant", continuation.Mark("", nil))
	oneLine(t, err, "an event wants a name and a function")
}
