package report

import (
	"strings"
	"testing"
)

const dot = "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR42mNk+M9QDwADhgGAWjR9awAAAABJRU5ErkJggg=="

func TestRichestSafeRepresentationIsShown(t *testing.T) {
	for _, c := range []struct{ name, data, want string }{
		{"a table", `{"text/html": "<table><tr><td>1 &lt; 2</td></tr></table>", "text/plain": "p"}`, "<table><tr><td>1 &lt; 2</td></tr></table>"},
		{"HTML that acts", `{"text/html": "<script>alert(1)</script>", "text/plain": "a < b"}`, `aria-label="value">a &lt; b</pre>`},
		{"a drawing", `{"image/svg+xml": "<?xml version='1.0'?><svg><path d='M0 0'/></svg>", "image/png": "` + dot + `"}`, `<figure role="img" aria-label="the words"><svg><path d='M0 0'/></svg></figure>`},
		{"a drawing that acts", `{"image/svg+xml": "<svg><script>1</script></svg>"}`, `<img src="data:image/svg+xml;base64,PHN2Zz48c2NyaXB0PjE8L3NjcmlwdD48L3N2Zz4=" alt="the words" />`},
		{"a picture", `{"image/png": "` + dot + `\n", "text/plain": "p"}`, `<img src="data:image/png;base64,` + dot + `" alt="the words" />`},
		{"a broken picture", `{"image/png": "\"><script>", "text/plain": "p"}`, `aria-label="value">the words</pre>`},
		{"markdown", `{"text/markdown": "a **b**", "text/plain": "p"}`, `<div class="prose"><p>a <strong>b</strong></p>`},
		{"JSON", `{"application/json": {"a": [1]}}`, "{\n &#34;a&#34;: [\n  1\n ]\n}"},
		{"nothing known", `{"application/x": "y"}`, ""},
	} {
		page := pageWith(t, display(c.data))
		elements(t, page)
		if !strings.Contains(page, c.want) {
			t.Errorf("%s: %s is not in the page", c.name, c.want)
		}
	}
}

func TestCleanHTML(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{`<P Class=x ID=y style="text-align: right">a<br>b &nbsp; &amp;</P>`, "<p style=\"text-align: right\">a<br />b \u00a0 &amp;</p>"},
		{`<td style="background: url(https://example.org/x)">a</td>`, "<td>a</td>"},
		{`<!-- note --><progress value="1" max="2" aria-label="half"></progress>`, `<progress value="1" max="2" aria-label="half"></progress>`},
	} {
		if got, ok := cleanHTML(c.in); !ok || got != c.want {
			t.Errorf("%s\n became %s, %v\n want %s", c.in, got, ok, c.want)
		}
	}
	for _, bad := range []string{
		`<script>x</script>`, `<p onclick="x">a</p>`, `<img src="https://example.org/a.png">`, `<a href="javascript:x">a</a>`,
		`<iframe></iframe>`, `<style>p{}</style>`, `<p>a`, `<p></b>`, `<?x?>`, `<!DOCTYPE html>`, `<svg></svg>`,
	} {
		if got, ok := cleanHTML(bad); ok {
			t.Errorf("%s passed as %s", bad, got)
		}
	}
}

func TestCleanSVG(t *testing.T) {
	good := `<svg viewBox="0 0 1 1"><defs><clipPath id="a"><path d="M0 0"/></clipPath></defs><g clip-path="url(#a)"><text>λ</text></g></svg>`
	if got, ok := cleanSVG("<?xml version=\"1.0\"?>\n<!DOCTYPE svg>\n" + good + "\n"); !ok || got != good {
		t.Errorf("became %s, %v", got, ok)
	}
	for _, bad := range []string{
		`<svg><script/></svg>`, `<svg onload="x"/>`, `<svg><use href="https://example.org/a#b"/></svg>`, `<svg><image href="a.png"/></svg>`,
		`<svg><rect fill="url(https://example.org/a)"/></svg>`, `<svg><rect style="fill:u\72l(x)"/></svg>`, `<svg><style>p{}</style></svg>`,
		`<svg><foreignObject/></svg>`, `<svg><text></svg>`, `<svg/><svg/>`, `<svg/></section>`, `<svg><![CDATA[<script>]]></svg>`, `plain`,
		`<svg><svg/></svg>`, `<svg/><g/>`, `<svg/><?x?>`,
	} {
		if _, ok := cleanSVG(bad); ok {
			t.Errorf("%s passed", bad)
		}
	}
}

func TestTerminalText(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"a\x1b[31;1mred\x1b[0m\x1b]0;title\x07b", "aredb"},
		{" 10 %\r 50 %\r100 %\n", "100 %"},
		{"a\r\nb\r\n", "a\nb"},
		{"tab\there\x00\x08", "tab\there"},
	} {
		if got := terminal(c.in); got != c.want {
			t.Errorf("%q became %q, want %q", c.in, got, c.want)
		}
	}
}
