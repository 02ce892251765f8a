package tape

import (
	"encoding/json"
	"math"
	"math/big"
	"os"
	"strconv"
	"testing"
)

// TestElementaryFunctions compares the elementary functions with values to 60
// digits at hard places: huge, tiny, near multiples of pi/4, subnormal results,
// ends of the pieces. Errors are in units of the last place of the exact value.
func TestElementaryFunctions(t *testing.T) {
	text, err := os.ReadFile("testdata/elementary.json")
	must(t, err)
	var cases map[string][][]string
	must(t, json.Unmarshal(text, &cases))
	functions := map[string]func([]float64) float64{
		"exp": func(x []float64) float64 { return exp(x[0]) }, "log": func(x []float64) float64 { return log(x[0]) },
		"sin": func(x []float64) float64 { return sin(x[0]) }, "cos": func(x []float64) float64 { return cos(x[0]) },
		"tanh": func(x []float64) float64 { return tanh(x[0]) }, "pow": func(x []float64) float64 { return pow(x[0], x[1]) },
	}
	for name, f := range functions {
		worst, failures := 0.0, 0
		var where []float64
		for _, c := range cases[name] {
			x := make([]float64, len(c)-1)
			for i := range x {
				x[i], err = strconv.ParseFloat(c[i], 64)
				must(t, err)
			}
			got := f(x)
			e := ulps(t, got, c[len(c)-1])
			if e > worst {
				worst, where = e, x
			}
			if !(e <= 1) {
				if failures++; failures < 6 {
					t.Errorf("%s(%v) is %v, want %.25s: %.3g ulp", name, x, got, c[len(c)-1], e)
				}
			}
		}
		t.Logf("%s: %d places, at most %.3f ulp, at %v", name, len(cases[name]), worst, where)
	}
}

// ulps is the error of got in units of the last place of the exact value.
func ulps(t *testing.T, got float64, want string) float64 {
	t.Helper()
	exact, _, err := big.ParseFloat(want, 10, 250, big.ToNearestEven)
	must(t, err)
	nearest, _ := exact.Float64()
	if math.IsInf(nearest, 0) || math.IsInf(got, 0) || math.IsNaN(got) {
		if got == nearest {
			return 0
		}
		return math.Inf(1)
	}
	unit := math.Nextafter(math.Abs(nearest), math.Inf(1)) - math.Abs(nearest)
	if f, e := math.Frexp(math.Abs(nearest)); f == 0.5 && e > -1020 && new(big.Float).Abs(exact).Cmp(big.NewFloat(math.Abs(nearest))) < 0 {
		unit /= 2 // just below a power of 2
	}
	d, _ := exact.Sub(exact, new(big.Float).SetPrec(250).SetFloat64(got)).Float64()
	return math.Abs(d) / unit
}

func TestElementarySpecialCases(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	zero := math.Copysign(0, -1)
	// The library's logarithm of a subnormal number and sine of a huge one are
	// wrong on some processors; these stand in the tables.
	unary := []float64{0, zero, inf, -inf, nan, 1, -1, 5e-324, -5e-324, math.MaxFloat64, 1000, -1000}
	functions := []struct {
		name        string
		own, theirs func(float64) float64
	}{{"exp", exp, math.Exp}, {"log", log, math.Log}, {"sin", sin, math.Sin}, {"cos", cos, math.Cos}, {"tanh", tanh, math.Tanh}}
	for _, f := range functions {
		for _, x := range unary {
			if f.name == "log" && x == 5e-324 || x == math.MaxFloat64 && (f.name == "sin" || f.name == "cos") {
				continue
			}
			alike(t, f.name, f.own(x), f.theirs(x), x)
		}
	}
	for _, x := range append(unary, 0.5, -0.5, 2, -2) {
		for _, y := range append(unary, 0.5, -0.5, 2, 3, -2, -3, 1e20, -1e20) {
			alike(t, "pow", pow(x, y), math.Pow(x, y), x, y)
		}
	}
}

func alike(t *testing.T, name string, got, want float64, x ...float64) {
	t.Helper()
	near := math.Abs(got-want) <= 4e-16*math.Abs(want)
	if !near && !(math.IsNaN(got) && math.IsNaN(want)) && got != want || got == 0 && math.Signbit(got) != math.Signbit(want) {
		t.Errorf("%s(%v) is %v, want %v", name, x, got, want)
	}
}

func BenchmarkElementary(b *testing.B) {
	x := make([]float64, 1024)
	for i := range x {
		x[i] = 3 * math.Sin(float64(i))
	}
	for _, f := range []struct {
		name        string
		own, theirs func(float64) float64
	}{
		{"exp", exp, math.Exp},
		{"log", func(x float64) float64 { return log(x * x) }, func(x float64) float64 { return math.Log(x * x) }},
		{"sin", sin, math.Sin}, {"cos", cos, math.Cos}, {"tanh", tanh, math.Tanh},
		{"pow", func(x float64) float64 { return pow(4+x, 1.7) }, func(x float64) float64 { return math.Pow(4+x, 1.7) }},
	} {
		b.Run(f.name, func(b *testing.B) {
			sum := 0.0
			ratio(b, func() {
				for _, v := range x {
					sum += f.own(v)
				}
			}, func() {
				for _, v := range x {
					sum += f.theirs(v)
				}
			})
		})
	}
}
