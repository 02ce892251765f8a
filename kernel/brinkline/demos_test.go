package main

import (
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"brinkline/kernel/headless"
	"brinkline/kernel/notebook"
)

var update = flag.Bool("update", false, "execute the demos and write them anew")

const fourteen = "../../testdata/fourteen-bus.ipynb"

func demos(t *testing.T) []string {
	t.Helper()
	found, err := filepath.Glob("../../notebooks-demo/*.ipynb")
	if err != nil || len(found) < 3 {
		t.Fatalf("found %v, %v", found, err)
	}
	return append(found, fourteen)
}

// The demos are committed as they come out: executed afresh, from a copy without
// outputs, they have the same bytes.
func TestDemosGiveTheirCommittedBytes(t *testing.T) {
	if runtime.GOARCH != "amd64" {
		t.Skip("the committed bytes are those of amd64; " + runtime.GOARCH + " may round the last digits otherwise")
	}
	for _, path := range demos(t) {
		t.Run(filepath.Base(path), func(t *testing.T) {
			committed, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			bare := filepath.Join(t.TempDir(), filepath.Base(path))
			if err := os.WriteFile(bare, withoutOutputs(t, committed), 0o644); err != nil {
				t.Fatal(err)
			}
			job := headless.Job{Notebook: bare, Output: bare}
			if err := job.Run(context.Background(), sessions(), io.Discard); err != nil {
				t.Fatal(err)
			}
			fresh, err := os.ReadFile(bare)
			if err != nil {
				t.Fatal(err)
			}
			if bytes.Equal(fresh, committed) {
				return
			}
			if *update {
				if err := os.WriteFile(path, fresh, 0o644); err != nil {
					t.Fatal(err)
				}
				return
			}
			t.Errorf("the outputs have changed (execute it again, or run the test with -update):\n%s", firstDifference(committed, fresh))
		})
	}
}

func withoutOutputs(t *testing.T, text []byte) []byte {
	t.Helper()
	var tree map[string]any
	if err := json.Unmarshal(text, &tree); err != nil {
		t.Fatal(err)
	}
	for _, c := range tree["cells"].([]any) {
		if cell := c.(map[string]any); cell["cell_type"] == "code" {
			cell["outputs"], cell["execution_count"] = []any{}, nil
		}
	}
	bare, err := json.Marshal(tree)
	if err != nil {
		t.Fatal(err)
	}
	return bare
}

func firstDifference(a, b []byte) string {
	x, y := strings.Split(string(a), "\n"), strings.Split(string(b), "\n")
	cut := func(s string) string { return s[:min(len(s), 300)] }
	for i := range min(len(x), len(y)) {
		if x[i] != y[i] {
			return fmt.Sprintf("line %d\n- %s\n+ %s", i+1, cut(x[i]), cut(y[i]))
		}
	}
	return fmt.Sprintf("%d and %d lines", len(x), len(y))
}

// outputText returns the plain text of all outputs of a cell.
func outputText(t *testing.T, path, id string) string {
	t.Helper()
	nb, err := notebook.Read(path)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range nb.Cells {
		if c.ID() != id {
			continue
		}
		var text strings.Builder
		for _, o := range c.Outputs() {
			_, stream := o.Stream()
			plain, _ := o.Data("text/plain")
			text.WriteString(stream + plain + "\n")
		}
		return text.String()
	}
	t.Fatalf("%s has no cell %q", path, id)
	return ""
}

// numbers finds what a pattern with groups of numbers matches in a text.
func numbers(t *testing.T, text, pattern string) []float64 {
	t.Helper()
	m := regexp.MustCompile(pattern).FindStringSubmatch(text)
	if m == nil {
		t.Fatalf("no %q in\n%s", pattern, text)
	}
	list := make([]float64, len(m)-1)
	for i := range list {
		v, err := strconv.ParseFloat(m[i+1], 64)
		if err != nil {
			t.Fatal(err)
		}
		list[i] = v
	}
	return list
}

// closeTo reports where a value is not the wanted one to an absolute error.
func closeTo(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.12g, want %.12g within %g", what, got, want, tolerance)
	}
}

