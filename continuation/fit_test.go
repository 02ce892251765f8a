package continuation_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"brinkline/continuation"
)

// measuredTank writes steady states of the tank on both sides of its ignition as if
// measured, with noise of the standard deviations given: its steady states are a curve in
// closed form.
func measuredTank(r *rand.Rand, inflow, sdCoolant, sdTemperature float64, errors bool) string {
	var b strings.Builder
	b.WriteString("Coolant (K),Temperature (K)")
	if errors {
		b.WriteString(",error Coolant (K),error Temperature (K)")
	}
	b.WriteString("\n")
	for temp := 322.0; temp <= 350; temp += 2 {
		k := 7.2e10 * math.Exp(-8750/temp)
		x := k / (inflow/100 + k)
		coolant := temp - (inflow/100*(350-temp)+209.2*inflow/100*x)/2.092
		fmt.Fprintf(&b, "%.15g,%.15g", coolant+sdCoolant*r.NormFloat64(), temp+sdTemperature*r.NormFloat64())
		if errors {
			fmt.Fprintf(&b, ",%g,%g", sdCoolant, sdTemperature)
		}
		b.WriteString("\n")
	}
	return b.String()
}

func readMeasured(t testing.TB, m *continuation.Model, text string) *continuation.Measured {
	t.Helper()
	d, err := m.ReadMeasured(strings.NewReader(text))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// Without noise the fit gives back what the points were made with, from 5 % away.
func TestFitWithoutNoise(t *testing.T) {
	start := settledAt(t, settled(t, newTank(t), tankState{0.1, 310}), "Inflow", 105)
	d := readMeasured(t, start.Model(), measuredTank(rand.New(rand.NewPCG(1, 1)), 100, 0, 0, false))
	f, err := start.Fit(d, "Inflow")
	if err != nil {
		t.Fatal(err)
	}
	if q := f.Parameters[0]; math.Abs(q.Value-100) > 1e-5 || q.Before != 105 || q.Error > 1e-4 || !f.Scaled || len(f.Nearest) != len(d.Rows) {
		t.Errorf("%v; %+v", f, q)
	}
	fold := mustFollow(t, f.Point, "Coolant", continuation.Within(260, 330)).Folds()[0]
	want := mustFollow(t, settled(t, newTank(t), tankState{0.1, 310}), "Coolant", continuation.Within(260, 330)).Folds()[0]
	if math.Abs(fold.Value()-want.Value()) > 1e-5 {
		t.Errorf("fold of the fit at %v, of the truth at %v", fold, want)
	}
}

// With noise the deviations have the size of the standard errors, of the parameter and of
// the fold.
func TestFitStatesItsUncertainty(t *testing.T) {
	start := settledAt(t, settled(t, newTank(t), tankState{0.1, 310}), "Inflow", 102)
	truth := mustFollow(t, settledAt(t, start, "Inflow", 100), "Coolant", continuation.Within(260, 330)).Folds()[0].Value()
	sum, sumFold, chi, n := 0.0, 0.0, 0.0, 20
	for k := range n {
		d := readMeasured(t, start.Model(), measuredTank(rand.New(rand.NewPCG(uint64(k), 7)), 100, 0.2, 0.3, true))
		f, err := start.Fit(d, "Inflow")
		if err != nil {
			t.Fatal(err)
		}
		z := (f.Parameters[0].Value - 100) / f.Parameters[0].Error
		fold := mustFollow(t, f.Point, "Coolant", continuation.Within(260, 330)).Folds()[0]
		e, err := f.Uncertainty(fold)
		if err != nil {
			t.Fatal(err)
		}
		y := (fold.Value() - truth) / e
		sum, sumFold, chi = sum+z*z, sumFold+y*y, chi+f.ChiSquared
		if f.Scaled || f.Freedom != 14 {
			t.Fatalf("%+v", f)
		}
	}
	// χ² with 20 degrees of freedom lies between 4.7 and 52 but for one time in 5,000, and
	// with 280 between 200 and 370.
	if sum < 4.7 || sum > 52 || sumFold < 4.7 || sumFold > 52 || chi < 200 || chi > 370 {
		t.Errorf("squared deviations over %d fits: parameter %.3g, fold %.3g; χ² %.4g of 280", n, sum, sumFold, chi)
	}
	t.Logf("squared deviations over %d fits: parameter %.3g, fold %.3g; χ² %.4g of 280", n, sum, sumFold, chi)
}

func TestBadMeasurements(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	m := start.Model()
	for _, c := range []struct{ text, want string }{
		{"Coolant (C),Temperature (K)\n1,2\n", "Coolant of the model is in K"},
		{"Coolant (K),Temprature (K)\n1,2\n", "did you mean Temperature?"},
		{"Coolant (K),Temperature (K)\n1,hot\n", `row 1, column Temperature (K): "hot" is no number`},
		{"Coolant (K),Temperature (K)\n1\n", "wrong number of fields"},
		{"Coolant (K),Temperature (K),error Temperature (K)\n1,2,0\n", "a standard deviation must be positive"},
		{"error Temperature (K)\n1\n", "no column holds a state"},
		{"Coolant (K)\n", "the first line names the columns"},
	} {
		_, err := m.ReadMeasured(strings.NewReader(c.text))
		oneLine(t, err, c.want)
	}
	good := measuredTank(rand.New(rand.NewPCG(1, 1)), 100, 0, 0, false)
	d := readMeasured(t, m, good)
	_, err := start.Fit(d, "Coolant")
	oneLine(t, err, "Coolant is measured")
	_, err = start.Fit(d)
	oneLine(t, err, "name at least one parameter")
	_, err = start.Fit(nil, "Inflow")
	oneLine(t, err, "no measured points")
	_, err = start.Fit(readMeasured(t, m, "Temperature (K)\n300\n310\n"), "Inflow")
	oneLine(t, err, "no column of the data is a parameter")
	_, err = start.Fit(readMeasured(t, m, "Coolant (K),Temperature (K)\n280,310\n"), "Inflow")
	oneLine(t, err, "too few")
	_, err = d.Column("Temp")
	oneLine(t, err, `no column "Temp"`)
}
