// Package sweep runs many variants of one case: a grid over any of its numbers,
// its inputs one at a time, the other defensible forms of its model. It finds
// the largest take within the permit's limit and the smallest population that is
// viable. Cells share each replicate's weather, and what is finished is kept in
// a ledger (package ledger), so that a long run can be stopped, resumed, cut
// into shards and merged, and gives the same figures in every one of these ways.
//
// It holds whole-number tallies only and derives everything else from them at
// the end. Inputs marked uncertain are taken at their stated values, and that is
// said (Study.Warnings). It refuses grids that have a cell that is no valid case,
// before anything is run. The commands call it.
package sweep
