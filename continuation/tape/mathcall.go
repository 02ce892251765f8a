package tape

import (
	"go/ast"
	"math"
)

var mathOps = map[string]Op{
	"Abs": opAbs, "Acos": opAcos, "Acosh": opAcosh, "Asin": opAsin, "Asinh": opAsinh, "Atan": opAtan, "Atan2": opAtan2,
	"Atanh": opAtanh, "Cbrt": opCbrt, "Ceil": opCeil, "Copysign": opCopysign, "Cos": opCos, "Cosh": opCosh, "Dim": opDim,
	"Erf": opErf, "Erfc": opErfc, "Erfinv": opErfinv, "Exp": opExp, "Exp2": opExp2, "Expm1": opExpm1, "Floor": opFloor,
	"Gamma": opGamma, "Hypot": opHypot, "Log": opLog, "Log10": opLog10, "Log1p": opLog1p, "Log2": opLog2, "Max": opMax,
	"Min": opMin, "Mod": opMod, "Pow": opPow, "Remainder": opRemainder, "Round": opRound, "RoundToEven": opRoundToEven,
	"Sin": opSin, "Sinh": opSinh, "Sqrt": opSqrt, "Tan": opTan, "Tanh": opTanh, "Trunc": opTrunc, "Signbit": opSignbit,
}

// mathCall records a call of a function of package math.
func (r *recorder) mathCall(e *ast.CallExpr, name string, args []value) value {
	x := make([]int32, len(args))
	whole := 0
	for i, v := range args {
		switch v.kind {
		case kFloat:
			x[i] = v.id()
		case kInt:
			whole = int(v.n)
		default:
			r.refuse(e, "math.%s of this cannot be recorded", name)
		}
	}
	if op, ok := mathOps[name]; ok {
		switch kinds[op].arity {
		case 1:
			id := r.g.unary(op, x[0], 0)
			if op.condition() {
				return r.truthOf(id)
			}
			return float(id)
		default:
			return float(r.g.binary(op, x[0], x[1]))
		}
	}
	return r.mathOther(e, name, x, whole)
}

func (r *recorder) mathOther(e *ast.CallExpr, name string, x []int32, whole int) value {
	g := r.g
	switch name {
	case "NaN":
		return float(g.constant(nan))
	case "Inf":
		return float(g.constant(math.Inf(whole)))
	case "IsNaN":
		return r.truthOf(r.not(g.binary(opEqual, x[0], x[0])))
	case "IsInf":
		return r.truthOf(r.isInf(x[0], whole))
	case "FMA":
		return float(g.fma(x[0], x[1], x[2]))
	case "Sincos":
		return value{kind: kTuple, ref: []value{float(g.unary(opSin, x[0], 0)), float(g.unary(opCos, x[0], 0))}}
	case "J0", "J1", "Jn":
		return float(g.unary(opBesselJ, x[len(x)-1], besselOrder(name, whole)))
	case "Y0", "Y1", "Yn":
		return float(g.unary(opBesselY, x[len(x)-1], besselOrder(name, whole)))
	case "Erfcinv":
		return float(g.unary(opErfinv, g.binary(opSub, g.constant(1), x[0]), 0))
	case "Pow10":
		return float(g.constant(math.Pow10(whole)))
	}
	return r.mathRest(e, name, x, whole)
}

// mathRest evaluates functions with a part that is no float: they serve where it
// is not needed, or where the argument is a constant.
func (r *recorder) mathRest(e *ast.CallExpr, name string, x []int32, whole int) value {
	if name == "Lgamma" {
		return value{kind: kTuple, ref: []value{float(r.g.unary(opLgamma, x[0], 0)), {}}}
	}
	if len(x) > 0 {
		if v, ok := r.g.known(x[0]); ok {
			switch name {
			case "Ldexp":
				return float(r.g.constant(math.Ldexp(v, whole)))
			case "Frexp":
				f, k := math.Frexp(v)
				return value{kind: kTuple, ref: []value{float(r.g.constant(f)), integer(int64(k))}}
			case "Modf":
				a, b := math.Modf(v)
				return value{kind: kTuple, ref: []value{float(r.g.constant(a)), float(r.g.constant(b))}}
			case "Ilogb":
				return integer(int64(math.Ilogb(v)))
			case "Logb":
				return float(r.g.constant(math.Logb(v)))
			}
		}
		if name == "Modf" {
			whole := r.g.unary(opTrunc, x[0], 0)
			rest := r.g.binary(opCopysign, r.g.binary(opSub, x[0], whole), x[0])
			return value{kind: kTuple, ref: []value{float(whole), float(rest)}}
		}
		if name == "Ldexp" && whole >= -1022 && whole <= 1023 {
			return float(r.g.binary(opMul, x[0], r.g.constant(math.Ldexp(1, whole))))
		}
	}
	r.refuse(e, "math.%s cannot be recorded: it has no derivative", name)
	return value{}
}

func besselOrder(name string, n int) int {
	switch name {
	case "J0", "Y0":
		return 0
	case "J1", "Y1":
		return 1
	}
	return n
}

// isInf is math.IsInf(x, sign).
func (r *recorder) isInf(x int32, sign int) int32 {
	up := r.g.binary(opEqual, x, r.g.constant(math.Inf(1)))
	down := r.g.binary(opEqual, x, r.g.constant(math.Inf(-1)))
	switch {
	case sign > 0:
		return up
	case sign < 0:
		return down
	}
	return r.g.binary(opOr, up, down)
}
