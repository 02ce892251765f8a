package session

import (
	"go/ast"
	"go/constant"
	"go/token"
	"go/types"
	"math"
	"strconv"
	"strings"
)

// typeOf is the type of an expression in the instance being lowered.
func (l *lowerer) typeOf(e ast.Expr) types.Type {
	if tv, ok := l.u.info.Types[e]; ok && tv.Type != nil {
		return l.sub(tv.Type)
	}
	if id, ok := e.(*ast.Ident); ok {
		if obj := l.u.info.ObjectOf(id); obj != nil {
			return l.sub(obj.Type())
		}
	}
	return types.Typ[types.Invalid]
}

// exprTo lowers an expression where a value of the target type is wanted.
func (l *lowerer) exprTo(e ast.Expr, target types.Type) ast.Expr {
	target = l.sub(target)
	if tv := l.u.info.Types[e]; tv.Value != nil {
		t := l.sub(tv.Type)
		if isUntyped(t) {
			if types.IsInterface(target) {
				t = types.Default(t)
			} else {
				t = target
			}
		}
		return l.convert(l.constant(tv.Value, t, false), t, target)
	}
	return l.convert(l.expr(e), l.typeOf(e), target)
}

func isUntyped(t types.Type) bool {
	b, ok := types.Unalias(t).(*types.Basic)
	return ok && b.Info()&types.IsUntyped != 0
}

// convert makes a lowered value of one type one of another to which it can be assigned.
func (l *lowerer) convert(x ast.Expr, from, to types.Type) ast.Expr {
	from, to = types.Unalias(l.sub(from)), types.Unalias(l.sub(to))
	if !types.IsInterface(to) {
		return x
	}
	if b, ok := from.(*types.Basic); ok && b.Kind() == types.UntypedNil {
		return ast.NewIdent("nil")
	}
	if l.dynamic(to) {
		return l.toDynamic(x, from)
	}
	return l.toReal(x, from, to)
}

// toDynamic converts to an interface that is an any in lowered code.
func (l *lowerer) toDynamic(x ast.Expr, from types.Type) ast.Expr {
	switch {
	case types.IsInterface(from) && l.dynamic(from):
		return x
	case types.IsInterface(from):
		return hostCall("Open", x)
	case l.mentionsOwn(from):
		return hostCall("Box", intLit(l.runtimeType(from).id), x)
	}
	return hostCall("Any", x)
}

// toReal converts to error or an interface of a compiled package.
func (l *lowerer) toReal(x ast.Expr, from, to types.Type) ast.Expr {
	if types.IsInterface(from) && !l.dynamic(from) {
		return x
	}
	if !types.IsInterface(from) {
		if !l.mentionsOwn(from) || !l.hasOwnMethods(from) {
			return x
		}
		x = hostCall("Box", intLit(l.runtimeType(from).id), x)
	}
	return l.toInterface(x, to)
}

// toInterface calls the host's converter to a compiled interface.
func (l *lowerer) toInterface(x ast.Expr, to types.Type) ast.Expr {
	if types.Identical(to, errorType) {
		return hostCall("Error", x)
	}
	name := l.converter(to)
	if name == "" {
		l.fail(token.NoPos, "%s cannot be used in cells", types.TypeString(to, shortQualifier))
	}
	return hostCall(name, x)
}

// hasOwnMethods reports whether the methods of a type are made in cells, so that compiled code cannot find them.
func (l *lowerer) hasOwnMethods(t types.Type) bool {
	if p, ok := t.(*types.Pointer); ok {
		t = types.Unalias(p.Elem())
	}
	switch t := t.(type) {
	case *types.Named:
		return t.Obj().Pkg() == l.u.pkg
	case *types.Struct:
		return true
	}
	return false
}

// constant writes a constant. A bare one may take its type from what stands around it.
func (l *lowerer) constant(v constant.Value, t types.Type, bare bool) ast.Expr {
	t = types.Unalias(l.sub(t))
	b, ok := t.Underlying().(*types.Basic)
	if !ok { // a type parameter's constant in an interface context
		b = types.Typ[types.Int]
		switch v.Kind() {
		case constant.String:
			b = types.Typ[types.String]
		case constant.Float:
			b = types.Typ[types.Float64]
		case constant.Bool:
			b = types.Typ[types.Bool]
		}
		t = b
	}
	lit := literal(v, b)
	if plainLiteral(t, b) || bare {
		return lit
	}
	return call(l.conversionFun(t), lit)
}

// plainLiteral reports whether the literal alone has the type.
func plainLiteral(t types.Type, b *types.Basic) bool {
	if _, named := t.(*types.Named); named {
		return false
	}
	switch b.Kind() {
	case types.Int, types.Float64, types.String, types.Bool, types.UntypedInt, types.UntypedFloat, types.UntypedString,
		types.UntypedBool, types.Complex128, types.UntypedComplex:
		return true
	}
	return false
}

func literal(v constant.Value, b *types.Basic) ast.Expr {
	switch info := b.Info(); {
	case info&types.IsBoolean != 0:
		return ast.NewIdent(strconv.FormatBool(constant.BoolVal(v)))
	case info&types.IsString != 0:
		return strLit(constant.StringVal(v))
	case info&types.IsInteger != 0:
		i := constant.ToInt(v)
		s := i.ExactString()
		if strings.HasPrefix(s, "-") {
			return paren(&ast.UnaryExpr{Op: token.SUB, X: &ast.BasicLit{Kind: token.INT, Value: s[1:]}})
		}
		return &ast.BasicLit{Kind: token.INT, Value: s}
	case info&types.IsFloat != 0:
		f, _ := constant.Float64Val(constant.ToFloat(v))
		if b.Kind() == types.Float32 {
			f32, _ := constant.Float32Val(constant.ToFloat(v))
			f = float64(f32)
		}
		return floatLit(f)
	default:
		re, _ := constant.Float64Val(constant.Real(v))
		im, _ := constant.Float64Val(constant.Imag(v))
		return hostCall("Complex", floatLit(re), floatLit(im))
	}
}

func floatLit(f float64) ast.Expr {
	if f < 0 || f == 0 && math.Signbit(f) {
		return paren(&ast.UnaryExpr{Op: token.SUB, X: floatLit(-f)})
	}
	s := strconv.FormatFloat(f, 'g', -1, 64)
	if !strings.ContainsAny(s, ".e") {
		s += ".0"
	}
	return &ast.BasicLit{Kind: token.FLOAT, Value: s}
}

// conversionFun writes a type where it is called.
func (l *lowerer) conversionFun(t types.Type) ast.Expr {
	e := l.typ(t)
	switch e.(type) {
	case *ast.Ident, *ast.SelectorExpr, *ast.ArrayType, *ast.MapType:
		return e
	}
	return paren(e)
}

// zero writes the zero value of a type as an expression.
func (l *lowerer) zero(t types.Type) ast.Expr {
	name := l.temp("z")
	return closure([]ast.Expr{l.typ(t)}, varStmt(name, l.typ(t), nil), &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent(name)}})
}
