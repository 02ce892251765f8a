package display

import (
	"bytes"
	"encoding/base64"
	"encoding/binary"
	"errors"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"brinkline/continuation"
)

func TestFigureErrors(t *testing.T) {
	path := tankBranch(t)
	other := feederBranch(t)
	for name, c := range map[string]struct {
		figure *Figure
		want   string
	}{
		"unknown x":        {Plot(path).X("Coolnt"), "did you mean Coolant?"},
		"unknown y":        {Plot(path).Y("Temperatur"), "did you mean Temperature?"},
		"first error":      {Plot(path).Y("Temperatur").X("Nonsense").Size(1, 1), "did you mean Temperature?"},
		"nothing":          {Plot(), "nothing to draw"},
		"empty slice":      {Plot([]*continuation.Branch{}), "nothing to draw"},
		"nil":              {Plot(path, nil), "value 2: there is nothing to draw (nil)"},
		"nil branch":       {Plot((*continuation.Branch)(nil)), "no branch to draw (nil)"},
		"an error":         {Plot(path, errors.New("did not converge")), "did not converge"},
		"a number":         {Plot(3.0), "a float64 cannot be drawn"},
		"size":             {Plot(path).Size(0, 9), "in centimetres"},
		"labels":           {Plot(path).Label("a", "b"), "Label has 2 texts for 1 curve"},
		"range":            {Plot(path).RangeX(3, 2), "the first value must be the smaller"},
		"no function":      {Plot(path).YFunc("y", nil), "wants a function"},
		"log of negative":  {Plot(other).Y("Angle").LogY(), "a logarithmic axis needs positive values; Angle is -"},
		"function panics":  {Plot(path).YFunc("y", func(*continuation.Point) float64 { panic("oh") }), "oh"},
		"all not a number": {Plot(path).YFunc("y", func(*continuation.Point) float64 { return math.NaN() }), "no finite value"},
		"other model":      {Plot(path, other).X("Temperature"), "the model has Angle, Voltage, Demand"},
	} {
		err := c.figure.Err()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
			continue
		}
		if strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: more than one line: %v", name, err)
		}
		b := Render(c.figure)
		if len(b.Data) != 1 || b.Text() != err.Error() {
			t.Errorf("%s: shown as %v", name, b.Data)
		}
	}
}

