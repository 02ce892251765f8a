package session

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/scanner"
	"go/token"
	"sort"
	"strings"
	"unicode/utf8"
)

// mark joins the parts of internal names. It is a letter to Go, so lowered code can be printed and parsed, and not one that is typed.
const mark = "ˑ"

// A source is the text of one run of a cell.
type source struct {
	id     string // the front end's name of the cell
	number int    // execution count
	text   string
	lines  []int // offset of each line's start
}

func newSource(id string, number int, text string) *source {
	s := &source{id: id, number: number, text: text, lines: []int{0}}
	for i := range len(text) {
		if text[i] == '\n' {
			s.lines = append(s.lines, i+1)
		}
	}
	return s
}

// label names the cell in messages.
func (s *source) label() string {
	if s.number > 0 {
		return fmt.Sprintf("cell %d", s.number)
	}
	return "cell"
}

// position turns an offset into a line and a column, both from 1, the column in characters.
func (s *source) position(offset int) (line, column int) {
	offset = max(0, min(offset, len(s.text)))
	i := sort.SearchInts(s.lines, offset+1) - 1
	return i + 1, utf8.RuneCountInString(s.text[s.lines[i]:offset]) + 1
}

// line returns the text of a line, counted from 1, without its end.
func (s *source) line(n int) string {
	if n < 1 || n > len(s.lines) {
		return ""
	}
	rest := s.text[s.lines[n-1]:]
	if i := strings.IndexByte(rest, '\n'); i >= 0 {
		rest = rest[:i]
	}
	return strings.TrimRight(rest, "\r")
}

// A place is an offset in a cell.
type place struct {
	src    *source
	offset int
}

// places maps the positions of pieces that were parsed separately back to their cells.
type places struct {
	fset   *token.FileSet
	pieces map[*token.File]piece
}

// A piece is a stretch of a cell that was parsed on its own: cell offset = file offset + delta.
type piece struct {
	src   *source
	delta int
	owner *def // the definition that the piece holds, or nil for statements
}

func newPlaces() *places {
	return &places{fset: token.NewFileSet(), pieces: map[*token.File]piece{}}
}

// find returns the place of a position; ok is false for what no cell contains.
func (p *places) find(pos token.Pos) (pl place, owner *def, ok bool) {
	if !pos.IsValid() {
		return place{}, nil, false
	}
	f := p.fset.File(pos)
	pc, ok := p.pieces[f]
	if !ok || pc.src == nil {
		return place{}, nil, false
	}
	return place{pc.src, f.Offset(pos) + pc.delta}, pc.owner, true
}

type segmentKind int

const (
	statementSegment segmentKind = iota
	importSegment
	typeSegment
	constSegment
	funcSegment
	methodSegment
)

// A segment is a declaration or a statement at the top level of a cell.
type segment struct {
	kind       segmentKind
	start, end int // offsets, without the closing semicolon
	explicit   bool
}

// lexeme is a token with its offset.
type lexeme struct {
	off int
	tok token.Token
	lit string
}

// scan cuts a text into tokens. The error is the first lexical one.
func scan(text string) ([]lexeme, *parseError) {
	fset := token.NewFileSet()
	file := fset.AddFile("", -1, len(text))
	var first *parseError
	var s scanner.Scanner
	s.Init(file, []byte(text), func(pos token.Position, msg string) {
		if first == nil {
			first = &parseError{pos.Offset, msg}
		}
	}, 0)
	var out []lexeme
	for {
		pos, tok, lit := s.Scan()
		if tok == token.EOF {
			return out, first
		}
		out = append(out, lexeme{file.Offset(pos), tok, lit})
	}
}

// parseError is a fault of syntax at an offset of the cell.
type parseError struct {
	offset  int
	message string
}

// segments cuts a cell at the semicolons, written or implied, that stand outside all brackets.
func segments(text string) ([]segment, *parseError) {
	toks, err := scan(text)
	if err != nil {
		return nil, err
	}
	var out []segment
	depth, first := 0, 0
	flush := func(last int, end int, explicit bool) {
		if last > first {
			out = append(out, segment{classify(toks[first:last]), toks[first].off, end, explicit})
		}
	}
	for i, t := range toks {
		switch t.tok {
		case token.LPAREN, token.LBRACK, token.LBRACE:
			depth++
		case token.RPAREN, token.RBRACK, token.RBRACE:
			if depth--; depth < 0 {
				return nil, &parseError{t.off, "unexpected " + t.tok.String() + " without its opening counterpart"}
			}
		case token.SEMICOLON:
			if depth <= 0 {
				flush(i, t.off, t.lit == ";")
				first = i + 1
			}
		}
	}
	flush(len(toks), len(text), false)
	return out, nil
}

func classify(toks []lexeme) segmentKind {
	switch toks[0].tok {
	case token.IMPORT:
		return importSegment
	case token.TYPE:
		return typeSegment
	case token.CONST:
		return constSegment
	case token.FUNC:
		return classifyFunc(toks)
	}
	return statementSegment
}

// classifyFunc tells a function or method declaration from a function literal.
func classifyFunc(toks []lexeme) segmentKind {
	if len(toks) > 1 && toks[1].tok == token.IDENT {
		return funcSegment
	}
	if len(toks) < 2 || toks[1].tok != token.LPAREN {
		return statementSegment
	}
	depth := 0
	for i := 1; i < len(toks); i++ {
		switch toks[i].tok {
		case token.LPAREN:
			depth++
		case token.RPAREN:
			if depth--; depth == 0 {
				if i+2 < len(toks) && toks[i+1].tok == token.IDENT && toks[i+2].tok == token.LPAREN {
					return methodSegment
				}
				return statementSegment
			}
		}
	}
	return statementSegment
}

