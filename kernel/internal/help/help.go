// Package help recognises cells that ask for help on a name, which is no Go.
package help

import "regexp"

var cell = regexp.MustCompile(`^\s*(\?)?([\pL_][\pL\pN_.]*)(\?)?\s*$`)

// On returns the name on which a cell asks for help: the cell is nothing but
// the name, with a question mark before or after it.
func On(source string) (name string, ok bool) {
	m := cell.FindStringSubmatch(source)
	if m == nil || (m[1] == "") == (m[3] == "") {
		return "", false
	}
	return m[2], true
}
