package svg

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"strings"

	"gonum.org/v1/plot/vg"
)

// fontFamily names generic families only after the metric-compatible ones.
const fontFamily = "Helvetica, Arial, Liberation Sans, sans-serif"

// Document returns the drawing as a complete file with a title and a
// description for those who cannot see it. Its ids begin with a hash of the
// content, so that several drawings can stand on one page.
func (c *Canvas) Document(title, description string) []byte {
	sum := sha256.New()
	fmt.Fprintf(sum, "%s\x00%s\x00", title, description)
	sum.Write(c.body.Bytes())
	id := "b" + hex.EncodeToString(sum.Sum(nil)[:5])

	var out bytes.Buffer
	fmt.Fprintf(&out, `<svg xmlns="http://www.w3.org/2000/svg" role="img" aria-labelledby="%s-title %s-desc"`, id, id)
	fmt.Fprintf(&out, ` width="%s" height="%s" viewBox="0 0 %s %s"`,
		number(pixels(c.width)), number(pixels(c.height)), number(c.width), number(c.height))
	fmt.Fprintf(&out, ` style="max-width:100%%;height:auto" font-family="%s" stroke-linejoin="round">`+"\n", fontFamily)
	fmt.Fprintf(&out, "<title id=\"%s-title\">%s</title>\n", id, Escape(title))
	fmt.Fprintf(&out, "<desc id=\"%s-desc\">%s</desc>\n", id, Escape(description))
	out.Write(c.body.Bytes())
	out.WriteString("</svg>\n")
	return out.Bytes()
}

// pixels turns points into the pixels of a screen page, 96 to the inch.
func pixels(l vg.Length) vg.Length { return l * 96 / 72 }

// Escape makes text fit to stand in an element or in a quoted attribute, and
// drops what no XML file may hold.
func Escape(text string) string {
	text = strings.Map(func(r rune) rune {
		allowed := r == '\t' || r == '\n' || (r >= 0x20 && r <= 0xD7FF) || (r >= 0xE000 && r <= 0xFFFD) || r >= 0x10000
		if !allowed {
			return -1
		}
		return r
	}, strings.ToValidUTF8(text, "\uFFFD"))
	return escaper.Replace(text)
}

var escaper = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;", `"`, "&quot;", "'", "&#39;")
