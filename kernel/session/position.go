package session

import "go/ast"

// anchor gives every node a position. The interpreter finds the package bl only from nodes that stand in a file.
func anchor(root ast.Node) {
	ast.Inspect(root, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.Ident:
			n.NamePos = 1
		case *ast.BasicLit:
			n.ValuePos = 1
		case *ast.FuncType:
			n.Func = 1
		case *ast.CompositeLit:
			n.Lbrace = 1
		case *ast.UnaryExpr:
			n.OpPos = 1
		case *ast.StarExpr:
			n.Star = 1
		case *ast.ParenExpr:
			n.Lparen = 1
		case *ast.Ellipsis:
			n.Ellipsis = 1
		case *ast.ArrayType:
			n.Lbrack = 1
		case *ast.MapType:
			n.Map = 1
		case *ast.StructType:
			n.Struct = 1
		case *ast.InterfaceType:
			n.Interface = 1
		case *ast.ChanType:
			n.Begin = 1
		case *ast.FieldList:
			n.Opening = 1
		case *ast.GenDecl:
			n.TokPos = 1
		default:
			anchorStmt(n)
		}
		return true
	})
}

func anchorStmt(n ast.Node) {
	switch n := n.(type) {
	case *ast.BlockStmt:
		n.Lbrace = 1
	case *ast.IfStmt:
		n.If = 1
	case *ast.ForStmt:
		n.For = 1
	case *ast.RangeStmt:
		n.For = 1
	case *ast.SwitchStmt:
		n.Switch = 1
	case *ast.SelectStmt:
		n.Select = 1
	case *ast.CaseClause:
		n.Case = 1
	case *ast.CommClause:
		n.Case = 1
	case *ast.ReturnStmt:
		n.Return = 1
	case *ast.BranchStmt:
		n.TokPos = 1
	case *ast.GoStmt:
		n.Go = 1
	case *ast.DeferStmt:
		n.Defer = 1
	}
}
