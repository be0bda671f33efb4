// Package track lays access tracks: a tree of ways from an entrance through all towers of a wind plant,
// along buildable ground where that is cheaper, around water and buildings.
//
// It knows no money: ground costs metres, a metre of costly ground counting as several. Ways are found on
// a grid, then pulled straight; what a way costs is always measured on the polygons themselves, so neither
// a thin stream nor the corner of a building slips between cells. There is no randomness; the same input
// gives the same tree.
package track
