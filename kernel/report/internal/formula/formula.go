// Package formula turns the formulas of prose, written in the mathematical
// notation of TeX, into MathML, which browsers set by themselves. It knows the
// part of the notation that steady-state models are written in; a formula with
// anything else is left to its writer's own text.
//
// MathML: the elements of MathML Core, W3C.
package formula

import (
	"errors"
	"html"
	"strings"
	"unicode"
	"unicode/utf8"
)

// MathML returns a formula as a math element; block says that it stands in
// lines of its own. ok is false when the formula holds something unknown.
func MathML(source string, block bool) (element string, ok bool) {
	p := &parser{rest: source, block: block}
	body, err := p.row("")
	if err != nil || body == "" {
		return "", false
	}
	display := ""
	if block {
		display = ` display="block"`
	}
	return `<math xmlns="http://www.w3.org/1998/Math/MathML"` + display + `><semantics><mrow>` + body +
		`</mrow><annotation encoding="application/x-tex">` + html.EscapeString(source) + `</annotation></semantics></math>`, true
}

var errUnknown = errors.New("not in the known part of the notation")

// parser reads a formula from left to right. A token is a command (\frac, \,),
// a number or one character.
type parser struct {
	rest  string
	block bool
}

func (p *parser) peek() string {
	p.rest = strings.TrimLeftFunc(p.rest, unicode.IsSpace)
	switch s := p.rest; {
	case s == "":
		return ""
	case s[0] == '\\' && len(s) > 1:
		if n := span(s[1:], unicode.IsLetter); n > 0 {
			return s[:1+n]
		}
		_, size := utf8.DecodeRuneInString(s[1:])
		return s[:1+size]
	case '0' <= s[0] && s[0] <= '9':
		n := span(s, unicode.IsDigit)
		if m := span(strings.TrimPrefix(s[n:], "."), unicode.IsDigit); m > 0 && strings.HasPrefix(s[n:], ".") {
			n += 1 + m
		}
		return s[:n]
	default:
		_, size := utf8.DecodeRuneInString(s)
		return s[:size]
	}
}

func (p *parser) next() string {
	token := p.peek()
	p.rest = p.rest[len(token):]
	return token
}

// span counts the bytes of the leading characters for which is holds.
func span(s string, is func(rune) bool) int {
	if n := strings.IndexFunc(s, func(r rune) bool { return !is(r) }); n >= 0 {
		return n
	}
	return len(s)
}

// row reads up to the given token, which it takes, or to the end for "".
func (p *parser) row(until string) (string, error) {
	var b strings.Builder
	for {
		switch token := p.peek(); {
		case token == until:
			p.next()
			return b.String(), nil
		case token == "":
			return "", errUnknown
		default:
			item, err := p.item()
			if err != nil {
				return "", err
			}
			b.WriteString(item)
		}
	}
}

// item reads an atom with what stands above and below it.
func (p *parser) item() (string, error) {
	first := p.peek()
	base, err := p.atom()
	if err != nil {
		return "", err
	}
	var below, above string
	for {
		switch p.peek() {
		case "_":
			below, err = p.script(below)
		case "^":
			above, err = p.script(above)
		case "'":
			p.next()
			above += "<mo>′</mo>"
		default:
			return scripted(base, below, above, p.block && limits[first]), nil
		}
		if err != nil {
			return "", err
		}
	}
}

// script reads one script; a second of the same kind is an error.
func (p *parser) script(before string) (string, error) {
	p.next()
	if strings.ReplaceAll(before, "<mo>′</mo>", "") != "" {
		return "", errUnknown
	}
	s, err := p.atom()
	return before + s, err
}

func scripted(base, below, above string, limits bool) string {
	element := map[bool][3]string{false: {"msub", "msup", "msubsup"}, true: {"munder", "mover", "munderover"}}[limits]
	switch {
	case below == "" && above == "":
		return base
	case above == "":
		return tag(element[0], group(base)+group(below))
	case below == "":
		return tag(element[1], group(base)+group(above))
	}
	return tag(element[2], group(base)+group(below)+group(above))
}

