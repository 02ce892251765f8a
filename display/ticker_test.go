package display

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"pgregory.net/rapid"
)

func labelsOf(marks []plot.Tick) []string {
	var list []string
	for _, m := range marks {
		if m.Label != "" {
			list = append(list, m.Label)
		}
	}
	return list
}

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		low, high float64
		length    vg.Length
		vertical  bool
		want      string
	}{
		{280, 320, 340, false, "280 285 290 295 300 305 310 315 320"},
		{0, 1, 340, false, "0.0 0.1 0.2 0.3 0.4 0.5 0.6 0.7 0.8 0.9 1.0"},
		{0, 1, 200, true, "0.0 0.2 0.4 0.6 0.8 1.0"},
		{-1, 1, 150, true, "−1.0 −0.5 0.0 0.5 1.0"},
		{0, 0.3, 200, false, "0.0 0.1 0.2 0.3"},
		{0, 5e-9, 340, false, "0 1e−9 2e−9 3e−9 4e−9 5e−9"},
		{-1.2e6, 1.2e6, 340, false, "−1.0e6 −0.5e6 0 0.5e6 1.0e6"},
		{1e6, 1e6 + 5, 340, false, "1000000 1000001 1000002 1000003 1000004 1000005"},
		{303.4199, 303.4201, 340, false, "303.41995 303.42000 303.42005 303.42010"},
		{-12, -3, 120, true, "−12 −10 −8 −6 −4"},
	} {
		got := strings.Join(labelsOf(ticker{c.length, c.vertical}.Ticks(c.low, c.high)), " ")
		if got != c.want {
			t.Errorf("%g to %g on %v:\n got %s\nwant %s", c.low, c.high, c.length, got, c.want)
		}
	}
}

func TestDecades(t *testing.T) {
	for _, c := range []struct {
		low, high float64
		want      string
	}{
		{0.05, 2000, "0.1 1 10 100 1000"},
		{1e-9, 1e-3, "1e−9 1e−7 1e−5 1e−3"},
		{1e-7, 1e7, "1e−7 1e−4 1e−1 1e2 1e5"},
		{1, 40, "1 2 5 10 20"},
		{3, 4, "3.0 3.1 3.2 3.3 3.4 3.5 3.6 3.7 3.8 3.9 4.0"},
	} {
		marks := decadeTicker{ticker{length: 340}}.Ticks(c.low, c.high)
		if got := strings.Join(labelsOf(marks), " "); got != c.want {
			t.Errorf("%g to %g:\n got %s\nwant %s", c.low, c.high, got, c.want)
		}
		for _, m := range marks {
			if m.Value < c.low*(1-1e-9) || m.Value > c.high*(1+1e-9) {
				t.Errorf("%g to %g: tick at %g", c.low, c.high, m.Value)
			}
		}
	}
	for _, low := range []float64{0, -1, math.NaN()} {
		if marks := (decadeTicker{ticker{length: 340}}).Ticks(low, 10); marks != nil {
			t.Errorf("from %g: %v", low, marks)
		}
	}
}

// TestTickLabelsSayTheirValues draws any range: labels read back as the value of
// their tick, ascend, and do not touch each other.
func TestTickLabelsSayTheirValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		centre := rapid.Float64Range(-1e3, 1e3).Draw(t, "centre")
		span := math.Pow(10, rapid.Float64Range(-6, 8).Draw(t, "decade"))
		low, high := centre-span/2, centre+span/2
		axis := ticker{vg.Length(rapid.Float64Range(150, 700).Draw(t, "length")), rapid.Bool().Draw(t, "vertical")}
		marks := axis.Ticks(low, high)
		if n := len(labelsOf(marks)); n < 1 || n > 28 {
			t.Fatalf("%d labels", n)
		}
		end := vg.Length(math.Inf(-1))
		f := face(labelSize)
		for _, m := range marks {
			if m.Value < low-1e-9*span || m.Value > high+1e-9*span {
				t.Fatalf("tick %g outside", m.Value)
			}
			if m.Label == "" {
				continue
			}
			v, err := strconv.ParseFloat(strings.ReplaceAll(m.Label, "−", "-"), 64)
			if err != nil || math.Abs(v-m.Value) > 1e-9*math.Max(span, math.Abs(v)*1e-3) {
				t.Fatalf("label %q at %v", m.Label, m.Value)
			}
			if !axis.vertical {
				at := vg.Length((m.Value-low)/span) * axis.length
				if at-f.Width(m.Label)/2 < end+4 {
					t.Fatalf("labels run into each other at %q", m.Label)
				}
				end = at + f.Width(m.Label)/2
			}
		}
	})
}

func TestNumbers(t *testing.T) {
	type c struct {
		v      float64
		digits int
		plain  string
		sure   string
	}
	var got, want []c
	for _, one := range []c{
		{303.42, 5, "303.42", "303.42"},
		{303.4, 5, "303.4", "303.40"},
		{-0.00012345, 3, "-0.000123", "-0.000123"},
		{1.5e-7, 4, "1.5e-7", "1.500e-7"},
		{123456, 3, "123456", "123456"},
		{2.5e9, 6, "2.5e9", "2.50000e9"},
		{999999.9, 6, "1000000", "1000000"},
		{0, 5, "0", "0"},
		{math.NaN(), 5, "not defined", "not defined"},
		{math.Inf(-1), 5, "-infinite", "-infinite"},
	} {
		want = append(want, one)
		got = append(got, c{one.v, one.digits, significant(one.v, one.digits), reliable(one.v, one.digits)})
	}
	for i := range got {
		if got[i].plain != want[i].plain || got[i].sure != want[i].sure {
			t.Errorf("%g to %d digits: %q, %q; want %q, %q", want[i].v, want[i].digits, got[i].plain, got[i].sure, want[i].plain, want[i].sure)
		}
	}
}

func TestColumns(t *testing.T) {
	for _, c := range []struct {
		values []float64
		digits []int
		want   []string
	}{
		{[]float64{301.7829132, 98.5}, []int{10, 10}, []string{"301.7829132", "98.5000000"}},
		{[]float64{301.7829132, 98.5}, []int{5, 10}, []string{"301.78", "98.50"}},
		{[]float64{0, 1, 2.5}, []int{6, 6, 6}, []string{"0", "1.00000", "2.50000"}},
		{[]float64{1e-30, 0.5}, []int{4, 4}, []string{"0.0000", "0.5000"}},
		{[]float64{1e-8, 1}, []int{3, 3}, []string{"1.00e-8", "1.00"}},
		{[]float64{math.NaN(), 1}, []int{3, 3}, []string{"not defined", "1.00"}},
	} {
		if diff := cmp.Diff(c.want, alignedTo(c.values, c.digits)); diff != "" {
			t.Errorf("%v: %s", c.values, diff)
		}
	}
}
