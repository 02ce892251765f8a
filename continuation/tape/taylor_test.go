package tape_test

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"brinkline/continuation/tape"
	"brinkline/continuation/tape/internal/samples"
)

// Along a straight path the coefficients are directional derivatives, which are
// known to 50 digits for the reference models.
func TestTaylorAlongALine(t *testing.T) {
	texts := equations(t)
	var cases []preciseCase
	readJSON(t, "../../testdata/derivatives.json", &cases)
	errors := worst{}
	for _, c := range cases {
		src, err := tape.Parse("model", texts[c.ID])
		if err != nil {
			t.Fatal(err)
		}
		for _, at := range c.Points {
			n := len(at.W)
			p, err := tape.Record(src, tape.Settings{States: n})
			if err != nil {
				t.Fatal(err)
			}
			e, err := p.NewTaylor(c.Free, 3)
			if err != nil {
				t.Fatal(err)
			}
			start := append(append([]float64(nil), at.Z[:n]...), at.Z[n+c.Free])
			path := [][]float64{start, at.A, make([]float64, n+1), make([]float64, n+1)}
			out := make([]float64, n)
			for k := range path {
				e.Expand(k, path, at.Z[n:], out)
				switch k {
				case 0:
					errors.compare(t, c.ID, "value", out, at.Value, 1e-14)
				case 2:
					errors.compare(t, c.ID, "second", scaled(out, 2), at.Second, 1e-13)
				case 3:
					errors.compare(t, c.ID, "third", scaled(out, 6), at.Third, 1e-13)
				}
			}
		}
	}
	t.Log(errors)
}

func scaled(x []float64, by float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = v * by
	}
	return out
}

// Known series, to order 12: the coefficients are those of Abramowitz & Stegun,
// chapters 3 and 4.
func TestTaylorOfKnownSeries(t *testing.T) {
	const order = 12
	factorial := func(k int) float64 { return math.Gamma(float64(k + 1)) }
	sign := func(k int) float64 { return 1 - 2*float64(k%2) }
	tests := []struct {
		text string
		want func(k int) float64
	}{
		{"math.Exp(x)", func(k int) float64 { return 1 / factorial(k) }},
		{"1 / (1 - x)", func(int) float64 { return 1 }},
		{"math.Log1p(x)", func(k int) float64 { return -sign(k) / float64(k) }},
		{"math.Log(1 + x)", func(k int) float64 { return -sign(k) / float64(k) }},
		{"math.Sin(x)", func(k int) float64 { return float64(k%2) * sign(k/2) / factorial(k) }},
		{"math.Cosh(x)", func(k int) float64 { return float64(1-k%2) / factorial(k) }},
		{"math.Sqrt(1 + x)", func(k int) float64 { return binomial(0.5, k) }},
		{"math.Pow(1+x, -1.5)", func(k int) float64 { return binomial(-1.5, k) }},
		{"math.Pow(x, 3) + math.Exp(0)", func(k int) float64 { return map[int]float64{0: 1, 3: 1}[k] }},
		{"math.Atan(x)", func(k int) float64 { return float64(k%2) * sign(k/2) / float64(max(k, 1)) }},
		{"math.Max(x+1, x*x)", func(k int) float64 { return map[int]float64{0: 1, 1: 1}[k] }},
	}
	for _, test := range tests {
		src, err := tape.Parse("model", "func model(u []float64, q struct{ A float64 }, f []float64) {\nx := u[0]\nf[0] = "+test.text+"\n}")
		if err != nil {
			t.Fatal(err)
		}
		p, err := tape.Record(src, tape.Settings{States: 1})
		if err != nil {
			t.Fatal(err)
		}
		e, err := p.NewTaylor(-1, order)
		if err != nil {
			t.Fatal(err)
		}
		path := [][]float64{{0}, {1}}
		for range order {
			path = append(path, []float64{0})
		}
		out := []float64{0}
		for k := range order + 1 {
			e.Expand(k, path, []float64{0}, out)
			want := test.want(k)
			if strings.Contains(test.text, "Log") && k == 0 {
				want = 0
			}
			if math.Abs(out[0]-want) > 1e-14 {
				t.Errorf("%s: coefficient %d is %v, want %v", test.text, k, out[0], want)
			}
		}
	}
}

func binomial(a float64, k int) float64 {
	v := 1.0
	for i := range k {
		v *= (a - float64(i)) / float64(i+1)
	}
	return v
}

// Two ways to the third derivative along a line agree for every sample.
func TestTaylorAgainstTapes(t *testing.T) {
	q := samples.Params{A: 1.25, B: -0.5, Table: [4]float64{1, -2, 0.5, 3}, N: 3}
	x, p := []float64{0.4, -0.7, 1.3}, []float64{1.25, -0.5, 1, -2, 0.5, 3}
	in := &tape.Inputs{X: x, P: p}
	in.Dirs[0] = []float64{0.5, -1, 0.25, 0}
	for name := range samples.Models {
		src, err := tape.Parse(name, samples.Source, samples.MoreSource)
		if err != nil {
			t.Fatal(err)
		}
		prog, err := tape.Record(src, tape.Settings{States: 3, Params: reflect.ValueOf(q), X: x, P: p})
		if err != nil {
			t.Fatal(err)
		}
		e, err := prog.NewTaylor(-1, 3)
		if err != nil {
			if name != "rare" {
				t.Errorf("%s: %v", name, err)
			}
			continue
		}
		m := prog.Directional(-1, "aaa").NewMachine()
		m.RunWith(in)
		zero := []float64{0, 0, 0, 0}
		path := [][]float64{x, in.Dirs[0], zero, zero}
		out := make([]float64, 3)
		for k := range path {
			e.Expand(k, path, p, out)
		}
		for i, v := range m.Out() {
			if math.Abs(v-6*out[i]) > 1e-11*(1+math.Abs(v)) {
				t.Errorf("%s: third derivative of f[%d] is %v by the tape, %v by the expansion", name, i, v, 6*out[i])
			}
		}
	}
}
