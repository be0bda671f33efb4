// Package weigh turns values of candidates into an order under one voice's weights.
//
// A value lies between 0 (worst anchor) and 1 (best anchor). Anchors are fixed beforehand and never
// taken from the set of candidates, so that adding or removing a candidate changes no other score.
// The score is additive: S_i = sum over keys k of w_k v_ik, with w the raw weights divided by their
// sum (Keeney and Raiffa 1976). It is never given alone: every line of an order carries its parts,
// its interval, its range of ranks, its limits, its gaps and what weights would change it.
//
// What is uncertain is treated as an interval. An unknown part may have any value from 0 to 1; its
// share is half its weight. Nothing unknown is imputed from other candidates and no weight is spread
// over the known keys.
//
// Left out: outranking and distance methods (they depend on the set), weights from incomplete
// pairwise judgements, rank acceptabilities beyond the first rank, choosing sets of candidates.
package weigh
