package session

import (
	"go/token"
	"strings"
)

// IsComplete tells whether a cell can run as it is: "complete", "incomplete" with the indent of the next line, or "invalid".
func (s *Session) IsComplete(source string) (status, indent string) {
	toks, lexical := scan(source)
	if lexical != nil {
		if strings.Contains(lexical.message, "not terminated") && !strings.Contains(lexical.message, "rune") &&
			(strings.Contains(lexical.message, "raw string") || strings.Contains(lexical.message, "comment")) {
			return "incomplete", ""
		}
		return "invalid", ""
	}
	depth := 0
	for _, t := range toks {
		switch t.tok {
		case token.LPAREN, token.LBRACK, token.LBRACE:
			depth++
		case token.RPAREN, token.RBRACK, token.RBRACE:
			if depth--; depth < 0 {
				return "invalid", ""
			}
		}
	}
	if depth > 0 {
		return "incomplete", strings.Repeat("\t", depth)
	}
	sp, err := splitCell(newSource("", 0, source))
	if err == nil {
		_, err = sp.parseBody(newPlaces())
	}
	switch {
	case err == nil:
		return "complete", ""
	case err.offset >= len(strings.TrimRight(source, " \t\r\n")):
		return "incomplete", ""
	}
	return "invalid", ""
}