// TestFigureBundle checks the forms of a figure: no html, a PNG of the right size
// that says its resolution, an alt text.
func TestFigureBundle(t *testing.T) {
	b := Render(tankBranch(t))
	if len(b.Data) != 3 {
		t.Fatalf("%d forms", len(b.Data))
	}
	text := b.Data[MIMEPNG].(string)
	raw, err := base64.StdEncoding.DecodeString(text)
	if err != nil || strings.ContainsAny(text, "\r\n") {
		t.Fatalf("png: %v", err)
	}
	img, err := png.Decode(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	meta := b.Metadata[MIMEPNG].(map[string]any)
	size := img.Bounds().Size()
	if size.X != 794 || size.Y != 510 || meta["width"] != 529 || meta["height"] != 340 { // 14 x 9 cm
		t.Errorf("%v pixels, shown as %v x %v", size, meta["width"], meta["height"])
	}
	at := bytes.Index(raw, []byte("pHYs"))
	if at < 0 || binary.BigEndian.Uint32(raw[at+4:]) != 5669 { // 144 / 0.0254
		t.Error("the resolution is missing")
	}
	alt := meta["alt"].(string)
	for _, want := range []string{"Conversion against Coolant (K)", "Fold at Coolant 301.78", "Hopf point at Coolant 303.09", "Solid: stable, dashed: unstable."} {
		if !strings.Contains(alt, want) {
			t.Errorf("%q is not in %q", want, alt)
		}
	}
	if !strings.Contains(b.Text(), "left the range at Coolant 280 K and left the range at Coolant 320 K.") {
		t.Errorf("the ends are not in %q", b.Text())
	}
	if doc := b.Data[MIMESVG].(string); !strings.Contains(doc, ">fold 301.78 K</text>") || !strings.Contains(doc, "<desc id=") {
		t.Error("the label is not in the svg")
	}
}

func TestAxesAreChosen(t *testing.T) {
	path := tankBranch(t)
	yield := func(p *continuation.Point) float64 { return 100 * p.State[0] }
	for _, c := range []struct {
		figure *Figure
		x, y   string
	}{
		{Plot(path), "Coolant (K)", "Conversion"},
		{Plot(path).Y("Temperature"), "Coolant (K)", "Temperature (K)"},
		{Plot(path).X("Temperature").Y("Coolant"), "Temperature (K)", "Coolant (K)"},
		{Plot(path).YFunc("Yield (%)", yield), "Coolant (K)", "Yield (%)"},
		{Plot(path).YFunc("Yield (%)", yield).Y("Temperature"), "Coolant (K)", "Temperature (K)"},
		{Plot(path.Folds()), "Coolant (K)", "Conversion"},
	} {
		if err := c.figure.Err(); err != nil {
			t.Error(err)
			continue
		}
		p := c.figure.built.plot
		if p.X.Label.Text != c.x || p.Y.Label.Text != c.y {
			t.Errorf("axes %q, %q; want %q, %q", p.X.Label.Text, p.Y.Label.Text, c.x, c.y)
		}
	}
}

// TestLines compares the kinds of line with the stability of the stretches.
func TestLines(t *testing.T) {
	kinds := func(b *continuation.Branch) []lineKind {
		s, err := Plot(b).scene()
		if err != nil {
			t.Fatal(err)
		}
		var list []lineKind
		for _, r := range s.curves[0].runs {
			list = append(list, r.line)
		}
		return list
	}
	same := func(got []lineKind, want ...lineKind) bool {
		if len(got) != len(want) {
			return false
		}
		for i := range got {
			if got[i] != want[i] {
				return false
			}
		}
		return true
	}
	if got := kinds(tankBranch(t)); !same(got, solid, dashed, solid) {
		t.Errorf("tank: %v", got)
	}
	if got := kinds(feederBranch(t)); !same(got, solid, dashed) {
		t.Errorf("feeder: %v", got)
	}
	if got := kinds(isola(t)); !same(got, solid, dashed) {
		t.Errorf("isola, closed in the middle of its stable half: %v", got)
	}
	m := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350})
	quick := follow(t, settle(t, m, tankState{0.1, 320}), "Coolant", continuation.Within(280, 320), continuation.WithoutEigenvalues())
	for _, k := range kinds(quick) {
		if k != dotted {
			t.Errorf("without eigenvalues: %v", k)
		}
	}
	if text := Plot(quick).String(); !strings.Contains(text, "Dotted: eigenvalues were not computed") || strings.Contains(text, "stable,") {
		t.Errorf("without eigenvalues: %s", text)
	}
	if text := Plot(feederBranch(t)).String(); !strings.Contains(text, "Of a balance nothing is called stable") || strings.Contains(text, "Solid: stable") {
		t.Errorf("feeder: %s", text)
	}
}

// TestFoldsThatAreClose says both values with the digits that tell them apart: the
// folds of λ = 1 ± ε, with ε = 2 (a²/3)^(3/2).
func TestFoldsThatAreClose(t *testing.T) {
	doc := new(bytes.Buffer)
	if err := Plot(closeFolds(t)).WriteSVG(doc); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{">fold 0.99999971 N<", ">fold 1.0000003 N<"} {
		if !strings.Contains(doc.String(), want) {
			t.Errorf("%s is missing", want)
		}
	}
}

// TestOnePointOnTwoBranches labels the crossing that both branches found once.
func TestOnePointOnTwoBranches(t *testing.T) {
	doc := new(bytes.Buffer)
	if err := Plot(transcritical(t)).WriteSVG(doc); err != nil {
		t.Fatal(err)
	}
	if n := strings.Count(doc.String(), ">transcritical bifurcation 1 N<"); n != 1 {
		t.Errorf("%d labels", n)
	}
}

func TestBranchesAreToldApart(t *testing.T) {
	a, b := lakeBranch(t, 0.7), lakeBranch(t, 1)
	for _, c := range []struct {
		figure *Figure
		want   string
	}{
		{Plot(a, b), "Flushing 0.7 1/a|Flushing 1 1/a"},
		{Plot(a, b).Label("slow", "fast"), "slow|fast"},
		{Plot(a, b).Label("slow"), "slow|"},
		{Plot(a, a), "branch 1|branch 2"},
		{Plot(a), ""},
	} {
		if got := strings.Join(c.figure.names(), "|"); got != c.want {
			t.Errorf("names %q, want %q", got, c.want)
		}
	}
	doc := new(bytes.Buffer)
	if err := Plot(a, b).WriteSVG(doc); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(doc.String(), ">Flushing 1 1/a</text>") || !strings.Contains(doc.String(), "#0072b2") {
		t.Error("the second branch has neither its name nor its ink")
	}
}

