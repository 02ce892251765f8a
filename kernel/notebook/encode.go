package notebook

import (
	"encoding/json"
	"maps"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// encode returns the notebook in the form in which the reference implementation
// saves it, so that a diff shows changes of content only: keys sorted, one
// space of indent a level, characters outside ASCII as they are, a newline at
// the end.
func (nb *Notebook) encode() []byte {
	cells := make([]any, len(nb.Cells))
	for i, c := range nb.Cells {
		cells[i] = c.tree
	}
	nb.tree["cells"] = cells
	return append(appendValue(nil, nb.tree, 0), '\n')
}

func appendValue(b []byte, v any, depth int) []byte {
	switch v := v.(type) {
	case nil:
		return append(b, "null"...)
	case bool:
		return strconv.AppendBool(b, v)
	case json.Number:
		return append(b, v...)
	case string:
		return appendString(b, v)
	case []any:
		return appendList(b, len(v), '[', ']', depth, func(b []byte, i int) []byte {
			return appendValue(b, v[i], depth+1)
		})
	case map[string]any:
		keys := sortedKeys(v)
		return appendList(b, len(keys), '{', '}', depth, func(b []byte, i int) []byte {
			b = append(appendString(b, keys[i]), ": "...)
			return appendValue(b, v[keys[i]], depth+1)
		})
	}
	panic("notebook: a value that is not JSON in the tree") // plain rules it out
}

func appendList(b []byte, n int, open, end byte, depth int, item func([]byte, int) []byte) []byte {
	b = append(b, open)
	if n == 0 {
		return append(b, end)
	}
	for i := range n {
		if i > 0 {
			b = append(b, ',')
		}
		b = item(appendIndent(b, depth+1), i)
	}
	return append(appendIndent(b, depth), end)
}

func appendIndent(b []byte, depth int) []byte {
	b = append(b, '\n')
	for range depth {
		b = append(b, ' ')
	}
	return b
}

// shortEscapes holds the characters that JSON escapes by one letter.
var shortEscapes = map[rune]byte{'"': '"', '\\': '\\', '\b': 'b', '\f': 'f', '\n': 'n', '\r': 'r', '\t': 't'}

// appendString quotes s. encoding/json would also escape U+2028 and U+2029,
// which the reference implementation leaves as they are.
func appendString(b []byte, s string) []byte {
	b = append(b, '"')
	for _, r := range s {
		letter, short := shortEscapes[r]
		switch {
		case short:
			b = append(b, '\\', letter)
		case r < ' ':
			b = append(b, '\\', 'u', '0', '0', "01"[r>>4], "0123456789abcdef"[r&15])
		default:
			b = utf8.AppendRune(b, r)
		}
	}
	return append(b, '"')
}

// lines cuts a text into lines that keep their ends, in the places where the
// reference implementation cuts.
func lines(s string) []any {
	cut := []any{}
	for s != "" {
		n := lineLength(s)
		cut = append(cut, s[:n])
		s = s[n:]
	}
	return cut
}

func lineLength(s string) int {
	for i, r := range s {
		switch r {
		case '\r':
			if strings.HasPrefix(s[i+1:], "\n") {
				return i + 2
			}
			return i + 1
		case '\n', '\v', '\f', 0x1c, 0x1d, 0x1e, 0x85, 0x2028, 0x2029:
			return i + utf8.RuneLen(r)
		}
	}
	return len(s)
}

func sortedKeys(m map[string]any) []string {
	return slices.Sorted(maps.Keys(m))
}
