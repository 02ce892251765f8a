package report

import (
	"encoding/xml"
	"io"
	"regexp"
	"strings"
)

// What a cell puts out as HTML or SVG goes into the page only when it consists
// of elements and attributes that show something and can neither run nor load
// anything. The page's content policy is a second wall, not the first.

func set(words string) map[string]bool {
	s := map[string]bool{}
	for _, w := range strings.Fields(words) {
		s[w] = true
	}
	return s
}

var (
	htmlElements = set(`table caption colgroup col thead tbody tfoot tr th td p div span em strong b i u s sub sup
		code pre br hr ul ol li dl dt dd small h3 h4 h5 h6 figure figcaption progress abbr section details summary`)
	htmlAttributes = set(`scope colspan rowspan headers title lang dir role value max start style`)
	htmlVoid       = set(`br hr col`)
	svgElements    = set(`svg g defs title desc path line polyline polygon rect circle ellipse text tspan clipPath
		mask marker pattern linearGradient radialGradient stop use symbol`)
	plainStyle = regexp.MustCompile(`^[a-zA-Z0-9 .,:;%#-]*$`) // no parentheses: no url() and nothing else that acts
)

// cleanHTML writes a fragment anew with what is allowed in it. ok is false when
// it holds an element that is not allowed, or is not well formed.
func cleanHTML(fragment string) (clean string, ok bool) {
	decoder := xml.NewDecoder(strings.NewReader(fragment))
	decoder.Strict, decoder.AutoClose, decoder.Entity = false, xml.HTMLAutoClose, xml.HTMLEntity
	var b strings.Builder
	for {
		token, err := decoder.Token()
		switch {
		case err == io.EOF:
			return b.String(), true
		case err != nil:
			return "", false
		}
		switch t := token.(type) {
		case xml.StartElement:
			if !writeStart(&b, t) {
				return "", false
			}
		case xml.EndElement:
			if name := strings.ToLower(t.Name.Local); !htmlVoid[name] {
				b.WriteString("</" + name + ">")
			}
		case xml.CharData:
			b.WriteString(escaped(printable(string(t))))
		case xml.Comment:
		default:
			return "", false
		}
	}
}

// writeStart leaves out attributes that could not be the page's own (id, class)
// and refuses those that act.
func writeStart(b *strings.Builder, t xml.StartElement) bool {
	name := strings.ToLower(t.Name.Local)
	if !htmlElements[name] {
		return false
	}
	b.WriteString("<" + name)
	for _, a := range t.Attr {
		key := strings.ToLower(a.Name.Local)
		switch {
		case strings.HasPrefix(key, "on"):
			return false
		case key == "style" && !plainStyle.MatchString(a.Value):
		case htmlAttributes[key] || strings.HasPrefix(key, "aria-label") && key != "aria-labelledby":
			b.WriteString(" " + key + `="` + escaped(a.Value) + `"`)
		}
	}
	if htmlVoid[name] {
		b.WriteString(" /")
	}
	b.WriteString(">")
	return true
}

// cleanSVG returns a drawing without its prolog when it may stand in the page as
// it is: well formed, only shapes and text, references only within itself.
func cleanSVG(drawing string) (clean string, ok bool) {
	start := strings.Index(drawing, "<svg")
	if start < 0 || strings.Contains(drawing, "<![CDATA[") {
		return "", false
	}
	drawing = strings.TrimSpace(drawing[start:])
	decoder := xml.NewDecoder(strings.NewReader(drawing))
	depth, roots := 0, 0
	for {
		token, err := decoder.Token()
		switch {
		case err == io.EOF:
			return drawing, roots == 1
		case err != nil:
			return "", false
		}
		switch t := token.(type) {
		case xml.StartElement:
			if depth == 0 {
				roots++
			}
			depth++
			if !svgElements[t.Name.Local] || (depth == 1) != (t.Name.Local == "svg") || !inert(t.Attr) {
				return "", false
			}
		case xml.EndElement:
			depth--
		case xml.CharData, xml.Comment:
		default:
			return "", false
		}
	}
}

var outsideURL = regexp.MustCompile(`(?i)url\(\s*["']?[^#"'\s]`)

// inert reports whether attributes neither act nor refer to anything outside.
func inert(attributes []xml.Attr) bool {
	for _, a := range attributes {
		key := strings.ToLower(a.Name.Local)
		switch {
		case strings.HasPrefix(key, "on"),
			key == "href" && !strings.HasPrefix(a.Value, "#"),
			outsideURL.MatchString(a.Value),
			strings.Contains(a.Value, `\`): // an escape of CSS could hide a url()
			return false
		}
	}
	return true
}
