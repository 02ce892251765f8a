package continuation_test

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"testing"

	"brinkline/continuation"
)

// The IEEE 14-bus system: the published data and solved case, and a nose that was
// found another way (bisection on the convergence of a Newton load flow). See
// "about" in the file.
type fourteenBus struct {
	Buses []struct {
		Bus        int
		Kind       string
		LoadMW     float64  `json:"load_MW"`
		LoadMVAr   float64  `json:"load_MVAr"`
		ShuntMVAr  float64  `json:"shunt_MVAr"`
		Voltage    float64  `json:"published_voltage"`
		Angle      float64  `json:"published_angle"`
		Generation *float64 `json:"generation_MW"`
	}
	Branches []struct {
		From, To            int
		R, X, Charging, Tap float64
	}
	Published struct {
		Losses float64 `json:"losses_MW"`
		Slack  float64 `json:"slack_MW"`
	}
	Recomputed struct {
		Losses    float64 `json:"losses_MW"`
		SlackMVAr float64 `json:"slack_MVAr"`
		Nose      struct {
			LoadFactor json.Number `json:"load_factor"`
			Voltage14  json.Number `json:"voltage_bus_14"`
			Voltage5   json.Number `json:"voltage_bus_5"`
		}
	}
}

func readFourteenBus(t testing.TB) *fourteenBus {
	t.Helper()
	text, err := os.ReadFile("../testdata/fourteen-bus.json")
	if err != nil {
		t.Fatal(err)
	}
	n := new(fourteenBus)
	if err := json.Unmarshal(text, n); err != nil {
		t.Fatal(err)
	}
	if len(n.Buses) != 14 || len(n.Branches) != 20 {
		t.Fatalf("%d buses and %d branches", len(n.Buses), len(n.Branches))
	}
	return n
}

// growth multiplies all loads and the scheduled generation.
type growth struct {
	LoadFactor float64
}

// fourteenFlow is the load flow in polar form. Its states are the angles of buses 2
// to 14 in degrees, then the voltages of the load buses in per unit.
type fourteenFlow struct {
	net  *fourteenBus
	g, b [14][14]float64
	pq   []int // indices of the buses whose voltage is a state
}

func newFourteenFlow(net *fourteenBus) *fourteenFlow {
	n := &fourteenFlow{net: net}
	for i, bus := range net.Buses {
		n.b[i][i] += bus.ShuntMVAr / 100
		if bus.Kind == "PQ" {
			n.pq = append(n.pq, i)
		}
	}
	for _, l := range net.Branches {
		i, k, tap := l.From-1, l.To-1, l.Tap
		if tap == 0 {
			tap = 1
		}
		y := 1 / complex(l.R, l.X)
		g, b := real(y), imag(y)
		n.g[i][i], n.b[i][i] = n.g[i][i]+g/(tap*tap), n.b[i][i]+(b+l.Charging/2)/(tap*tap)
		n.g[k][k], n.b[k][k] = n.g[k][k]+g, n.b[k][k]+b+l.Charging/2
		n.g[i][k], n.b[i][k] = n.g[i][k]-g/tap, n.b[i][k]-b/tap
		n.g[k][i], n.b[k][i] = n.g[k][i]-g/tap, n.b[k][i]-b/tap
	}
	return n
}

// spread returns voltages and angles (in radians) of all buses.
func (n *fourteenFlow) spread(u []float64) (v, a [14]float64) {
	for i, bus := range n.net.Buses {
		v[i] = bus.Voltage
	}
	for i := 1; i < 14; i++ {
		a[i] = u[i-1] * math.Pi / 180
	}
	for k, i := range n.pq {
		v[i] = u[13+k]
	}
	return v, a
}

// injected returns what flows from bus i into the network, per unit.
func (n *fourteenFlow) injected(i int, v, a *[14]float64) (p, q float64) {
	for k := range 14 {
		s, c := math.Sincos(a[i] - a[k])
		p += v[i] * v[k] * (n.g[i][k]*c + n.b[i][k]*s)
		q += v[i] * v[k] * (n.g[i][k]*s - n.b[i][k]*c)
	}
	return p, q
}

func (n *fourteenFlow) balance(u []float64, q growth, f []float64) {
	v, a := n.spread(u)
	for i, row := 1, 0; i < 14; i++ {
		bus := n.net.Buses[i]
		p, r := n.injected(i, &v, &a)
		f[i-1] = q.LoadFactor*(*bus.Generation-bus.LoadMW)/100 - p
		if bus.Kind == "PQ" {
			f[13+row] = -q.LoadFactor*bus.LoadMVAr/100 - r
			row++
		}
	}
}