// The IEEE 14-bus system as a notebook, against the published solved case and a
// nose found by bisection; see "about" in the file.
func TestFourteenBusNotebook(t *testing.T) {
	var net struct {
		Buses []struct {
			Voltage float64 `json:"published_voltage"`
			Angle   float64 `json:"published_angle"`
		}
		Published struct {
			Losses float64 `json:"losses_MW"`
			Slack  float64 `json:"slack_MW"`
		}
		Recomputed struct {
			Nose struct {
				LoadFactor json.Number `json:"load_factor"`
			}
		}
	}
	text, err := os.ReadFile("../../testdata/fourteen-bus.json")
	if err == nil {
		err = json.Unmarshal(text, &net)
	}
	if err != nil || len(net.Buses) != 14 {
		t.Fatalf("%d buses, %v", len(net.Buses), err)
	}
	solved := outputText(t, fourteen, "solved")
	for i, bus := range net.Buses {
		got := numbers(t, solved, fmt.Sprintf(`bus +%d: voltage (\S+) pu, published \S+; angle (\S+) deg`, i+1))
		closeTo(t, fmt.Sprintf("voltage of bus %d", i+1), got[0], bus.Voltage, 0.0015)
		closeTo(t, fmt.Sprintf("angle of bus %d", i+1), got[1], bus.Angle, 0.03)
	}
	// To the printed digits.
	closeTo(t, "losses", numbers(t, solved, `losses (\S+) MW`)[0], net.Published.Losses, 0.005)
	closeTo(t, "slack", numbers(t, solved, `slack (\S+) MW`)[0], net.Published.Slack, 0.05)
	nose, err := net.Recomputed.Nose.LoadFactor.Float64()
	if err != nil {
		t.Fatal(err)
	}
	closeTo(t, "nose", numbers(t, outputText(t, fourteen, "nose"), `nose (\S+),`)[0], nose, 1e-8)
}

// The folds of the stirred tank against its closed form: the jacket temperature as
// a function of the vessel's.
func TestStirredTankAgainstItsClosedForm(t *testing.T) {
	const notebook = "../../notebooks-demo/01-stirred-tank.ipynb"
	jacket := func(inflow float64) func(float64) float64 {
		return func(temp float64) float64 {
			k := 0.12 / 60 * math.Exp(79/8.314462618e-3*(1/300.0-1/temp))
			c := 2.2 * inflow / (inflow + k*1200)
			return temp - (96*k*c*1200-inflow*1.8*(temp-298))/(60*0.8)
		}
	}
	ignition := extremum(jacket(40), 305, 320, 1)
	closeTo(t, "ignition", numbers(t, outputText(t, notebook, "ignition"), `Coolant \(K\) +(\S+)`)[0], ignition, 6e-8)
	closeTo(t, "margin", numbers(t, outputText(t, notebook, "ignition"), `margin +(\S+) K`)[0], ignition-297, 1e-5)
	extinction := extremum(jacket(40), 335, 355, -1)
	closeTo(t, "extinction", numbers(t, outputText(t, notebook, "extinction"), `Coolant \(K\) +(\S+)`)[0], extinction, 6e-8)
	for _, inflow := range []float64{30, 40, 50} {
		row := numbers(t, outputText(t, notebook, "inflow"), fmt.Sprintf(`(?m)^ +%g +\S+ +(\S+) +(\S+) +(\S+)$`, inflow))
		closeTo(t, fmt.Sprintf("ignition at %g L/min", inflow), row[0], extremum(jacket(inflow), 305, 320, 1), 0.005001)
		closeTo(t, fmt.Sprintf("margin at %g L/min", inflow), row[1], extremum(jacket(inflow), 305, 320, 1)-297, 0.005001)
		closeTo(t, fmt.Sprintf("extinction at %g L/min", inflow), row[2], extremum(jacket(inflow), 335, 355, -1), 0.005001)
	}
}

// extremum returns the greatest (sign 1) or least (sign -1) value of f between a
// and b by golden section.
func extremum(f func(float64) float64, a, b, sign float64) float64 {
	const golden = 0.6180339887498949
	for range 120 {
		c, d := b-golden*(b-a), a+golden*(b-a)
		if sign*f(c) > sign*f(d) {
			b = d
		} else {
			a = c
		}
	}
	return f((a + b) / 2)
}

// valley is the feeder of the demo as currents and voltages of a tree, solved by
// backward and forward sweeps; the notebook has it as a load flow in polar form.
type valley struct {
	load, factor, busbar, capacitor, hydro float64
	sawmill                                float64 // MW more at bus 8
}

