package display

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

// TestTrajectory draws the free decay x = exp(-t) between the steps of the integrator.
func TestTrajectory(t *testing.T) {
	m := newModel(t, func(s oneState, q oneParams) oneState { return oneState{q.Push - s.X} }, oneParams{}, continuation.Named("decay"))
	path, err := m.Simulate(oneState{1}, 3)
	if err != nil {
		t.Fatal(err)
	}
	s, err := Plot(path).scene()
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, r := range s.curves[0].runs {
		for _, p := range r.places {
			n++
			if math.Abs(p.y-math.Exp(-p.x)) > 1e-4 {
				t.Errorf("%g at time %g", p.y, p.x)
			}
		}
	}
	if n <= len(path.Times) {
		t.Errorf("%d places for %d steps", n, len(path.Times))
	}
	b := Render(path)
	if b.Data[MIMESVG] == nil || !strings.Contains(b.Text(), "X against Time") || !strings.Contains(b.Text(), "Reached time 3.") || strings.Contains(b.Text(), "stable") {
		t.Errorf("%q", b.Text())
	}
}

// TestRelaxations shows a rest, and an oscillation with the radius 1/√2 and the period π.
func TestRelaxations(t *testing.T) {
	m := newModel(t, wheel, wheelParams{Drive: 0.5, Spin: 2}, continuation.Named("wheel"))
	r, err := m.Relax(wheelState{0.1, 0})
	if err != nil {
		t.Fatal(err)
	}
	text := Render(Table(r)).Text()
	for _, want := range []string{"Relaxation of wheel to an oscillation", "period             3.14", "0.707"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
	for _, f := range []*Figure{Plot(r), Plot(r).X("X").Y("Y"), Plot(r, r)} {
		if err := f.Err(); err != nil {
			t.Error(err)
		}
	}
	if text := Render(r).Text(); !strings.Contains(text, "period") {
		t.Errorf("%q", text)
	}
	rest, err := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank")).Relax(tankState{0.1, 310})
	if err != nil {
		t.Fatal(err)
	}
	if text := Table(rest).String(); !strings.Contains(text, "Relaxation of tank: Steady state") || !strings.Contains(text, "326.678") {
		t.Errorf("%s", text)
	}
	path := tankBranch(t)
	for name, c := range map[string]struct {
		figure *Figure
		want   string
	}{
		"nil":     {Plot((*continuation.Trajectory)(nil)), "no trajectory to draw (nil)"},
		"nil too": {Plot((*continuation.Relaxation)(nil)), "no relaxation to draw (nil)"},
		"YFunc":   {Plot(rest).YFunc("y", func(*continuation.Point) float64 { return 1 }), "choose a state"},
		"unknown": {Plot(rest).Y("Temperatur"), "did you mean Temperature?"},
		"mixed":   {Plot(path, r).X("Temperature").Y("Conversion"), "the model has"},
	} {
		if err := c.figure.Err(); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
	if err := Plot(path, rest).X("Temperature").Y("Conversion").Err(); err != nil {
		t.Error(err)
	}
}
