package display

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/plot"
	"gonum.org/v1/plot/plotter"

	"brinkline/continuation"
)

type word string

func (w word) String() string { return "<" + string(w) + ">" }

type bad struct{}

func (bad) String() string { panic("no text") }

func TestRenderPlain(t *testing.T) {
	long := make([]float64, 5000)
	for _, c := range []struct {
		v    any
		want string
	}{
		{nil, "nil"},
		{(*continuation.Branch)(nil), "nil *continuation.Branch"},
		{(*Figure)(nil), "nil *display.Figure"},
		{3.5, "3.5"},
		{"text", "text"},
		{[]int{1, 2}, "[1 2]"},
		{map[string]int{"b": 2, "a": 1}, "map[a:1 b:2]"},
		{struct{ A, B int }{1, 2}, "{A:1 B:2}"},
		{&struct{ A int }{1}, "&{A:1}"},
		{errors.New("no steady state"), "no steady state"},
		{word("w"), "<w>"},
		{bad{}, "a display.bad that cannot be shown: no text"},
		{long, "[" + strings.Repeat("0 ", 20) + "..." + strings.Repeat(" 0", 20) + "] (5000 values)"},
	} {
		b := Render(c.v)
		if len(b.Data) != 1 || b.Text() != c.want {
			t.Errorf("%T: %v, want %q", c.v, b.Data, c.want)
		}
	}
}

func TestRenderGonum(t *testing.T) {
	m := Render(mat.NewDense(2, 2, []float64{1, -2.5, 3e-9, 4}))
	if !strings.Contains(m.Text(), "-2.5") || !strings.Contains(m.Data[MIMEHTML].(string), "3e-9") {
		t.Errorf("matrix: %v", m.Data)
	}
	p := plot.New()
	p.Title.Text = "A line"
	line, err := plotter.NewLine(plotter.XYs{{X: 0, Y: 0}, {X: 1, Y: 1}})
	if err != nil {
		t.Fatal(err)
	}
	p.Add(line)
	b := Render(p)
	if b.Data[MIMESVG] == nil || b.Data[MIMEPNG] == nil || !strings.Contains(b.Text(), "A line") {
		t.Errorf("plot: %d forms, %q", len(b.Data), b.Text())
	}
}

func TestShow(t *testing.T) {
	var out bytes.Buffer
	path := tankBranch(t)
	if err := Fshow(&out, "first", path.Folds()[0], 3); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"first\n", "Fold of tank in Coolant", caution, "\n3\n"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("%q is not in\n%s", want, &out)
		}
	}
	out.Reset()
	err := Fshow(&out, "shown", Plot(path).Y("Presure"), "not shown")
	if err == nil || !strings.Contains(err.Error(), "Presure") || out.String() != "shown\n" {
		t.Errorf("error %v, output %q", err, &out)
	}
	if err := Fshow(&out); err == nil {
		t.Error("Show of nothing is no error")
	}
	if err := Fshow(&out, Group{1, Table(7)}); err == nil {
		t.Error("the error of a group is lost")
	}
	if text := Render(Group{1, "two"}).Text(); text != "1\n\ntwo" {
		t.Errorf("group: %q", text)
	}
}

