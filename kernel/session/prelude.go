package session

import (
	_ "embed"
	"strings"
)

// loadPrelude reads the session's own source of the library's generic functions, which have no compiled form to call.
func loadPrelude(s *Session) (map[string]*def, error) {
	out := map[string]*def{}
	for _, file := range []struct{ pkg, text string }{{"slices", slicesSource}, {"maps", mapsSource}, {"cmp", cmpSource}} {
		src := newSource("", 0, file.text)
		sp, err := splitCell(src)
		if err != nil {
			line, _ := src.position(err.offset)
			return nil, &Error{Name: "SyntaxError", Message: "prelude of " + file.pkg + ": " + err.message, Line: line}
		}
		for _, d := range sp.defs {
			d.prelude, d.index = true, s.nextIndex()
			d.uses, d.env = map[string]bool{}, map[string]*def{}
			out[d.names[0]] = d
			if name, ok := strings.CutPrefix(d.names[0], file.pkg+mark); ok {
				out[file.pkg+"."+name] = d
			}
		}
	}
	return out, nil
}

//go:embed prelude_slices.txt
var slicesSource string

//go:embed prelude_maps.txt
var mapsSource string

//go:embed prelude_cmp.txt
var cmpSource string
