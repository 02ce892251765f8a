package display

import (
	"strings"
	"testing"

	"brinkline/continuation"
)

// TestMargins shows the limits on both sides of the tank's cold state: the fold above
// it, none below it; and the way to the fold with two parameters that move together.
func TestMargins(t *testing.T) {
	start := tankStart(t)
	m, err := start.Margins("Coolant", continuation.Within(280, 320))
	if err != nil {
		t.Fatal(err)
	}
	text := Render(m).Text()
	for _, want := range []string{"Margins of tank in Coolant", "now 300 K", "above: fold", "301.78291 K", "1.78291 K", "0.5943 %", "no limit", caution} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
	f := Plot(m)
	if err := f.Err(); err != nil || !strings.Contains(f.String(), "Margin in Coolant: 1.78291 K") {
		t.Errorf("%v: %q", err, f)
	}
	d, err := start.MarginAlong(map[string]float64{"Coolant": 1, "Inflow": -2}, 20)
	if err != nil {
		t.Fatal(err)
	}
	text = Render(d).Text()
	for _, want := range []string{"Margin of tank along a direction", "fold", "steps to it", "Coolant (K)", "Inflow (L/min)", "parameters that stay", "Feed (K)", caution} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
	if err := Plot((*continuation.Margins)(nil)).Err(); err == nil {
		t.Error("margins that are nil are no error")
	}
	t.Log(Render(m).Text() + "\n" + text)
}

// TestRealSurvey shows what a survey found: three steady states, two of them stable.
func TestRealSurvey(t *testing.T) {
	m := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank"))
	s, err := m.Survey(continuation.Box{"Conversion": {0, 1}, "Temperature": {280, 450}})
	if err != nil {
		t.Fatal(err)
	}
	b := Render(s)
	for _, want := range []string{"Steady states of tank found", "Conversion from 0 to 1", "Temperature from 280 to 450 K", "0.143709", "stable", "found nothing new"} {
		if !strings.Contains(b.Text(), want) {
			t.Errorf("%q is not in\n%s", want, b.Text())
		}
	}
	if g := Table(s); g.Rows() != len(s.Points()) {
		t.Errorf("%d rows", g.Rows())
	}
	if err := Plot(s).X("Conversion").Y("Temperature").Err(); err != nil {
		t.Error(err)
	}
	t.Log(b.Text())
}

// TestNearestLimits shows the nearest limit, the probability that it is passed and the
// second order of the tank's ignition.
func TestNearestLimits(t *testing.T) {
	start := tankStart(t)
	n, err := start.NearestLimit(map[string]float64{"Coolant": 1, "Inflow": 5})
	if err != nil {
		t.Fatal(err)
	}
	c, err := start.Chance(continuation.Scatter(continuation.Normal("Coolant", 300, 0.7), continuation.Normal("Inflow", 100, 3)))
	if err != nil {
		t.Fatal(err)
	}
	second, err := tankBranch(t).Folds()[0].SecondOrder()
	if err != nil {
		t.Fatal(err)
	}
	for _, one := range []struct {
		v    any
		want []string
	}{
		{n, []string{"Nearest limit of tank: fold", "distance", "Coolant (K)", "share", "no proof", caution}},
		{c, []string{"Probability that tank passes a limit (fold)", "β = ", "Φ(-β) = ", "Inflow (L/min)", "factor", caution}},
		{second, []string{"How the fold at Coolant 301.783 K moves", "second derivative", "Inflow (L/min)"}},
	} {
		text := Render(one.v).Text()
		for _, want := range one.want {
			if !strings.Contains(text, want) {
				t.Errorf("%q is not in\n%s", want, text)
			}
		}
		t.Log(text)
	}
}