var (
	valleyToday    = valley{load: 3.2, factor: 0.95, busbar: 1.04, capacitor: 0.6, hydro: 0.25}
	valleySections = [][5]float64{ // from, to, km, ohm/km
		{1, 2, 7.5, 0.306, 0.355}, {2, 3, 6.2, 0.306, 0.355}, {3, 4, 7.2, 0.306, 0.355}, {4, 5, 5.8, 0.306, 0.355},
		{5, 6, 8.0, 0.306, 0.355}, {6, 7, 5.4, 0.595, 0.377}, {7, 8, 8.3, 0.595, 0.377},
		{3, 9, 5.1, 0.595, 0.377}, {9, 10, 6.4, 0.595, 0.377}, {6, 11, 3.9, 0.595, 0.377}, {11, 12, 5.4, 0.595, 0.377},
	}
	valleyShare = [13]float64{2: 0.11, 3: 0.06, 4: 0.13, 5: 0.08, 6: 0.12, 7: 0.07, 8: 0.10, 9: 0.06, 10: 0.08, 11: 0.09, 12: 0.10}
)

// sweep returns the voltages by bus in per unit, and false where the sweeps do not
// converge.
func (f valley) sweep() (v [13]complex128, ok bool) {
	const ohm = 20.0 * 20.0 / 10.0
	for k := range v {
		v[k] = complex(f.busbar, 0)
	}
	tangent := math.Sqrt(1/(f.factor*f.factor) - 1)
	for range 100000 {
		var current [13]complex128
		for k := 2; k <= 12; k++ {
			p := valleyShare[k] * f.load
			if k == 8 {
				p += f.sawmill
			}
			s := complex(p, p*tangent)
			if k == 10 {
				s -= complex(f.hydro, 0)
			}
			current[k] = cmplx.Conj(s / 10 / v[k])
		}
		current[7] += complex(0, f.capacitor/10) * v[7]
		for i := len(valleySections) - 1; i >= 0; i-- { // a later section never feeds an earlier one
			s := valleySections[i]
			if from, to := int(s[0]), int(s[1]); from > 1 {
				current[from] += current[to]
			}
		}
		change := 0.0
		for _, s := range valleySections {
			from, to := int(s[0]), int(s[1])
			next := v[from] - current[to]*complex(s[3], s[4])*complex(s[2]/ohm, 0)
			change = math.Max(change, cmplx.Abs(next-v[to]))
			v[to] = next
		}
		if change < 1e-14 {
			return v, true
		}
		if !(change < 10) {
			break
		}
	}
	return v, false
}

// nose bisects on the convergence of the sweeps, roughly, and extrapolates: the
// load is a smooth function of the voltage at the end of the line, and the nose is
// its maximum.
func (f valley) nose() float64 {
	low, high := 5.0, 15.0
	for high-low > 2e-4*low {
		f.load = (low + high) / 2
		if _, ok := f.sweep(); ok {
			low = f.load
		} else {
			high = f.load
		}
	}
	var x, y []float64
	for _, back := range []float64{0, 2e-4, 6e-4, 1.3e-3, 2.5e-3, 4.5e-3, 7.5e-3, 1.2e-2} {
		f.load = low * (1 - back)
		v, _ := f.sweep()
		x, y = append(x, cmplx.Abs(v[8])), append(y, f.load)
	}
	return extremum(func(at float64) float64 { return lagrange(x, y, at) }, x[0]-0.03, x[0], 1)
}

// reaches returns the load at which a limit is met, by bisection between today and
// a load just short of the nose.
func (f valley) reaches(limit func(v [13]complex128) float64) float64 {
	low, high := f.load, 10.0
	for range 40 {
		f.load = (low + high) / 2
		if v, _ := f.sweep(); limit(v) > 0 {
			low = f.load
		} else {
			high = f.load
		}
	}
	return low
}

func lagrange(x, y []float64, at float64) float64 {
	sum := 0.0
	for i := range x {
		term := y[i]
		for j := range x {
			if i != j {
				term *= (at - x[j]) / (x[i] - x[j])
			}
		}
		sum += term
	}
	return sum
}

