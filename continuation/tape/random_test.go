package tape

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

const randomPoints = 12

// TestRandomModels makes models, has the Go toolchain compile them, and compares
// the bits of f with those of the tape; in the models of plain arithmetic it also
// compares derivatives with differences in numbers of 150 digits.
func TestRandomModels(t *testing.T) {
	count := 300
	if os.Getenv("BRINKLINE_LONG") != "" {
		count = 4000
	}
	if _, err := exec.LookPath("go"); err != nil {
		if os.Getenv("BRINKLINE_REQUIRE_ALL") != "" {
			t.Fatal(err)
		}
		t.Skip("no Go toolchain: ", err)
	}
	UseLibrary(t)
	compared, guarded, checked, gaveUp := 0, 0, 0, 0
	for first := 0; first < count; first += 500 {
		models := make([]string, min(500, count-first))
		for k := range models {
			models[k] = newWriter(uint64(first + k)).model(k)
		}
		want := compiledValues(t, models)
		for k, text := range models {
			src, err := Parse(fmt.Sprint("model", k), text)
			if err != nil {
				t.Fatalf("%v\n%s", err, text)
			}
			family := NewFamily(src, Settings{States: 3})
			for i := range randomPoints {
				x, p := randomPoint(i)
				program, err := family.At(x, p)
				if err == ErrGuards {
					gaveUp++
					continue
				}
				if err != nil {
					t.Fatalf("%v\n%s", err, text)
				}
				got, ok := program.Plainly(x, p)
				if !ok {
					t.Fatalf("guards do not hold\n%s", text)
				}
				for e, v := range got {
					w := want[(k*randomPoints+i)*3+e]
					if math.Float64bits(v) != math.Float64bits(w) && !(math.IsNaN(v) && math.IsNaN(w)) {
						t.Fatalf("model %d at %v %v: f[%d] is %v, the compiler's is %v\n%s", first+k, x, p, e, v, w, text)
					}
					compared++
				}
				if i < 3 {
					checked += checkDerivatives(t, program, x, p, text)
				}
			}
			if family.Recorded() > 1 {
				guarded++
			}
		}
	}
	t.Logf("%d models, %d of them with guards that failed and were recorded again; %d values and %d derivatives compared; %d points with too many patterns", count, guarded, compared, checked, gaveUp)
	if compared < 20*count || checked < count || guarded == 0 {
		t.Error("too little was compared")
	}
}

func randomPoint(i int) (x, p []float64) {
	rng := rand.New(rand.NewPCG(99, uint64(i)))
	x, p = make([]float64, 3), make([]float64, 2)
	for k := range x {
		x[k] = math.Round(rng.NormFloat64()*64) / 32
	}
	for k := range p {
		p[k] = math.Round(rng.NormFloat64()*64) / 64
	}
	return x, p
}

