package tape_test

import (
	"math"
	"math/big"
	"strings"
	"testing"

	"brinkline/continuation/tape"
)

// TestFunctionDerivatives compares every function and removable singularity with
// values to 50 digits. Errors are relative to the derivative or to what a
// rounding of x does to it, whichever is more.
func TestFunctionDerivatives(t *testing.T) {
	var cases []struct {
		F      string
		X      float64
		Values []string
	}
	readJSON(t, "../../testdata/functions.json", &cases)
	worst := map[string]float64{}
	for _, c := range cases {
		src, err := tape.Parse("model", strings.Replace(`func model(u []float64, q struct{ A float64 }, f []float64) {
	x := u[0]
	f[0] = EXPR
}
func lgamma(x float64) float64 { v, _ := math.Lgamma(x); return v }`, "EXPR", c.F, 1))
		if err != nil {
			t.Fatal(err)
		}
		p, err := tape.Record(src, tape.Settings{States: 1})
		if err != nil {
			t.Fatal(err)
		}
		in := &tape.Inputs{X: []float64{c.X}, P: []float64{0}}
		in.Dirs[0] = []float64{1, 0}
		for k, along := range []string{"", "a", "aa", "aaa"} {
			removable := strings.Contains(c.F, "Exp") && strings.Contains(c.F, "/")
			if k == 0 && removable {
				continue // f is as the analyst wrote it, cancellation and all
			}
			m := p.Directional(-1, along).NewMachine()
			m.RunWith(in)
			scale := math.Max(math.Abs(decimalValue(t, c.Values[k])), math.Abs(c.X*decimalValue(t, c.Values[k+1])))
			e := gap(t, m.Out()[0], c.Values[k]) / scale
			if m.Out()[0] == 0 && scale == 0 {
				e = 0
			}
			worst[along] = math.Max(worst[along], e)
			if most := []float64{1e-14, 1e-14, 1e-13, 1e-13}[k]; !(e <= most) {
				t.Errorf("derivative %d of %s at %v is %v, want %.20s: error %.2g", k, c.F, c.X, m.Out()[0], c.Values[k], e)
			}
		}
	}
	t.Logf("largest errors by order: %v", worst)
}

func decimalValue(t *testing.T, text string) float64 {
	t.Helper()
	v, _, err := big.ParseFloat(text, 10, 64, big.ToNearestEven)
	if err != nil {
		t.Fatal(err)
	}
	f, _ := v.Float64()
	return f
}
