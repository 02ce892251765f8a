package notebook

import (
	"fmt"
	"go/ast"
	"go/format"
	"go/parser"
	"go/token"
	"slices"
	"strings"
)

// Tags by which the reference tools know the cell with a notebook's parameters
// and the one that overrides them.
const (
	parametersTag = "parameters"
	overridesTag  = "injected-parameters"
)

// SetParameters overrides values that the cell tagged "parameters" gives, by a
// cell after it that assigns the new ones, for instance "Inflow = 120". A reader
// of the executed notebook so sees both. The cell of an earlier override is
// replaced; without settings it stays.
func (nb *Notebook) SetParameters(settings []string) error {
	if len(settings) == 0 {
		return nil
	}
	source := "// values set when the notebook was run"
	for _, s := range settings {
		assignment, err := parseSetting(s)
		if err != nil {
			return err
		}
		source += "\n" + assignment
	}
	cells := slices.DeleteFunc(slices.Clone(nb.Cells), func(c *Cell) bool { return c.Tagged(overridesTag) })
	at := slices.IndexFunc(cells, func(c *Cell) bool { return c.Type() == "code" && c.Tagged(parametersTag) })
	if at < 0 {
		return fmt.Errorf("no cell carries the tag %q, so there is nothing to set; tag the cell that holds the parameters", parametersTag)
	}
	nb.Cells = cells
	nb.Cells = slices.Insert(nb.Cells, at+1, nb.overrideCell(source))
	return nil
}

// parseSetting accepts one assignment of Go, such as a.b=3, and returns it as
// gofmt writes it.
func parseSetting(s string) (string, error) {
	bad := fmt.Errorf("can't set %q: write it as name=value, with the value as in Go", s)
	fset := token.NewFileSet()
	file, err := parser.ParseFile(fset, "", "package p; func _() {\n"+s+"\n}", 0)
	if err != nil || len(file.Decls) != 1 {
		return "", bad
	}
	body := file.Decls[0].(*ast.FuncDecl).Body.List
	if len(body) != 1 {
		return "", bad
	}
	assign, ok := body[0].(*ast.AssignStmt)
	if !ok || assign.Tok != token.ASSIGN || len(assign.Lhs) != 1 || len(assign.Rhs) != 1 {
		return "", bad
	}
	var out strings.Builder
	if err := format.Node(&out, fset, assign); err != nil {
		return "", bad
	}
	return out.String(), nil
}

func (nb *Notebook) overrideCell(source string) *Cell {
	cell := map[string]any{
		"cell_type":       "code",
		"execution_count": nil,
		"metadata":        map[string]any{"tags": []any{overridesTag}},
		"outputs":         []any{},
		"source":          lines(source),
	}
	if nb.Minor() >= 5 {
		cell["id"] = nb.freeID(overridesTag)
	}
	return &Cell{cell}
}

// freeID returns an id that no cell has.
func (nb *Notebook) freeID(wish string) string {
	id := wish
	for n := 2; slices.ContainsFunc(nb.Cells, func(c *Cell) bool { return c.ID() == id }); n++ {
		id = fmt.Sprintf("%s-%d", wish, n)
	}
	return id
}
