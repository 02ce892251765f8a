package tape_test

import (
	"encoding/json"
	"math"
	"math/big"
	"os"
	"strconv"
	"testing"

	"brinkline/continuation/tape"
)

// A decimal is a value to 50 digits with the sum of the absolute values of its
// terms, as testdata/derivatives.py writes them.
type decimal [2]string

type precisePoint struct {
	Z, W, A                                             []float64
	Value, Jacobian, Parameters, Second, Third, Adjoint map[int]decimal
}

type preciseCase struct {
	ID     string
	Free   int
	Points []precisePoint
}

func readJSON(t testing.TB, path string, into any) {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, into); err != nil {
		t.Fatal(err)
	}
}

// equations returns the Go text of each reference model.
func equations(t testing.TB) map[string]string {
	t.Helper()
	var file struct {
		Cases []struct{ ID, Equations string }
	}
	readJSON(t, "../../testdata/reference-cases.json", &file)
	texts := map[string]string{}
	for _, c := range file.Cases {
		texts[c.ID] = c.Equations
	}
	return texts
}

// worst keeps the largest relative error of each kind of derivative.
type worst map[string]float64

// compare measures the errors of got, relative to the sums of terms.
func (w worst) compare(t *testing.T, id, what string, got []float64, want map[int]decimal, most float64) {
	t.Helper()
	for k, v := range got {
		d, ok := want[k]
		if !ok {
			if v != 0 {
				t.Errorf("%s: %s[%d] is %v, want 0", id, what, k, v)
			}
			continue
		}
		scale, err := strconv.ParseFloat(d[1], 64)
		if err != nil {
			t.Fatal(err)
		}
		e := gap(t, v, d[0]) / scale
		w[what] = math.Max(w[what], e)
		if !(e <= most) {
			t.Errorf("%s: %s[%d] is %v, want %s: error %.2g of the sum of its terms", id, what, k, v, d[0][:20], e)
		}
	}
}

// gap is |got - want| with want in decimal.
func gap(t *testing.T, got float64, want string) float64 {
	t.Helper()
	exact, _, err := big.ParseFloat(want, 10, 200, big.ToNearestEven)
	if err != nil {
		t.Fatal(err)
	}
	d, _ := exact.Sub(exact, new(big.Float).SetPrec(200).SetFloat64(got)).Float64()
	return math.Abs(d)
}

// TestReferenceDerivatives compares derivatives of every reference model with
// values to 50 digits: at most 1e-14 of the sum of the absolute terms for f and
// first derivatives, 1e-13 for second and third ones.
func TestReferenceDerivatives(t *testing.T) {
	texts := equations(t)
	var cases []preciseCase
	readJSON(t, "../../testdata/derivatives.json", &cases)
	if len(cases) != len(texts) {
		t.Fatalf("%d cases, want %d", len(cases), len(texts))
	}
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
			in := &tape.Inputs{X: at.Z[:n], P: at.Z[n:], W: at.W}
			in.Dirs[0] = at.A
			run := func(c *tape.Code) []float64 {
				m := c.NewMachine()
				if !m.RunWith(in) {
					t.Fatal("guards do not hold")
				}
				return m.Out()
			}
			errors.compare(t, c.ID, "value", run(p.Value()), at.Value, 1e-14)
			errors.compare(t, c.ID, "jacobian", run(p.Jacobian(c.Free)), at.Jacobian, 1e-14)
			errors.compare(t, c.ID, "parameters", run(p.Parameters()), at.Parameters, 1e-14)
			errors.compare(t, c.ID, "second", run(p.Directional(c.Free, "aa")), at.Second, 1e-13)
			errors.compare(t, c.ID, "third", run(p.Directional(c.Free, "aaa")), at.Third, 1e-13)
			errors.compare(t, c.ID, "adjoint", run(p.Adjoint(c.Free, "a")), at.Adjoint, 1e-13)
		}
	}
	for what, e := range errors {
		t.Logf("%s: largest error %.2g", what, e)
	}
}