// compiledValues compiles the models as one program and runs it.
func compiledValues(t *testing.T, models []string) []float64 {
	t.Helper()
	dir := t.TempDir()
	var b strings.Builder
	b.WriteString("package main\n\nimport (\n\"encoding/binary\"\n\"math\"\n\"os\"\n)\n\nvar models = []func([]float64, Params, []float64){\n")
	for k := range models {
		fmt.Fprintf(&b, "model%d,\n", k)
	}
	b.WriteString("}\n\ntype Params struct{ A, B float64 }\ntype pair struct{ x, y float64 }\n\nfunc main() {\nvar out []float64\nfor _, m := range models {\n")
	for i := range randomPoints {
		x, p := randomPoint(i)
		fmt.Fprintf(&b, "{ f := []float64{0, 0, 0}; m([]float64{%v, %v, %v}, Params{%v, %v}, f); out = append(out, f...) }\n", x[0], x[1], x[2], p[0], p[1])
	}
	b.WriteString("}\nbinary.Write(os.Stdout, binary.LittleEndian, out)\n}\nvar _ = math.Pi\n")
	for _, text := range models {
		_, body, _ := strings.Cut(text, "// model\n")
		b.WriteString(body)
	}
	must(t, os.WriteFile(filepath.Join(dir, "main.go"), []byte(b.String()), 0o666))
	must(t, os.WriteFile(filepath.Join(dir, "go.mod"), []byte("module models\n\ngo 1.26.0\n"), 0o666))
	cmd := exec.Command("go", "run", ".")
	cmd.Dir = dir
	cmd.Env = append(os.Environ(), "GOWORK=off", "GOFLAGS=", "GOAMD64=v1")
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	raw, err := cmd.Output()
	if err != nil {
		t.Fatalf("%v\n%.2000s", err, stderr.String())
	}
	out := make([]float64, len(raw)/8)
	must(t, binary.Read(bytes.NewReader(raw), binary.LittleEndian, out))
	return out
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

// A writer makes up a model.
type writer struct {
	rng     *rand.Rand
	b       strings.Builder
	helpers strings.Builder
	k       int
	names   int
	floats  []string // variables in scope
	slices  []string
	pairs   []string
	truths  []string
	calls   []string // helpers of one argument
	plain   bool     // arithmetic only
	depth   int
	loops   int
	breaks  int
}

func newWriter(seed uint64) *writer {
	return &writer{rng: rand.New(rand.NewPCG(7, seed)), plain: seed%2 == 0}
}

func (w *writer) name(prefix string) string {
	w.names++
	return fmt.Sprint(prefix, w.names)
}

func (w *writer) pick(list []string) string { return list[w.rng.IntN(len(list))] }

func (w *writer) model(k int) string {
	w.k = k
	for range w.rng.IntN(3) {
		w.helper()
	}
	w.floats, w.slices, w.pairs, w.truths = nil, []string{"u"}, nil, nil
	w.line("func model%d(u []float64, q Params, f []float64) {", k)
	w.line("f[0], f[1], f[2] = u[0], u[1], u[2]")
	w.body(4+w.rng.IntN(8), "return")
	for i := range 3 {
		if w.rng.IntN(3) > 0 {
			w.line("f[%d] = %s", i, w.expr(3))
		}
	}
	w.line("}")
	return "package p\nimport \"math\"\nvar _ = math.Pi\ntype Params struct{ A, B float64 }\ntype pair struct{ x, y float64 }\n// model\n" + w.helpers.String() + w.b.String()
}

// helper writes a function of one float, with early returns.
func (w *writer) helper() {
	name := fmt.Sprintf("help%d_%d", w.k, len(w.calls))
	outer := w.b
	w.b = strings.Builder{}
	w.floats, w.slices, w.pairs, w.truths = []string{"x"}, nil, nil, nil
	w.line("func %s(x float64) (r float64) {", name)
	w.body(1+w.rng.IntN(4), "RESULT")
	w.line("return %s\n}", w.expr(2))
	w.helpers.WriteString(strings.ReplaceAll(w.b.String(), "RESULT", "return r + x"))
	w.b = outer
	w.calls = append(w.calls, name)
}

func (w *writer) line(format string, args ...any) { fmt.Fprintf(&w.b, format+"\n", args...) }

// body writes statements in a scope of their own.
func (w *writer) body(n int, leave string) {
	floats, slices, pairs, truths := len(w.floats), len(w.slices), len(w.pairs), len(w.truths)
	w.depth++
	for range n {
		w.statement(leave)
	}
	w.depth--
	w.floats, w.slices, w.pairs, w.truths = w.floats[:floats], w.slices[:slices], w.pairs[:pairs], w.truths[:truths]
}

func (w *writer) statement(leave string) {
	kind := w.rng.IntN(16)
	if w.depth > 3 && kind > 7 {
		kind = w.rng.IntN(8)
	}
	switch kind {
	case 0, 1:
		v := w.name("v")
		w.line("%s := %s\n_ = %s", v, w.expr(3), v)
		w.floats = append(w.floats, v)
	case 2, 3:
		if own := w.variables(); len(own) > 0 {
			w.line("%s %s %s", w.pick(own), w.pick([]string{"=", "+=", "-=", "*="}), w.expr(2))
		}
	case 4:
		v := w.name("s")
		w.line("%s := []float64{%s, %s, %s}\n_ = %s", v, w.expr(2), w.expr(1), w.expr(1), v)
		w.slices = append(w.slices, v)
	case 5:
		if len(w.slices) > 0 {
			s := w.pick(w.slices)
			w.line("%s[%d] = %s", s, w.rng.IntN(3), w.expr(2))
			if w.rng.IntN(2) == 0 {
				v := w.name("s")
				w.line("%s := append(%s[:%d], %s, %s, %s)\n_ = %s", v, s, w.rng.IntN(4), w.expr(1), w.expr(1), w.expr(1), v)
				w.slices = append(w.slices, v)
			}
		}
	case 6:
		v := w.name("p")
		w.line("%s := pair{%s, y: %s}\n_ = %s", v, "x: "+w.expr(1), w.expr(1), v)
		w.pairs = append(w.pairs, v)
		if w.rng.IntN(2) == 0 {
			w.line("%s = pair{%s.y, %s}", w.pick(w.pairs), w.pick(w.pairs), w.expr(1))
		}
	case 7:
		v := w.name("t")
		w.line("%s := %s\n_ = %s", v, w.cond(2), v)
		w.truths = append(w.truths, v)
	case 8, 9:
		w.line("if %s {", w.cond(2))
		w.body(1+w.rng.IntN(3), leave)
		if w.rng.IntN(2) == 0 {
			w.line("} else {")
			w.body(1+w.rng.IntN(2), leave)
		}
		w.line("}")
	case 10:
		w.line("if %s {", w.cond(1))
		w.body(w.rng.IntN(2), leave)
		w.line("%s\n}", leave)
	case 11, 12:
		w.loop(leave)
	case 13:
		w.line("switch {\ncase %s:", w.cond(1))
		w.body(1, leave)
		if w.rng.IntN(3) == 0 {
			w.line("fallthrough")
		}
		w.line("case %s, %s:", w.cond(1), w.cond(0))
		w.body(2, leave)
		if w.rng.IntN(2) == 0 {
			w.line("if %s {\nbreak\n}", w.cond(1))
			w.body(1, leave)
		}
		w.line("default:")
		w.body(1, leave)
		w.line("}")
	case 14:
		w.closure()
	case 15:
		w.swap()
	}
}

func (w *writer) loop(leave string) {
	if w.loops > 2 {
		return
	}
	w.loops++
	i := w.name("i")
	switch w.rng.IntN(3) {
	case 0:
		w.line("for %s := range 3 {\n_ = %s", i, i)
	case 1:
		w.line("for %s := 0; %s < %d; %s++ {", i, i, 2+w.rng.IntN(3), i)
	default:
		v := w.name("e")
		s := "u"
		if len(w.slices) > 0 {
			s = w.pick(w.slices)
		} else {
			s = "[]float64{x, 2, -x}"
		}
		w.line("for %s, %s := range %s[:3] {\n_, _ = %s, %s", i, v, s, i, v)
	}
	scope := len(w.floats)
	w.floats = append(w.floats, "float64("+i+")")
	w.body(1, leave)
	switch w.rng.IntN(4) {
	case 0:
		w.line("if %s {\ncontinue\n}", w.cond(1))
	case 1:
		if w.breaks < 2 {
			w.breaks++
			w.line("if %s {\nbreak\n}", w.cond(1))
		}
	}
	w.body(1+w.rng.IntN(2), leave)
	w.floats = w.floats[:scope]
	w.line("}")
	w.loops--
}

func (w *writer) closure() {
	c, x := w.name("c"), w.name("x")
	w.line("%s := func(%s float64) float64 {", c, x)
	scope := len(w.floats)
	w.floats = append(w.floats, x)
	w.body(1, "return "+x+"*2")
	w.line("return %s\n}", w.expr(2))
	w.floats = w.floats[:scope]
	v := w.name("v")
	w.line("%s := %s(%s) - %s(%s)\n_ = %s", v, c, w.expr(1), c, w.expr(1), v)
	w.floats = append(w.floats, v)
}

// variables lists the floats that can be assigned to.
func (w *writer) variables() []string {
	var own []string
	for _, v := range w.floats {
		if !strings.Contains(v, "(") {
			own = append(own, v)
		}
	}
	return own
}

func (w *writer) swap() {
	if own := w.variables(); len(own) > 1 {
		a, b := own[0], own[len(own)-1]
		w.line("%s, %s = %s, %s+1", a, b, b, a)
	}
}

func (w *writer) cond(depth int) string {
	if depth > 0 {
		switch w.rng.IntN(5) {
		case 0:
			return fmt.Sprintf("(%s && %s)", w.cond(depth-1), w.cond(depth-1))
		case 1:
			return fmt.Sprintf("(%s || %s)", w.cond(depth-1), w.cond(depth-1))
		case 2:
			return fmt.Sprintf("!(%s)", w.cond(depth-1))
		}
	}
	if len(w.truths) > 0 && w.rng.IntN(3) == 0 {
		return w.pick(w.truths)
	}
	return fmt.Sprintf("%s %s %s", w.expr(1), w.pick([]string{"<", ">", "<=", ">=", "==", "!="}), w.expr(1))
}

func (w *writer) atom() string {
	for {
		switch w.rng.IntN(7) {
		case 0, 1:
			if len(w.floats) > 0 {
				return w.pick(w.floats)
			}
		case 2, 3:
			if len(w.slices) > 0 {
				return fmt.Sprintf("%s[%d]", w.pick(w.slices), w.rng.IntN(3))
			}
		case 4:
			if len(w.pairs) > 0 {
				return w.pick(w.pairs) + w.pick([]string{".x", ".y"})
			}
		case 5:
			if len(w.slices) > 0 && w.slices[0] == "u" {
				return w.pick([]string{"q.A", "q.B"})
			}
		case 6:
			return w.pick([]string{"0.5", "2.0", "1.25", "-3.0", "0.1", "1.0"})
		}
	}
}

func (w *writer) expr(depth int) string {
	if depth <= 0 {
		return w.atom()
	}
	a, b := w.expr(depth-1), w.expr(w.rng.IntN(depth))
	switch w.rng.IntN(12) {
	case 0, 1, 2:
		return fmt.Sprintf("(%s + %s)", a, b)
	case 3, 4:
		return fmt.Sprintf("(%s - %s)", a, b)
	case 5, 6, 7:
		return fmt.Sprintf("%s * %s", a, b)
	case 8:
		return fmt.Sprintf("%s / (1 + %s*%s)", a, b, b)
	case 9:
		return "(-(" + a + ") + 0)"
	case 10:
		if len(w.calls) > 0 {
			return fmt.Sprintf("%s(%s)", w.pick(w.calls), a)
		}
	case 11:
		return fmt.Sprintf("%s(%s, %s)", w.pick([]string{"min", "max", "math.Max", "math.Min"}), a, b)
	}
	if w.plain {
		return fmt.Sprintf("math.Abs(%s)", a)
	}
	return fmt.Sprintf("%s(%s)", w.pick([]string{"math.Sin", "math.Tanh", "math.Exp", "math.Sqrt", "math.Cos", "math.Log", "math.Atan", "math.Expm1"}), a)
}