func TestFeederAgainstSweeps(t *testing.T) {
	const notebook = "../../notebooks-demo/02-feeder.ipynb"
	v, ok := valleyToday.sweep()
	if !ok {
		t.Fatal("today's sweep does not converge")
	}
	start := outputText(t, notebook, "start")
	for k := 1; k <= 12; k++ {
		got := numbers(t, start, fmt.Sprintf(`(?m)^ +%d +(\S+) +\S+ +(\S+)$`, k))
		closeTo(t, fmt.Sprintf("voltage of bus %d", k), got[0], cmplx.Abs(v[k]), 0.00005001)
		closeTo(t, fmt.Sprintf("angle of bus %d", k), got[1], cmplx.Phase(v[k])*180/math.Pi, 0.005001)
	}
	nose := valleyToday.nose()
	text := outputText(t, notebook, "nose")
	closeTo(t, "nose", numbers(t, text, `Load \(MW\) +(\S+)`)[0], nose, 1e-8)
	closeTo(t, "margin", numbers(t, text, `margin +(\S+) MW`)[0], nose-3.2, 1e-5)
	closeTo(t, "margin in percent", numbers(t, text, `in percent of the value now +(\S+) %`)[0], 100*(nose-3.2)/3.2, 0.05001)
	for _, c := range []struct {
		pattern string
		set     func(*valley) *float64
		step    float64
	}{
		{`Busbar +1.04 pu +(\S+)`, func(f *valley) *float64 { return &f.busbar }, 0.002},
		{`PowerFactor +0.95 +(\S+)`, func(f *valley) *float64 { return &f.factor }, 0.002},
		{`Capacitor +0.6 Mvar +(\S+)`, func(f *valley) *float64 { return &f.capacitor }, 0.1},
		{`Hydro +0.25 MW +(\S+)`, func(f *valley) *float64 { return &f.hydro }, 0.1},
	} {
		up, down := valleyToday, valleyToday
		*c.set(&up) += c.step
		*c.set(&down) -= c.step
		want := (up.nose() - down.nose()) / (2 * c.step)
		// Four digits are printed; the difference leaves one in 1e4.
		closeTo(t, c.pattern, numbers(t, outputText(t, notebook, "sensitivities"), c.pattern)[0], want, 2e-4*want)
	}
	for _, c := range []struct {
		mark  string
		limit func(v [13]complex128) float64 // 0 at the limit, positive before
	}{
		{"band left", func(v [13]complex128) float64 { return cmplx.Abs(v[12]) - 0.95 }},
		{"line full", func(v [13]complex128) float64 {
			amperes := cmplx.Abs(v[1]-v[2]) / math.Hypot(0.306*7.5, 0.355*7.5) * 20000 / math.Sqrt(3)
			return 320 - amperes
		}},
	} {
		got := numbers(t, outputText(t, notebook, "band"), c.mark+` +(\S+)`)[0]
		closeTo(t, c.mark, got, valleyToday.reaches(c.limit), 0.005001)
	}
	more, less := valleyToday, valleyToday
	more.sawmill, less.sawmill = 0.02, -0.02
	closeTo(t, "cost of 1 MW at bus 8", numbers(t, outputText(t, notebook, "weak"), `(?m)^ +8 .* (\S+)$`)[0], (less.nose()-more.nose())/0.04, 0.005001)
	for _, pf := range []float64{0.85, 0.90, 0.95, 0.98} {
		f := valleyToday
		f.factor = pf
		got := numbers(t, outputText(t, notebook, "factor"), fmt.Sprintf(`(?m)^ +%.2f +\S+ +\S+ +(\S+)`, pf))[0]
		closeTo(t, fmt.Sprintf("nose at power factor %g", pf), got, f.nose(), 0.005001)
	}
}

// mere is the lake of the demo in closed form: the load of a steady state as a
// function of its phosphorus.
type mere struct{ loss, recycling, half, exponent float64 }

var mereToday = mere{loss: 0.7, recycling: 60, half: 70, exponent: 5}

func (m mere) load(p float64) float64 {
	y := math.Pow(p/m.half, m.exponent)
	return m.loss*p - m.recycling*y/(1+y)
}

// slope is the derivative of load.
func (m mere) slope(p float64) float64 {
	y := math.Pow(p/m.half, m.exponent)
	return m.loss - m.recycling*m.exponent*y/(p*(1+y)*(1+y))
}

