package display

import (
	"fmt"
	"strings"
)

// latex writes the table for the path from notebook to PDF, which takes no html.
// It needs no package.
func (g *Grid) latex() string {
	var out strings.Builder
	out.WriteString("\\begin{center}\n")
	if g.caption != "" {
		fmt.Fprintf(&out, "%s\\\\[0.5ex]\n", latexText(g.caption))
	}
	out.WriteString("\\begin{tabular}{")
	for _, c := range g.columns {
		out.WriteString(map[bool]string{true: "r", false: "l"}[c.numeric])
	}
	out.WriteString("}\n\\hline\n")
	if g.headed() {
		heads := row{}
		for _, c := range g.columns {
			heads.cells = append(heads.cells, c.head)
		}
		g.rowLaTeX(&out, heads)
		out.WriteString("\\hline\n")
	}
	rows, omitted := g.shown()
	for i, r := range rows {
		if omitted > 0 && i == headRows {
			fmt.Fprintf(&out, "\\multicolumn{%d}{c}{\\ldots}\\\\\n", len(g.columns))
		}
		g.rowLaTeX(&out, r)
	}
	out.WriteString("\\hline\n\\end{tabular}\n\\end{center}\n")
	for _, line := range g.foot() {
		fmt.Fprintf(&out, "\\noindent %s\n\n", latexText(line))
	}
	return out.String()
}

func (g *Grid) rowLaTeX(out *strings.Builder, r row) {
	if r.heading != "" {
		fmt.Fprintf(out, "\\multicolumn{%d}{l}{\\textit{%s}}\\\\\n", len(g.columns), latexText(r.heading))
		return
	}
	cells := make([]string, len(r.cells))
	for i, c := range r.cells {
		cells[i] = latexText(c)
		if span := len(g.columns) - i; i == len(r.cells)-1 && (span > 1 || (r.text && g.columns[i].numeric)) {
			cells[i] = fmt.Sprintf("\\multicolumn{%d}{p{0.6\\textwidth}}{%s}", span, cells[i])
		}
	}
	out.WriteString(strings.Join(cells, " & ") + "\\\\\n")
}

func latexText(text string) string { return latexEscapes.Replace(text) }

var latexEscapes = strings.NewReplacer(
	`\`, `\textbackslash{}`, "{", `\{`, "}", `\}`, "$", `\$`, "&", `\&`, "#", `\#`, "%", `\%`, "_", `\_`,
	"~", `\textasciitilde{}`, "^", `\textasciicircum{}`,
	"µ", `$\mu$`, "μ", `$\mu$`, "Ω", `$\Omega$`, "°", `$^\circ$`, "·", `$\cdot$`, "×", `$\times$`, "−", `$-$`,
	"λ", `$\lambda$`, "∂", `$\partial$`, "ω", `$\omega$`, "π", `$\pi$`, "≈", `$\approx$`, "±", `$\pm$`, "ᵀ", `$^T$`,
	"²", `$^2$`, "³", `$^3$`, "¹", `$^1$`, "⁻", `$^-$`, "½", `$\frac12$`, "⋮", `\ldots`,
)
