package tape

import "math"

// An Op is an operation of a tape.
type Op uint8

// Leaves come first, then conditions, whose value is 1 or 0, then arithmetic,
// then functions. The operands of a node are a, b and c, as many as arity says;
// what is left of them may hold an immediate integer.
const (
	opConst  Op = iota // consts[a]
	opState            // state a
	opParam            // parameter a
	opHidden           // variable outside of the model, number a
	opDir              // component a of direction c
	opWeight           // component a of the weights w

	opLess // a < b
	opLessEq
	opEqual
	opNot
	opAnd
	opOr
	opSignbit

	opSelect // b where a holds, else c
	opNeg
	opAdd
	opSub
	opMul
	opDiv
	opMulSkip // 0 where a is 0, else a*b
	opSqrt
	opAbs
	opMax // of package math, where Max(Inf, NaN) is Inf
	opMin
	opGreatest // the language's max, where NaN wins
	opLeast
	opFMA
	opCopysign
	opFloor
	opCeil
	opTrunc
	opRound
	opRoundToEven
	opMod
	opRemainder
	opDim

	opExp
	opExp2
	opExpm1
	opLog
	opLog2
	opLog10
	opLog1p
	opSin
	opCos
	opTan
	opAsin
	opAcos
	opAtan
	opSinh
	opCosh
	opTanh
	opAsinh
	opAcosh
	opAtanh
	opCbrt
	opErf
	opErfc
	opErfinv
	opGamma
	opLgamma
	opPsi     // polygamma function of order c
	opBesselJ // of order c
	opBesselY // of order c
	opRise    // derivative of order c of a/(exp(a) - 1)
	opExprel  // derivative of order c of (exp(a) - 1)/a
	opPow
	opHypot
	opAtan2

	opCount
)

// kinds says what is to be known of each operation.
var kinds = [opCount]struct {
	name        string
	arity       int
	commutative bool
	immediate   bool // c is part of the operation
	flat        bool // derivative zero wherever there is one
}{
	opConst:       {name: "const"},
	opState:       {name: "state"},
	opParam:       {name: "parameter"},
	opHidden:      {name: "hidden"},
	opDir:         {name: "direction", immediate: true},
	opWeight:      {name: "weight"},
	opLess:        {name: "<", arity: 2, flat: true},
	opLessEq:      {name: "<=", arity: 2, flat: true},
	opEqual:       {name: "==", arity: 2, commutative: true, flat: true},
	opNot:         {name: "!", arity: 1, flat: true},
	opAnd:         {name: "&&", arity: 2, commutative: true, flat: true},
	opOr:          {name: "||", arity: 2, commutative: true, flat: true},
	opSignbit:     {name: "math.Signbit", arity: 1, flat: true},
	opSelect:      {name: "select", arity: 3},
	opNeg:         {name: "-", arity: 1},
	opAdd:         {name: "+", arity: 2, commutative: true},
	opSub:         {name: "-", arity: 2},
	opMul:         {name: "*", arity: 2, commutative: true},
	opDiv:         {name: "/", arity: 2},
	opMulSkip:     {name: "mulskip", arity: 2},
	opSqrt:        {name: "math.Sqrt", arity: 1},
	opAbs:         {name: "math.Abs", arity: 1},
	opMax:         {name: "math.Max", arity: 2, commutative: true},
	opMin:         {name: "math.Min", arity: 2, commutative: true},
	opGreatest:    {name: "max", arity: 2, commutative: true},
	opLeast:       {name: "min", arity: 2, commutative: true},
	opFMA:         {name: "math.FMA", arity: 3},
	opCopysign:    {name: "math.Copysign", arity: 2},
	opFloor:       {name: "math.Floor", arity: 1, flat: true},
	opCeil:        {name: "math.Ceil", arity: 1, flat: true},
	opTrunc:       {name: "math.Trunc", arity: 1, flat: true},
	opRound:       {name: "math.Round", arity: 1, flat: true},
	opRoundToEven: {name: "math.RoundToEven", arity: 1, flat: true},
	opMod:         {name: "math.Mod", arity: 2},
	opRemainder:   {name: "math.Remainder", arity: 2},
	opDim:         {name: "math.Dim", arity: 2},
	opExp:         {name: "math.Exp", arity: 1},
	opExp2:        {name: "math.Exp2", arity: 1},
	opExpm1:       {name: "math.Expm1", arity: 1},
	opLog:         {name: "math.Log", arity: 1},
	opLog2:        {name: "math.Log2", arity: 1},
	opLog10:       {name: "math.Log10", arity: 1},
	opLog1p:       {name: "math.Log1p", arity: 1},
	opSin:         {name: "math.Sin", arity: 1},
	opCos:         {name: "math.Cos", arity: 1},
	opTan:         {name: "math.Tan", arity: 1},
	opAsin:        {name: "math.Asin", arity: 1},
	opAcos:        {name: "math.Acos", arity: 1},
	opAtan:        {name: "math.Atan", arity: 1},
	opSinh:        {name: "math.Sinh", arity: 1},
	opCosh:        {name: "math.Cosh", arity: 1},
	opTanh:        {name: "math.Tanh", arity: 1},
	opAsinh:       {name: "math.Asinh", arity: 1},
	opAcosh:       {name: "math.Acosh", arity: 1},
	opAtanh:       {name: "math.Atanh", arity: 1},
	opCbrt:        {name: "math.Cbrt", arity: 1},
	opErf:         {name: "math.Erf", arity: 1},
	opErfc:        {name: "math.Erfc", arity: 1},
	opErfinv:      {name: "math.Erfinv", arity: 1},
	opGamma:       {name: "math.Gamma", arity: 1},
	opLgamma:      {name: "math.Lgamma", arity: 1},
	opPsi:         {name: "polygamma", arity: 1, immediate: true},
	opBesselJ:     {name: "math.Jn", arity: 1, immediate: true},
	opBesselY:     {name: "math.Yn", arity: 1, immediate: true},
	opRise:        {name: "rise", arity: 1, immediate: true},
	opExprel:      {name: "exprel", arity: 1, immediate: true},
	opPow:         {name: "math.Pow", arity: 2},
	opHypot:       {name: "math.Hypot", arity: 2, commutative: true},
	opAtan2:       {name: "math.Atan2", arity: 2},
}

