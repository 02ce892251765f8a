package report

import (
	"encoding/base64"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestProse(t *testing.T) {
	for _, c := range []struct{ name, source, want string }{
		{"inline HTML", "x<sub>2</sub> <br> y<!-- note -->", "x<sub>2</sub> <br /> y</p>"},
		{"a tag left open", "x<sub>2 and on", "x&lt;sub&gt;2 and on</p>"},
		{"inline HTML that acts", `a <img src=x onerror=y> b`, "a &lt;img src=x onerror=y&gt; b"},
		{"a block of HTML", "<table><tr><td>a</td></tr></table>", "<table><tr><td>a</td></tr></table>"},
		{"a block that acts", "<script>\nalert(1)\n</script>", "<pre>&lt;script&gt;\nalert(1)\n&lt;/script&gt;</pre>"},
		{"a link that acts", "[a](javascript:alert(1))", `<a href="">a</a>`},
		{"a picture elsewhere", "![a view](https://example.org/a.png)", `[picture not in this page: a view https://example.org/a.png]`},
		{"a picture outside the folder", "![x](../secret.png)", `[picture not in this page: x ../secret.png]`},
		{"a formula with marks of markdown", "so $a_1 * b_2 * c$", `so <math xmlns="http://www.w3.org/1998/Math/MathML"><semantics><mrow><msub>`},
		{"a formula in a line of its own", "$$x < y$$", `<p><math xmlns="http://www.w3.org/1998/Math/MathML" display="block"><semantics><mrow><mi>x</mi><mo>&lt;</mo>`},
		{"a formula of lines", "before\n$$\na\n= b\n$$\nafter", "\n= b</annotation></semantics></math>\n<p>after</p>"},
		{"a formula never closed", "$$\na", `application/x-tex">a</annotation>`},
		{"an unknown formula", "$a \\odd < b$", `<code class="math">a \odd &lt; b</code>`},
		{"an unknown formula of lines", "$$\n\\odd\n$$", `<pre class="math">\odd</pre>`},
		{"a formula in a heading", "## At $x_1$", `<h2 id="s-at-x-1">At <math `},
		{"money", "from $5 to $10, 3 $", "from $5 to $10, 3 $"},
		{"a definition list", "fold\n: a limit", "<dt>fold</dt>\n<dd>a limit</dd>"},
	} {
		page := pageWith(t, markdown("text"), markdown(c.source))
		elements(t, page)
		if !strings.Contains(page, c.want) {
			t.Errorf("%s: %s is not in the page", c.name, c.want)
		}
	}
}

func TestPicturesOfTheNotebookAreTakenIn(t *testing.T) {
	folder := t.TempDir()
	png, err := base64.StdEncoding.DecodeString(dot)
	if err != nil {
		t.Fatal(err)
	}
	notebook := `{"cells": [
		{"cell_type": "markdown", "metadata": {}, "source": "![one](my%20dot.png) ![two](attachment:b.png) ![three](data:image/png;base64,` + dot + `)",
		 "attachments": {"b.png": {"image/png": "` + dot + `"}}}], "nbformat": 4, "nbformat_minor": 4}`
	path := filepath.Join(folder, "a.ipynb")
	for name, content := range map[string][]byte{"my dot.png": png, "a.ipynb": []byte(notebook)} {
		if err := os.WriteFile(filepath.Join(folder, name), content, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	page := pageOf(t, path)
	for _, alt := range []string{"one", "two", "three"} {
		if want := `<img src="data:image/png;base64,` + dot + `" alt="` + alt + `" />`; !strings.Contains(page, want) {
			t.Errorf("the page lacks %s", want)
		}
	}
}
