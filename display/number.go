package display

import (
	"math"
	"strconv"
	"strings"

	"brinkline/continuation"
)

// significant writes a number with at most that many significant digits, without
// trailing zeros, and with an exponent only where the plain form is long.
func significant(v float64, digits int) string {
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return special(v)
	}
	text := strconv.FormatFloat(v, 'e', digits-1, 64)
	mantissa, exponent, _ := strings.Cut(text, "e")
	e, _ := strconv.Atoi(exponent)
	if e < -4 || e >= max(7, digits+1) {
		return trim(mantissa) + "e" + strconv.Itoa(e)
	}
	return trim(strconv.FormatFloat(v, 'f', max(0, digits-1-e), 64))
}

func special(v float64) string {
	switch {
	case math.IsNaN(v):
		return "not defined"
	case math.IsInf(v, 1):
		return "infinite"
	case math.IsInf(v, -1):
		return "-infinite"
	}
	return "0"
}

func trim(text string) string {
	if !strings.Contains(text, ".") {
		return text
	}
	return strings.TrimRight(strings.TrimRight(text, "0"), ".")
}

// reliable writes a value with the digits that can be relied on, all of them
// shown: 303.40, not 303.4.
func reliable(v float64, digits int) string {
	digits = min(max(digits, 3), 10)
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return special(v)
	}
	e := exponentOf(v, digits)
	if e < -4 || e >= max(7, digits+1) {
		text := strconv.FormatFloat(v, 'e', digits-1, 64)
		mantissa, exponent, _ := strings.Cut(text, "e")
		n, _ := strconv.Atoi(exponent)
		return mantissa + "e" + strconv.Itoa(n)
	}
	return strconv.FormatFloat(v, 'f', max(0, digits-1-e), 64)
}

// exponentOf returns the decimal exponent of v after rounding to digits.
func exponentOf(v float64, digits int) int {
	_, exponent, _ := strings.Cut(strconv.FormatFloat(v, 'e', max(0, digits-1), 64), "e")
	e, _ := strconv.Atoi(exponent)
	return e
}

// typeset puts the minus sign of printing for hyphens before numbers.
func typeset(number string) string { return strings.ReplaceAll(number, "-", "−") }

// withUnit writes a number and its unit.
func withUnit(number, unit string) string {
	if unit == "" {
		return number
	}
	return number + " " + unit
}

// labelled names a variable with its value: Coolant 303.42 K.
func labelled(v continuation.Variable, value float64, digits int) string {
	return v.Name + " " + withUnit(significant(value, digits), v.Unit)
}
