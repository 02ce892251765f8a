package report

import (
	"bytes"

	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/parser"
	"github.com/yuin/goldmark/text"
	"github.com/yuin/goldmark/util"

	"brinkline/kernel/report/internal/formula"
)

// Formulas between dollar signs are kept from markdown, to which _ and * mean
// something. Those in a notation that package formula does not know are shown as
// they are written.

var (
	kindMath      = ast.NewNodeKind("Math")
	kindMathBlock = ast.NewNodeKind("MathBlock")
)

type mathNode struct {
	ast.BaseInline
	formula []byte
	display bool // between $$ and $$: set in a line of its own
}

func (*mathNode) Kind() ast.NodeKind         { return kindMath }
func (n *mathNode) Dump(src []byte, lvl int) { ast.DumpHelper(n, src, lvl, nil, nil) }

type mathBlockNode struct {
	ast.BaseBlock
}

func (*mathBlockNode) Kind() ast.NodeKind         { return kindMathBlock }
func (*mathBlockNode) IsRaw() bool                { return true }
func (n *mathBlockNode) Dump(src []byte, lvl int) { ast.DumpHelper(n, src, lvl, nil, nil) }

// mathSpan parses $formula$ and $$formula$$ within a line. The formula touches
// its dollar signs, and no digit follows: so "from $5 to $10" stays text.
type mathSpan struct{}

// Trigger implements parser.InlineParser.
func (mathSpan) Trigger() []byte { return []byte{'$'} }

// Parse implements parser.InlineParser.
func (mathSpan) Parse(_ ast.Node, block text.Reader, _ parser.Context) ast.Node {
	line, _ := block.PeekLine()
	mark := []byte("$")
	if bytes.HasPrefix(line, []byte("$$")) {
		mark = []byte("$$")
	}
	rest := line[len(mark):]
	end := bytes.Index(rest, mark)
	if end <= 0 {
		return nil
	}
	formula, after := rest[:end], rest[end+len(mark):]
	if len(mark) == 1 && (util.IsSpace(formula[0]) || util.IsSpace(formula[end-1]) || len(after) > 0 && util.IsNumeric(after[0])) {
		return nil
	}
	block.Advance(2*len(mark) + end)
	return &mathNode{formula: bytes.TrimSpace(formula), display: len(mark) == 2}
}

// mathBlock parses a formula in lines of its own between $$ and $$.
type mathBlock struct{}

// Trigger implements parser.BlockParser.
func (mathBlock) Trigger() []byte { return []byte{'$'} }

// Open implements parser.BlockParser.
func (mathBlock) Open(_ ast.Node, reader text.Reader, _ parser.Context) (ast.Node, parser.State) {
	line, segment := reader.PeekLine()
	trimmed := bytes.TrimSpace(line)
	if !bytes.HasPrefix(trimmed, []byte("$$")) || bytes.Contains(trimmed[2:], []byte("$$")) {
		return nil, parser.NoChildren // a formula in one line is an inline one
	}
	node := &mathBlockNode{}
	start := segment.Start + bytes.Index(line, []byte("$$")) + 2
	if first := segment.WithStart(start); len(bytes.TrimSpace(trimmed[2:])) > 0 {
		node.Lines().Append(first)
	}
	reader.AdvanceToEOL()
	return node, parser.NoChildren
}

// Continue implements parser.BlockParser.
func (mathBlock) Continue(node ast.Node, reader text.Reader, _ parser.Context) parser.State {
	line, segment := reader.PeekLine()
	end := bytes.Index(line, []byte("$$"))
	if end < 0 {
		node.Lines().Append(segment)
		reader.AdvanceToEOL()
		return parser.Continue | parser.NoChildren
	}
	if len(bytes.TrimSpace(line[:end])) > 0 {
		node.Lines().Append(segment.WithStop(segment.Start + end))
	}
	reader.AdvanceToEOL()
	return parser.Close
}

// Close implements parser.BlockParser.
func (mathBlock) Close(ast.Node, text.Reader, parser.Context) {}

// CanInterruptParagraph implements parser.BlockParser.
func (mathBlock) CanInterruptParagraph() bool { return true }

// CanAcceptIndentedLine implements parser.BlockParser.
func (mathBlock) CanAcceptIndentedLine() bool { return false }

func renderMath(w util.BufWriter, _ []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if entering {
		n := node.(*mathNode)
		source := string(n.formula)
		element, ok := formula.MathML(source, n.display)
		if !ok {
			element = `<code class="math">` + escaped(source) + `</code>`
		}
		_, _ = w.WriteString(element)
	}
	return ast.WalkSkipChildren, nil
}

func renderMathBlock(w util.BufWriter, source []byte, node ast.Node, entering bool) (ast.WalkStatus, error) {
	if entering {
		written := string(bytes.TrimRight(node.Lines().Value(source), "\n"))
		element, ok := formula.MathML(written, true)
		if !ok {
			element = `<pre class="math">` + escaped(written) + `</pre>`
		}
		_, _ = w.WriteString(element + "\n")
	}
	return ast.WalkSkipChildren, nil
}
