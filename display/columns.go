package display

import (
	"math"
	"strconv"
	"strings"
)

// How many digits tables and cards show of values that carry no error estimate:
// the corrector's tolerance is far below.
const (
	stateDigits  = 6
	vectorDigits = 4
)

// aligned writes the numbers of a column with one number of decimals where that
// shows all of them to two digits at least, so that their points stand one under
// the other; else each with its own. digits counts from the greatest.
func aligned(values []float64, digits int) []string {
	all := make([]int, len(values))
	for i := range all {
		all[i] = digits
	}
	return alignedTo(values, all)
}

// alignedTo does the same for numbers of which different digits can be relied on:
// no cell has decimals beyond its own.
func alignedTo(values []float64, digits []int) []string {
	out := make([]string, len(values))
	decimals, ok := commonDecimals(values, digits)
	for i, v := range values {
		switch {
		case v == 0 || math.IsNaN(v) || math.IsInf(v, 0):
			out[i] = special(v)
		case ok:
			out[i] = strconv.FormatFloat(v, 'f', decimals, 64)
		default:
			out[i] = reliable(v, digits[i])
		}
	}
	return out
}

func commonDecimals(values []float64, digits []int) (decimals int, ok bool) {
	greatest, least := 0.0, math.Inf(1)
	for _, v := range values {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			greatest = max(greatest, math.Abs(v))
		}
	}
	noise := 1e-12 * greatest // what rounding leaves of a 0
	for _, v := range values {
		if math.Abs(v) > noise {
			least = min(least, math.Abs(v))
		}
	}
	if greatest == 0 || greatest >= 1e7 || least < 1e-5 {
		return 0, false
	}
	fewest, most := math.MaxInt, math.MinInt
	for i, v := range values {
		if math.Abs(v) <= noise || math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		d := min(max(digits[i], 3), 10) - 1 - exponentOf(v, digits[i])
		fewest, most = min(fewest, d), max(most, d)
	}
	// The smallest number sets no limit on the decimals of the others.
	decimals = max(fewest, 0)
	return decimals, least >= 10*math.Pow10(-decimals) || most-fewest <= 1
}

// evened gives the numbers of a column one number of decimals, so that their points
// stand one under the other: as many as the longest has, and no more than show the
// greatest to stateDigits. Where that would leave the least of them with fewer than
// two digits, or without a number (NaN), cells stay as they are.
func evened(cells []string, values []float64) []string {
	decimals, whole, least := 0, 0, math.Inf(1)
	for i, text := range cells {
		if v := values[i]; v != 0 && isFinite(v) {
			if strings.Contains(text, "e") {
				return cells
			}
			before, after, _ := strings.Cut(strings.TrimPrefix(text, "-"), ".")
			decimals, whole = max(decimals, len(after)), max(whole, len(before))
			least = min(least, math.Abs(v))
		}
	}
	if fit := max(0, stateDigits-whole); decimals > fit {
		decimals = fit
		if least < 10*math.Pow10(-decimals) {
			return cells
		}
	}
	out := make([]string, len(cells))
	for i, v := range values {
		out[i] = cells[i]
		if v != 0 && isFinite(v) {
			out[i] = strconv.FormatFloat(v, 'f', decimals, 64)
		}
	}
	return out
}

func isFinite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
