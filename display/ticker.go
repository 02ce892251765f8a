package display

import (
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
)

// A ticker puts ticks at multiples of 1, 2 or 5 times a power of ten, as many as
// have room for their labels.
type ticker struct {
	length   vg.Length // of the axis
	vertical bool
}

// Ticks returns the ticks between low and high.
func (t ticker) Ticks(low, high float64) []plot.Tick {
	span := high - low
	if !(span > 0) || math.IsInf(span, 0) {
		return nil
	}
	exponent := int(math.Floor(math.Log10(span))) - 2
	var marks []plot.Tick
	for k := 0; ; k++ {
		step := decimal{[]int{1, 2, 5}[k%3], exponent + k/3}
		if span/step.value() > 40 {
			continue
		}
		next := step.marks(low, high)
		if len(marks) > 1 && len(next) < 2 {
			return t.tidy(alternate(marks), low, span)
		}
		marks = next
		if len(marks) < 2 || t.fits(marks, step.value()/span) {
			return t.tidy(marks, low, span)
		}
	}
}

// alternate takes the label off every second tick: there is no room for all.
func alternate(marks []plot.Tick) []plot.Tick {
	for i := 1; i < len(marks); i += 2 {
		marks[i].Label = ""
	}
	return marks
}

// tidy takes a wide label off a tick in the corner, where it would run under the
// other axis's.
func (t ticker) tidy(marks []plot.Tick, low, span float64) []plot.Tick {
	if t.vertical || len(marks) < 3 {
		return marks
	}
	if f := face(labelSize); vg.Length((marks[0].Value-low)/span)*t.length+4 < f.Width(marks[0].Label)/2-13 {
		marks[0].Label = ""
	}
	return marks
}

// fits reports whether labels keep their distance on the axis, given the part of
// it between two ticks.
func (t ticker) fits(marks []plot.Tick, part float64) bool {
	pitch := vg.Length(part) * t.length
	if t.vertical {
		return pitch >= 26
	}
	widest := vg.Length(0)
	f := face(labelSize)
	for _, m := range marks {
		widest = max(widest, f.Width(m.Label))
	}
	return pitch >= max(widest+14, 34)
}

// A decimal is digit times a power of ten.
type decimal struct{ digit, exponent int }

func (d decimal) value() float64 { return float64(d.digit) * math.Pow10(d.exponent) }

// marks lists the multiples of d between low and high. Values are made of their
// decimal text, so that no 0.30000000000000004 comes up.
func (d decimal) marks(low, high float64) []plot.Tick {
	unit := d.value()
	slack := 1e-9 * (high - low) / unit
	first, last := math.Ceil(low/unit-slack), math.Floor(high/unit+slack)
	if !(math.Abs(first) < 1e15 && math.Abs(last) < 1e15) {
		return nil
	}
	var values []float64
	for i := first; i <= last; i++ {
		v, err := strconv.ParseFloat(strconv.FormatFloat(i*float64(d.digit), 'f', 0, 64)+"e"+strconv.Itoa(d.exponent), 64)
		if err == nil {
			values = append(values, v+0)
		}
	}
	labels := tickLabels(values, d.exponent)
	list := make([]plot.Tick, len(values))
	for i, v := range values {
		list[i] = plot.Tick{Value: v, Label: labels[i]}
	}
	return list
}

// tickLabels writes all values in the shorter of two forms: plain, or with the
// exponent of the greatest. last is the exponent of the last digit that matters.
func tickLabels(values []float64, last int) []string {
	greatest := 0.0
	for _, v := range values {
		greatest = max(greatest, math.Abs(v))
	}
	top := last + len(whole(greatest, last)) - 1
	plain := make([]string, len(values))
	short := make([]string, len(values))
	for i, v := range values {
		plain[i] = strconv.FormatFloat(v, 'f', max(0, -last), 64)
		short[i] = scientific(v, top, last)
	}
	chosen := plain
	if longest(plain) > 6 && longest(short) < longest(plain) {
		chosen = short
	}
	for i := range chosen {
		chosen[i] = typeset(chosen[i])
	}
	return chosen
}

// whole writes v as a whole number of 10^last.
func whole(v float64, last int) string {
	text := strconv.FormatFloat(v, 'e', 16, 64)
	mantissa, exponent, _ := strings.Cut(text, "e")
	e, _ := strconv.Atoi(exponent)
	n, _ := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(e-last), 64)
	return strconv.FormatFloat(n, 'f', 0, 64)
}

// scientific writes v as a multiple of 10^top down to the digit of 10^last.
func scientific(v float64, top, last int) string {
	if v == 0 {
		return "0"
	}
	m, _ := strconv.ParseFloat(whole(v, last)+"e"+strconv.Itoa(last-top), 64)
	return strconv.FormatFloat(m, 'f', max(0, top-last), 64) + "e" + strconv.Itoa(top)
}

func longest(texts []string) int {
	n := 0
	for _, t := range texts {
		n = max(n, len(t))
	}
	return n
}

// A decadeTicker puts ticks at powers of ten of a logarithmic axis, with at most
// six labels; on a short range also at 2 and 5 times them, or as a ticker does.
type decadeTicker struct{ ticker }

// Ticks returns the ticks between low and high, none unless both are positive.
func (t decadeTicker) Ticks(low, high float64) []plot.Tick {
	if !(low > 0) || !(high > low) || math.IsInf(high, 0) {
		return nil
	}
	from := int(math.Ceil(math.Log10(low) - 1e-9))
	to := int(math.Floor(math.Log10(high) + 1e-9))
	if to-from >= 2 {
		return decades(low, high, from, to)
	}
	marks := mantissas(low, high, from-1, to+1)
	if len(marks) < 3 {
		return t.ticker.Ticks(low, high)
	}
	return marks
}

func decades(low, high float64, from, to int) []plot.Tick {
	stride := 1
	for (to-from)/stride >= 6 {
		stride++
	}
	plain := from >= -4 && to <= 4
	var marks []plot.Tick
	for e := from - 1; e <= to; e++ {
		if e >= from && (e-from)%stride == 0 {
			marks = append(marks, plot.Tick{Value: math.Pow10(e), Label: decadeLabel(e, plain)})
		} else if e >= from {
			marks = append(marks, plot.Tick{Value: math.Pow10(e)})
		}
		for k := 2; k <= 9 && to-from <= 6; k++ {
			if v := float64(k) * math.Pow10(e); v >= low && v <= high {
				marks = append(marks, plot.Tick{Value: v})
			}
		}
	}
	return marks
}

func decadeLabel(e int, plain bool) string {
	switch {
	case plain && e < 0:
		return strconv.FormatFloat(math.Pow10(e), 'f', -e, 64)
	case plain || e == 0:
		return strconv.FormatFloat(math.Pow10(e), 'f', 0, 64)
	default:
		return typeset("1e" + strconv.Itoa(e))
	}
}

// mantissas puts labels at 1, 2 and 5 times powers of ten.
func mantissas(low, high float64, from, to int) []plot.Tick {
	var marks []plot.Tick
	for e := from; e <= to; e++ {
		for k := 1; k <= 9; k++ {
			v := decimal{k, e}.value()
			if v < low*(1-1e-12) || v > high*(1+1e-12) {
				continue
			}
			m := plot.Tick{Value: v}
			if k == 1 || k == 2 || k == 5 {
				m.Label = typeset(significant(v, 3))
			}
			marks = append(marks, m)
		}
	}
	return marks
}
