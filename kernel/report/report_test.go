package report

import (
	"bytes"
	"encoding/xml"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"brinkline/kernel/notebook"
)

// sample is a notebook with all that a page can show: prose, formulas, code, a
// figure, a table, streams, an error and a cell after it.
const sample = "testdata/sample.ipynb"

var told = Options{
	Version: "0.1.0", Specials: []string{"fold 303.42 K <Coolant>"},
	Command: "brinkline run sample.ipynb --report sample.html",
}

func pageOf(t *testing.T, path string) string {
	t.Helper()
	nb, err := notebook.Read(path)
	if err != nil {
		t.Fatal(err)
	}
	var page bytes.Buffer
	if err := HTML(&page, nb, told); err != nil {
		t.Fatal(err)
	}
	return page.String()
}

// pageWith returns the page of a notebook with the given cells, in JSON.
func pageWith(t *testing.T, cells ...string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "made.ipynb")
	content := `{"cells": [` + strings.Join(cells, ",") + `], "metadata": {}, "nbformat": 4, "nbformat_minor": 4}`
	if err := os.WriteFile(path, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	return pageOf(t, path)
}

func markdown(source string) string {
	return `{"cell_type": "markdown", "metadata": {}, "source": ` + quote(source) + `}`
}

func display(data string) string {
	return `{"cell_type": "code", "metadata": {}, "execution_count": 1, "source": "show", "outputs": [
		{"output_type": "display_data", "metadata": {"image/png": {"alt": "the words"}}, "data": ` + data + `}]}`
}

