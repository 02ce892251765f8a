package display

import (
	"fmt"
	"html"
	"strings"
)

// html writes the table with inline styles only: front ends strip <style> from
// pages they do not trust, and colour plain tables to fit light and dark pages.
func (g *Grid) html() string {
	var out strings.Builder
	out.WriteString("<table>\n")
	if g.caption != "" {
		fmt.Fprintf(&out, `<caption style="text-align:left">%s</caption>`+"\n", html.EscapeString(g.caption))
	}
	if g.headed() {
		out.WriteString("<thead>\n<tr>")
		for i, c := range g.columns {
			fmt.Fprintf(&out, `<th scope="col" style="text-align:%s%s">%s</th>`, alignment(c.numeric), g.apart(i), html.EscapeString(c.head))
		}
		if g.wordy() {
			out.WriteString(`<td style="width:100%"></td>`)
		}
		out.WriteString("</tr>\n</thead>\n")
	}
	out.WriteString("<tbody>\n")
	rows, omitted := g.shown()
	for i, r := range rows {
		if omitted > 0 && i == headRows {
			g.gapHTML(&out)
		}
		g.rowHTML(&out, r)
	}
	out.WriteString("</tbody>\n")
	g.footHTML(&out)
	out.WriteString("</table>\n")
	return out.String()
}

func alignment(numeric bool) string {
	if numeric {
		return "right"
	}
	return "left"
}

// apart keeps a column off the one on its left.
func (g *Grid) apart(i int) string {
	if i == 0 {
		return ""
	}
	return ";padding-left:1.2em"
}

// width is the number of columns in the html.
func (g *Grid) width() int {
	if g.wordy() {
		return len(g.columns) + 1
	}
	return len(g.columns)
}

func (g *Grid) rowHTML(out *strings.Builder, r row) {
	if r.heading != "" {
		fmt.Fprintf(out, `<tr><th scope="rowgroup" colspan="%d" style="text-align:left">%s</th></tr>`+"\n", g.width(), html.EscapeString(r.heading))
		return
	}
	out.WriteString("<tr>")
	for i, c := range r.cells {
		text := html.EscapeString(c)
		switch {
		case i == 0 && g.card:
			fmt.Fprintf(out, `<th scope="row" style="text-align:left;font-weight:normal;white-space:nowrap">%s</th>`, text)
		case r.text:
			fmt.Fprintf(out, `<td colspan="%d" style="text-align:left;padding-left:1.2em">%s</td>`, g.width()-i, text)
		case g.columns[i].numeric:
			fmt.Fprintf(out, `<td style="text-align:right;white-space:nowrap;font-variant-numeric:tabular-nums%s">%s</td>`, g.apart(i), text)
		default:
			fmt.Fprintf(out, `<td style="text-align:left%s">%s</td>`, g.apart(i), text)
		}
	}
	if g.wordy() && !r.text {
		out.WriteString("<td></td>")
	}
	out.WriteString("</tr>\n")
}

func (g *Grid) gapHTML(out *strings.Builder) {
	out.WriteString("<tr>")
	for range g.columns {
		out.WriteString(`<td style="text-align:center">⋮</td>`)
	}
	out.WriteString("</tr>\n")
}

// footHTML writes the size of a table that is cut and the notes under it.
func (g *Grid) footHTML(out *strings.Builder) {
	lines := g.foot()
	if len(lines) == 0 {
		return
	}
	out.WriteString("<tfoot>\n")
	for _, line := range lines {
		fmt.Fprintf(out, `<tr><td colspan="%d" style="text-align:left">%s</td></tr>`+"\n", g.width(), html.EscapeString(line))
	}
	out.WriteString("</tfoot>\n")
}

func (g *Grid) foot() []string {
	var lines []string
	if s := g.size(); s != "" {
		lines = append(lines, s)
	}
	return append(lines, g.notes...)
}