// TestFoldCard checks the card against a model with known folds: x' = p + x - x³
// turns at x = ∓1/√3 with p = ±2/(3√3); v = 1, w = 1, wᵀf_λ = 1, a = ½ f_xx = -3x.
func TestFoldCard(t *testing.T) {
	m := newModel(t, func(s oneState, q oneParams) oneState { return oneState{q.Push + s.X - s.X*s.X*s.X} },
		oneParams{Push: -1}, continuation.Named("switch"))
	path := follow(t, settle(t, m, oneState{-1.3}), "Push", continuation.Within(-1, 1))
	text := Render(path.Folds()[0]).Text()
	exact := 2 / (3 * math.Sqrt(3))
	a := 3 / math.Sqrt(3)
	for _, want := range []string{
		"Fold of switch in Push",
		fmt.Sprintf(" %.10f\n", exact), fmt.Sprintf(" %.5f ", -1/math.Sqrt(3)),
		"wᵀ f_λ = 1, not 0: f_λ lies outside the range of f_x",
		"a = ½ wᵀ f_xx[v, v] = " + significant(a, 4),
		"-a/(wᵀ f_λ) = " + significant(-a, 4),
		"the greatest Push near by: the two steady states that meet here do not exist above 0.3849 N",
		"stable before, unstable (1 eigenvalue with positive real part) after",
		"|v| = 1", "wᵀ v = 1",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
	if !strings.HasSuffix(text, "\n"+caution) {
		t.Errorf("the caution does not end\n%s", text)
	}
}

func TestCards(t *testing.T) {
	path := tankBranch(t)
	fold := path.Folds()[0]
	start := path.Points()[path.Start()]
	margin, err := start.MarginTo(fold)
	if err != nil {
		t.Fatal(err)
	}
	sens, err := fold.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]struct {
		v    any
		want []string
	}{
		"model":         {path.Model(), []string{"Model tank: 2 states, 3 parameters", "Temperature (K)", "dx/dt", "finite differences"}},
		"balance":       {feederBranch(t).Model(), []string{"without time", "nothing is called stable"}},
		"point":         {start, []string{"Steady state of tank at Coolant 300 K", "326.678", "stable: both eigenvalues", "-0.8526 ± 0.5603 i"}},
		"balance point": {feederBranch(t).Points()[3], []string{"not called stable or unstable"}},
		"Hopf":          {path.HopfPoints()[0], []string{"303.094", "period", "loss of stability", "first Lyapunov coefficient", caution}},
		"bifurcation":   {strutBranch(t).BranchPoints()[0], []string{"Simple stationary bifurcation of strut", "supercritical pitchfork", "0 up to rounding", "two branches cross here", "1 s m - 0.3 s³ = 0 for m = Load - 12"}},
		"margin":        {margin, []string{"1.78291 K", "0.5943 %", "up:", caution}},
		"sensitivities": {sens, []string{"Feed", "K per L/min", "percent per percent"}},
		"special":       {Table(path), []string{"Coolant (K)", "301.7829132", "unstable (1)", "stable", "digits", "left the range"}},
		"folds":         {path.Folds(), []string{"361.487"}},
		"points":        {Points(path), []string{"90 rows x 8 columns", "start", "Hopf point", "..."}},
		"marked":        {Mark(start, "today"), []string{"Steady state of tank"}},
	} {
		b := Render(c.v)
		page, _ := b.Data[MIMEHTML].(string)
		if page == "" || b.Data[MIMELaTeX] == nil {
			t.Errorf("%s: no table", name)
		}
		for _, want := range c.want {
			if !strings.Contains(b.Text(), want) {
				t.Errorf("%s: %q is not in\n%s", name, want, b.Text())
			}
		}
		for _, bad := range []string{"<style", "color", "class=", "<script"} {
			if strings.Contains(page, bad) {
				t.Errorf("%s: %s in the html", name, bad)
			}
		}
		if !strings.Contains(page, "<caption") || !strings.Contains(page, `th scope=`) {
			t.Errorf("%s: no caption or scope:\n%s", name, page)
		}
	}
	if text := Render(sens).Text(); strings.Index(text, "Feed") > strings.Index(text, "Inflow") {
		t.Errorf("the greater elasticity does not come first:\n%s", text)
	}
}