// leaf reports whether an operation has no operands.
func (op Op) leaf() bool { return op <= opWeight }

// condition reports whether the value is a truth, 1 or 0.
func (op Op) condition() bool { return op >= opLess && op <= opSignbit }

func truth(b bool) float64 {
	if b {
		return 1
	}
	return 0
}

// apply does one operation that has operands. k is the immediate.
func apply(op Op, a, b, c float64, k int) float64 {
	switch op {
	case opLess:
		return truth(a < b)
	case opLessEq:
		return truth(a <= b)
	case opEqual:
		return truth(a == b)
	case opNot:
		return 1 - a
	case opAnd:
		return a * b
	case opOr:
		return truth(a != 0 || b != 0)
	case opSignbit:
		return truth(math.Signbit(a))
	case opSelect:
		if a != 0 {
			return b
		}
		return c
	case opNeg:
		return -a
	case opAdd:
		return a + b
	case opSub:
		return a - b
	case opMul:
		return a * b
	case opDiv:
		return a / b
	case opMulSkip:
		if a == 0 {
			return 0
		}
		return a * b
	}
	if kinds[op].arity == 1 {
		return function(op, a, k)
	}
	return function2(op, a, b, c)
}

// function does an operation of one operand.
func function(op Op, a float64, k int) float64 {
	if library {
		return libraryFunction(op, a, k)
	}
	switch op {
	case opExp:
		return exp(a)
	case opLog:
		return log(a)
	case opSin:
		return sin(a)
	case opCos:
		return cos(a)
	case opTanh:
		return tanh(a)
	}
	return commonFunction(op, a, k)
}

// libraryFunction is function by package math.
func libraryFunction(op Op, a float64, k int) float64 {
	switch op {
	case opExp:
		return math.Exp(a)
	case opLog:
		return math.Log(a)
	case opSin:
		return math.Sin(a)
	case opCos:
		return math.Cos(a)
	case opTanh:
		return math.Tanh(a)
	}
	return commonFunction(op, a, k)
}

func commonFunction(op Op, a float64, k int) float64 {
	switch op {
	case opSqrt:
		return math.Sqrt(a)
	case opAbs:
		return math.Abs(a)
	case opFloor:
		return math.Floor(a)
	case opCeil:
		return math.Ceil(a)
	case opTrunc:
		return math.Trunc(a)
	case opRound:
		return math.Round(a)
	case opRoundToEven:
		return math.RoundToEven(a)
	case opExp2:
		return math.Exp2(a)
	case opExpm1:
		return math.Expm1(a)
	case opLog2:
		return math.Log2(a)
	case opLog10:
		return math.Log10(a)
	case opLog1p:
		return math.Log1p(a)
	case opTan:
		return math.Tan(a)
	case opAsin:
		return math.Asin(a)
	case opAcos:
		return math.Acos(a)
	case opAtan:
		return math.Atan(a)
	case opSinh:
		return math.Sinh(a)
	case opCosh:
		return math.Cosh(a)
	}
	return rareFunction(op, a, k)
}

func rareFunction(op Op, a float64, k int) float64 {
	switch op {
	case opAsinh:
		return math.Asinh(a)
	case opAcosh:
		return math.Acosh(a)
	case opAtanh:
		return math.Atanh(a)
	case opCbrt:
		return math.Cbrt(a)
	case opErf:
		return math.Erf(a)
	case opErfc:
		return math.Erfc(a)
	case opErfinv:
		return math.Erfinv(a)
	case opGamma:
		return math.Gamma(a)
	case opLgamma:
		v, _ := math.Lgamma(a)
		return v
	case opPsi:
		return polygamma(k, a)
	case opBesselJ:
		return besselJ(k, a)
	case opBesselY:
		return besselY(k, a)
	case opRise:
		return rise(k, a)
	case opExprel:
		return exprel(k, a)
	}
	panic("tape: no function " + kinds[op].name)
}

// function2 does an operation of two or three operands that is no arithmetic.
func function2(op Op, a, b, c float64) float64 {
	switch op {
	case opMax:
		return math.Max(a, b)
	case opMin:
		return math.Min(a, b)
	case opGreatest:
		return max(a, b)
	case opLeast:
		return min(a, b)
	case opFMA:
		return math.FMA(a, b, c)
	case opCopysign:
		return math.Copysign(a, b)
	case opMod:
		return math.Mod(a, b)
	case opRemainder:
		return math.Remainder(a, b)
	case opDim:
		return math.Dim(a, b)
	case opPow:
		if library {
			return math.Pow(a, b)
		}
		return pow(a, b)
	case opHypot:
		return math.Hypot(a, b)
	case opAtan2:
		return math.Atan2(a, b)
	}
	panic("tape: no function " + kinds[op].name)
}
