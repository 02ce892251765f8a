package display

import (
	"bytes"
	"encoding/xml"
	"flag"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/plot/vg"
	"pgregory.net/rapid"

	"brinkline/continuation"
	"brinkline/display/internal/plane"
)

var update = flag.Bool("update", false, "write the golden files anew")

// golden compares with a file of testdata.
func golden(t *testing.T, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), got); diff != "" {
		t.Errorf("%s differs (run with -update to accept):\n%s", name, diff)
	}
}

// switchScene is the curve x = y - y³ with its exact folds, as if computed.
func switchScene(n int) *scene {
	s := &scene{
		x: side{label: "Push (N)", variable: continuation.Variable{Name: "Push", Unit: "N"}},
		y: side{label: "Angle"},
	}
	turn := 1 / math.Sqrt(3)
	at := func(y float64) place { return place{y - y*y*y, y, 1 - 3*y*y, 1} }
	part := func(from, to float64, line lineKind) {
		var r run
		r.line = line
		for i := range n {
			r.places = append(r.places, at(from+(to-from)*float64(i)/float64(n-1)))
		}
		s.curves[0].runs = append(s.curves[0].runs, r)
	}
	s.curves = []curve{{ink: ink}}
	part(-1.3, -turn, solid)
	part(-turn, turn, dashed)
	part(turn, 1.3, solid)
	s.marks = []mark{
		{place: at(-turn), shape: foldShape, away: 1, label: "fold −0.3849 N"},
		{place: at(turn), shape: foldShape, away: -1, label: "fold 0.3849 N"},
		{place: at(0), shape: crossingShape, tangents: [2]place{{dx: 1, dy: 1}, {dy: 1}}, label: "simple stationary bifurcation 0 N"},
		{place: at(1), shape: ringShape, label: "Hopf point 0 N"},
		{place: at(-1.1), label: "now 0.231 N"},
	}
	s.spans = []span{{from: at(-1.1), to: at(turn), label: "margin 0.154 N"}}
	return s
}

// pictureOf lays a scene out as a figure would.
func pictureOf(t testing.TB, s *scene) *picture {
	t.Helper()
	f := &Figure{width: usualWidth * vg.Centimeter, height: usualHeight * vg.Centimeter}
	p, err := f.lay(s, nil)
	if err != nil {
		t.Fatal(err)
	}
	p.title, p.description = "Angle against Push", "A made-up curve."
	return p
}

func TestSceneGolden(t *testing.T) {
	golden(t, "switch.svg", string(pictureOf(t, switchScene(12)).svg()))
}

// planeScene is a plane of two parameters made by hand: the folds of x' = p + q x - x³
// with their cusp at 0, a Hopf locus with what can lie on it, the path of a branch.
func planeScene() *scene {
	s := &scene{
		x: side{label: "Push (N)", variable: continuation.Variable{Name: "Push", Unit: "N"}, parameter: true},
		y: side{label: "Lever (m)", variable: continuation.Variable{Name: "Lever", Unit: "m"}, parameter: true},
	}
	var folds, hopfs run
	for i := range 21 {
		u := float64(i)/10 - 1
		folds.places = append(folds.places, place{2 * u * u * u, 3 * u * u, 6 * u * u, 6 * u})
		hopfs.places = append(hopfs.places, place{3*u - 1, 1.5 - u, 3, -1})
	}
	hopfs.line = dashDotted
	saddles := run{places: hopfs.places[14:], line: dotted}
	hopfs.places = hopfs.places[:15]
	s.curves = []curve{{ink: ink, label: "folds", locus: true, runs: []run{folds}}, {ink: inks[1], label: "Hopf points", locus: true, runs: []run{hopfs, saddles}}}
	s.hair = []hairline{{places: []place{at(-3, 1), at(2, 1)}, ink: faint}}
	edges := [2][]place{slices.Clone(folds.places[:11]), folds.places[10:]}
	slices.Reverse(edges[0])
	s.marks = []mark{
		{place: folds.places[10], shape: wedgeShape, edges: edges, label: "cusp 0 N, 0 m"},
		{place: hopfs.places[14], shape: restShape, label: "Bogdanov-Takens point 0.2 N, 1.1 m"},
		{place: hopfs.places[5], shape: halfShape, label: "degenerate Hopf point −2.5 N, 2 m"},
		{place: hopfs.places[9], shape: twinShape, label: "Hopf-Hopf point −1.3 N, 1.6 m"},
		{place: folds.places[18], shape: throughShape, label: "fold-Hopf point 1.024 N, 1.92 m"},
		{place: at(-3, 1), label: "now −3 N, 1 m"},
	}
	s.spans = []span{{from: at(-3, 1), to: at(-0.385, 1), label: "margin 2.615 N"}}
	return s
}

func TestPlaneGolden(t *testing.T) {
	golden(t, "plane.svg", string(pictureOf(t, planeScene()).svg()))
}

