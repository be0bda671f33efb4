// Package measure computes lengths, areas, distances between plain geometries of the local frame.
//
// Everything here is planar arithmetic on metres; how true the plane is, is the business of package crs.
// Results depend on the input alone. Products are rounded before they are added, so that processors
// with a fused multiply-add give the same bits.
package measure