func TestMarksInAFigure(t *testing.T) {
	path := tankBranch(t)
	start := path.Points()[path.Start()]
	fold := path.Folds()[0]
	margin, err := start.MarginTo(fold)
	if err != nil {
		t.Fatal(err)
	}
	f := Plot(path, fold, Mark(start, "today"), margin)
	doc := new(bytes.Buffer)
	if err := f.WriteSVG(doc); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{">today 300 K<", ">margin 1.783 K (0.594 %)<", ">fold 295.25 K<"} {
		if strings.Count(doc.String(), want) != 1 {
			t.Errorf("%d times %s", strings.Count(doc.String(), want), want)
		}
	}
	if n := strings.Count(doc.String(), ">fold 301.78 K<"); n != 1 {
		t.Errorf("a fold that is given twice is labelled %d times", n)
	}
	if !strings.Contains(f.String(), "Margin in Coolant: 1.78291 K") {
		t.Errorf("the margin is not in %q", f)
	}
}

func TestSave(t *testing.T) {
	dir := t.TempDir()
	f := Plot(tankBranch(t))
	for _, name := range []string{"a.svg", "a.PNG"} {
		if err := f.Save(filepath.Join(dir, name)); err != nil {
			t.Error(err)
		}
		if info, err := os.Stat(filepath.Join(dir, name)); err != nil || info.Size() < 2000 {
			t.Errorf("%s: %v", name, err)
		}
	}
	if err := f.Save(filepath.Join(dir, "a.bmp")); err == nil || !strings.Contains(err.Error(), ".svg or .png") {
		t.Errorf("bmp: %v", err)
	}
}

func TestUnitsMustAgree(t *testing.T) {
	type celsius struct {
		Conversion  float64
		Temperature float64 `unit:"°C"`
	}
	m := newModel(t, func(s celsius, q tankParams) celsius {
		return celsius{q.Feed - 300 - s.Conversion, q.Coolant - s.Temperature}
	}, tankParams{Coolant: 300, Feed: 300})
	other := follow(t, settle(t, m, celsius{0, 300}), "Coolant", continuation.Within(280, 320))
	err := Plot(tankBranch(t), other).Y("Temperature").Err()
	if err == nil || !strings.Contains(err.Error(), "cannot share an axis") {
		t.Errorf("%v", err)
	}
}

// TestTangentsAtCrossings compares the crossing's strokes with the tangents known
// by hand: at the pitchfork of the strut along the load and across it, at the
// transcritical point of x(1 - x - p) along x = 0 and x = 1 - p.
func TestTangentsAtCrossings(t *testing.T) {
	for _, c := range []struct {
		branch *continuation.Branch
		slopes [2]float64 // dx/dp, infinite across the parameter
		label  string
	}{
		{strutBranch(t), [2]float64{0, math.Inf(1)}, "supercritical pitchfork 12 kN"},
		{transcritical(t)[1], [2]float64{0, -1}, "transcritical bifurcation 1 N"},
	} {
		s, err := Plot(c.branch).scene()
		if err != nil {
			t.Fatal(err)
		}
		m := s.marks[0]
		if m.shape != crossingShape || m.label != c.label {
			t.Errorf("shape %d, label %q, want %q", m.shape, m.label, c.label)
		}
		for _, want := range c.slopes {
			near := false
			for _, d := range m.tangents {
				if math.IsInf(want, 0) {
					near = near || math.Abs(d.dx) < 1e-6*math.Abs(d.dy)
				} else {
					near = near || math.Abs(d.dy-want*d.dx) < 1e-6*math.Hypot(d.dx, d.dy)
				}
			}
			if !near {
				t.Errorf("%s: no tangent of slope %g in %v", c.label, want, m.tangents)
			}
		}
	}
}

func TestEventsAreMarked(t *testing.T) {
	b := hotTank(t)
	var doc bytes.Buffer
	if err := Plot(b).WriteSVG(&doc); err != nil {
		t.Fatal(err)
	}
	if n := strings.Count(doc.String(), ">too hot 31"); n != 1 {
		t.Errorf("%d labels of the event", n)
	}
	for _, v := range []any{Table(b), b.Events(), b.Events()[0]} {
		text := Render(v).Text()
		if !strings.Contains(strings.ToLower(text), "too hot") || strings.Contains(text, "not computed") {
			t.Errorf("%T:\n%s", v, text)
		}
	}
}