func TestSameSceneSameBytes(t *testing.T) {
	a, b := pictureOf(t, switchScene(40)), pictureOf(t, switchScene(40))
	if !bytes.Equal(a.svg(), b.svg()) || !bytes.Equal(a.png(), b.png()) {
		t.Error("the same scene gives other bytes")
	}
	if !bytes.Equal(a.svg(), a.svg()) {
		t.Error("drawing a picture twice gives other bytes")
	}
}

// TestForbiddenInSVG looks for what a page that does not trust the picture would
// refuse, or what would reach out of it.
func TestForbiddenInSVG(t *testing.T) {
	doc := string(pictureOf(t, switchScene(12)).svg())
	doc += string(pictureOf(t, planeScene()).svg())
	for _, bad := range []string{"<script", "foreignObject", "href", "url(", "@import", "<style", "NaN", "Inf", "e-0", "e+0"} {
		if strings.Contains(doc, bad) {
			t.Errorf("%s in the picture", bad)
		}
	}
	if long := regexp.MustCompile(`[a-z]="[^"<>]*\d\.\d{3,}[^"<>]*"`).FindString(doc); long != "" {
		t.Errorf("more than two decimals: %.60s", long)
	}
	doc = string(pictureOf(t, switchScene(12)).svg())
	plateFirst := regexp.MustCompile(`</desc>\n<path d="M0 \S+ \S+ \S+ 0[^"]*Z" fill="#fff"/>`)
	if !plateFirst.MatchString(doc) {
		t.Errorf("the opaque plate does not come first: %.700s", doc)
	}
}

// TestManyPoints holds 1e5 points of all kinds of curves under 200 kB.
func TestManyPoints(t *testing.T) {
	const n = 100_000
	random := rand.New(rand.NewPCG(1, 2))
	nan := math.NaN()
	for name, at := range map[string]func(i int) place{
		"smooth":  func(i int) place { u := float64(i) / n; return place{u, math.Sin(9 * u), 1, 9 * math.Cos(9*u)} },
		"spiral":  func(i int) place { a := float64(i) / 400; return place{a * math.Cos(a), a * math.Sin(a), nan, nan} },
		"noise":   func(i int) place { return place{float64(i), random.Float64(), nan, nan} },
		"snaking": func(i int) place { u := float64(i) / 500; return place{math.Sin(u), u, math.Cos(u), 1} },
	} {
		s := &scene{curves: []curve{{ink: ink}}, x: side{label: "x"}, y: side{label: "y"}}
		var r run
		for i := range n {
			r.places = append(r.places, at(i))
		}
		s.curves[0].runs = []run{r}
		doc := pictureOf(t, s).svg()
		t.Logf("%s: %d bytes", name, len(doc))
		if len(doc) > 200_000 {
			t.Errorf("%s: %d bytes", name, len(doc))
		}
	}
}

// What a test reads back from an SVG.
type readBack struct {
	texts []readText
	lines [][]vg.Point
}

type readText struct {
	box    vg.Rectangle
	text   string
	turned bool
	size   float64
}

func readSVG(t testing.TB, doc []byte) readBack {
	t.Helper()
	var out readBack
	dec := xml.NewDecoder(bytes.NewReader(doc))
	open := false
	for {
		tok, err := dec.Token()
		if err == io.EOF {
			return out
		}
		if err != nil {
			t.Fatal(err)
		}
		switch tok := tok.(type) {
		case xml.StartElement:
			attr := map[string]string{}
			for _, a := range tok.Attr {
				attr[a.Name.Local] = a.Value
			}
			open = tok.Name.Local == "text"
			if open {
				x, y, w, size := number(attr["x"]), number(attr["y"]), number(attr["textLength"]), number(attr["font-size"])
				out.texts = append(out.texts, readText{
					box:    vg.Rectangle{Min: vg.Point{X: vg.Length(x), Y: vg.Length(y - 0.7*size)}, Max: vg.Point{X: vg.Length(x + w), Y: vg.Length(y + 0.2*size)}},
					turned: attr["transform"] != "", size: size,
				})
			}
			if w := attr["stroke-width"]; tok.Name.Local == "path" && attr["fill"] == "none" && (w == "1.5" || w == "0.9" || w == "0.6") {
				out.lines = append(out.lines, pathPoints(attr["d"])...)
			}
		case xml.CharData:
			if open {
				out.texts[len(out.texts)-1].text += string(tok)
			}
		case xml.EndElement:
			open = false
		}
	}
}

func number(text string) float64 {
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		return math.NaN()
	}
	return v
}

var numberPattern = regexp.MustCompile(`-?[0-9.]+`)

func pathPoints(d string) [][]vg.Point {
	var lines [][]vg.Point
	for _, part := range strings.Split(d, "M")[1:] {
		n := numberPattern.FindAllString(part, -1)
		var line []vg.Point
		for i := 0; i+1 < len(n); i += 2 {
			line = append(line, vg.Point{X: vg.Length(number(n[i])), Y: vg.Length(number(n[i+1]))})
		}
		lines = append(lines, line)
	}
	return lines
}

