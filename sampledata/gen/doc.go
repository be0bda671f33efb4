// Package gen makes the files of the invented sample district, the Isle of Marram, from one seed.
//
// The island is built in the order in which land is made: a coast, a relief worn down by running
// water, the streams that wore it, lanes that follow the relief, fields between lanes, streams and
// shore, houses along the lanes. Every step draws from its own random stream, keyed by the seed and
// the step's name, so that a change in one step does not stir the next.
//
// Generate gives the same bytes for the same seed. Products that are summed carry an explicit
// conversion, so that no fused operation changes bits, and what is written is rounded (7 decimals of a
// degree, decimetres of height). Elementary functions of the standard library may still differ in the
// last bit between processor families; rounding hides that, but no proof is offered.
//
// Left out: tides and depths of the sea, bridges as features of their own, buildings as polygons,
// seasons of the vegetation.
package gen
