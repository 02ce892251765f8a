package display

import (
	"math"
	"strings"
	"testing"
)

func TestNumbersOfAColumnStandUnderEachOther(t *testing.T) {
	for _, c := range []struct {
		name   string
		values []float64
		want   string
	}{
		{"as many decimals as the longest", []float64{297, 297.485, 300.34}, "297.000 297.485 300.340"},
		{"no more than the greatest can carry", []float64{7.50073, 17.7719}, "7.5007 17.7719"},
		{"rounded by the analyst", []float64{-3, -2.57, 0}, "-3.00 -2.57 0"},
		{"too far apart", []float64{0.00123456, 1234.56}, "0.00123456 1234.56"},
		{"with an exponent", []float64{1e-9, 2}, "1e-9 2"},
		{"without a number", []float64{math.NaN(), 2.5, 3}, "not defined 2.5 3.0"},
	} {
		t.Run(c.name, func(t *testing.T) {
			cells := make([]string, len(c.values))
			for i, v := range c.values {
				cells[i] = significant(v, stateDigits)
			}
			if got := strings.Join(evened(cells, c.values), " "); got != c.want {
				t.Errorf("%s, want %s", got, c.want)
			}
		})
	}
}

func TestDecimalsOfAField(t *testing.T) {
	type row struct {
		Load   float64 `unit:"MW" decimals:"2"`
		Digits int     `decimals:"2"`
		Word   string  `decimals:"2"`
	}
	want := "" +
		"Load (MW)  Digits  Word\n" +
		"---------  ------  -----\n" +
		"    10.07       3  today\n" +
		"     0.00       3\n" +
		"    -0.50       3"
	got := Table([]row{{10.0704, 3, "today"}, {-0.001, 3, ""}, {-0.5, 3, ""}}).String()
	if got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}