func (n *fourteenFlow) model(t testing.TB) *continuation.Model {
	t.Helper()
	var names, units []string
	for i := 2; i <= 14; i++ {
		names, units = append(names, fmt.Sprintf("Angle %d", i)), append(units, "deg")
	}
	for _, i := range n.pq {
		names, units = append(names, fmt.Sprintf("Voltage %d", i+1)), append(units, "pu")
	}
	m, err := continuation.NewModel(n.balance, growth{1}, continuation.States(names, units, nil), continuation.Balance())
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func (n *fourteenFlow) flat() []float64 {
	u := make([]float64, 13+len(n.pq))
	for k := range n.pq {
		u[13+k] = 1
	}
	return u
}

func TestFourteenBusMatchesThePublishedCase(t *testing.T) {
	net := readFourteenBus(t)
	n := newFourteenFlow(net)
	start := settled(t, n.model(t), n.flat())
	v, a := n.spread(start.State)
	for i, bus := range net.Buses {
		if math.Abs(v[i]-bus.Voltage) > 0.0015 {
			t.Errorf("bus %d: voltage %.5f, published %.3f", i+1, v[i], bus.Voltage)
		}
		if deg := a[i] * 180 / math.Pi; math.Abs(deg-bus.Angle) > 0.03 {
			t.Errorf("bus %d: angle %.4f degrees, published %.2f", i+1, deg, bus.Angle)
		}
	}
	p, q := n.injected(0, &v, &a)
	losses := 0.0
	for i := range 14 {
		p, _ := n.injected(i, &v, &a)
		losses += 100 * p
	}
	for _, c := range []struct {
		what      string
		got, want float64
		error     float64 // half a unit of the last digit printed; one unit of the last recomputed
	}{
		{"losses, published (MW)", losses, net.Published.Losses, 0.005},
		{"slack, published (MW)", 100 * p, net.Published.Slack, 0.05},
		{"losses, recomputed (MW)", losses, net.Recomputed.Losses, 1e-7},
		{"slack, recomputed (MVAr)", 100 * q, net.Recomputed.SlackMVAr, 1e-7},
	} {
		if math.Abs(c.got-c.want) > c.error {
			t.Errorf("%s: %.9f, want %v", c.what, c.got, c.want)
		}
	}
}

func TestFourteenBusNose(t *testing.T) {
	net := readFourteenBus(t)
	n := newFourteenFlow(net)
	start := settled(t, n.model(t), n.flat())
	b := mustFollow(t, start, "LoadFactor", continuation.Within(0.5, 5), continuation.StopAtFold(), continuation.Upward())
	nose, err := b.LimitAbove(start)
	if err != nil {
		t.Fatal(err)
	}
	// 8 decimals of the bisection.
	if want, _ := net.Recomputed.Nose.LoadFactor.Float64(); math.Abs(nose.Value()-want) > 1e-8 {
		t.Errorf("nose at %.11f, by bisection %v", nose.Value(), want)
	}
	if len(b.Specials()) != 1 || nose.Digits() < 8 || !nose.Greatest() || nose.RangeRelative < 1e-6 {
		t.Errorf("%v; %d digits, range test %g", b.Specials(), nose.Digits(), nose.RangeRelative)
	}
	for name, want := range map[string]json.Number{"Voltage 14": net.Recomputed.Nose.Voltage14, "Voltage 5": net.Recomputed.Nose.Voltage5} {
		v, err := nose.At(name)
		// Near a nose a bisection that stops at 1e-9 leaves about 1e-4 in the voltages.
		if x, _ := want.Float64(); err != nil || math.Abs(v-x) > 0.0006 {
			t.Errorf("%s at the nose is %.5f, by bisection %s (%v)", name, v, want, err)
		}
	}
	t.Logf("nose at %.12g, %d digits", nose.Value(), nose.Digits())
}

// A load flow written in units a million times smaller has the same nose.
func TestFourteenBusNoseInOtherUnits(t *testing.T) {
	n := newFourteenFlow(readFourteenBus(t))
	want := settled(t, n.model(t), n.flat())
	const unit = 1e6
	scaled := func(u []float64, q growth, f []float64) {
		x := make([]float64, len(u))
		for i := range u {
			x[i] = u[i] / unit
		}
		n.balance(x, q, f)
	}
	// A flat start is no hint at the size of the angles, so they say it themselves.
	names, scales := make([]string, len(n.flat())), make([]float64, len(n.flat()))
	for i := range names {
		names[i], scales[i] = fmt.Sprintf("X%d", i), 10*unit
	}
	m, err := continuation.NewModel(scaled, growth{1}, continuation.States(names, nil, scales), continuation.Balance())
	if err != nil {
		t.Fatal(err)
	}
	guess := n.flat()
	for i := range guess {
		guess[i] *= unit
	}
	nose := func(p *continuation.Point) float64 {
		b := mustFollow(t, p, "LoadFactor", continuation.Within(0.5, 5), continuation.StopAtFold())
		fold, err := b.LimitAbove(p)
		if err != nil {
			t.Fatal(err)
		}
		return fold.Value()
	}
	if a, b := nose(want), nose(settled(t, m, guess)); math.Abs(a-b) > 1e-10 {
		t.Errorf("nose at %.13g, in other units %.13g", a, b)
	}
}
