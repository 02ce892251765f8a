package report

import (
	"encoding/base64"
	"html/template"
	"strings"

	"brinkline/kernel/notebook"
)

// outputs marks up what a cell put out, in order.
func outputs(list []notebook.Output, prose *prose) []template.HTML {
	var shown []template.HTML
	for _, o := range list {
		if s := output(o, prose); s != "" {
			shown = append(shown, template.HTML(s))
		}
	}
	return shown
}

func output(o notebook.Output, prose *prose) string {
	switch o.Type() {
	case "stream":
		name, content := o.Stream()
		if name == "stderr" {
			return pre("text stderr", "standard error", content)
		}
		return pre("text", "output", content)
	case "error":
		return errorOutput(o)
	case "display_data", "execute_result":
		return value(o, prose)
	}
	return ""
}

func errorOutput(o notebook.Output) string {
	name, message, traceback := o.Error()
	content := strings.Join(traceback, "\n")
	if content == "" {
		content = strings.TrimPrefix(name+": "+message, ": ")
	}
	return pre("text error", "error", content)
}

// pre shows a text that may be wider than the page: readers without a mouse can
// reach it and scroll.
func pre(class, label, content string) string {
	return `<pre class="` + class + `" tabindex="0" aria-label="` + label + `">` + escaped(terminal(content)) + `</pre>`
}

// value shows the richest representation that a page can hold.
func value(o notebook.Output, prose *prose) string {
	if content, ok := o.Data("text/html"); ok {
		if clean, ok := cleanHTML(content); ok {
			return `<div class="value" tabindex="0" role="group" aria-label="table">` + clean + `</div>`
		}
	}
	if content, ok := o.Data("image/svg+xml"); ok {
		return drawing(content, alternative(o))
	}
	for _, mime := range []string{"image/png", "image/jpeg", "image/gif", "image/webp"} {
		if content, ok := o.Data(mime); ok {
			return picture(mime, content, alternative(o))
		}
	}
	if content, ok := o.Data("text/markdown"); ok {
		return `<div class="prose">` + string(prose.fragment(content)) + `</div>`
	}
	for _, mime := range []string{"text/plain", "text/latex", "application/json"} {
		if content, ok := o.Data(mime); ok {
			return pre("text", "value", content)
		}
	}
	return ""
}

// alternative is the sentence that stands for a picture where it can't be seen.
func alternative(o notebook.Output) string {
	for _, mime := range []string{"image/png", "image/svg+xml"} {
		if alt := o.Metadata(mime, "alt"); alt != "" {
			return alt
		}
	}
	plain, _ := o.Data("text/plain")
	return strings.Join(strings.Fields(plain), " ")
}

// drawing puts an SVG into the page, so that its text can be found and copied.
// One that holds more than shapes becomes an image, in which nothing can act.
func drawing(content, alt string) string {
	clean, ok := cleanSVG(content)
	switch {
	case !ok:
		return picture("image/svg+xml", base64.StdEncoding.EncodeToString([]byte(content)), alt)
	case strings.Contains(clean, "<title"):
		return `<figure>` + clean + `</figure>`
	default:
		return `<figure role="img" aria-label="` + escaped(alt) + `">` + clean + `</figure>`
	}
}

func picture(mime, content, alt string) string {
	content = strings.Join(strings.Fields(content), "")
	if _, err := base64.StdEncoding.DecodeString(content); err != nil {
		return pre("text", "value", alt)
	}
	return `<figure><img src="data:` + mime + `;base64,` + content + `" alt="` + escaped(alt) + `" /></figure>`
}
