// Package vector does arithmetic on whole arrays at the speed of compiled code.
//
// Recipe code is interpreted, so that a loop over 6000 integrations costs some
// hundred times what it would cost compiled. A [V] is a column of numbers whose
// methods are such loops: a model written with them is interpreted once per
// operation instead of once per number. An instrument that settles with the
// time scale p[1], for example:
//
//	t := vector.Of(curve.Time).Shift(-curve.Time[0])
//	ramp := t.Scale(-1 / p[1]).Exp().Scale(p[0]).Shift(1) // 1 + p0 exp(-(t-t0)/p1)
//
// A [Mask] is a column of yes and no: the outcome of a comparison, or the usable
// samples of a light curve. It picks elements ([V.Keep]) or decides between two
// columns ([Mask.Select]):
//
//	usable := vector.Used(curve.Mask)
//	level := vector.Of(curve.Flux).Keep(usable).Median()
//
// # Rules
//
// Methods never change their operands. [Of] takes a slice as it is, without a
// copy, and the results of methods never share memory with it.
//
// Two columns of different lengths cannot be combined, and there are a few
// other faults, such as an index out of range. So that expressions stay
// readable, functions do not return an error each: a result that does not exist
// carries the first fault instead of numbers, everything computed from it does
// too, and it comes out at the end, from [V.Values] or from the fit that the
// column is given to. A single number computed from such a column is NaN.
//
// NaN is never passed over: an element computed from NaN is NaN, and so are sum,
// mean, median, smallest value and so on of a column that holds one. Take NaN out
// with Keep(v.Finite()). Comparisons with NaN are false. Beyond a function's
// domain, such as the logarithm of a negative number, the result is NaN, and 1/0 is
// infinite, as package math and IEEE 754 have it.
//
// Sums are pairwise: runs of up to 64 elements are added from left to right, and
// longer ones are cut into halves and the sums of the halves added, so that
// rounding errors grow with the logarithm of the length (Higham 1993). The order
// depends on the length alone; the same numbers give the same sum, bit for bit.
// Products are rounded before they are added on every machine.
//
// A result is as long as an operand or shorter, but for [Full], [Linspace],
// [Concat] and [V.Repeat], which make up to [MaxLength] elements.
package vector
