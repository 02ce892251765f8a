package display

import (
	"bytes"
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

// The models of the loci are normal forms in invented units, or the invented tank:
// where their special points lie is known by hand.

func locus(t testing.TB, s continuation.Special, second string, opts ...continuation.FollowOption) *continuation.Locus {
	t.Helper()
	var l *continuation.Locus
	var err error
	switch s := s.(type) {
	case *continuation.Fold:
		l, err = s.Follow(second, opts...)
	case *continuation.Hopf:
		l, err = s.Follow(second, opts...)
	default:
		t.Fatalf("a %T has no locus", s)
	}
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// tankLoci are the edge of ignition and the Hopf points of the tank, and a branch.
func tankLoci(t testing.TB) (path *continuation.Branch, folds, hopfs *continuation.Locus) {
	path = tankBranch(t)
	folds = locus(t, path.Folds()[0], "Inflow", continuation.Within(20, 250), continuation.Bound("Coolant", 240, 340))
	hopfs = locus(t, path.HopfPoints()[0], "Inflow", continuation.Within(20, 250), continuation.Bound("Coolant", 240, 340))
	return path, folds, hopfs
}

type pairParams struct {
	Push  float64 `unit:"N"`
	Lever float64 `unit:"m"`
}

type planar struct{ X, Y float64 }

// takens has a Bogdanov-Takens point at 0, 0; its folds lie at Push = Lever²/4 and
// its Hopf points at Push = 0, Lever < 0. sense is the sign of a2 b2.
func takens(t testing.TB, sense float64) *continuation.Branch {
	f := func(s planar, q pairParams) planar {
		return planar{s.Y, q.Push + q.Lever*s.X + s.X*s.X + sense*s.X*s.Y}
	}
	m := newModel(t, f, pairParams{Push: -2, Lever: -2}, continuation.Named("rocker"))
	return follow(t, settle(t, m, planar{-0.8, 0}), "Push", continuation.Within(-2, 2))
}

type spatial struct{ X, Y, Z float64 }

// foldHopf has folds at Push = 0, and a pair with the real part Lever there.
func foldHopf(t testing.TB) *continuation.Locus {
	f := func(s spatial, q pairParams) spatial {
		r, a := s.X*s.X+s.Y*s.Y, q.Lever+s.Z
		return spatial{a*s.X - 3*s.Y - r*s.X, 3*s.X + a*s.Y - r*s.Y, q.Push + 0.2*q.Lever*q.Lever - s.Z*s.Z - r}
	}
	m := newModel(t, f, pairParams{Push: 1, Lever: -2}, continuation.Named("top"))
	path := follow(t, settle(t, m, spatial{0, 0, 1}), "Push", continuation.Within(-2, 2))
	return locus(t, path.Folds()[0], "Lever", continuation.Within(-3, 3))
}

type four struct{ A, B, C, D float64 }

// hopfHopf has pairs with the real parts Push - Lever² and Lever + Push/3.
func hopfHopf(t testing.TB) *continuation.Locus {
	f := func(s four, q pairParams) four {
		one, two := q.Push-q.Lever*q.Lever, q.Lever+q.Push/3
		r, w := s.A*s.A+s.B*s.B, s.C*s.C+s.D*s.D
		return four{one*s.A - 2*s.B - r*s.A, 2*s.A + one*s.B - r*s.B, two*s.C - 5*s.D - w*s.C, 5*s.C + two*s.D - w*s.D}
	}
	m := newModel(t, f, pairParams{Push: -1, Lever: -0.8}, continuation.Named("coupler"))
	path := follow(t, settle(t, m, four{}), "Push", continuation.Within(-1, 2))
	return locus(t, path.HopfPoints()[0], "Lever", continuation.Within(-1, 1))
}

// degenerate has Hopf points at Push = Lever²/5 whose first Lyapunov coefficient has
// the sign of Lever.
func degenerate(t testing.TB, lever float64) *continuation.Branch {
	f := func(s planar, q pairParams) planar {
		r := s.X*s.X + s.Y*s.Y
		a := q.Push - q.Lever*q.Lever/5 + q.Lever*r - r*r
		return planar{a*s.X - 3*s.Y, 3*s.X + a*s.Y}
	}
	m := newModel(t, f, pairParams{Push: -1, Lever: lever}, continuation.Named("rotor"))
	return follow(t, settle(t, m, planar{}), "Push", continuation.Within(-2, 2))
}

func degenerateLocus(t testing.TB) *continuation.Locus {
	return locus(t, degenerate(t, -1).HopfPoints()[0], "Lever", continuation.Within(-2, 2))
}

// TestLocusFigure holds the lines and marks against what is known by hand.
func TestLocusFigure(t *testing.T) {
	rocker := takens(t, -1)
	within := continuation.Within(-3, 3)
	folds, hopfs := locus(t, rocker.Folds()[0], "Lever", within), locus(t, rocker.HopfPoints()[0], "Lever", within)
	s, err := Plot(folds, hopfs).scene()
	if err != nil {
		t.Fatal(err)
	}
	if s.x.what() != "Push" || s.y.what() != "Lever" || !s.plane() {
		t.Errorf("axes %s, %s", s.x.what(), s.y.what())
	}
	for _, r := range s.curves[0].runs {
		for _, p := range r.places {
			if !close(p.x, p.y*p.y/4) {
				t.Errorf("fold at %g, %g, want Push = Lever²/4", p.x, p.y)
			}
			if below := p.y < -1e-6; r.line != solid || (below && r.fine && p.y != r.places[0].y) {
				t.Errorf("line %d, fine %v at Lever %g", r.line, r.fine, p.y)
			}
		}
	}
	var lines []lineKind
	for _, r := range s.curves[1].runs {
		lines = append(lines, r.line)
		for _, p := range r.places {
			if !close(p.x, 0) || (r.line == dotted) != (r.places[0].y > -1e-6 && r.places[len(r.places)-1].y > 0) {
				t.Errorf("Hopf locus at %g, %g as line %d", p.x, p.y, r.line)
			}
		}
	}
	if len(lines) != 2 || lines[0] == lines[1] {
		t.Errorf("lines of the Hopf locus: %v", lines)
	}
	var takens []mark
	for _, m := range s.marks {
		if m.shape == restShape {
			takens = append(takens, m)
		}
	}
	if len(takens) != 1 || takens[0].label != "Bogdanov-Takens point 0 N, 0 m" {
		t.Errorf("marks %v, want the point on both loci once", takens)
	}
}

func close(a, b float64) bool { return math.Abs(a-b) <= 1e-6*(1+math.Abs(b)) }

// TestCorners draws each kind of special point of loci, and says it in the figure, a
// card and a table.
func TestCorners(t *testing.T) {
	_, folds, hopfs := tankLoci(t)
	rocker := takens(t, 1)
	for _, c := range []struct {
		locus *continuation.Locus
		kind  string
		shape shape
		card  []string
		row   string
	}{
		{folds, "cusp", wedgeShape, []string{"Cusp of tank in Coolant and Inflow", "c = 0.00159", "wᵀ v = 1", "three steady states"}, "c = "},
		{locus(t, rocker.Folds()[0], "Lever", continuation.Within(-3, 3)), "Bogdanov-Takens point", restShape,
			[]string{"a2 = 1, b2 = 1", "|q0| = 1", "small oscillations are unstable", "eigenvalues of f_x  0, 0"}, "a2 = 1, b2 = 1"},
		{foldHopf(t), "fold-Hopf point", throughShape, []string{"± 3 i", "0 ± 3 i, 0", "period 2.0944"}, "ω = 3"},
		{hopfHopf(t), "Hopf-Hopf point", twinShape, []string{"± 2 i", "± 5 i", "Two Hopf loci cross"}, "ω = 2 and 5"},
		{degenerateLocus(t), "degenerate Hopf point", halfShape, []string{"± 3 i", "softly"}, "ω = 3, l1 = 0"},
		{hopfs, "degenerate Hopf point", halfShape, []string{"softly"}, "l1 = 0"},
	} {
		s, err := Plot(c.locus).scene()
		if err != nil {
			t.Fatal(err)
		}
		found := false
		for _, m := range s.marks {
			found = found || (m.shape == c.shape && strings.HasPrefix(m.label, c.kind+" "))
		}
		if !found {
			t.Errorf("%s is not in the scene", c.kind)
		}
		if b := Render(c.locus); b.Data[MIMESVG] == nil || !strings.Contains(strings.ToLower(b.Text()), strings.ToLower(c.kind)+" at ") {
			t.Errorf("%s is not in %q", c.kind, b.Text())
		}
		for _, special := range c.locus.Specials() {
			if special.Kind != c.kind {
				continue
			}
			text := Render(special).Text()
			for _, want := range append(c.card, caution) {
				if !strings.Contains(strings.ToLower(text), strings.ToLower(want)) {
					t.Errorf("%s: %q is not in\n%s", c.kind, want, text)
				}
			}
			if err := Plot(special).Err(); err != nil {
				t.Error(err)
			}
		}
		for _, v := range []any{Table(c.locus), c.locus.Specials()} {
			if text := Render(v).Text(); !strings.Contains(text, c.kind) || !strings.Contains(text, c.row) {
				t.Errorf("%s: no row %q in\n%s", c.kind, c.row, text)
			}
		}
	}
}

// TestHalfRing turns the filled half to the side where the first Lyapunov coefficient
// is positive: that of growing Lever.
func TestHalfRing(t *testing.T) {
	s, err := Plot(degenerateLocus(t)).scene()
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range s.marks {
		if m.shape == halfShape && !(m.dy > 0) {
			t.Errorf("the hard side points to %g, %g", m.dx, m.dy)
		}
	}
}

// TestPlane draws a branch in a plane of two parameters: its path, its folds along the
// edge they lie on, where the model was made.
func TestPlane(t *testing.T) {
	path, folds, _ := tankLoci(t)
	f := Plot(path, folds).X("Coolant").Y("Inflow")
	s, err := f.scene()
	if err != nil {
		t.Fatal(err)
	}
	if len(s.curves) != 1 || !s.curves[0].locus || len(s.hair) != 1 {
		t.Errorf("%d curves, %d thin lines", len(s.curves), len(s.hair))
	}
	sens, err := path.Folds()[0].Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	bars := 0
	for _, m := range s.marks {
		if m.shape == foldShape {
			bars++
			if bars == 1 && !close(m.dx/m.dy, sens.List[0].Slope) {
				t.Errorf("the bar has the slope %g, want the sensitivity %g", m.dx/m.dy, sens.List[0].Slope)
			}
		}
	}
	text := f.String()
	for _, want := range []string{"locus of folds", "Cusp at Coolant 306.82", "fold at Coolant 301.78291 K", "The thin line is the path", "The dot is where the model was made: Coolant 300 K, Inflow 100 L/min."} {
		if !strings.Contains(strings.ToLower(text), strings.ToLower(want)) {
			t.Errorf("%q is not in %q", want, text)
		}
	}
	if bars != 2 {
		t.Errorf("%d folds", bars)
	}
	start := path.Points()[path.Start()]
	if text := Plot(folds, Mark(start, "today")).String(); strings.Contains(text, "The dot is") {
		t.Errorf("the model's own values besides a point of the analyst's: %q", text)
	}
	if err := Plot(path).X("Coolant").Y("Inflow").Err(); err != nil {
		t.Error(err)
	}
	var doc bytes.Buffer
	if err := Plot(folds, Mark(start, "today")).X("Inflow").WriteSVG(&doc); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(doc.String(), ">today 100 L/min, 300 K<") || !strings.Contains(doc.String(), ">cusp 69.834 L/min, 306.82 K<") {
		t.Error("the values do not follow the axes")
	}
}

// TestLocusPoints holds the tables of points.
func TestLocusPoints(t *testing.T) {
	_, folds, hopfs := tankLoci(t)
	for _, c := range []struct {
		v    any
		want []string
	}{
		{Points(folds), []string{"Locus of the folds of tank", "Coolant (K)", "Inflow (L/min)", "start", "cusp", "others positive"}},
		{Points(hopfs), []string{"ω", "l1", "Bogdanov-Takens point", "|q| = 1"}},
		{folds.Points()[:3], []string{"Points of loci"}},
		{folds.Points()[0], []string{"Point of a locus of tank at Coolant 240 K", "critical"}},
	} {
		text := Render(c.v).Text()
		for _, want := range c.want {
			if !strings.Contains(text, want) {
				t.Errorf("%q is not in\n%s", want, text)
			}
		}
		if strings.Contains(text, "NaN") || strings.Contains(text, "not defined") {
			t.Errorf("what is not there is shown:\n%s", text)
		}
	}
}

// TestFan holds the fan against the oscillation in closed form: of the rotor with
// Lever -1 r² = Push - 1/5 to leading order, for Push above 1/5, and below it with +1.
func TestFan(t *testing.T) {
	for _, c := range []struct {
		lever float64
		line  lineKind
		side  float64
	}{{-1, solid, 1}, {1, dashed, -1}} {
		f := Plot(degenerate(t, c.lever))
		s, err := f.scene()
		if err != nil {
			t.Fatal(err)
		}
		if len(s.hair) != 2 {
			t.Fatalf("%d thin lines", len(s.hair))
		}
		for i, h := range s.hair {
			if h.line != c.line || !h.fan {
				t.Errorf("Lever %g: line %d", c.lever, h.line)
			}
			for _, p := range h.places {
				want := math.Sqrt(max(0, c.side*(p.x-0.2)))
				if i == 1 {
					want = -want
				}
				if math.Abs(p.y-want) > 1e-5 {
					t.Errorf("Lever %g: %g at Push %g, want %g", c.lever, p.y, p.x, want)
				}
			}
		}
		if text := f.String(); !strings.Contains(text, "local estimate") {
			t.Errorf("%q", text)
		}
	}
	path := tankBranch(t)
	for name, f := range map[string]*Figure{
		"no state on y":     Plot(path).YFunc("y", func(p *continuation.Point) float64 { return p.State[0] }),
		"parameter on y":    Plot(path).X("Conversion").Y("Coolant"),
		"other state on x":  Plot(path).X("Temperature"),
		"no Hopf point":     Plot(lakeBranch(t, 0.7)),
		"a balance":         Plot(feederBranch(t)),
		"the Hopf alone":    Plot(path.HopfPoints()),
		"plane of two":      Plot(path).X("Coolant").Y("Inflow"),
		"eigenvalues of it": Eigenvalues(path),
	} {
		if strings.Contains(f.String(), "fan") {
			t.Errorf("%s: a fan is said: %q", name, f)
		}
	}
}

// TestEigenvalues compares the lines with the closed form of the rocker: of x² - x y
// the trace is -x and the determinant -(Lever + 2x).
func TestEigenvalues(t *testing.T) {
	path := takens(t, -1)
	f := Eigenvalues(path)
	s, err := f.eigenScene()
	if err != nil {
		t.Fatal(err)
	}
	for k, c := range s.curves {
		for _, r := range c.runs {
			for _, p := range r.places {
				x := func(root float64) float64 { return 1 + root*math.Sqrt(1-p.x) } // Lever -2
				best := math.Inf(1)
				for _, root := range []float64{-1, 1} {
					for _, sign := range []float64{-1, 1} {
						disc := x(root)*x(root)/4 + (2*x(root) - 2)
						best = min(best, math.Abs(p.y-(-x(root)/2+sign*math.Sqrt(max(disc, 0)))))
					}
				}
				if best > 1e-6 {
					t.Errorf("eigenvalue %d: %g at Push %g is off by %g", k, p.y, p.x, best)
				}
			}
		}
	}
	text := f.String()
	for _, want := range []string{"Real parts of the eigenvalues of f_x against Push (N)", "Hopf point at Push", "dash-dotted: complex pairs"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in %q", want, text)
		}
	}
	start := tankStart(t)
	text = Eigenvalues(start).String()
	for _, want := range []string{"complex plane", "-0.8526 ± 0.5603 i", "Stable: both eigenvalues"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in %q", want, text)
		}
	}
	for _, v := range []any{Mark(start, "now"), path.Folds()[0], foldHopf(t).Points()[0], strutBranch(t), feederBranch(t)} {
		if b := Render(Eigenvalues(v)); b.Data[MIMESVG] == nil {
			t.Errorf("%T: %s", v, b.Text())
		}
	}
	if text := Eigenvalues(feederBranch(t)).String(); strings.Contains(text, "stable") {
		t.Errorf("of a balance: %q", text)
	}
	for name, c := range map[string]struct {
		figure *Figure
		want   string
	}{
		"nil":        {Eigenvalues(nil), "wants a branch or a steady state"},
		"nil branch": {Eigenvalues((*continuation.Branch)(nil)), "wants a branch or a steady state"},
		"nil mark":   {Eigenvalues(Mark(nil, "x")), "wants a branch or a steady state"},
		"a number":   {Eigenvalues(3), "not a int"},
		"Y":          {Eigenvalues(path).Y("X"), "Y cannot change it"},
		"X of point": {Eigenvalues(start).X("Coolant"), "X cannot change them"},
		"unknown":    {Eigenvalues(path).X("Pusch"), "did you mean Push?"},
	} {
		if err := c.figure.Err(); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}

// TestFewEigenvalues leaves out those that would press the others against zero.
func TestFewEigenvalues(t *testing.T) {
	f := func(s spatial, q oneParams) spatial { return spatial{q.Push - s.X*s.X, -2*s.Y + s.X, -1e5 * s.Z} }
	m := newModel(t, f, oneParams{Push: 1}, continuation.Named("stiff"))
	path := follow(t, settle(t, m, spatial{1, 0.5, 0}), "Push", continuation.Within(-1, 2))
	figure := Eigenvalues(path)
	if text := figure.String(); !strings.Contains(text, "Shown are the 2 of 3") {
		t.Errorf("%q", text)
	}
}

func TestLocusErrors(t *testing.T) {
	path, folds, _ := tankLoci(t)
	for name, c := range map[string]struct {
		figure *Figure
		want   string
	}{
		"nil locus":   {Plot((*continuation.Locus)(nil)), "no locus to draw (nil)"},
		"nil special": {Plot((*continuation.LocusSpecial)(nil)), "no special point of a locus to draw (nil)"},
		"nil point":   {Plot((*continuation.LocusPoint)(nil)), "no point of a locus"},
		"unknown":     {Plot(folds).Y("Temprature"), "did you mean Temperature?"},
		"labels":      {Plot(path, folds).Label("a", "b", "c"), "3 texts for 2 curves"},
	} {
		if err := c.figure.Err(); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
	if err := Points((*continuation.Locus)(nil)).Err(); err == nil {
		t.Error("points of no locus")
	}
	if got := strings.Join(Plot(folds, folds).names(), "|"); got != "folds 1|folds 2" {
		t.Errorf("%q", got)
	}
	if got := strings.Join(Plot(path, folds).Label("way", "edge").names(), "|"); got != "way|edge" {
		t.Errorf("%q", got)
	}
}
