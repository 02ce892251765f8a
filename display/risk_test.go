package display_test

import (
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"brinkline/continuation"
	"brinkline/display"
)

// harvest is a stock with two drains: x (1-x) = First + 2 Second.
func harvest(t *testing.T) *continuation.Point {
	t.Helper()
	type state struct {
		Stock float64 `unit:"t"`
	}
	type params struct {
		First  float64 `unit:"t/a"`
		Second float64 `unit:"t/a"`
	}
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{s.Stock*(1-s.Stock) - q.First - 2*q.Second}
	}, params{0.05, 0.04}, continuation.Named("harvest"))
	if err != nil {
		t.Fatal(err)
	}
	p, err := m.Settle(state{0.85})
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func plainOf(t *testing.T, v any) string {
	t.Helper()
	text, _ := display.Render(v).Data[display.MIMEPlain].(string)
	return text
}

func holdsAll(t *testing.T, text string, words ...string) {
	t.Helper()
	for _, w := range words {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
}

func TestFamilyShowsItself(t *testing.T) {
	f, err := harvest(t).Sweep("First", "Second", []float64{0.02, 0.04, 0.2}, continuation.Within(0, 0.3))
	if err != nil {
		t.Fatal(err)
	}
	b := display.Render(f)
	if svg, _ := b.Data[display.MIMESVG].(string); strings.Count(svg, "<path") < 2 {
		t.Errorf("no picture: %v", b.Data[display.MIMEPlain])
	}
	holdsAll(t, display.Table(f).String(), "Second (t/a)", "fold", "0.21", "0.17", "no start: the branch in Second met the fold")
}

func TestScatterAndBarsShowThemselves(t *testing.T) {
	p := harvest(t)
	b, err := p.Follow("First", continuation.Within(0, 0.3))
	if err != nil {
		t.Fatal(err)
	}
	s, err := p.MarginScatter(b.Folds()[0], continuation.Scatter(continuation.Normal("Second", 0.04, 0.02), continuation.Normal("First", 0.05, 0.02)), 500)
	if err != nil {
		t.Fatal(err)
	}
	holdsAll(t, plainOf(t, s), "Margin in First to the fold over 500 samples", "passed in", "not a safety limit")
	if _, ok := display.Render(s).Data[display.MIMESVG]; !ok {
		t.Error("no histogram")
	}
	all, err := b.Folds()[0].Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	bars := display.Bars(all)
	if _, ok := bars.Data[display.MIMESVG]; !ok {
		t.Error("no bars")
	}
	// λ* = 1/4 - 2 Second: elasticity -0.08/0.17
	holdsAll(t, plainOf(t, bars), "fold at First 0.17", "Second -0.471")
	holdsAll(t, plainOf(t, display.Bars(nil)), "no sensitivities")
}

func TestFitAndMeasurementsShowThemselves(t *testing.T) {
	p := harvest(t)
	r := rand.New(rand.NewPCG(1, 2))
	text := "First (t/a),Stock (t)\n"
	var rows []string
	for x := 0.55; x < 0.9; x += 0.05 {
		rows = append(rows, strings.Join([]string{number(x*(1-x) - 0.09 + 0.001*r.NormFloat64()), number(x)}, ","))
	}
	d, err := p.Model().ReadMeasured(strings.NewReader(text + strings.Join(rows, "\n")))
	if err != nil {
		t.Fatal(err)
	}
	f, err := p.Fit(d, "Second")
	if err != nil {
		t.Fatal(err)
	}
	holdsAll(t, plainOf(t, f), "fitted to measured points", "Second (t/a)", "0.04", "degrees of freedom")
	holdsAll(t, plainOf(t, d), "First (t/a)", "Stock (t)")
	path, err := f.Point.Follow("First", continuation.Within(0, 0.3))
	if err != nil {
		t.Fatal(err)
	}
	if err := display.Plot(path, d).Err(); err != nil {
		t.Error(err)
	}
}

func number(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
