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
