// Package portable holds the elementary functions that lie on the path of a
// random draw: Exp, Expm1, Log, Log1p, Pow, SinTurns and Logistic.
//
// They give the same bits on every processor. The standard library's own
// choose processor-specific code (Exp and Pow pick fused multiply-add at run
// time on amd64, and have assembly on other processors), and the compiler may
// fuse x*y + z where the processor has an instruction for it. Here only
// + - * / , comparisons, integer operations and exact bit tricks are used, and
// every product that is added to something is rounded by float64(x*y) first,
// which the language says forbids fusing.
//
// The error is below one unit in the last place for Exp, Log, SinTurns and
// Pow, and below 2 for Expm1, Log1p and Logistic; the tests hold them to that
// against 200-bit arithmetic. Zero, infinity, NaN, overflow and gradual
// underflow come out as in package math, except that Pow of a negative base is
// NaN: no rate of this program has one.
//
// Package rng and the rooms of the yearly step call it. Code that only derives
// figures from tallies has no need of it and uses package math.
package portable
