// Package tape turns the Go source of a model into a straight-line program, a
// tape, and works on that: exact derivatives, the sparsity of the Jacobian,
// Taylor coefficients, and fast evaluation without a compiler.
//
// # Recording
//
// [Record] evaluates the type-checked syntax of a function partially. Floats
// are symbols; all else (integers, lengths, loops, calls, closures) is
// computed. A condition on floats records both sides and selects. Where that
// cannot work, because the sides leave different integers behind or one of them
// leaves a loop, the recorder follows the side that the sample point takes and
// keeps a guard; a run that meets a guard the other way records again.
//
// What cannot be recorded gives a [Refusal] that names the position and the
// reason; a tape is never silently wrong.
//
// # Arithmetic
//
// A tape does the operations of the source in their order, without fused
// multiply-add, so f has the bits that the Go compiler's code gives on amd64.
// Simplifications keep the bits of f (NaN payloads aside): 0·x is never folded.
//
// # Derivatives
//
// Derivatives are tapes made from tapes: forward with sparse rows for the
// Jacobian, forward along directions for f_z[a], f_zz[a, b] and f_zzz[a, b, c],
// and in reverse for wᵀ f_zz[a, ·]. Selected sides are selected in derivatives
// too and never multiplied by masks, so an infinity on the side not taken does
// no harm. See Griewank & Walther, Evaluating Derivatives (2nd ed., 2008).
package tape
