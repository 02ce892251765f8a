package display

import (
	"strings"

	"golang.org/x/image/font/sfnt"
)

// A glyph that the font lacks is dropped without a word when a picture is drawn:
// 10⁻⁷ would read 10⁷. So text is spelt with what the font has.

const (
	superscripts = "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻"
	raised       = "0123456789+−"
)

// drawable returns whether the font has a glyph for a rune.
func drawable(r rune) bool {
	if r == '\n' {
		return true
	}
	var buf sfnt.Buffer
	f := face(labelSize)
	index, err := f.Face.GlyphIndex(&buf, r)
	return err == nil && index != 0
}

// spell writes superscripts of which the font lacks one as ^−7, and lowered signs
// as plain ones.
func spell(text string) string {
	var out strings.Builder
	runes := []rune(text)
	for i := 0; i < len(runes); {
		n := superscriptRun(runes[i:])
		if n == 0 {
			out.WriteString(lowered.Replace(string(runes[i])))
			i++
			continue
		}
		out.WriteString(spellRun(runes[i : i+n]))
		i += n
	}
	return out.String()
}

var lowered = strings.NewReplacer("₊", "+", "₋", "−", "\t", " ", "\n", " ", "\r", "")

func superscriptRun(runes []rune) int {
	n := 0
	for n < len(runes) && strings.ContainsRune(superscripts, runes[n]) {
		n++
	}
	return n
}

func spellRun(run []rune) string {
	whole := true
	for _, r := range run {
		whole = whole && drawable(r)
	}
	if whole {
		return string(run)
	}
	plain := []rune(raised)
	out := []rune{'^'}
	for _, r := range run {
		for i, s := range []rune(superscripts) {
			if s == r {
				out = append(out, plain[i])
			}
		}
	}
	return string(out)
}

// boxed puts a white square for every rune that the font lacks, as a raster
// picture cannot turn to another font; a vector picture keeps the rune.
func boxed(text string) string {
	return strings.Map(func(r rune) rune {
		if !drawable(r) {
			return '□'
		}
		return r
	}, text)
}
