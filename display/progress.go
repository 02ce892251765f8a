package display

import (
	"fmt"
	"html"
	"math"
	"strings"

	"brinkline/continuation"
)

// progressBundle shows how a long piece of work goes on: a line of words, a bar
// and the curve as far as it is known. The last word on a task has no bar, so that
// nothing half done is kept in a notebook. The caller sees to it that there are at
// most 8 a second.
func progressBundle(p continuation.Progress) Bundle {
	branch := partial(p)
	b := plainBundle(progressText(p, branch))
	b.Data[MIMEHTML] = progressHTML(p, branch)
	return b
}

func partial(p continuation.Progress) *continuation.Branch {
	if p.Partial == nil {
		return nil
	}
	return p.Partial()
}

// progressText says what is done, how far it is and where.
func progressText(p continuation.Progress, b *continuation.Branch) string {
	parts := []string{p.Task + ": " + count(p.Steps, "step", "steps")}
	if !p.Done && p.Fraction > 0 {
		parts = append(parts, fmt.Sprintf("%d %%", percent(p.Fraction)))
	}
	if b != nil {
		q := b.Parameter()
		if !math.IsNaN(p.Value) {
			parts = append(parts, labelled(q.Variable, p.Value, 5))
		}
		if n := len(b.Specials()); n > 0 {
			parts = append(parts, count(n, "special point", "special points"))
		}
	}
	if p.Done {
		parts = append(parts, "done")
	}
	return strings.Join(parts, ", ")
}

func percent(fraction float64) int { return int(math.Round(100 * min(max(fraction, 0), 1))) }

func progressHTML(p continuation.Progress, b *continuation.Branch) string {
	text := html.EscapeString(progressText(p, b))
	if p.Done {
		return "<div>" + text + "</div>\n"
	}
	bar := `<progress max="100"></progress>`
	if p.Fraction > 0 {
		bar = fmt.Sprintf(`<progress max="100" value="%d">%d %%</progress>`, percent(p.Fraction), percent(p.Fraction))
	}
	return "<div>" + bar + " " + text + "</div>\n" + growing(b)
}

// growing is the curve so far, nothing as long as it cannot be drawn.
func growing(b *continuation.Branch) string {
	if b == nil || len(b.Points()) < 2 {
		return ""
	}
	f := Plot(b).Size(11, 7)
	if f.Err() != nil {
		return ""
	}
	return string(f.built.svg())
}