// importLine is one import of a cell.
type importLine struct {
	name, path string
	offset     int
}

// A split is a cell taken apart.
type split struct {
	src        *source
	imports    []importLine
	defs       []*def
	statements string // the cell with everything but its statements blanked
	hasBody    bool
	shows      bool // the last segment is an expression to be shown
	lastStart  int  // where the last statement begins
}

// splitCell takes a cell apart; the error has the cell's own offset.
func splitCell(src *source) (*split, *parseError) {
	segs, err := segments(src.text)
	if err != nil {
		return nil, err
	}
	sp := &split{src: src}
	blank := []byte(src.text)
	for _, sg := range segs {
		if sg.kind == statementSegment {
			sp.hasBody, sp.lastStart = true, sg.start
			continue
		}
		wipe(blank, sg.start, sg.end, sg.explicit)
		if err := sp.declaration(sg); err != nil {
			return nil, err
		}
	}
	sp.statements = string(blank)
	if n := len(segs); n > 0 && segs[n-1].kind == statementSegment && !segs[n-1].explicit {
		sp.shows = true
	}
	return sp, nil
}

// wipe replaces a stretch by blanks and keeps the line ends, so that offsets stay.
func wipe(b []byte, start, end int, semicolon bool) {
	for i := start; i < end; i++ {
		if b[i] != '\n' && b[i] != '\r' {
			b[i] = ' '
		}
	}
	if semicolon && end < len(b) && b[end] == ';' {
		b[end] = ' '
	}
}

const (
	declPrefix = "package p;"
	bodyPrefix = "package p;func _(){"
)

func (sp *split) declaration(sg segment) *parseError {
	text := sp.src.text[sg.start:sg.end]
	f, perr := parsePiece(newPlaces(), piece{src: sp.src}, declPrefix, text, "", sg.start)
	if perr != nil {
		return perr
	}
	if sg.kind == importSegment {
		for _, im := range f.Imports {
			sp.addImport(im, sg.start)
		}
		return nil
	}
	for _, d := range f.Decls {
		sp.addDecl(d, f, sg)
	}
	return nil
}

func (sp *split) addImport(im *ast.ImportSpec, start int) {
	line := importLine{path: strings.Trim(im.Path.Value, "\"`"), offset: start}
	if im.Name != nil {
		line.name = im.Name.Name
	}
	sp.imports = append(sp.imports, line)
}

// addDecl turns a declaration into definitions: one a function, method or type, one a constant group.
func (sp *split) addDecl(d ast.Decl, f *ast.File, sg segment) {
	at := func(n ast.Node) (int, int) {
		base := int(f.FileStart) + len(declPrefix)
		return sg.start + int(n.Pos()) - base, sg.start + int(n.End()) - base
	}
	switch d := d.(type) {
	case *ast.FuncDecl:
		df := &def{kind: funcDef, src: sp.src, names: []string{d.Name.Name}}
		if d.Recv != nil && len(d.Recv.List) == 1 {
			df.kind, df.recv = methodDef, receiverName(d.Recv.List[0].Type)
		}
		df.start, df.end = at(d)
		df.generic = d.Type.TypeParams != nil
		sp.defs = append(sp.defs, df.finish())
	case *ast.GenDecl:
		if d.Tok == token.CONST {
			df := &def{kind: constDef, src: sp.src}
			for _, s := range d.Specs {
				for _, n := range s.(*ast.ValueSpec).Names {
					df.names = append(df.names, n.Name)
				}
			}
			df.start, df.end = at(d)
			sp.defs = append(sp.defs, df.finish())
			return
		}
		for _, s := range d.Specs {
			ts, ok := s.(*ast.TypeSpec)
			if !ok {
				continue
			}
			df := &def{kind: typeDef, src: sp.src, names: []string{ts.Name.Name}, generic: ts.TypeParams != nil}
			df.start, df.end = at(ts)
			df.prefix = "type "
			sp.defs = append(sp.defs, df.finish())
		}
	}
}

func receiverName(e ast.Expr) string {
	for {
		switch t := e.(type) {
		case *ast.StarExpr:
			e = t.X
		case *ast.ParenExpr:
			e = t.X
		case *ast.IndexExpr:
			e = t.X
		case *ast.IndexListExpr:
			e = t.X
		case *ast.Ident:
			return t.Name
		default:
			return ""
		}
	}
}

// parsePiece parses a stretch of a cell within a prefix and a suffix and registers it, so that its positions can be traced back.
func parsePiece(pl *places, pc piece, prefix, text, suffix string, start int) (*ast.File, *parseError) {
	f, err := parser.ParseFile(pl.fset, "", prefix+text+suffix, parser.SkipObjectResolution)
	pc.delta = start - len(prefix)
	if f != nil {
		pl.pieces[pl.fset.File(f.FileStart)] = pc
	}
	if err == nil {
		return f, nil
	}
	list, ok := err.(scanner.ErrorList)
	if !ok || len(list) == 0 {
		return nil, &parseError{start, err.Error()}
	}
	e := list[0]
	return nil, &parseError{max(start, min(e.Pos.Offset+pc.delta, start+len(text))), e.Msg}
}

// parseBody parses the statements of a cell as the body of a function.
func (sp *split) parseBody(pl *places) (*ast.BlockStmt, *parseError) {
	f, err := parsePiece(pl, piece{src: sp.src}, bodyPrefix, sp.statements, "\n}", 0)
	if err != nil {
		return nil, err
	}
	if len(f.Decls) != 1 {
		pos := f.Decls[1].Pos()
		at, _, _ := pl.find(pos)
		return nil, &parseError{at.offset, "unexpected } at the top level of the cell"}
	}
	return f.Decls[0].(*ast.FuncDecl).Body, nil
}