func TestTables(t *testing.T) {
	type part struct {
		Name string
		Heat float64 `unit:"kW"`
		note string
	}
	g := Table([]part{{"north <1>", 1.25, ""}, {"south", 1250, ""}}).Caption("Heat & more")
	golden(t, "table.html", g.html())
	golden(t, "table.txt", g.plain()+"\n")
	golden(t, "table.tex", g.latex())
	if g.Rows() != 2 || g.Columns() != 2 {
		t.Errorf("%d rows, %d columns", g.Rows(), g.Columns())
	}
	for _, v := range []any{nil, 7, "text", (*continuation.Branch)(nil)} {
		if err := Table(v).Err(); err == nil {
			t.Errorf("Table(%v) is no error", v)
		}
		if err := Points(v).Err(); err == nil {
			t.Errorf("Points(%v) is no error", v)
		}
	}
	for _, v := range []any{map[string]float64{"a": 1}, []float64{1, 2}, [][]float64{{1, 2}, {3}}, mat.NewDense(30, 30, nil), []continuation.Special{}, []*continuation.Point{}} {
		if err := Table(v).Err(); err != nil {
			t.Errorf("%T: %v", v, err)
		}
		Render(Table(v))
	}
}

func TestNoSpecialPoints(t *testing.T) {
	path := tankBranch(t)
	m := newModel(t, func(s oneState, q oneParams) oneState { return oneState{q.Push - s.X} }, oneParams{})
	plain := follow(t, settle(t, m, oneState{}), "Push", continuation.Within(-1, 1))
	if text := Table(plain).String(); !strings.Contains(text, "none") {
		t.Errorf("%s", text)
	}
	if text := Render(plain).Text(); !strings.Contains(text, "No special points.") {
		t.Errorf("%s", text)
	}
	if text := Table(path).String(); strings.Contains(text, "none") {
		t.Errorf("%s", text)
	}
}

func TestProgress(t *testing.T) {
	path := tankBranch(t)
	p := continuation.Progress{Task: "Follow Coolant", Steps: 40, Fraction: 0.4, Value: 299.5, Partial: func() *continuation.Branch { return path }}
	b := Render(p)
	page := b.Data[MIMEHTML].(string)
	if b.Text() != "Follow Coolant: 40 steps, 40 %, Coolant 299.5 K, 3 special points" {
		t.Errorf("%q", b.Text())
	}
	if !strings.Contains(page, `<progress max="100" value="40">`) || !strings.Contains(page, "<svg") {
		t.Errorf("%s", page)
	}
	p.Done = true
	b = Render(p)
	if page := b.Data[MIMEHTML].(string); strings.Contains(page, "progress") || !strings.Contains(page, "done") {
		t.Errorf("%s", page)
	}
	for _, p := range []continuation.Progress{{Task: "Settle"}, {Task: "Follow", Fraction: 7, Value: math.NaN()}} {
		if text := Render(p).Text(); !strings.HasPrefix(text, p.Task+": 0 steps") {
			t.Errorf("%q", text)
		}
	}
}

// found stands for the result of a survey.
type found []*continuation.Point

func (f found) Points() []*continuation.Point { return f }
func (f found) Statement() string             { return "64 starts, the last 40 found nothing new" }

func TestSurveys(t *testing.T) {
	points := tankBranch(t).Points()
	v := found{points[0], points[40]}
	b := Render(v)
	for _, want := range []string{"Steady states found", "305.039", "64 starts, the last 40 found nothing new."} {
		if !strings.Contains(b.Text(), want) {
			t.Errorf("%q is not in\n%s", want, b.Text())
		}
	}
	if err := Plot(v).Err(); err != nil {
		t.Error(err)
	}
	if text := Render(found{}).Text(); !strings.Contains(text, "none") {
		t.Errorf("%s", text)
	}
}

func TestGroupShowsAll(t *testing.T) {
	b := Render(Group{Plot(tankBranch(t)), Table([]float64{1}), "a < b"})
	page := b.Data[MIMEHTML].(string)
	for _, want := range []string{"<svg", "<table", "<pre>a &lt; b</pre>"} {
		if !strings.Contains(page, want) {
			t.Errorf("%s is missing", want)
		}
	}
}
