// Package geo holds the nouns of the map: positions, geometries, features, layers, notices.
//
// It does no input or output and knows nothing of energy.
package geo