// middle is where the slope is least, whatever the rates are: the cusp's phosphorus.
func (m mere) middle() float64 {
	return m.half * math.Pow((m.exponent-1)/(m.exponent+1), 1/m.exponent)
}

func (m mere) tipping() float64  { return extremum(m.load, 0, m.middle(), 1) }
func (m mere) comeback() float64 { return extremum(m.load, m.middle(), 300, -1) }

// later integrates with the classical Runge-Kutta method in steps of a thousandth year.
func (m mere) later(p, load float64, years int) float64 {
	const h = 0.001
	rate := func(p float64) float64 { return load - m.load(p) }
	for range years * 1000 {
		a := rate(p)
		b := rate(p + h/2*a)
		c := rate(p + h/2*b)
		p += h / 6 * (a + 2*b + 2*c + rate(p+h*c))
	}
	return p
}

// zero bisects.
func zero(f func(float64) float64, a, b float64) float64 {
	rising := f(b) > 0
	for range 200 {
		if c := (a + b) / 2; (f(c) > 0) == rising {
			b = c
		} else {
			a = c
		}
	}
	return (a + b) / 2
}

// halfDigit is half a unit of the last of so many significant digits, and a little more.
func halfDigit(v float64, digits int) float64 {
	return 0.501 * math.Pow(10, math.Floor(math.Log10(math.Abs(v)))+1-float64(digits))
}

const mereNotebook = "../../notebooks-demo/03-lake.ipynb"

func TestLakeStatesAgainstTheirClosedForm(t *testing.T) {
	m := mereToday
	over := func(p float64) float64 { return m.load(p) - 20 }
	tip, back := zero(m.slope, 10, m.middle()), zero(m.slope, m.middle(), 300)
	states := []float64{zero(over, 0, tip), zero(over, tip, back), zero(over, back, 300)}

	start := outputText(t, mereNotebook, "start")
	closeTo(t, "today", numbers(t, start, `Phosphorus \(mg/m3\) +(\S+)`)[0], states[0], 5.001e-5)
	closeTo(t, "eigenvalue", numbers(t, start, `eigenvalues of f_x +(\S+)`)[0], -m.slope(states[0]), 5.001e-5)
	for i, state := range states {
		row := fmt.Sprintf(`(?m)^ +%d +(\S+) +%s`, i, []string{"stable", "unstable", "stable"}[i])
		closeTo(t, row, numbers(t, outputText(t, mereNotebook, "states"), row)[0], state, 0.0005001)
	}
	if text := outputText(t, mereNotebook, "states"); regexp.MustCompile(`(?m)^ +3 `).MatchString(text) {
		t.Errorf("a fourth state in\n%s", text)
	}

	disturbed := outputText(t, mereNotebook, "disturbed")
	for _, c := range []struct{ start, rest float64 }{{50, states[0]}, {66, states[0]}, {69, states[2]}, {90, states[2]}} {
		row := numbers(t, disturbed, fmt.Sprintf(`(?m)^ +%g +(\S+) +(\S+) +(\S+)$`, c.start))
		closeTo(t, fmt.Sprintf("2 years from %g", c.start), row[0], m.later(c.start, 20, 2), 0.005001)
		closeTo(t, fmt.Sprintf("10 years from %g", c.start), row[1], m.later(c.start, 20, 10), 0.005001)
		closeTo(t, fmt.Sprintf("rest from %g", c.start), row[2], c.rest, 0.005001)
	}
}

