package display

import (
	"fmt"
	"math"
	"sort"

	"brinkline/continuation"
)

// ranked orders sensitivities by the size of the elasticity, and by the size of
// value times slope where there is none; undefined ones come last.
func ranked(list []continuation.Sensitivity) []continuation.Sensitivity {
	out := append([]continuation.Sensitivity(nil), list...)
	weight := func(s continuation.Sensitivity) float64 {
		if w := math.Abs(s.Elasticity); !math.IsNaN(w) {
			return w
		}
		if w := math.Abs(s.Value * s.Slope); !math.IsNaN(w) {
			return w
		}
		return -1
	}
	sort.SliceStable(out, func(i, j int) bool { return weight(out[i]) > weight(out[j]) })
	return out
}

// briefly says a special point with as many digits as a sentence bears.
func briefly(s continuation.Special) string {
	v := variableOf(s.Where())
	return fmt.Sprintf("%s at %s %s", s.Kind(), v.Name, withUnit(valueText(s, 6), v.Unit))
}

// valueText writes the value of the followed parameter with at most that many
// digits, and no more than can be relied on.
func valueText(s continuation.Special, most int) string {
	if isZero(s) {
		return "0"
	}
	return significant(s.Where().Value(), min(most, max(s.Digits(), 3)))
}
