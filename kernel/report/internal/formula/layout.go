package formula

import (
	"html"
	"strings"
)

// fenced reads \left( ... \right).
func (p *parser) fenced() (string, error) {
	open, ok := fence(p.next())
	if !ok {
		return "", errUnknown
	}
	body, err := p.row(`\right`)
	if err != nil {
		return "", err
	}
	end, ok := fence(p.next())
	if !ok {
		return "", errUnknown
	}
	return group(open + body + end), nil
}

// fence returns a bracket that grows with what it holds; a dot is none.
func fence(token string) (string, bool) {
	symbols := map[string]string{`\{`: "{", `\}`: "}", `\langle`: "⟨", `\rangle`: "⟩", `\|`: "‖", ".": ""}
	symbol, ok := symbols[token]
	if !ok {
		symbol, ok = token, token != "" && strings.Contains("()[]|/", token)
	}
	if symbol == "" {
		return "", ok
	}
	return `<mo stretchy="true" fence="true">` + symbol + "</mo>", ok
}

// environments that are tables: the fences around them and how columns stand.
var environments = map[string]struct{ open, end, align string }{
	"aligned": {"", "", "right left"}, "align": {"", "", "right left"}, "align*": {"", "", "right left"},
	"cases": {"{", "", "left"}, "matrix": {"", "", ""}, "pmatrix": {"(", ")", ""}, "bmatrix": {"[", "]", ""},
	"vmatrix": {"|", "|", ""}, "gathered": {"", "", ""},
}

// table reads \begin{name} rows \end{name}.
func (p *parser) table() (string, error) {
	name, err := p.braced()
	if err != nil {
		return "", err
	}
	environment, ok := environments[name]
	if !ok {
		return "", errUnknown
	}
	rows, err := p.cells(environment.align)
	if err != nil {
		return "", err
	}
	if end, err := p.braced(); err != nil || end != name {
		return "", errUnknown
	}
	body := ""
	if environment.open != "" {
		body = `<mo stretchy="true" fence="true">` + environment.open + "</mo>"
	}
	body += `<mtable displaystyle="true">` + rows + "</mtable>"
	if environment.end != "" {
		body += `<mo stretchy="true" fence="true">` + environment.end + "</mo>"
	}
	return group(body), nil
}

// cells reads the rows of a table up to \end, which it takes.
func (p *parser) cells(align string) (string, error) {
	var rows, row, cell strings.Builder
	column := 0
	endCell := func() {
		row.WriteString(`<mtd style="` + columnStyle(align, column) + `">` + cell.String() + "</mtd>")
		cell.Reset()
		column++
	}
	for {
		token := p.peek()
		switch token {
		case "":
			return "", errUnknown
		case "&":
			p.next()
			endCell()
		case `\\`, `\end`:
			p.next()
			if token == `\\` || cell.Len() > 0 || column > 0 {
				endCell()
				rows.WriteString(tag("mtr", row.String()))
			}
			row.Reset()
			column = 0
			if token == `\end` {
				return rows.String(), nil
			}
		default:
			item, err := p.item()
			if err != nil {
				return "", err
			}
			cell.WriteString(item)
		}
	}
}

// columnStyle sets a column's side and takes away the gap between the two sides
// of an aligned equation.
func columnStyle(align string, column int) string {
	switch sides := strings.Fields(align); len(sides) {
	case 0:
		return "text-align:center"
	case 1:
		return "text-align:" + align
	default:
		side := sides[column%len(sides)]
		return "text-align:" + side + ";padding-" + side + ":0"
	}
}

// braced reads a word in braces, escaped for HTML.
func (p *parser) braced() (string, error) {
	if p.next() != "{" {
		return "", errUnknown
	}
	word, rest, ok := strings.Cut(p.rest, "}")
	if !ok {
		return "", errUnknown
	}
	p.rest = rest
	return html.EscapeString(word), nil
}