func tag(name, content string) string { return "<" + name + ">" + content + "</" + name + ">" }

// group makes one element of several.
func group(content string) string { return tag("mrow", content) }

// atom reads a group, a command or one symbol.
func (p *parser) atom() (string, error) {
	token := p.next()
	r, _ := utf8.DecodeRuneInString(token)
	switch {
	case token == "":
		return "", errUnknown
	case token == "{":
		body, err := p.row("}")
		return group(body), err
	case strings.HasPrefix(token, `\`):
		return p.command(token)
	case unicode.IsDigit(r):
		return tag("mn", token), nil
	case unicode.IsLetter(r):
		return tag("mi", token), nil
	case token == "-":
		return "<mo>−</mo>", nil
	case strings.Contains("()[]|", token):
		return `<mo stretchy="false">` + token + "</mo>", nil
	case strings.Contains("+=<>,;:!/*.~", token), r > unicode.MaxASCII:
		return tag("mo", html.EscapeString(strings.Replace(token, "~", "\u00a0", 1))), nil
	}
	return "", errUnknown
}

func (p *parser) command(name string) (string, error) {
	word := name[1:]
	if symbol, ok := identifiers[word]; ok {
		return tag("mi", symbol), nil
	}
	if symbol, ok := operators[word]; ok {
		return tag("mo", symbol), nil
	}
	if width, ok := spaces[word]; ok {
		return `<mspace width="` + width + `"></mspace>`, nil
	}
	if mark, ok := accents[word]; ok {
		base, err := p.atom()
		return accented(base, mark), err
	}
	if functions[word] {
		return tag("mi", word) + "<mo>\u2061</mo>", nil
	}
	switch word {
	case "frac", "dfrac", "tfrac":
		return p.fraction()
	case "sqrt":
		return p.root()
	case "left":
		return p.fenced()
	case "begin":
		return p.table()
	case "text", "mathrm", "operatorname", "mathbf", "boldsymbol":
		return p.upright(word)
	}
	return "", errUnknown
}

// accented puts a mark over something. Over one letter it becomes part of the
// letter, because browsers place it badly where no font for mathematics is
// installed.
func accented(base, mark string) string {
	letter := strings.TrimSuffix(strings.TrimPrefix(strings.TrimSuffix(strings.TrimPrefix(base, "<mrow>"), "</mrow>"), "<mi>"), "</mi>")
	combining, ok := combiningMarks[mark]
	if ok && utf8.RuneCountInString(letter) == 1 {
		return `<mi style="font-style:italic">` + letter + combining + "</mi>"
	}
	return `<mover accent="true">` + group(base) + tag("mo", mark) + "</mover>"
}

func (p *parser) fraction() (string, error) {
	over, err1 := p.atom()
	under, err2 := p.atom()
	return tag("mfrac", group(over)+group(under)), errors.Join(err1, err2)
}

func (p *parser) root() (string, error) {
	if p.peek() != "[" {
		body, err := p.atom()
		return tag("msqrt", body), err
	}
	p.next()
	degree, err1 := p.row("]")
	body, err2 := p.atom()
	return tag("mroot", group(body)+group(degree)), errors.Join(err1, err2)
}

// upright reads a word in braces, which is not mathematics.
func (p *parser) upright(command string) (string, error) {
	word, err := p.braced()
	if err != nil || strings.ContainsAny(word, `{\$`) {
		return "", errUnknown
	}
	switch command {
	case "text":
		return tag("mtext", strings.ReplaceAll(word, " ", "\u00a0")), nil
	case "mathbf", "boldsymbol":
		return `<mi mathvariant="normal" style="font-weight:bold">` + word + "</mi>", nil
	}
	return `<mi mathvariant="normal">` + word + "</mi>", nil
}