func TestLakeLimitsAgainstTheirClosedForm(t *testing.T) {
	m := mereToday
	for _, c := range []struct {
		cell      string
		value, at float64
	}{
		{"tipping", m.tipping(), zero(m.slope, 10, m.middle())},
		{"return", m.comeback(), zero(m.slope, m.middle(), 300)},
	} {
		text := outputText(t, mereNotebook, c.cell)
		closeTo(t, c.cell, numbers(t, text, `Load \(mg/m3/yr\) +(\S+)`)[0], c.value, 6e-9)
		closeTo(t, c.cell+" phosphorus", numbers(t, text, `Phosphorus \(mg/m3\) +(\S+)`)[0], c.at, 5.001e-5)
		closeTo(t, c.cell+" margin", numbers(t, text, `margin +(\S+) mg`)[0], c.value-20, 5.001e-6)
		closeTo(t, c.cell+" margin in percent", numbers(t, text, `in percent of the value now +(\S+) %`)[0], 100*(c.value-20)/20, 0.005001)
		curvature := (m.slope(c.at+1e-4) - m.slope(c.at-1e-4)) / 4e-4
		closeTo(t, c.cell+" curvature", numbers(t, text, `curvature +.* = (\S+):`)[0], curvature, 5.001e-6)
	}

	for _, recycling := range []float64{45, 60, 75, 90} {
		s := m
		s.recycling = recycling
		row := numbers(t, outputText(t, mereNotebook, "recycling"), fmt.Sprintf(`(?m)^ +%g +(\S+) +(\S+) +(\S+) +(\S+)$`, recycling))
		today := zero(func(p float64) float64 { return s.load(p) - 20 }, 0, zero(s.slope, 10, s.middle()))
		for i, want := range []float64{today, s.tipping(), 5 * (s.tipping() - 20), s.comeback()} {
			tolerance := []float64{0.05001, 0.005001, 0.5001, 0.005001}[i]
			closeTo(t, fmt.Sprintf("column %d at recycling %g", i+1, recycling), row[i], want, tolerance)
		}
	}

	tables := regexp.MustCompile(`(?s)(How the fold.*)(How the fold.*)`).FindStringSubmatch(outputText(t, mereNotebook, "sensitivities"))
	if tables == nil {
		t.Fatal("not two tables of sensitivities")
	}
	for _, c := range []struct {
		row string
		set func(*mere) *float64
	}{
		{`Loss +0.7 1/yr`, func(m *mere) *float64 { return &m.loss }},
		{`HalfLevel +70 mg/m3`, func(m *mere) *float64 { return &m.half }},
		{`Exponent +5`, func(m *mere) *float64 { return &m.exponent }},
		{`Recycling +60 mg/m3/yr`, func(m *mere) *float64 { return &m.recycling }},
	} {
		for i, limit := range []func(mere) float64{mere.tipping, mere.comeback} {
			up, down := m, m
			now := *c.set(&up)
			*c.set(&up) *= 1.001
			*c.set(&down) *= 0.999
			want := (limit(up) - limit(down)) / (0.002 * now)
			got := numbers(t, tables[i+1], c.row+` +(\S+) .* (\S+)\n`)
			closeTo(t, c.row, got[0], want, halfDigit(want, 4))
			closeTo(t, c.row+" in percent", got[1], want*now/limit(m), halfDigit(want*now/limit(m), 4))
		}
	}
}

func TestLakeLocusAgainstItsClosedForm(t *testing.T) {
	m := mereToday
	n, p := m.exponent, m.middle()
	cusp := numbers(t, outputText(t, mereNotebook, "locus"), `cusp +(\S+) +(\S+) +(\S+) +c = (\S+)`)
	closeTo(t, "load of the cusp", cusp[0], m.recycling*(n-1)*(n-1)/(4*n), 5.001e-7)
	closeTo(t, "loss of the cusp", cusp[1], m.recycling*(n*n-1)/(4*n*p), 5.001e-8)
	closeTo(t, "phosphorus of the cusp", cusp[2], p, 5.001e-5)
	third := (m.slope(p+0.01) - 2*m.slope(p) + m.slope(p-0.01)) / (0.01 * 0.01)
	closeTo(t, "cubic coefficient of the cusp", cusp[3], -third/6, 1e-7)

	text := outputText(t, mereNotebook, "flushing")
	for _, loss := range []float64{0.5, 0.6, 0.7, 0.8, 1.0} {
		m.loss = loss
		row := numbers(t, text, fmt.Sprintf(`(?m)^ +%.1f +(\S+) +(\S+)$`, loss))
		closeTo(t, fmt.Sprintf("return at loss %g", loss), row[0], m.comeback(), 0.05001)
		closeTo(t, fmt.Sprintf("tipping at loss %g", loss), row[1], m.tipping(), 0.05001)
	}
	folds := numbers(t, text, `fold +(\S+) .*\nfold +(\S+) `)
	for i, limit := range []func(mere) float64{mere.comeback, mere.tipping} {
		want := zero(func(loss float64) float64 { m.loss = loss; return limit(m) - 20 }, 0.5, 0.9)
		closeTo(t, "loss at a load of 20", folds[i], want, 1e-10)
	}
}