// TestLabelsCollideWithNothing draws random scenes and reads the pictures back: no
// text lies on other text, none leaves the picture, and no label of a mark lies on
// a curve.
func TestLabelsCollideWithNothing(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		s := randomScene(rt)
		got := readSVG(t, pictureOf(t, s).svg())
		width, height := vg.Length(usualWidth*vg.Centimeter), vg.Length(usualHeight*vg.Centimeter)
		for i, a := range got.texts {
			if a.turned {
				continue
			}
			if a.box.Min.X < 0 || a.box.Min.Y < 0 || a.box.Max.X > width || a.box.Max.Y > height {
				rt.Fatalf("%q leaves the picture: %v", a.text, a.box)
			}
			for _, b := range got.texts[:i] {
				if !b.turned && plane.Overlap(a.box, b.box) {
					rt.Fatalf("%q lies on %q", a.text, b.text)
				}
			}
			if !slices.ContainsFunc([]string{"fold", "Hopf", "cusp", "Bogdanov", "degenerate"}, func(word string) bool { return strings.HasPrefix(a.text, word) }) {
				continue
			}
			for _, line := range got.lines {
				if len(plane.Clip(line, a.box)) > 0 {
					rt.Fatalf("%q lies on a curve", a.text)
				}
			}
		}
	})
}

func randomScene(t *rapid.T) *scene {
	s := &scene{x: side{label: "Push (N)"}, y: side{label: "Angle"}}
	words := map[shape]string{foldShape: "fold", crossingShape: "simple stationary bifurcation", ringShape: "Hopf point", tickShape: "too hot", dotShape: "now",
		wedgeShape: "cusp", restShape: "Bogdanov-Takens point", throughShape: "fold-Hopf point", twinShape: "Hopf-Hopf point",
		halfShape: "degenerate Hopf point", crossShape: "-0.5 ± 2 i"}
	nan := math.NaN()
	for i := range rapid.IntRange(1, 5).Draw(t, "curves") {
		c := curve{ink: inks[i]}
		if rapid.Bool().Draw(t, "named") {
			c.label = fmt.Sprintf("branch %d", i+1)
		}
		a, b, k := coefficient(t), coefficient(t), 1+5*math.Abs(coefficient(t))
		var r run
		for j := range 60 {
			u := float64(j) / 59
			r.places = append(r.places, place{u + 0.3*a*math.Sin(k*u), b + math.Cos(k*u)*a, nan, nan})
		}
		r.line = lineKind(rapid.IntRange(int(solid), int(dashDotted)).Draw(t, "line"))
		r.fine, c.locus = rapid.Bool().Draw(t, "fine"), rapid.Bool().Draw(t, "locus")
		c.runs = []run{r}
		s.curves = append(s.curves, c)
		if rapid.Bool().Draw(t, "hair") {
			h := hairline{ink: faint, line: dashed}
			for _, p := range r.places[20:50] {
				h.places = append(h.places, at(p.x+0.1, p.y+0.15))
			}
			s.hair = append(s.hair, h)
		}
		for range rapid.IntRange(0, 3).Draw(t, "marks") {
			k := rapid.IntRange(0, 59).Draw(t, "at")
			p := r.places[k]
			kind := shape(rapid.IntRange(int(dotShape), int(crossShape)).Draw(t, "shape"))
			m := mark{place: p, shape: kind, tangents: [2]place{unknownTangent, unknownTangent}, label: words[kind] + " " + significant(p.x, 5) + " N"}
			if kind == foldShape {
				m.away = rapid.SampledFrom([]float64{-1, 1}).Draw(t, "away")
			}
			if kind == wedgeShape {
				m.edges[0], m.edges[1] = slices.Clone(r.places[:k+1]), r.places[k:]
				slices.Reverse(m.edges[0])
			}
			s.marks = append(s.marks, m)
		}
	}
	return s
}

func coefficient(t *rapid.T) float64 { return rapid.Float64Range(-1, 1).Draw(t, "coefficient") }

// TestGlyphs checks that no text of the pictures has a rune that the font lacks.
func TestGlyphs(t *testing.T) {
	for _, text := range []string{
		"fold −303.42 K", "simple stationary bifurcation 1.2e−7 mol/L", "Temperature (°C)", "Load (µg/L/a)", "margin 3 K (1.1 %)",
		"α β γ θ λ ω Ω ± × · ½ ≈ ≤ √ ∂ ∞ é ü ß Å", "m² s⁻¹", "10⁻⁷", "x₊", "W/(m²·K)", "kg·m⁻³",
	} {
		for _, r := range spell(text) {
			if !drawable(r) {
				t.Errorf("%q keeps %q, which the font lacks", text, r)
			}
		}
	}
	for text, want := range map[string]string{
		"10⁻⁷": "10^−7", "m² s⁻¹": "m² s^−1", "m²": "m²", "x₊": "x+", "kg·m⁻³": "kg·m^−3", "a\nb": "a b",
	} {
		if got := spell(text); got != want {
			t.Errorf("spell(%q) = %q, want %q", text, got, want)
		}
	}
	if got := boxed("温度 (K)"); got != "□□ (K)" {
		t.Errorf("boxed: %q", got)
	}
}
