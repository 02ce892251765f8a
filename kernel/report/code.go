package report

import (
	"html/template"
	"strings"

	"github.com/alecthomas/chroma/v2"
	"github.com/alecthomas/chroma/v2/lexers"
)

var goLexer = chroma.Coalesce(lexers.Get("go"))

// highlight marks up Go code with the classes of style.css.
func highlight(source string) template.HTML {
	source = printable(strings.Trim(source, "\n"))
	tokens, err := goLexer.Tokenise(nil, source)
	if err != nil {
		return template.HTML(escaped(source))
	}
	var b strings.Builder
	for token := range tokens.Stdlib() {
		value := escaped(token.Value)
		if class := classOf(token.Type); class != "" {
			value = `<span class="` + class + `">` + value + `</span>`
		}
		b.WriteString(value)
	}
	return template.HTML(strings.TrimSuffix(b.String(), "\n")) // the lexer adds one
}

func classOf(t chroma.TokenType) string {
	switch {
	case t.InCategory(chroma.Comment):
		return "tc"
	case t.InCategory(chroma.Keyword):
		return "tk"
	case t.InSubCategory(chroma.LiteralString):
		return "ts"
	case t.InSubCategory(chroma.LiteralNumber):
		return "tn"
	case t == chroma.NameFunction:
		return "tf"
	}
	return ""
}
