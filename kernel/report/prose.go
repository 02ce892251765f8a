package report

import (
	"bytes"
	"fmt"
	"html/template"
	"strings"
	"unicode"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	"github.com/yuin/goldmark/parser"
	"github.com/yuin/goldmark/renderer"
	"github.com/yuin/goldmark/renderer/html"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"

	"brinkline/kernel/notebook"
)

// A heading of the notebook, for the table of contents.
type heading struct {
	Level int
	ID    string
	Text  string
	HTML  template.HTML
}

// prose turns the markdown cells of one notebook into HTML.
type prose struct {
	markdown goldmark.Markdown
	raw      *rawRenderer
	headings []heading
	ids      slugs
	cells    int
}

func newProse(folder string) *prose {
	p := &prose{raw: &rawRenderer{folder: folder}, ids: slugs{}}
	footnotes := extension.NewFootnote(extension.WithFootnoteIDPrefixFunction(func(ast.Node) []byte {
		return fmt.Appendf(nil, "n%d-", p.cells) // footnotes of several cells must not share ids
	}))
	p.markdown = goldmark.New(
		goldmark.WithExtensions(
			extension.NewTable(extension.WithTableCellAlignMethod(extension.TableCellAlignStyle)),
			extension.Strikethrough, extension.Linkify, extension.TaskList, extension.DefinitionList, footnotes,
		),
		goldmark.WithParserOptions(
			parser.WithAutoHeadingID(),
			parser.WithBlockParsers(util.Prioritized(mathBlock{}, 650)),
			parser.WithInlineParsers(util.Prioritized(mathSpan{}, 150)),
		),
		goldmark.WithRendererOptions(html.WithXHTML(), renderer.WithNodeRenderers(util.Prioritized(p.raw, 100))),
	)
	return p
}

// cell returns a markdown cell as HTML. A first heading of level 1 is the title
// of the notebook when the cell is its first; it is returned apart.
func (p *prose) cell(c *notebook.Cell, first bool) (body template.HTML, title heading) {
	p.raw.cell = c
	source := []byte(c.Source())
	document := p.parse(source)
	if h, ok := document.FirstChild().(*ast.Heading); ok && first && h.Level == 1 {
		title = p.heading(h, source)
		document.RemoveChild(document, h)
	}
	for node := document.FirstChild(); node != nil; node = node.NextSibling() {
		if h, ok := node.(*ast.Heading); ok {
			p.headings = append(p.headings, p.heading(h, source))
		}
	}
	return p.render(document, source), title
}

// fragment returns markdown that a cell put out as HTML. Its headings are not
// those of the notebook.
func (p *prose) fragment(source string) template.HTML {
	p.raw.cell = nil
	return p.render(p.parse([]byte(source)), []byte(source))
}

func (p *prose) parse(source []byte) ast.Node {
	p.cells++
	return p.markdown.Parser().Parse(text.NewReader(source), parser.WithContext(parser.NewContext(parser.WithIDs(p.ids))))
}

// render lets the inline HTML of the prose stand only when the result is well
// formed: a tag that somebody forgot to close must not spill over the page.
func (p *prose) render(node ast.Node, source []byte) template.HTML {
	for _, escape := range []bool{false, true} {
		p.raw.escape = escape
		var b bytes.Buffer
		if err := p.markdown.Renderer().Render(&b, source, node); err == nil && (escape || wellFormed(b.String())) {
			return template.HTML(b.String())
		}
	}
	return template.HTML("<pre>" + escaped(printable(string(source))) + "</pre>")
}

func (p *prose) heading(h *ast.Heading, source []byte) heading {
	found := heading{Level: h.Level, Text: plainText(h, source)}
	if id, ok := h.AttributeString("id"); ok {
		found.ID = string(id.([]byte))
	}
	for child := h.FirstChild(); child != nil; child = child.NextSibling() {
		found.HTML += p.render(child, source)
	}
	return found
}

// plainText is the text of a node without its markup.
func plainText(node ast.Node, source []byte) string {
	var b strings.Builder
	_ = ast.Walk(node, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		switch n := n.(type) {
		case *ast.Text:
			if entering {
				b.Write(n.Segment.Value(source))
			}
		case *ast.String:
			if entering {
				b.Write(n.Value)
			}
		case *mathNode:
			if entering {
				b.Write(n.formula)
			}
		}
		return ast.WalkContinue, nil
	})
	return b.String()
}

// slugs gives headings ids made of their words, none twice in a page.
type slugs map[string]bool

// Generate implements parser.IDs.
func (s slugs) Generate(value []byte, _ ast.NodeKind) []byte {
	words := strings.FieldsFunc(strings.ToLower(string(value)), func(r rune) bool {
		return !unicode.IsLetter(r) && !unicode.IsDigit(r)
	})
	base := "s-" + strings.Join(words, "-")
	id := base
	for n := 2; s[id]; n++ {
		id = fmt.Sprintf("%s-%d", base, n)
	}
	s[id] = true
	return []byte(id)
}

// Put implements parser.IDs.
func (s slugs) Put(value []byte) { s[string(value)] = true }
