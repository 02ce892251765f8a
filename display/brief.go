package display

import (
	"fmt"

	"brinkline/continuation"
)

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
