package display

import (
	"strings"
	"unicode/utf8"
)

// plain writes the table in columns of a fixed pitch.
func (g *Grid) plain() string {
	rows, omitted := g.shown()
	widths := g.widths(rows)
	var lines []string
	if g.caption != "" {
		lines = append(lines, g.caption)
	}
	if g.headed() {
		heads := row{}
		for _, c := range g.columns {
			heads.cells = append(heads.cells, c.head)
		}
		lines = append(lines, g.line(heads, widths), g.rule(widths))
	}
	for i, r := range rows {
		if omitted > 0 && i == headRows {
			lines = append(lines, "...")
		}
		if r.heading != "" {
			lines = append(lines, r.heading)
			continue
		}
		lines = append(lines, g.line(r, widths))
	}
	return strings.Join(append(lines, g.foot()...), "\n")
}

func (g *Grid) widths(rows []row) []int {
	widths := make([]int, len(g.columns))
	for i, c := range g.columns {
		widths[i] = utf8.RuneCountInString(c.head)
	}
	for _, r := range rows {
		for i, c := range r.cells {
			if i == 0 || !r.text { // words run over all columns
				widths[i] = max(widths[i], utf8.RuneCountInString(c))
			}
		}
	}
	return widths
}

func (g *Grid) line(r row, widths []int) string {
	var out strings.Builder
	for i, c := range r.cells {
		if i > 0 {
			out.WriteString("  ")
		}
		pad := strings.Repeat(" ", max(0, widths[i]-utf8.RuneCountInString(c)))
		if g.columns[i].numeric && !r.text {
			out.WriteString(pad + c)
		} else {
			out.WriteString(c + pad)
		}
	}
	text := strings.TrimRight(out.String(), " ")
	if g.card {
		text = "  " + text
	}
	return text
}

func (g *Grid) rule(widths []int) string {
	parts := make([]string, len(widths))
	for i, w := range widths {
		parts[i] = strings.Repeat("-", w)
	}
	text := strings.Join(parts, "  ")
	if g.card {
		text = "  " + text
	}
	return text
}