var quoter = strings.NewReplacer(`\`, `\\`, `"`, `\"`, "\n", `\n`, "\t", `\t`)

func quote(s string) string { return `"` + quoter.Replace(s) + `"` }

// An element of a page, as the tests look at it.
type element struct {
	name       string
	attributes map[string]string
}

// elements parses a whole page, which must be well formed.
func elements(t *testing.T, page string) []element {
	t.Helper()
	decoder := xml.NewDecoder(strings.NewReader(strings.TrimPrefix(page, "<!doctype html>")))
	decoder.Entity = xml.HTMLEntity
	var all []element
	for {
		token, err := decoder.Token()
		if err == io.EOF {
			return all
		}
		if err != nil {
			t.Fatalf("the page is not well formed: %v", err)
		}
		if start, ok := token.(xml.StartElement); ok {
			e := element{start.Name.Local, map[string]string{}}
			for _, a := range start.Attr {
				e.attributes[a.Name.Local] = a.Value
			}
			all = append(all, e)
		}
	}
}

func TestPageLoadsAndRunsNothing(t *testing.T) {
	page := pageOf(t, sample)
	for _, e := range elements(t, page) {
		switch e.name {
		case "script", "link", "iframe", "object", "embed", "form", "foreignObject", "base":
			t.Errorf("the page has <%s>", e.name)
		}
		for key, value := range e.attributes {
			if strings.HasPrefix(key, "on") || key == "src" && !strings.HasPrefix(value, "data:image/") {
				t.Errorf("<%s %s=%q>", e.name, key, value)
			}
		}
	}
	if regexp.MustCompile(`(?i)url\(|@import`).MatchString(page) {
		t.Error("the style refers to something")
	}
	if !strings.Contains(page, `content="default-src 'none'; img-src data:; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'"`) {
		t.Error("the content policy is not the strict one")
	}
}

func TestPageHasLandmarksAndWorkingLinks(t *testing.T) {
	ids, counts := map[string]int{}, map[string]int{}
	all := elements(t, pageOf(t, sample))
	for _, e := range all {
		counts[e.name]++
		if id := e.attributes["id"]; id != "" {
			ids[id]++
		}
	}
	for _, landmark := range []string{"header", "nav", "main", "footer", "title", "h1"} {
		if counts[landmark] != 1+btoi(landmark == "title")*counts["svg"] {
			t.Errorf("%d <%s>", counts[landmark], landmark)
		}
	}
	for id, n := range ids {
		if n > 1 {
			t.Errorf("id %q is used %d times", id, n)
		}
	}
	for _, e := range all {
		target, local := strings.CutPrefix(e.attributes["href"], "#")
		if local && ids[target] == 0 {
			t.Errorf("link to #%s leads nowhere", target)
		}
		if e.name == "img" && e.attributes["alt"] == "" {
			t.Error("a picture without words")
		}
	}
}

func btoi(b bool) int {
	if b {
		return 1
	}
	return 0
}

func TestPageTellsWhatTheNotebookHolds(t *testing.T) {
	page := pageOf(t, sample)
	for _, want := range []string{
		"<title>How far the coolant may warm: the stirred tank at plant 2</title>",
		`<h1>How far the coolant may warm: the <em>stirred tank</em> at <code>plant 2</code></h1>`,
		`<li class="l3"><a href="#s-from-today-s-point">From today&#39;s point</a></li>`,
		`<h3 id="s-from-today-s-point">`,
		`<li>fold 303.42 K &lt;Coolant&gt;</li>`,
		`<span class="tk">func</span> <span class="tf">tank</span>(s State, q Params) State {`,
		`<span class="ts">&#34;Coolant&#34;</span>`,
		`<td style="text-align:right">100 L</td>`,
		`<th scope="col" style="text-align: right">Coolant (K)</th>`,
		`<figure><svg xmlns="http://www.w3.org/2000/svg"`,
		`application/x-tex">\dot x = -\frac{F}{V} x + k(T)(1-x)</annotation>`,
		`Costs went from $5 to $10. H<sub>2</sub>O.`,
		`aria-label="standard error">slow place near 303 K</pre>`,
		`This run stopped at <a href="#cell-8">cell 4</a>; the cells after it were not run.`,
		`<p class="notrun">This cell was not run.</p>`,
		`<code>brinkline run sample.ipynb --report sample.html</code>`,
		`brinkline 0.1.0`,
	} {
		if !strings.Contains(page, want) {
			t.Errorf("the page lacks %s", want)
		}
	}
	if strings.Contains(page, "left from an earlier run") {
		t.Error("the page shows outputs of a cell that was not run")
	}
}

func TestSameNotebookGivesTheSameBytes(t *testing.T) {
	if first, second := pageOf(t, sample), pageOf(t, sample); first != second {
		t.Error("two pages of one notebook differ")
	}
}

func TestPageIsSmallBesideItsFigures(t *testing.T) {
	if page := pageWith(t, markdown("# Nothing")); len(page) > 12_000 {
		t.Errorf("an empty page has %d bytes", len(page))
	}
	flood := `{"cell_type": "code", "metadata": {}, "execution_count": 1, "source": "", "outputs": [
		{"output_type": "stream", "name": "stdout", "text": ` + quote(strings.Repeat(strings.Repeat("x", 60)+"\n", 100_000)) + `}]}`
	if page := pageWith(t, flood); len(page) > 40_000 || !strings.Contains(page, "… 99700 lines left out; the notebook has them …") {
		t.Errorf("a flood of output gives %d bytes", len(page))
	}
}

func TestTwoCellsWithTheSameHeadingAndFootnote(t *testing.T) {
	cell := markdown("# Part\n\ntext[^1]\n\n[^1]: note")
	ids := map[string]bool{}
	for _, e := range elements(t, pageWith(t, cell, cell, cell)) {
		if id := e.attributes["id"]; id != "" && ids[id] {
			t.Errorf("id %q twice", id)
		} else {
			ids[id] = true
		}
	}
	if !ids["s-part-2"] || !ids["s-part-3"] {
		t.Errorf("ids %v", ids)
	}
}

func TestHiddenPartsAreFoldedOrLeftOut(t *testing.T) {
	page := pageWith(t, `{"cell_type": "code", "metadata": {"jupyter": {"source_hidden": true, "outputs_hidden": true}},
		"execution_count": 3, "source": "// set up\nx", "outputs": [{"output_type": "stream", "name": "stdout", "text": "secret"}]}`)
	if !strings.Contains(page, "<details><summary>Code: set up</summary>") || strings.Contains(page, "secret") {
		t.Error("the hidden parts are not hidden")
	}
}

func TestExpectedErrorsDoNotStopThePage(t *testing.T) {
	page := pageWith(t, `{"cell_type": "code", "metadata": {"tags": ["raises-exception"]}, "execution_count": 1, "source": "bad",
		"outputs": [{"output_type": "error", "ename": "Error", "evalue": "as expected", "traceback": []}]}`)
	if strings.Contains(page, "stopped") || !strings.Contains(page, "Error: as expected") {
		t.Error("an expected error is told as one that stopped the run")
	}
}
