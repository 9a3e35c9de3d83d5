// Package rng draws the random numbers of the program: streams named by a key
// of seed, replicate and purpose, and exact samplers of the binomial, Poisson,
// negative binomial, normal and exponential laws.
//
// It has no default source, no global state and no clock: whoever wants a
// number holds a Stream and has seeded it. Equal keys give equal numbers on
// every processor; the samplers use package portable in place of the
// elementary functions of package math.
//
// Draw order is a contract. Which words of its stream a sampler uses, and how,
// decides every count the program reports, so a change in it is a change of
// results and is announced as "draws changed". The golden tests hold it.
//
// "Exact" means: the rejection methods accept with the ratio of the true
// probabilities, and the tables hold the true probabilities rounded to whole
// multiples of 2^-64; the law of one draw differs from the law asked for by
// less than the rounding of its parameters to doubles (a relative 2^-53) plus
// at most 2^-50 in total variation. No normal approximation is used anywhere.
//
// The functions Binomial, Poisson, ... take their parameters at every call, as
// the yearly step needs. They panic on NaN and on parameters out of range,
// which is a bug of the caller: the case has been checked long before. Code
// that draws with parameters from outside builds a law first (NewBinomial and
// its like), which answers with an error.
//
// The rooms of the yearly step, the outer draws of uncertain inputs and the
// bootstrap of fitting call it.
package rng
